//! The run of a batch drawn: gravity above, temperature below, doses on the same axis of time.
//!
//! Lines differ by form and place, not by colour. The drawing says what was read; it forecasts
//! nothing. The broken line is the expected final gravity as the record states it.

use crate::batch_record::{Chart, ChartDose};
use crate::font::Weight;
use crate::mark::{Mark, NOTCH};
use crate::page::{Canvas, Ink, Spot, Type};
use crate::sheet::{BODY, LEFT, RIGHT, Sheet, times};

const LABEL: Type = Type::new(Weight::Regular, 6.6, Ink::Grey);
const DOSE: Type = Type::new(Weight::Regular, 6.6, Ink::Black);
const TITLE: Type = Type::new(Weight::Bold, 7.2, Ink::Black);

/// Rows for the labels of doses above the chart.
const LABEL_ROWS: usize = 4;
/// From one row of labels to the next, in millimetres.
const ROW: f32 = 3.6;

/// A rectangle of the page on which a range of hours and a range of values are drawn.
struct Panel {
    left: f32,
    top: f32,
    width: f32,
    height: f32,
    hours: (f32, f32),
    values: (f32, f32),
}

impl Panel {
    fn x(&self, hours: f32) -> f32 {
        let (first, last) = self.hours;
        self.left + self.width * ((hours - first) / (last - first)).clamp(0.0, 1.0)
    }

    fn y(&self, value: f32) -> f32 {
        let (low, high) = self.values;
        self.top + self.height * (1.0 - ((value - low) / (high - low)).clamp(0.0, 1.0))
    }

    fn bottom(&self) -> f32 {
        self.top + self.height
    }

    fn right(&self) -> f32 {
        self.left + self.width
    }
}

/// Draws the chart at the current place of the sheet, with a sentence that says the same.
pub(crate) fn draw(sheet: &mut Sheet, chart: &Chart) {
    let chart = &drawable(chart);
    let has_temperature = chart.points.iter().any(|point| point.temperature.is_some());
    let labelled = place_labels(&sheet.canvas, chart);
    let rows = labelled.iter().flatten().max().map_or(0, |row| row + 1);
    let above = 6.0 + ROW * times(rows);
    sheet.need(above + if has_temperature { 98.0 } else { 70.0 });
    let gravity = gravity_panel(chart, sheet.y + above);
    let temperature = has_temperature.then(|| temperature_panel(chart, gravity.bottom() + 7.0));
    let lowest = temperature.as_ref().map_or(gravity.bottom(), Panel::bottom);

    let figure = sheet.canvas.tagged("Figure", |canvas| {
        frame(canvas, &gravity, "gravity (SG)", 3);
        if let Some(panel) = &temperature {
            frame(canvas, panel, "temperature (°C)", 0);
        }
        draw_hours(canvas, &gravity, lowest);
        draw_doses(canvas, chart, &gravity, lowest, &labelled);
        draw_expected(canvas, chart, &gravity);
        let spots: Vec<Spot> =
            chart.points.iter().map(|p| (gravity.x(p.hours), gravity.y(p.gravity))).collect();
        draw_line(canvas, &spots, 1.3);
        if let Some(panel) = &temperature {
            let spots: Vec<Spot> = chart
                .points
                .iter()
                .filter_map(|p| Some((panel.x(p.hours), panel.y(p.temperature?))))
                .collect();
            draw_line(canvas, &spots, 0.7);
        }
    });
    sheet.canvas.tags.elements[figure].alternative = Some(in_words(chart));
    sheet.y = lowest + 7.0;
    let unlabelled = labelled.iter().filter(|row| row.is_none()).count();
    let note = if unlabelled > 0 {
        format!(" Doses without a label for want of room: {unlabelled}; the tables below hold all.")
    } else {
        String::new()
    };
    sheet.paragraph(BODY, &format!("{}{note}", in_words(chart)));
}

