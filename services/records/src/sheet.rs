//! A ledger page that fills from the top and turns by itself: headings, paragraphs, furniture.

use crate::RecordError;
use crate::font::Weight;
use crate::page::{Canvas, HEIGHT, Ink, Spot, Type};

/// Left edge of the text, in millimetres.
pub(crate) const LEFT: f32 = 28.0;
/// Right edge of the text.
pub(crate) const RIGHT: f32 = 194.0;
/// The margin rule, with the notches to its left.
pub(crate) const RULE: f32 = 25.0;
/// Top of the body.
const TOP: f32 = 22.0;
/// Bottom of the body; the footer stands below.
const BOTTOM: f32 = 266.0;
/// Kept free for the page number at the right of the footer.
const NUMBER_ROOM: f32 = 28.0;
/// For the left and the right head of a page.
const HEAD_ROOM: (f32, f32) = (92.0, 70.0);

const HEADING: Type = Type::new(Weight::Bold, 11.0, Ink::Black);
const SMALL: Type = Type::new(Weight::Regular, 7.0, Ink::Grey);
const SMALL_BOLD: Type = Type::new(Weight::Bold, 7.0, Ink::Black);

/// Running text.
pub(crate) const BODY: Type = Type::new(Weight::Regular, 8.4, Ink::Black);

/// A place in the document that its table of contents leads to.
#[derive(Debug)]
pub(crate) struct Bookmark {
    pub(crate) title: String,
    pub(crate) page: usize,
    /// Points from the bottom of the page, as the file format counts.
    pub(crate) top: f32,
}

/// What stands on every page around the body.
pub(crate) struct Furniture {
    /// Head of the page, left and right.
    pub(crate) head: (String, String),
    /// First line of the footer; the page number stands at its right.
    pub(crate) foot: String,
    /// Said in bold on every page: a simulation, a preview.
    pub(crate) warnings: Vec<&'static str>,
    /// The deferral statement.
    pub(crate) deferral: &'static str,
}

/// The document while it is filled.
pub(crate) struct Sheet {
    pub(crate) canvas: Canvas,
    pub(crate) bookmarks: Vec<Bookmark>,
    /// Where the next thing goes, in millimetres from the top.
    pub(crate) y: f32,
}

impl Sheet {
    pub(crate) fn new() -> Result<Self, RecordError> {
        let mut canvas = Canvas::new()?;
        canvas.add_page();
        Ok(Self { canvas, bookmarks: Vec::new(), y: TOP })
    }

    /// Millimetres left on this page.
    pub(crate) fn room(&self) -> f32 {
        BOTTOM - self.y
    }

    /// Millimetres on an empty page.
    pub(crate) fn full_room() -> f32 {
        BOTTOM - TOP
    }

    pub(crate) fn turn(&mut self) {
        self.canvas.add_page();
        self.y = TOP;
    }

    /// Turns the page unless so many millimetres are left.
    pub(crate) fn need(&mut self, height: f32) {
        if self.room() < height {
            self.turn();
        }
    }

    /// A section's heading and its bookmark. The caller has seen to it that what follows has room
    /// on the same page.
    pub(crate) fn heading(&mut self, title: &str) {
        if self.y > TOP + 0.1 {
            self.y += 5.0;
        }
        let title = self.canvas.legible(title);
        let top = (HEIGHT - self.y) / crate::font::MM_PER_POINT;
        let page = self.canvas.page();
        self.bookmarks.push(Bookmark { title: title.clone(), page, top });
        let spot = (LEFT, self.y + HEADING.rise());
        self.canvas.tagged("H2", |canvas| canvas.text(HEADING, spot, &title));
        self.y += HEADING.leading() + 1.4;
    }

    /// A paragraph over the full width, broken into lines and over pages.
    pub(crate) fn paragraph(&mut self, set: Type, text: &str) {
        let text = self.canvas.legible(text);
        for line in wrap(&self.canvas, set, RIGHT - LEFT, &text) {
            self.need(set.leading());
            let spot = (LEFT, self.y + set.rise());
            self.canvas.tagged("P", |canvas| canvas.text(set, spot, &line));
            self.y += set.leading();
        }
    }

    pub(crate) fn gap(&mut self, height: f32) {
        self.y += height;
    }

