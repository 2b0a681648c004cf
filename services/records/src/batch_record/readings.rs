//! Readings with their corrections and amendments, and the nitrogen account.

use super::{BatchRecord, Reading};
use crate::mark::Mark;
use crate::sheet::Sheet;
use crate::table::{Cell, Column, Row, Side, Table, Voice};

pub(super) fn draw(sheet: &mut Sheet, record: &BatchRecord) {
    readings(sheet, record);
    account(sheet, record);
}

fn readings(sheet: &mut Sheet, record: &BatchRecord) {
    let columns = [
        Column("n", 9.0, Side::Right),
        Column("Taken", 27.0, Side::Left),
        Column("Kind", 22.0, Side::Left),
        Column("As entered", 31.0, Side::Right),
        Column("Corrected", 17.0, Side::Right),
        Column("Method, instrument", 38.0, Side::Left),
        Column("By", 0.0, Side::Left),
    ];
    let mut table = Table::titled(sheet, "Readings and laboratory results", "", &columns);
    for reading in &record.readings {
        table.row(row(reading));
    }
    table.end();
}

fn row(reading: &Reading) -> Row {
    let was = reading.struck.as_ref().map_or("", |struck| &struck.was);
    let mut row = Row::new([
        Cell::from(reading.n.to_string()),
        Cell::from(&*reading.at),
        Cell::from(&*reading.kind),
        Cell::default().and(Voice::Struck, was).and(Voice::Plain, &*reading.entered),
        Cell::from(&*reading.corrected),
        Cell::from(&*reading.method).and(Voice::Quiet, &*reading.instrument),
        Cell::from(&*reading.by),
    ]);
    if let Some(struck) = &reading.struck {
        row.marks.push(Mark::Amended);
        let text = format!(
            "{} struck through, now {}; {}, {}: “{}”",
            struck.was, reading.entered, struck.by, struck.at, struck.why
        );
        row.note("Amended", text);
    }
    if !reading.late.is_empty() {
        row.marks.push(Mark::Late);
        row.note("Late", &*reading.late);
    }
    row
}

fn account(sheet: &mut Sheet, record: &BatchRecord) {
    let columns = [
        Column("Time", 29.0, Side::Left),
        Column("What changed it", 61.0, Side::Left),
        Column("Ammonium N", 21.0, Side::Right),
        Column("Amino N", 18.0, Side::Right),
        Column("Supply", 18.0, Side::Right),
        Column("Need", 0.0, Side::Right),
    ];
    let title = "Nitrogen account, mg N per litre of liquid";
    let mut table = Table::titled(sheet, title, "", &columns);
    for row in &record.account {
        table.row(Row::new([
            Cell::from(&*row.at),
            Cell::from(&*row.what),
            Cell::from(&*row.ammonium_n),
            Cell::from(&*row.amino_n),
            Cell::strong(&*row.supply),
            Cell::from(&*row.need),
        ]));
    }
    table.end();
}
