//! A thin page over the page writer's operators: text, rules, shapes, tags.
//!
//! Coordinates are millimetres from the top left corner of an A4 page. Nothing here breaks lines
//! or pages; [`crate::sheet`] and [`crate::table`] do.

use std::collections::{BTreeMap, BTreeSet};

use printpdf::{
    Color, DictItem, FontId, Line, LineDashPattern, LinePoint, Mm, Op, PaintMode, PdfFontHandle,
    Point, Polygon, PolygonRing, Pt, Rgb, TextItem, WindingOrder,
};

use crate::RecordError;
use crate::font::{self, MM_PER_POINT, Typeface, Weight};
use crate::tags::Tags;

/// Page width in millimetres (A4, ISO 216).
pub(crate) const WIDTH: f32 = 210.0;
/// Page height in millimetres (A4, ISO 216).
pub(crate) const HEIGHT: f32 = 297.0;

/// A place on the page in millimetres from its top left corner.
pub(crate) type Spot = (f32, f32);

/// The inks of the house: paper, three greys and one accent.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub(crate) enum Ink {
    Black,
    Grey,
    Hairline,
    Tint,
    Paper,
    /// The margin rule, the notches and the strokes through amended values.
    Accent,
}

impl Ink {
    fn colour(self) -> Color {
        let (r, g, b) = match self {
            Self::Black => (0.07, 0.07, 0.07),
            Self::Grey => (0.34, 0.34, 0.34),
            Self::Hairline => (0.66, 0.66, 0.66),
            Self::Tint => (0.935, 0.93, 0.915),
            Self::Paper => (1.0, 1.0, 1.0),
            Self::Accent => (0.48, 0.13, 0.17),
        };
        Color::Rgb(Rgb { r, g, b, icc_profile: None })
    }
}

/// How a text is set.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Type {
    pub(crate) weight: Weight,
    pub(crate) points: f32,
    pub(crate) ink: Ink,
}

impl Type {
    pub(crate) const fn new(weight: Weight, points: f32, ink: Ink) -> Self {
        Self { weight, points, ink }
    }

    /// From one line to the next, in millimetres: a little more than the face's full height.
    pub(crate) fn leading(self) -> f32 {
        1.26 * self.points * MM_PER_POINT
    }

    /// From the top of a line down to its baseline, in millimetres.
    pub(crate) fn rise(self) -> f32 {
        0.97 * self.points * MM_PER_POINT
    }
}

/// Where a text was set, to prove that nothing leaves the page or covers something else.
#[cfg(test)]
#[derive(Clone, Debug)]
pub(crate) struct TextBox {
    pub(crate) page: usize,
    pub(crate) left: f32,
    pub(crate) top: f32,
    pub(crate) right: f32,
    pub(crate) bottom: f32,
    pub(crate) text: String,
}

/// The pages of one document while they are drawn.
pub(crate) struct Canvas {
    pub(crate) typeface: &'static Typeface,
    pub(crate) tags: Tags,
    pages: Vec<Vec<Op>>,
    current: usize,
    fill: Option<Ink>,
    used: [BTreeSet<char>; 2],
    missing: Option<char>,
    #[cfg(test)]
    pub(crate) boxes: Vec<TextBox>,
}

impl Canvas {
    pub(crate) fn new() -> Result<Self, RecordError> {
        Ok(Self {
            typeface: font::typeface()?,
            tags: Tags::new(),
            pages: Vec::new(),
            current: 0,
            fill: None,
            used: [BTreeSet::new(), BTreeSet::new()],
            missing: None,
            #[cfg(test)]
            boxes: Vec::new(),
        })
    }

    pub(crate) fn add_page(&mut self) {
        self.pages.push(Vec::new());
        self.turn_to(self.pages.len() - 1);
    }

    pub(crate) fn turn_to(&mut self, page: usize) {
        self.current = page;
        self.fill = None;
    }

    pub(crate) fn page(&self) -> usize {
        self.current
    }

    pub(crate) fn page_count(&self) -> usize {
        self.pages.len()
    }

    /// The first character met that the typeface cannot show.
    pub(crate) fn missing(&self) -> Option<char> {
        self.missing
    }

    /// The text as it will be shown; what cannot be shown is remembered and replaced.
    pub(crate) fn legible(&mut self, text: &str) -> String {
        let (shown, missing) = self.typeface.legible(text);
        self.missing = self.missing.or(missing);
        shown.into_owned()
    }

    pub(crate) fn width(&self, text: &str, set: Type) -> f32 {
        self.typeface.face(set.weight).width(text, set.points)
    }

