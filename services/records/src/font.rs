//! The record's typeface: measuring, what it can show, and the reduced copy a document embeds.
//!
//! The two faces are parsed once per process. A document carries only the outlines it uses
//! ([`crate::truetype`]) under the glyph numbers of the full face.

use std::borrow::Cow;
use std::collections::{BTreeMap, BTreeSet};
use std::sync::OnceLock;

use printpdf::ParsedFont;
use sha2::{Digest, Sha256};

use crate::RecordError;
use crate::truetype;

/// Millimetres in one typographic point (1/72 inch of 25.4 mm).
pub(crate) const MM_PER_POINT: f32 = 25.4 / 72.0;

/// Stands for a character that cannot be shown.
pub(crate) const STAND_IN: char = '□';

static REGULAR: &[u8] = include_bytes!("../assets/DejaVuSansCondensed-subset.ttf");
static BOLD: &[u8] = include_bytes!("../assets/DejaVuSansCondensed-Bold-subset.ttf");

/// One of the two faces.
#[derive(Clone, Copy, Debug, Default, Eq, PartialEq)]
pub(crate) enum Weight {
    #[default]
    Regular,
    Bold,
}

/// What the face knows about one character; glyph 0 is "none".
#[derive(Clone, Copy, Default)]
struct Sign {
    glyph: u16,
    advance: u16,
    /// The lowest character with the same glyph. A document can map a glyph back to one character
    /// only, so the others are written as this one: a no-break space as a space.
    same_as: char,
}

/// A parsed face with a table by code point, quick enough to measure every word of a long record.
pub(crate) struct Face {
    /// The face without outlines and maps, to be filled for one document.
    bare: ParsedFont,
    program: &'static [u8],
    name: &'static str,
    signs: Vec<Sign>,
}

/// Both faces.
pub(crate) struct Typeface {
    regular: Face,
    bold: Face,
}

/// The typeface, parsed at first use.
pub(crate) fn typeface() -> Result<&'static Typeface, RecordError> {
    static PARSED: OnceLock<Option<Typeface>> = OnceLock::new();
    PARSED
        .get_or_init(|| {
            Some(Typeface {
                regular: Face::parse(REGULAR, "DejaVuSansCondensed")?,
                bold: Face::parse(BOLD, "DejaVuSansCondensed-Bold")?,
            })
        })
        .as_ref()
        .ok_or(RecordError::Typeface)
}

/// The text with every character that the record's typeface cannot show replaced by a visible
/// box, `□`, and every kind of space by a plain one. Line ends stay.
///
/// A record has to be printable whatever was typed into it, and a dropped character would be
/// worse than a visible gap. [`crate::batch_record`] does this to all its text;
/// [`crate::batch_record_exact`] fails instead. Invisible formatting characters (direction
/// overrides, zero-width signs) count as not showable: they could make a page read differently
/// from what was recorded.
///
/// ```
/// assert_eq!(records::legible("25 µL 🍷 ≤ ½"), "25 µL □ ≤ ½");
/// ```
pub fn legible(text: &str) -> String {
    match typeface() {
        Ok(typeface) => typeface.legible(text).0.into_owned(),
        Err(_) => text.to_owned(),
    }
}

impl Typeface {
    pub(crate) fn face(&self, weight: Weight) -> &Face {
        match weight {
            Weight::Regular => &self.regular,
            Weight::Bold => &self.bold,
        }
    }

    /// The text as it can be shown, and the first character that had to be replaced.
    pub(crate) fn legible<'a>(&self, text: &'a str) -> (Cow<'a, str>, Option<char>) {
        if text.bytes().all(|byte| byte == b'\n' || (0x20..0x7f).contains(&byte)) {
            return (Cow::Borrowed(text), None);
        }
        let mut missing = None;
        let shown = text
            .chars()
            .map(|character| {
                self.shown(character).unwrap_or_else(|| {
                    missing.get_or_insert(character);
                    STAND_IN
                })
            })
            .collect();
        (Cow::Owned(shown), missing)
    }

    fn shown(&self, character: char) -> Option<char> {
        if character == '\n' {
            return Some(character);
        }
        if character.is_whitespace() {
            return Some(' ');
        }
        let regular = self.regular.sign(character)?;
        self.bold.sign(character).filter(|_| !is_invisible(character)).map(|_| regular.same_as)
    }
}

