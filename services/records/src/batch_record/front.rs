//! The first page: what the batch is, how to read the marks, what went in, how it ran.

use super::readings::strike;
use super::{Absent, BatchRecord, standing};
use crate::chart;
use crate::font::Weight;
use crate::mark::{Mark, NOTCH};
use crate::page::{Ink, Type};
use crate::sheet::{LEFT, RIGHT, Sheet, wrap};
use crate::table::{Cell, Column, Row, Side, Table, Voice};

const TITLE: Type = Type::new(Weight::Bold, 20.0, Ink::Black);
const UNDER: Type = Type::new(Weight::Regular, 10.0, Ink::Grey);
const KEY: Type = Type::new(Weight::Regular, 7.4, Ink::Black);

pub(super) fn draw(sheet: &mut Sheet, record: &BatchRecord) {
    title(sheet, record);
    summary(sheet, record);
    sheet.gap(2.0);
    key(sheet);
    chart_section(sheet, record);
    materials(sheet, record);
}

fn title(sheet: &mut Sheet, record: &BatchRecord) {
    let text = sheet.canvas.legible(&format!("Batch record {}", record.batch.code));
    for line in wrap(&sheet.canvas, TITLE, RIGHT - LEFT, &text) {
        let spot = (LEFT, sheet.y + TITLE.rise());
        sheet.canvas.tagged("H1", |canvas| canvas.text(TITLE, spot, &line));
        sheet.y += TITLE.leading();
    }
    sheet.paragraph(UNDER, &format!("{} · {}", record.site.name, record.batch.product_class));
    sheet.gap(3.0);
}

fn summary(sheet: &mut Sheet, record: &BatchRecord) {
    let (site, batch) = (&record.site, &record.batch);
    let mut table = Table::new(sheet, &[Column("", 40.0, Side::Left), Column("", 0.0, Side::Left)]);
    let facts = [
        ("Site", join(&[&site.name, &site.code, &site.premises])),
        ("Licence", site.licence.clone()),
        ("Times printed in", site.time_zone.clone()),
        ("Opened", batch.opened_at.clone()),
        ("Claims", batch.claims.clone()),
        ("Destinations", batch.destinations.join("\n")),
        ("Vessel and volume", join(&[&batch.vessel, &batch.volume])),
        ("Doses are judged on", batch.liquid_basis.clone()),
        ("Fermentable sugar", batch.fermentable_sugar.clone()),
        ("Expected final gravity", batch.expected_final_gravity.clone()),
        ("Nitrogen need", batch.demand.clone()),
        ("This record", handed_out(record)),
    ];
    for (name, value) in facts {
        let value = if value.is_empty() { Cell::quiet("not stated") } else { Cell::from(value) };
        table.row(Row::new([Cell::quiet(name), value]));
    }
    table.end();
}

fn handed_out(record: &BatchRecord) -> String {
    let covers = format!("{}; covers entries 1 to {}", standing(record), record.entries_n);
    record.issued.as_ref().map_or_else(
        || covers.clone(),
        |issued| format!("{covers}; n was {} in a log of {}", issued.entries_n, issued.log_size),
    )
}

/// The marks of the margin with their words, on one line.
fn key(sheet: &mut Sheet) {
    sheet.need(8.0);
    let y = sheet.y + KEY.rise();
    sheet.canvas.tagged("P", |canvas| {
        let lead = "Marks in the margin:";
        canvas.text(KEY, (LEFT, y), lead);
        let mut x = LEFT + canvas.width(lead, KEY) + 4.0;
        for mark in Mark::ALL {
            canvas.stroke(Ink::Accent, 0.7, &[(x + NOTCH, y - 2.7), (x + NOTCH, y + 1.0)]);
            mark.draw(canvas, (x + NOTCH, y - 0.85));
            canvas.text(KEY, (x + NOTCH + 1.4, y), mark.word());
            x += NOTCH + 1.4 + canvas.width(mark.word(), KEY) + 5.0;
        }
    });
    sheet.y += KEY.leading();
}

fn chart_section(sheet: &mut Sheet, record: &BatchRecord) {
    if record.chart.points.is_empty() {
        return;
    }
    sheet.need(136.0);
    sheet.heading("How it ran");
    chart::draw(sheet, &record.chart);
}

fn materials(sheet: &mut Sheet, record: &BatchRecord) {
    if record.materials.is_empty() {
        return;
    }
    let columns = [
        Column("n", 9.0, Side::Right),
        Column("Material", 44.0, Side::Left),
        Column("Lot", 21.0, Side::Left),
        Column("Supplier and its lot", 37.0, Side::Left),
        Column("Received", 17.0, Side::Left),
        Column("Expiry", 17.0, Side::Left),
        Column("Used", 0.0, Side::Right),
    ];
    let mut table = Table::titled(sheet, "Materials and their lots", "", &columns);
    for lot in &record.materials {
        let mut row = Row::new([
            Cell::from(lot.n.to_string()),
            Cell::from(&*lot.material),
            Cell::from(&*lot.lot),
            Cell::from(&*lot.supplier).and(Voice::Quiet, &*lot.supplier_lot),
            Cell::from(&*lot.received),
            Cell::from(&*lot.expiry),
            Cell::from(&*lot.used),
        ]);
        strike(&mut row, &lot.struck);
        table.row(row);
    }
    table.end();
}

/// The parts given, without the empty ones.
pub(super) fn join(parts: &[&str]) -> String {
    let given: Vec<&str> = parts.iter().copied().filter(|part| !part.is_empty()).collect();
    given.join(", ")
}

/// A section that has nothing to show, as the record's last section lists it.
pub(super) fn nothing(what: &str, why: &str) -> Absent {
    Absent { what: what.to_owned(), why: why.to_owned() }
}
