//! Empties the outlines of unused glyphs in a TrueType file.
//!
//! Glyph numbers stay as they are, so text already written by glyph number stays right; tables
//! that a PDF reader does not need are left out. Layout of the tables: ISO/IEC 14496-22
//! (OpenType), chapters 5.2 and 5.3.

use std::collections::{BTreeMap, BTreeSet};
use std::ops::Range;

/// The tables a PDF reader uses of an embedded TrueType face, in the order they are written.
const KEPT: [&[u8; 4]; 9] =
    [b"cvt ", b"fpgm", b"glyf", b"head", b"hhea", b"hmtx", b"loca", b"maxp", b"prep"];

/// A copy of `file` in which only `used` glyphs, their parts and glyph 0 have outlines.
/// `None` if the file is not a well-formed single TrueType face.
pub(crate) fn keep_glyphs(file: &[u8], used: &BTreeSet<u16>) -> Option<Vec<u8>> {
    let font = Outlines::read(file)?;
    let kept = font.with_parts(used)?;
    let (mut glyf, mut loca) = (Vec::new(), Vec::new());
    for glyph in 0..font.count {
        loca.extend(u32::try_from(glyf.len()).ok()?.to_be_bytes());
        if kept.contains(&glyph) {
            glyf.extend(file.get(font.outline(glyph)?)?);
            pad(&mut glyf);
        }
    }
    loca.extend(u32::try_from(glyf.len()).ok()?.to_be_bytes());

    let mut tables = Vec::new();
    for name in KEPT {
        let Some(range) = font.tables.get(name) else { continue };
        let bytes = match name {
            b"glyf" => glyf.clone(),
            b"loca" => loca.clone(),
            b"head" => long_offsets(file.get(range.clone())?)?,
            _ => file.get(range.clone())?.to_vec(),
        };
        tables.push((*name, bytes));
    }
    assemble(&tables)
}

/// Where the outlines of a face are.
struct Outlines<'a> {
    file: &'a [u8],
    tables: BTreeMap<[u8; 4], Range<usize>>,
    long: bool,
    count: u16,
}

impl<'a> Outlines<'a> {
    fn read(file: &'a [u8]) -> Option<Self> {
        let mut tables = BTreeMap::new();
        for index in 0..usize::from(u16_at(file, 4)?) {
            let record = 12 + 16 * index;
            let name = <[u8; 4]>::try_from(file.get(record..record + 4)?).ok()?;
            let start = usize_at(file, record + 8)?;
            tables.insert(name, start..start + usize_at(file, record + 12)?);
        }
        let long = u16_at(file, tables.get(b"head")?.start + 50)? == 1;
        let count = u16_at(file, tables.get(b"maxp")?.start + 4)?;
        Some(Self { file, tables, long, count })
    }

    fn outline(&self, glyph: u16) -> Option<Range<usize>> {
        let glyf = self.tables.get(b"glyf")?.start;
        Some(glyf + self.offset(usize::from(glyph))?..glyf + self.offset(usize::from(glyph) + 1)?)
    }

    fn offset(&self, index: usize) -> Option<usize> {
        let loca = self.tables.get(b"loca")?.start;
        if self.long {
            usize_at(self.file, loca + 4 * index)
        } else {
            Some(usize::from(u16_at(self.file, loca + 2 * index)?) * 2)
        }
    }

    /// The glyphs asked for, glyph 0, and every glyph that these are composed of.
    fn with_parts(&self, used: &BTreeSet<u16>) -> Option<BTreeSet<u16>> {
        let mut kept = used.clone();
        kept.insert(0);
        let mut open: Vec<u16> = kept.iter().copied().collect();
        while let Some(glyph) = open.pop() {
            for part in self.parts(glyph)? {
                if kept.insert(part) {
                    open.push(part);
                }
            }
        }
        Some(kept)
    }

    /// A composite glyph (negative contour count) lists its parts, each with flags that say how
    /// long the record is and whether another follows.
    fn parts(&self, glyph: u16) -> Option<Vec<u16>> {
        const WORDS: u16 = 0x0001;
        const SCALE: u16 = 0x0008;
        const MORE: u16 = 0x0020;
        const TWO_SCALES: u16 = 0x0040;
        const MATRIX: u16 = 0x0080;

        let range = self.outline(glyph)?;
        let mut parts = Vec::new();
        if range.is_empty() || u16_at(self.file, range.start)? < 0x8000 {
            return Some(parts);
        }
        let mut at = range.start + 10;
        loop {
            let flags = u16_at(self.file, at)?;
            parts.push(u16_at(self.file, at + 2)?);
            at += 4 + if flags & WORDS == 0 { 2 } else { 4 };
            at += match flags {
                flags if flags & SCALE != 0 => 2,
                flags if flags & TWO_SCALES != 0 => 4,
                flags if flags & MATRIX != 0 => 8,
                _ => 0,
            };
            if flags & MORE == 0 {
                return Some(parts);
            }
        }
    }
}

/// The `head` table with long glyph offsets and the whole-file checksum cleared.
fn long_offsets(head: &[u8]) -> Option<Vec<u8>> {
    let mut head = head.to_vec();
    head.get_mut(8..12)?.fill(0);
    head.get_mut(50..52)?.copy_from_slice(&1_u16.to_be_bytes());
    Some(head)
}

fn assemble(tables: &[([u8; 4], Vec<u8>)]) -> Option<Vec<u8>> {
    let count = u16::try_from(tables.len()).ok()?;
    let selector = u16::try_from(count.checked_ilog2()?).ok()?;
    let range = 16 << selector;
    let mut out = vec![0, 1, 0, 0];
    for value in [count, range, selector, 16 * count - range] {
        out.extend(value.to_be_bytes());
    }
    let mut start = 12 + 16 * tables.len();
    for (name, bytes) in tables {
        out.extend(name);
        out.extend(checksum(bytes).to_be_bytes());
        out.extend(u32::try_from(start).ok()?.to_be_bytes());
        out.extend(u32::try_from(bytes.len()).ok()?.to_be_bytes());
        start += bytes.len().next_multiple_of(4);
    }
    for (_, bytes) in tables {
        out.extend(bytes);
        pad(&mut out);
    }
    Some(out)
}

fn pad(bytes: &mut Vec<u8>) {
    bytes.resize(bytes.len().next_multiple_of(4), 0);
}

fn checksum(bytes: &[u8]) -> u32 {
    bytes.chunks(4).fold(0, |sum, chunk| {
        let mut word = [0; 4];
        word[..chunk.len()].copy_from_slice(chunk);
        u32::wrapping_add(sum, u32::from_be_bytes(word))
    })
}

fn u16_at(bytes: &[u8], at: usize) -> Option<u16> {
    Some(u16::from_be_bytes(bytes.get(at..at + 2)?.try_into().ok()?))
}

fn usize_at(bytes: &[u8], at: usize) -> Option<usize> {
    usize::try_from(u32::from_be_bytes(bytes.get(at..at + 4)?.try_into().ok()?)).ok()
}