fn is_invisible(character: char) -> bool {
    matches!(character, '\u{ad}' | '\u{200b}'..='\u{200f}' | '\u{2028}'..='\u{202e}'
        | '\u{2060}'..='\u{206f}' | '\u{feff}')
}

impl Face {
    fn parse(program: &'static [u8], name: &'static str) -> Option<Self> {
        let mut parsed = ParsedFont::from_bytes(program, 0, &mut Vec::new())?;
        let mut signs = vec![Sign::default(); 0x1_0000];
        let mut first_of: BTreeMap<u16, char> = BTreeMap::new();
        for (&code, &glyph) in &parsed.codepoint_to_glyph {
            let (Some(character), Some(&advance)) =
                (char::from_u32(code), parsed.glyph_widths.get(&glyph))
            else {
                continue;
            };
            let same_as = *first_of.entry(glyph).or_insert(character);
            if let Some(sign) = usize::try_from(code).ok().and_then(|code| signs.get_mut(code)) {
                *sign = Sign { glyph, advance, same_as };
            }
        }
        parsed.original_bytes.clear();
        parsed.codepoint_to_glyph.clear();
        parsed.glyph_widths.clear();
        Some(Self { bare: parsed, program, name, signs })
    }

    fn sign(&self, character: char) -> Option<Sign> {
        let code = usize::try_from(u32::from(character)).ok()?;
        self.signs.get(code).copied().filter(|sign| sign.glyph != 0)
    }

    /// Width of a text in millimetres at a size in points.
    pub(crate) fn width(&self, text: &str, points: f32) -> f32 {
        let units: f32 = text
            .chars()
            .filter_map(|character| self.sign(character))
            .map(|sign| f32::from(sign.advance))
            .sum();
        units / f32::from(self.bare.units_per_em) * points * MM_PER_POINT
    }

    /// The face reduced to the characters one document shows.
    pub(crate) fn reduced(&self, used: &BTreeSet<char>) -> Result<ParsedFont, RecordError> {
        let signs: BTreeMap<u32, Sign> = used
            .iter()
            .filter_map(|&character| Some((u32::from(character), self.sign(character)?)))
            .collect();
        let glyphs: BTreeSet<u16> = signs.values().map(|sign| sign.glyph).collect();
        let mut font = self.bare.clone();
        font.original_bytes =
            truetype::keep_glyphs(self.program, &glyphs).ok_or(RecordError::Typeface)?;
        font.font_name = Some(format!("{}+{}", subset_tag(&glyphs), self.name));
        font.glyph_widths = signs.values().map(|sign| (sign.glyph, sign.advance)).collect();
        font.codepoint_to_glyph = signs.iter().map(|(&code, sign)| (code, sign.glyph)).collect();
        Ok(font)
    }
}

/// Six capitals that mark an embedded face as reduced (ISO 32000-1, 9.6.4), from its content.
fn subset_tag(glyphs: &BTreeSet<u16>) -> String {
    let mut hash = Sha256::new();
    for glyph in glyphs {
        hash.update(glyph.to_be_bytes());
    }
    hash.finalize().iter().take(6).map(|byte| char::from(b'A' + byte % 26)).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn signs_of_measure_and_european_letters_are_shown_as_they_are() {
        let text = "é ß µ ° ² ≤ ½ č Š ± · – — → □ ’ ' \" Ж Ω";
        assert_eq!(legible(text), text);
    }

    #[test]
    fn what_cannot_be_seen_becomes_a_box() {
        assert_eq!(legible("a\u{202e}b\u{7}c漢"), "a□b□c□");
        assert_eq!(legible("3\u{a0}000\u{202f}L\tx\ny"), "3 000 L x\ny");
    }

    #[test]
    fn every_digit_has_the_same_width_in_both_faces() {
        let typeface = typeface().unwrap();
        for weight in [Weight::Regular, Weight::Bold] {
            let widths: BTreeSet<u16> =
                ('0'..='9').map(|c| typeface.face(weight).sign(c).unwrap().advance).collect();
            assert_eq!(widths.len(), 1);
        }
    }
}
