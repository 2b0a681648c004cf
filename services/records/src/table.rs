//! Ruled tables that run over pages: the head repeats, rows keep together where they can.

use std::ops::Range;

use crate::font::{MM_PER_POINT, Weight};
use crate::mark::{Mark, NOTCH};
use crate::page::{Ink, Type};
use crate::sheet::{BODY, LEFT, RIGHT, RULE, Sheet, baseline, times, wrap};

const TEXT: Type = Type::new(Weight::Regular, 7.8, Ink::Black);
const STRONG: Type = Type::new(Weight::Bold, 7.8, Ink::Black);
const QUIET: Type = Type::new(Weight::Regular, 7.8, Ink::Grey);
const HEAD: Type = Type::new(Weight::Bold, 7.4, Ink::Black);

/// Above and below the lines of a row, in millimetres.
const PAD: f32 = 0.75;
/// Between two columns.
const GUTTER: f32 = 2.2;
/// Height of a heading with the space above it.
const TITLE_ROOM: f32 = 12.0;
/// Height of a remark of up to three lines.
const REMARK_ROOM: f32 = 13.0;
/// Width of a note's lead.
const LEAD: f32 = 27.0;
/// How far a note stands in from the edge of its row.
const INDENT: f32 = 6.0;

/// On which side of its column a cell stands.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub(crate) enum Side {
    Left,
    /// For figures: the digits of the typeface are all of one width.
    Right,
}

/// A column: its head, its width in millimetres, its side. The last may be 0: "what is left".
#[derive(Clone, Copy, Debug)]
pub(crate) struct Column(pub(crate) &'static str, pub(crate) f32, pub(crate) Side);

/// How a piece of a cell is set.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub(crate) enum Voice {
    Plain,
    Strong,
    Quiet,
    /// A value no longer in force, with a line through it.
    Struck,
}

/// What stands in one column of one row, piece below piece.
#[derive(Clone, Debug, Default)]
pub(crate) struct Cell(Vec<(Voice, String)>);

impl Cell {
    /// Adds a piece below; an empty one leaves no line.
    pub(crate) fn and(mut self, voice: Voice, text: impl Into<String>) -> Self {
        let text = text.into();
        if !text.is_empty() {
            self.0.push((voice, text));
        }
        self
    }

    pub(crate) fn strong(text: impl Into<String>) -> Self {
        Self::default().and(Voice::Strong, text)
    }

    pub(crate) fn quiet(text: impl Into<String>) -> Self {
        Self::default().and(Voice::Quiet, text)
    }
}

impl<T: Into<String>> From<T> for Cell {
    fn from(text: T) -> Self {
        Self::default().and(Voice::Plain, text)
    }
}

/// A full-width remark under a row: a bold lead and a text beside it.
#[derive(Clone, Debug)]
pub(crate) struct Note {
    pub(crate) mark: Option<Mark>,
    pub(crate) lead: String,
    pub(crate) text: Cell,
}

/// One row with its marks in the margin and its notes.
#[derive(Clone, Debug, Default)]
pub(crate) struct Row {
    pub(crate) marks: Vec<Mark>,
    pub(crate) cells: Vec<Cell>,
    pub(crate) notes: Vec<Note>,
}

impl Row {
    pub(crate) fn new(cells: impl IntoIterator<Item = Cell>) -> Self {
        Self { cells: cells.into_iter().collect(), ..Self::default() }
    }

    pub(crate) fn note(&mut self, lead: impl Into<String>, text: impl Into<Cell>) {
        self.notes.push(Note { mark: None, lead: lead.into(), text: text.into() });
    }
}

struct Line {
    text: String,
    set: Type,
    struck: bool,
}

/// The lines of one cell and where they stand.
struct Piece {
    left: f32,
    width: f32,
    side: Side,
    columns: usize,
    lines: Vec<Line>,
}

/// A row, or one of its notes, broken into lines.
struct Strip {
    marks: Vec<Mark>,
    pieces: Vec<Piece>,
    ruled: bool,
}

impl Strip {
    fn lines(&self) -> usize {
        self.pieces.iter().map(|piece| piece.lines.len()).max().unwrap_or(0)
    }

    fn height(&self) -> f32 {
        times(self.lines()) * TEXT.leading() + 2.0 * PAD
    }
}