/// The chart without values that are no numbers, doses in order of time.
fn drawable(chart: &Chart) -> Chart {
    let mut chart = chart.clone();
    chart.points.retain(|point| point.hours.is_finite() && point.gravity.is_finite());
    for point in &mut chart.points {
        point.temperature = point.temperature.filter(|temperature| temperature.is_finite());
    }
    chart.doses.retain(|dose| dose.hours.is_finite());
    chart.doses.sort_by(|one, other| one.hours.total_cmp(&other.hours));
    chart.expected_final = chart.expected_final.filter(|gravity| gravity.is_finite());
    chart
}

/// The chart as a sentence, for those who do not see it.
fn in_words(chart: &Chart) -> String {
    let (Some(first), Some(last)) = (chart.points.first(), chart.points.last()) else {
        return "No readings to draw.".to_owned();
    };
    let expected = chart.expected_final.map_or_else(String::new, |gravity| {
        format!(" Broken line: expected final gravity {gravity:.4}.")
    });
    format!(
        "Gravity from {:.4} to {:.4} in {:.0} hours; {} readings; {} doses, each under the notch of its verdict.\
         {expected} Values in force only: amended ones are struck through in the table of readings.",
        first.gravity,
        last.gravity,
        last.hours - first.hours,
        chart.points.len(),
        chart.doses.len()
    )
}

fn hours(chart: &Chart) -> (f32, f32) {
    let all =
        chart.points.iter().map(|point| point.hours).chain(chart.doses.iter().map(|d| d.hours));
    let (first, last) = range(all, (0.0, 24.0));
    (first, last.max(first + 1.0))
}

fn gravity_panel(chart: &Chart, top: f32) -> Panel {
    let all = chart.points.iter().map(|point| point.gravity).chain(chart.expected_final);
    let (low, high) = range(all, (0.990, 1.100));
    let room = ((high - low) * 0.06).max(0.001);
    Panel {
        left: LEFT + 13.0,
        top,
        width: RIGHT - LEFT - 16.0,
        height: 52.0,
        hours: hours(chart),
        values: (low - room, high + room),
    }
}

fn temperature_panel(chart: &Chart, top: f32) -> Panel {
    let (low, high) =
        range(chart.points.iter().filter_map(|point| point.temperature), (10.0, 30.0));
    let values = ((low - 1.0).floor(), (high + 1.0).ceil());
    Panel {
        left: LEFT + 13.0,
        top,
        width: RIGHT - LEFT - 16.0,
        height: 19.0,
        hours: hours(chart),
        values,
    }
}

fn range(values: impl Iterator<Item = f32>, otherwise: (f32, f32)) -> (f32, f32) {
    values
        .fold(None, |range: Option<(f32, f32)>, value| {
            Some(range.map_or((value, value), |(low, high)| (low.min(value), high.max(value))))
        })
        .unwrap_or(otherwise)
}

/// The frame, its title, and level lines at round values.
fn frame(canvas: &mut Canvas, panel: &Panel, title: &str, decimals: usize) {
    let (low, high) = panel.values;
    for value in ticks(low, high, 5) {
        let y = panel.y(value);
        canvas.stroke(Ink::Hairline, 0.25, &[(panel.left, y), (panel.right(), y)]);
        let label = format!("{value:.decimals$}");
        canvas.text_right(LABEL, (panel.left - 1.5, y + 0.8), &label);
    }
    let corner = (panel.left, panel.bottom());
    canvas.stroke(
        Ink::Black,
        0.6,
        &[(panel.left, panel.top), corner, (panel.right(), panel.bottom())],
    );
    canvas.text_right(TITLE, (panel.right(), panel.top - 1.2), title);
}

fn draw_hours(canvas: &mut Canvas, panel: &Panel, lowest: f32) {
    let (first, last) = panel.hours;
    for value in hour_ticks(first, last) {
        let x = panel.x(value);
        canvas.stroke(Ink::Black, 0.4, &[(x, lowest), (x, lowest + 1.2)]);
        let label = format!("{value:.0} h");
        let half = canvas.width(&label, LABEL) / 2.0;
        canvas.text(LABEL, (x - half, lowest + 4.2), &label);
    }
}

