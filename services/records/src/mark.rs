//! The notches: marks cut into the margin rule that say by shape what a row is.
//!
//! Shape comes first, so that a record copied in grey, or read by an eye that does not part
//! colours, says the same.

use crate::batch_record::Verdict;
use crate::page::{Canvas, Ink, Spot};

/// Width of one notch in millimetres.
pub(crate) const NOTCH: f32 = 4.0;

/// A mark in the margin.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub(crate) enum Mark {
    /// The verdict of an assessment or of one finding.
    Verdict(Verdict),
    /// Entered later than the site's limit allows.
    Late,
    /// An earlier value was struck through.
    Amended,
}

impl Mark {
    /// Every mark, for the key.
    pub(crate) const ALL: [Self; 6] = [
        Self::Verdict(Verdict::Clear),
        Self::Verdict(Verdict::Advise),
        Self::Verdict(Verdict::Refer),
        Self::Verdict(Verdict::Refuse),
        Self::Late,
        Self::Amended,
    ];

    pub(crate) fn word(self) -> &'static str {
        match self {
            Self::Verdict(verdict) => verdict.word(),
            Self::Late => "late",
            Self::Amended => "amended",
        }
    }

    /// Draws the mark so that it ends at the rule at `x`, centred on `y`.
    pub(crate) fn draw(self, canvas: &mut Canvas, (x, y): Spot) {
        let tip = x - NOTCH;
        match self {
            Self::Verdict(Verdict::Clear) => {
                canvas.stroke(Ink::Accent, 1.1, &[(tip, y), (x, y)]);
            }
            Self::Verdict(Verdict::Advise) => {
                canvas.outline(Ink::Accent, 0.8, &[(x, y - 1.5), (tip, y), (x, y + 1.5)]);
            }
            Self::Verdict(Verdict::Refer) => {
                canvas.shape(Ink::Accent, &[(x, y - 1.6), (tip, y), (x, y + 1.6)]);
            }
            Self::Verdict(Verdict::Refuse) => barred(canvas, (x, y)),
            Self::Late => {
                let middle = x - NOTCH / 2.0;
                let spots = [(middle, y - 1.4), (x - 0.5, y), (middle, y + 1.4), (tip + 0.5, y)];
                canvas.outline(Ink::Accent, 0.8, &spots);
            }
            Self::Amended => {
                for offset in [-0.6, 0.6] {
                    let line = [(tip + 0.6, y + offset), (x - 0.6, y + offset)];
                    canvas.stroke(Ink::Accent, 0.8, &line);
                }
            }
        }
    }
}

/// A full block crossed out: may not be done.
fn barred(canvas: &mut Canvas, (x, y): Spot) {
    let (left, top, bottom) = (x - NOTCH, y - 1.6, y + 1.6);
    canvas.shape(Ink::Accent, &[(left, top), (x, top), (x, bottom), (left, bottom)]);
    canvas.stroke(Ink::Paper, 0.9, &[(left + 0.7, top + 0.6), (x - 0.7, bottom - 0.6)]);
    canvas.stroke(Ink::Paper, 0.9, &[(left + 0.7, bottom - 0.6), (x - 0.7, top + 0.6)]);
}