/// A table being filled, row by row.
pub(crate) struct Table<'s> {
    sheet: &'s mut Sheet,
    columns: Vec<Column>,
    /// A heading and a remark, drawn with the first row so that they never stand alone.
    title: Option<(&'static str, &'static str)>,
    opened: bool,
    headed: bool,
    /// Nothing but the head stands on this page yet.
    fresh: bool,
}

impl<'s> Table<'s> {
    pub(crate) fn new(sheet: &'s mut Sheet, columns: &[Column]) -> Self {
        let taken: f32 = columns.iter().map(|column| column.1).sum();
        let rest = RIGHT - LEFT - taken;
        let columns = columns
            .iter()
            .map(|&Column(head, width, side)| {
                Column(head, if width > 0.0 { width } else { rest }, side)
            })
            .collect();
        Self { sheet, columns, title: None, opened: false, headed: false, fresh: false }
    }

    /// A table under a heading, with a remark between the two if it is not empty.
    pub(crate) fn titled(
        sheet: &'s mut Sheet,
        title: &'static str,
        remark: &'static str,
        columns: &[Column],
    ) -> Self {
        Self { title: Some((title, remark)), ..Self::new(sheet, columns) }
    }

    pub(crate) fn row(&mut self, row: Row) {
        let strips = self.strips(row);
        let together: f32 = strips.iter().map(Strip::height).sum();
        let mut head = if self.headed { 0.0 } else { HEAD.leading() + 2.0 * PAD };
        if let Some((_, remark)) = self.title {
            head += if remark.is_empty() { TITLE_ROOM } else { TITLE_ROOM + REMARK_ROOM };
        }
        if self.sheet.room() < together + head && together < 0.6 * Sheet::full_room() {
            self.turn();
        }
        self.open();
        if !self.headed {
            self.head();
        }
        for strip in &strips {
            self.strip(strip);
        }
    }

    /// Draws the title before the first row.
    fn open(&mut self) {
        if self.opened {
            return;
        }
        self.opened = true;
        if let Some((title, remark)) = self.title.take() {
            self.sheet.heading(title);
            if !remark.is_empty() {
                self.sheet.paragraph(BODY, remark);
                self.sheet.gap(1.5);
            }
        }
        self.sheet.canvas.tags.open("Table");
    }

    /// Ends the table with its closing rule.
    pub(crate) fn end(self) {
        if !self.opened {
            return;
        }
        let y = self.sheet.y;
        self.sheet.canvas.tags.close();
        self.sheet.canvas.artifact(|canvas| {
            canvas.stroke(Ink::Black, 0.7, &[(LEFT, y), (RIGHT, y)]);
        });
        self.sheet.y += 1.5;
    }

    fn turn(&mut self) {
        self.sheet.turn();
        self.headed = false;
    }

    fn head(&mut self) {
        self.headed = true;
        self.fresh = true;
        let y = self.sheet.y;
        let titled = self.columns.iter().any(|column| !column.0.is_empty());
        let height = if titled { HEAD.leading() + 2.0 * PAD } else { 0.0 };
        self.sheet.canvas.artifact(|canvas| {
            if titled {
                let band = [(LEFT, y), (RIGHT, y), (RIGHT, y + height), (LEFT, y + height)];
                canvas.shape(Ink::Tint, &band);
            }
            canvas.stroke(Ink::Black, 0.7, &[(LEFT, y), (RIGHT, y)]);
        });
        if titled {
            self.head_cells(y + PAD);
        }
        self.sheet.y += height;
    }

    fn head_cells(&mut self, y: f32) {
        let canvas = &mut self.sheet.canvas;
        canvas.tags.open("TR");
        let mut left = LEFT;
        for &Column(head, width, side) in &self.columns {
            canvas.tagged("TH", |canvas| match side {
                Side::Left => canvas.text(HEAD, baseline(HEAD, (left, y)), head),
                Side::Right => {
                    let right = left + width - GUTTER;
                    canvas.text_right(HEAD, baseline(HEAD, (right, y)), head);
                }
            });
            left += width;
        }
        canvas.tags.close();
    }