    /// Sets one line with its baseline at `y`. The text must have gone through [`Self::legible`].
    pub(crate) fn text(&mut self, set: Type, (x, y): Spot, text: &str) {
        if text.is_empty() {
            return;
        }
        self.note_box(set, (x, y), text);
        self.fill_with(set.ink);
        let face = usize::from(set.weight == Weight::Bold);
        self.used[face].extend(text.chars());
        let font = PdfFontHandle::External(FontId(font_id(set.weight).to_owned()));
        self.draw(Op::StartTextSection);
        self.draw(Op::SetFont { font, size: Pt(set.points) });
        self.draw(Op::SetTextCursor { pos: point((x, y)) });
        self.draw(Op::ShowText { items: vec![TextItem::Text(text.to_owned())] });
        self.draw(Op::EndTextSection);
    }

    /// Sets one line that ends at `x`.
    pub(crate) fn text_right(&mut self, set: Type, (x, y): Spot, text: &str) {
        let width = self.width(text, set);
        self.text(set, (x - width, y), text);
    }

    #[cfg(test)]
    fn note_box(&mut self, set: Type, (left, y): Spot, text: &str) {
        let em = set.points * MM_PER_POINT;
        self.boxes.push(TextBox {
            page: self.current,
            left,
            top: y - 0.93 * em,
            right: left + self.width(text, set),
            bottom: y + 0.24 * em,
            text: text.to_owned(),
        });
    }

    #[cfg(not(test))]
    #[expect(clippy::unused_self, reason = "keeps the caller the same in tests, where boxes count")]
    fn note_box(&mut self, _: Type, _: Spot, _: &str) {}

    /// A line through `spots`, `points` thick.
    pub(crate) fn stroke(&mut self, ink: Ink, points: f32, spots: &[Spot]) {
        self.draw(Op::SetOutlineColor { col: ink.colour() });
        self.draw(Op::SetOutlineThickness { pt: Pt(points) });
        let points = spots.iter().map(|&spot| corner(spot)).collect();
        self.draw(Op::DrawLine { line: Line { points, is_closed: false } });
    }

    /// A broken line, for what is expected and not observed.
    pub(crate) fn dashed(&mut self, ink: Ink, points: f32, spots: &[Spot]) {
        self.draw(Op::SetLineDashPattern { dash: LineDashPattern::new(0.0, &[5.0, 3.0]) });
        self.stroke(ink, points, spots);
        self.draw(Op::SetLineDashPattern { dash: LineDashPattern::solid() });
    }

    /// A filled shape.
    pub(crate) fn shape(&mut self, ink: Ink, spots: &[Spot]) {
        self.fill_with(ink);
        self.polygon(PaintMode::Fill, spots);
    }

    /// The outline of a shape, with paper inside.
    pub(crate) fn outline(&mut self, ink: Ink, points: f32, spots: &[Spot]) {
        self.fill_with(Ink::Paper);
        self.draw(Op::SetOutlineColor { col: ink.colour() });
        self.draw(Op::SetOutlineThickness { pt: Pt(points) });
        self.polygon(PaintMode::FillStroke, spots);
    }

    fn polygon(&mut self, mode: PaintMode, spots: &[Spot]) {
        let points = spots.iter().map(|&spot| corner(spot)).collect();
        let rings = vec![PolygonRing { points }];
        let winding_order = WindingOrder::NonZero;
        self.draw(Op::DrawPolygon { polygon: Polygon { rings, mode, winding_order } });
    }

    /// Content of a new element `tag` of the document's structure.
    pub(crate) fn tagged(&mut self, tag: &'static str, draw: impl FnOnce(&mut Self)) -> usize {
        let (element, mark) = self.tags.leaf(tag, self.current);
        let map = BTreeMap::from([("MCID".to_owned(), DictItem::Int(mark))]);
        let properties = DictItem::Dict { map };
        self.draw(Op::BeginMarkedContentWithProperties { tag: tag.to_owned(), properties });
        draw(self);
        self.draw(Op::EndMarkedContent);
        element
    }

    /// Content that is not part of the text: rules, page numbers.
    pub(crate) fn artifact(&mut self, draw: impl FnOnce(&mut Self)) {
        self.draw(Op::BeginMarkedContent { tag: "Artifact".to_owned() });
        draw(self);
        self.draw(Op::EndMarkedContent);
    }

    fn fill_with(&mut self, ink: Ink) {
        if self.fill != Some(ink) {
            self.fill = Some(ink);
            self.draw(Op::SetFillColor { col: ink.colour() });
        }
    }

    fn draw(&mut self, op: Op) {
        if let Some(page) = self.pages.get_mut(self.current) {
            page.push(op);
        }
    }

    /// The drawn pages, the structure, and the characters used of each face.
    pub(crate) fn into_parts(self) -> (Vec<Vec<Op>>, Tags, [BTreeSet<char>; 2]) {
        (self.pages, self.tags, self.used)
    }
}

/// The resource name of a face inside the document.
pub(crate) fn font_id(weight: Weight) -> &'static str {
    match weight {
        Weight::Regular => "Regular",
        Weight::Bold => "Bold",
    }
}

fn point((x, y): Spot) -> Point {
    Point::new(Mm(x), Mm(HEIGHT - y))
}

fn corner(spot: Spot) -> LinePoint {
    LinePoint { p: point(spot), bezier: false }
}