    /// Draws what stands on every page, once all pages are known.
    pub(crate) fn furnish(&mut self, furniture: &Furniture) {
        let total = self.canvas.page_count();
        let head = (
            self.one_line(SMALL, HEAD_ROOM.0, &furniture.head.0),
            self.one_line(SMALL, HEAD_ROOM.1, &furniture.head.1),
        );
        let lines = self.footer(furniture);
        for page in 0..total {
            self.canvas.turn_to(page);
            let number = format!("page {} of {total}", page + 1);
            self.canvas.artifact(|canvas| {
                canvas.stroke(Ink::Accent, 0.7, &[(RULE, TOP - 3.0), (RULE, BOTTOM + 2.0)]);
                canvas.stroke(Ink::Hairline, 0.4, &[(LEFT, 269.5), (RIGHT, 269.5)]);
                canvas.text(SMALL, (LEFT, 15.0), &head.0);
                canvas.text_right(SMALL, (RIGHT, 15.0), &head.1);
                canvas.text_right(SMALL_BOLD, (RIGHT, 273.2), &number);
                let mut y = 273.2;
                for (set, line) in &lines {
                    canvas.text(*set, (LEFT, y), line);
                    y += set.leading();
                }
            });
        }
    }

    /// The lines of the footer; the first leaves room for the page number.
    fn footer(&mut self, furniture: &Furniture) -> Vec<(Type, String)> {
        let foot = self.one_line(SMALL, RIGHT - LEFT - NUMBER_ROOM, &furniture.foot);
        let mut lines = vec![(SMALL, foot)];
        let warnings = furniture.warnings.iter().map(|line| (SMALL_BOLD, *line));
        for (set, line) in warnings.chain([(SMALL, furniture.deferral)]) {
            let broken = wrap(&self.canvas, set, RIGHT - LEFT, line);
            lines.extend(broken.into_iter().map(|line| (set, line)));
        }
        lines
    }

    /// A text cut to what one line holds. The whole of it stands on the first page.
    fn one_line(&mut self, set: Type, width: f32, text: &str) -> String {
        let text = self.canvas.legible(text).replace('\n', " ");
        let mut lines = wrap(&self.canvas, set, width - 2.0, &text).into_iter();
        let first = lines.next().unwrap_or_default();
        if lines.next().is_some() { format!("{first}…") } else { first }
    }
}

/// Breaks a legible text into lines no wider than `width` millimetres: at line ends, at spaces,
/// and inside a word that is wider than a line (a digest, a pasted address).
pub(crate) fn wrap(canvas: &Canvas, set: Type, width: f32, text: &str) -> Vec<String> {
    let face = canvas.typeface.face(set.weight);
    let measure = |text: &str| face.width(text, set.points);
    let space = measure(" ");
    let mut lines = Vec::new();
    for given in text.split('\n') {
        let (mut line, mut used) = (String::new(), 0.0);
        for word in given.split(' ').filter(|word| !word.is_empty()) {
            let own = measure(word);
            if !line.is_empty() && used + space + own <= width {
                line.push(' ');
                line.push_str(word);
                used += space + own;
                continue;
            }
            if !line.is_empty() {
                lines.push(std::mem::take(&mut line));
            }
            let mut rest = word;
            while let Some(cut) = overlong(rest, width, &measure) {
                lines.push(rest[..cut].to_owned());
                rest = &rest[cut..];
            }
            line.push_str(rest);
            used = measure(rest);
        }
        lines.push(line);
    }
    lines
}

/// Where to cut a word that is wider than a line; at least one character stays before the cut.
fn overlong(word: &str, width: f32, measure: &impl Fn(&str) -> f32) -> Option<usize> {
    if measure(word) <= width {
        return None;
    }
    let mut fits = None;
    for (start, character) in word.char_indices() {
        let end = start + character.len_utf8();
        if fits.is_some() && measure(&word[..end]) > width {
            break;
        }
        fits = Some(end);
    }
    fits.filter(|&end| end < word.len())
}

/// A number of things as a length factor; page layouts never count beyond this range.
pub(crate) fn times(count: usize) -> f32 {
    f32::from(u16::try_from(count).unwrap_or(u16::MAX))
}

/// The place of a line of type whose top is at `y`.
pub(crate) fn baseline(set: Type, (x, y): Spot) -> Spot {
    (x, y + set.rise())
}