    /// The row and its notes, each broken into lines; the last one is ruled off.
    fn strips(&mut self, row: Row) -> Vec<Strip> {
        let mut left = LEFT;
        let mut pieces = Vec::new();
        for (cell, &Column(_, width, side)) in row.cells.iter().zip(&self.columns.clone()) {
            pieces.push(self.piece(cell, left, width, side, 1));
            left += width;
        }
        let mut strips = vec![Strip { marks: row.marks, pieces, ruled: false }];
        for note in row.notes {
            strips.push(self.note_strip(note));
        }
        if let Some(last) = strips.last_mut() {
            last.ruled = true;
        }
        strips
    }

    fn note_strip(&mut self, note: Note) -> Strip {
        let lead = Cell::strong(note.lead);
        let beside = LEFT + INDENT + LEAD;
        let columns = self.columns.len().saturating_sub(1).max(1);
        let pieces = vec![
            self.piece(&lead, LEFT + INDENT, LEAD, Side::Left, 1),
            self.piece(&note.text, beside, RIGHT - beside + GUTTER, Side::Left, columns),
        ];
        Strip { marks: note.mark.into_iter().collect(), pieces, ruled: false }
    }

    fn piece(&mut self, cell: &Cell, left: f32, width: f32, side: Side, columns: usize) -> Piece {
        let canvas = &mut self.sheet.canvas;
        let mut lines = Vec::new();
        for (voice, text) in &cell.0 {
            let set = match voice {
                Voice::Plain => TEXT,
                Voice::Strong => STRONG,
                Voice::Quiet | Voice::Struck => QUIET,
            };
            let text = canvas.legible(text);
            let struck = *voice == Voice::Struck;
            let broken = wrap(canvas, set, width - GUTTER, &text);
            lines.extend(broken.into_iter().map(|text| Line { text, set, struck }));
        }
        Piece { left, width: width - GUTTER, side, columns, lines }
    }

    /// Draws a strip, over as many pages as it takes.
    fn strip(&mut self, strip: &Strip) {
        let total = strip.lines();
        let mut done = 0;
        while done < total {
            let left = total - done;
            let fits = self.lines_that_fit(left);
            let long = times(left) * TEXT.leading() > 0.6 * Sheet::full_room() && fits > 3;
            if fits < left && !self.fresh && !long {
                self.turn();
                self.head();
                continue;
            }
            let take = fits.max(1);
            self.draw(strip, done..done + take);
            done += take;
            self.fresh = false;
        }
    }

    fn lines_that_fit(&self, wanted: usize) -> usize {
        let room = self.sheet.room() - 2.0 * PAD;
        (1..=wanted).take_while(|&lines| times(lines) * TEXT.leading() <= room).count()
    }

    fn draw(&mut self, strip: &Strip, range: Range<usize>) {
        let top = self.sheet.y;
        let canvas = &mut self.sheet.canvas;
        canvas.tags.open("TR");
        let mut strokes = Vec::new();
        for piece in &strip.pieces {
            let cell = canvas.tagged("TD", |canvas| {
                let mut y = top + PAD;
                for line in piece.lines.iter().take(range.end).skip(range.start) {
                    let length = canvas.width(&line.text, line.set);
                    let left = match piece.side {
                        Side::Left => piece.left,
                        Side::Right => piece.left + piece.width - length,
                    };
                    let (x, base) = baseline(line.set, (left, y));
                    canvas.text(line.set, (x, base), &line.text);
                    if line.struck {
                        let middle = base - 0.27 * line.set.points * MM_PER_POINT;
                        strokes.push([(x - 0.4, middle), (x + length + 0.4, middle)]);
                    }
                    y += line.set.leading();
                }
            });
            if piece.columns > 1 {
                canvas.tags.elements[cell].columns = Some(piece.columns);
            }
        }
        canvas.tags.close();
        let last = range.end == strip.lines();
        let height = times(range.len()) * TEXT.leading() + 2.0 * PAD;
        canvas.artifact(|canvas| {
            for stroke in &strokes {
                canvas.stroke(Ink::Accent, 0.9, stroke);
            }
            if range.start == 0 {
                let middle = top + PAD + TEXT.leading() / 2.0;
                let mut x = RULE;
                for mark in &strip.marks {
                    mark.draw(canvas, (x, middle));
                    x -= NOTCH + 0.8;
                }
            }
            if last && strip.ruled {
                let y = top + height;
                canvas.stroke(Ink::Hairline, 0.35, &[(LEFT, y), (RIGHT, y)]);
            }
        });
        self.sheet.y += height;
    }
}
