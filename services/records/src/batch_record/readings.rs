//! Readings with their corrections and amendments, and the nitrogen account.

use super::{BatchRecord, Reading, Struck};
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
    let entered = reading
        .struck
        .iter()
        .fold(Cell::default(), |cell, struck| cell.and(Voice::Struck, &*struck.was))
        .and(Voice::Plain, &*reading.entered);
    let mut row = Row::new([
        Cell::from(reading.n.to_string()),
        Cell::from(&*reading.at),
        Cell::from(&*reading.kind),
        entered,
        Cell::from(&*reading.corrected),
        Cell::from(&*reading.method).and(Voice::Quiet, &*reading.instrument),
        Cell::from(&*reading.by),
    ]);
    strike(&mut row, &reading.struck);
    if !reading.note.is_empty() {
        row.note("Remark", &*reading.note);
    }
    if !reading.late.is_empty() {
        row.marks.push(Mark::Late);
        row.note("Late", &*reading.late);
    }
    row
}

/// The mark of an amendment, and for each one what it struck, who made it, when and why.
pub(super) fn strike(row: &mut Row, struck: &[Struck]) {
    if !struck.is_empty() {
        row.marks.push(Mark::Amended);
    }
    for Struck { was, now, by, at, why } in struck {
        row.note("Amended", format!("{was} struck through, now {now}; {by}, {at}: “{why}”"));
    }
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