fn draw_expected(canvas: &mut Canvas, chart: &Chart, panel: &Panel) {
    if let Some(expected) = chart.expected_final {
        let y = panel.y(expected);
        canvas.dashed(Ink::Black, 0.6, &[(panel.left, y), (panel.right(), y)]);
    }
}

fn draw_line(canvas: &mut Canvas, spots: &[Spot], points: f32) {
    if spots.len() > 1 {
        canvas.stroke(Ink::Black, points, spots);
    }
    for &(x, y) in spots.iter().filter(|_| spots.len() <= 60) {
        let half = 0.35 + points * 0.25;
        let square = [(x - half, y), (x, y - half), (x + half, y), (x, y + half)];
        canvas.shape(Ink::Black, &square);
    }
}

fn draw_doses(
    canvas: &mut Canvas,
    chart: &Chart,
    panel: &Panel,
    lowest: f32,
    labelled: &[Option<usize>],
) {
    for (dose, row) in chart.doses.iter().zip(labelled) {
        let x = panel.x(dose.hours);
        let top = row.map_or(panel.top - 2.0, |row| label_y(panel.top, row));
        canvas.stroke(Ink::Accent, 0.35, &[(x, top), (x, lowest)]);
        if row.is_some() {
            Mark::Verdict(dose.verdict).draw(canvas, (x, top));
            let label = canvas.legible(&dose.label);
            canvas.text(DOSE, (x + 0.8, top + 0.8), &label);
        }
    }
}

fn label_y(panel_top: f32, row: usize) -> f32 {
    panel_top - 5.4 - ROW * times(row)
}

/// For each dose the row of its label, so that no two labels touch; `None` if no row has room.
/// From the last dose to the first: an earlier label that would cover a later line goes above it.
fn place_labels(canvas: &Canvas, chart: &Chart) -> Vec<Option<usize>> {
    let panel = gravity_panel(chart, 0.0);
    let mut begins = [f32::MAX; LABEL_ROWS];
    let mut place = |dose: &ChartDose| {
        let (shown, _) = canvas.typeface.legible(&dose.label);
        let start = panel.x(dose.hours) - NOTCH - 1.0;
        let end = panel.x(dose.hours) + 1.0 + canvas.width(&shown, DOSE);
        let row = begins.iter().position(|&taken| end < taken).filter(|_| end <= RIGHT + 1.0)?;
        begins[row] = start;
        begins[..row].fill(panel.x(dose.hours));
        Some(row)
    };
    let mut rows: Vec<Option<usize>> = chart.doses.iter().rev().map(&mut place).collect();
    rows.reverse();
    rows
}

/// Round values inside a range, at most `most` or so, a step of 1, 2 or 5 times a power of ten.
fn ticks(low: f32, high: f32, most: usize) -> Vec<f32> {
    let target = (high - low) / times(most);
    let power = 10_f32.powf(target.log10().floor());
    let step = [1.0, 2.0, 5.0, 10.0]
        .into_iter()
        .map(|factor| factor * power)
        .find(|&step| step >= target)
        .unwrap_or(10.0 * power);
    spaced(low, high, step)
}

/// Whole hours that people think in: shifts and days.
fn hour_ticks(first: f32, last: f32) -> Vec<f32> {
    let step = [6.0, 12.0, 24.0, 48.0, 96.0, 168.0, 336.0, 720.0, 2_160.0, 8_760.0]
        .into_iter()
        .find(|step| (last - first) / step <= 12.0)
        .unwrap_or((last - first) / 12.0);
    spaced(first, last, step)
}

fn spaced(low: f32, high: f32, step: f32) -> Vec<f32> {
    let first = (low / step).ceil();
    (0..64)
        .map(|index| (first + times(index)) * step)
        .take_while(|&value| value <= high + step * 0.001)
        .collect()
}
