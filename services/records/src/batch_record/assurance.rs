//! What the record rests on, and what it does not hold: rule sets, ledger head, people, cautions.

use super::front::nothing;
use super::{Absent, BatchRecord};
use crate::sheet::Sheet;
use crate::table::{Cell, Column, Row, Side, Table, Voice};

const CAUTION: &str = "Reminders, not a risk assessment of the site. Local rules override them.";
const RELIANCE: &str = "This record was drawn from an append-only log. The head below fixes every entry of \
    that log up to its size. To rely on it, compare the key's fingerprint with one obtained elsewhere: from an \
    earlier record, a notice, another house.";

/// A name and what it stands for, without a head.
const PAIR: [Column; 2] = [Column("", 40.0, Side::Left), Column("", 0.0, Side::Left)];

pub(super) fn draw(sheet: &mut Sheet, record: &BatchRecord) {
    rule_sets(sheet, record);
    cautions(sheet, record);
    people(sheet, record);
    head(sheet, record);
    absent(sheet, record);
}

fn rule_sets(sheet: &mut Sheet, record: &BatchRecord) {
    let columns = [
        Column("Rule set", 44.0, Side::Left),
        Column("Version", 18.0, Side::Left),
        Column("In force", 40.0, Side::Left),
        Column("Standing here", 0.0, Side::Left),
    ];
    let mut table = Table::titled(sheet, "Rule sets in force", "", &columns);
    for set in &record.rule_sets {
        let mut row = Row::new([
            Cell::from(&*set.id),
            Cell::from(&*set.version),
            Cell::from(&*set.effective),
            Cell::from(&*set.standing),
        ]);
        row.note("Digest", Cell::quiet(&*set.digest));
        table.row(row);
    }
    table.end();
}

fn cautions(sheet: &mut Sheet, record: &BatchRecord) {
    let mut table = Table::titled(sheet, "Cautions that apply", CAUTION, &PAIR);
    for caution in &record.cautions {
        table.row(Row::new([
            Cell::strong(&*caution.topic),
            Cell::from(&*caution.text).and(Voice::Quiet, &*caution.source),
        ]));
    }
    table.end();
}

fn people(sheet: &mut Sheet, record: &BatchRecord) {
    let mut table = Table::titled(
        sheet,
        "People named in this record",
        "",
        &[Column("Name", 70.0, Side::Left), Column("Role", 0.0, Side::Left)],
    );
    for person in &record.people {
        table.row(Row::new([Cell::from(&*person.name), Cell::from(&*person.role)]));
    }
    table.end();
}

fn head(sheet: &mut Sheet, record: &BatchRecord) {
    let head = &record.head;
    let note = head.note.iter().fold(Cell::default(), |cell, line| cell.and(Voice::Plain, line));
    let facts = [
        ("Log", Cell::from(&*head.origin)),
        ("Entries in the log", Cell::from(head.size.to_string())),
        ("Entries of this batch", Cell::from(format!("n = 1 to {}", record.entries_n))),
        ("Root", Cell::from(&*head.root)),
        ("Signed note", note),
        ("Key fingerprint", Cell::from(&*head.key_fingerprint)),
        ("Assessed by engine", Cell::from(&*record.engine)),
    ];
    let mut table = Table::titled(sheet, "Ledger head", RELIANCE, &PAIR);
    for (name, value) in facts {
        table.row(Row::new([Cell::quiet(name), value]));
    }
    table.end();
}

fn absent(sheet: &mut Sheet, record: &BatchRecord) {
    let mut missing = empty_sections(record);
    missing.extend(record.absent.iter().cloned());
    if let Some(character) = sheet.canvas.missing() {
        missing.push(nothing(
            "Some characters",
            &format!(
                "□ stands for a character that the typeface of this record lacks, the first one is U+{:04X}; \
                 the ledger holds the text as it was typed",
                u32::from(character)
            ),
        ));
    }
    let mut table = Table::titled(
        sheet,
        "Not in this record, and why",
        "",
        &[Column("What", 60.0, Side::Left), Column("Why", 0.0, Side::Left)],
    );
    for Absent { what, why } in missing {
        table.row(Row::new([Cell::from(what), Cell::from(why)]));
    }
    table.end();
}

/// The sections left out above because there was nothing to put in them.
fn empty_sections(record: &BatchRecord) -> Vec<Absent> {
    let none = "none recorded for this batch";
    [
        (record.chart.points.is_empty(), "Chart", "no gravity reading in force to draw"),
        (record.materials.is_empty(), "Material lots", none),
        (record.additions.is_empty(), "Additions", none),
        (record.proposals.is_empty(), "Proposals not carried out", none),
        (record.deviations.is_empty(), "Deviations", none),
        (record.readings.is_empty(), "Readings", none),
        (record.account.is_empty(), "Nitrogen account", "no nitrogen measured or added"),
        (record.rule_sets.is_empty(), "Rule sets", "none adopted: no limit was checked"),
        (record.cautions.is_empty(), "Cautions", "none was selected for this batch"),
        (record.people.is_empty(), "People", "none is named by an entry"),
    ]
    .into_iter()
    .filter(|(empty, ..)| *empty)
    .map(|(_, what, why)| nothing(what, why))
    .collect()
}
