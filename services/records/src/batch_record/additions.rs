//! Additions, proposals that were not carried out, and deviations.

use super::front::join;
use super::readings::strike;
use super::{Addition, BatchRecord, Deviation, Finding, Signature, Verdict};
use crate::mark::Mark;
use crate::sheet::Sheet;
use crate::table::{Cell, Column, Note, Row, Side, Table, Voice};

pub(super) fn draw(sheet: &mut Sheet, record: &BatchRecord) {
    table(sheet, ("Additions", ""), "Done", &record.additions);
    let title = (
        "Proposals not carried out",
        "Each was assessed and answered as shown; nothing of it went into the batch.",
    );
    table(sheet, title, "Planned for", &record.proposals);
    deviations(sheet, record);
}

fn table(
    sheet: &mut Sheet,
    title: (&'static str, &'static str),
    when: &'static str,
    additions: &[Addition],
) {
    let columns = [
        Column("n", 9.0, Side::Right),
        Column("Verdict", 17.0, Side::Left),
        Column(when, 30.0, Side::Left),
        Column("Material", 52.0, Side::Left),
        Column("Lot", 20.0, Side::Left),
        Column("Amount", 18.0, Side::Right),
        Column("By", 0.0, Side::Left),
    ];
    let mut table = Table::titled(sheet, title.0, title.1, &columns);
    for addition in additions {
        table.row(row(addition));
    }
    table.end();
}

fn row(addition: &Addition) -> Row {
    let mut row = Row::new([
        Cell::from(addition.n.to_string()),
        Cell::strong(addition.verdict.word()),
        Cell::from(&*addition.at),
        Cell::default(),
        Cell::default(),
        Cell::default(),
        Cell::from(&*addition.by),
    ]);
    if let [one] = &addition.lines[..] {
        row.cells[3] = Cell::from(&*one.material);
        row.cells[4] = Cell::from(&*one.lot);
        row.cells[5] = Cell::from(&*one.amount);
    } else {
        row.cells[3] = Cell::quiet(format!("{} lots, listed below", addition.lines.len()));
    }
    row.marks.push(Mark::Verdict(addition.verdict));
    if !addition.late.is_empty() {
        row.marks.push(Mark::Late);
    }
    if addition.lines.len() > 1 {
        let lots = addition.lines.iter().fold(Cell::default(), |cell, line| {
            cell.and(Voice::Plain, join(&[&line.lot, &line.material, &line.amount]))
        });
        row.note("Lots", lots);
    }
    strike(&mut row, &addition.struck);
    particulars(&mut row, addition);
    for finding in &addition.findings {
        row.notes.push(finding_note(finding));
    }
    for signature in &addition.signatures {
        row.note("Signed", signed(signature));
    }
    row
}

fn particulars(row: &mut Row, addition: &Addition) {
    let prepared = join(&[&addition.preparation, &addition.carrier_water]);
    if !prepared.is_empty() {
        row.note("Prepared", prepared);
    }
    if !addition.purpose.is_empty() {
        row.note("Purpose", &*addition.purpose);
    }
    if let Some(proposal) = &addition.proposal {
        let text =
            format!("entry {}: proposed {}, done {}", proposal.n, proposal.proposed, proposal.done);
        row.note("Proposal", text);
    }
    if let Some(reason) = &addition.already_done {
        let told = "entered after the act, and assessed as of the time of the act";
        row.note("Already done", format!("{told}: “{reason}”"));
    }
    if !addition.late.is_empty() {
        row.note("Late", &*addition.late);
    }
    if !addition.outcome.is_empty() {
        row.note("Outcome", &*addition.outcome);
    }
}

/// A finding with its own notch, unless it is information only.
fn finding_note(finding: &Finding) -> Note {
    let remedy = if finding.remedy.is_empty() {
        String::new()
    } else {
        format!("What would remove it: {}", finding.remedy)
    };
    let information = finding.verdict == Verdict::Clear;
    Note {
        mark: (!information).then_some(Mark::Verdict(finding.verdict)),
        lead: if information { "information" } else { finding.verdict.word() }.to_owned(),
        text: Cell::from(&*finding.sentence)
            .and(Voice::Quiet, join(&[&finding.basis, &finding.citation]))
            .and(Voice::Plain, remedy),
    }
}

/// A signature as it is read: printed name, time, meaning, reason, and what it binds.
pub(super) fn signed(signature: &Signature) -> Cell {
    let who = join(&[&signature.name, &signature.role, &signature.at]);
    let reason = if signature.reason.is_empty() {
        String::new()
    } else {
        format!("“{}”", signature.reason)
    };
    Cell::from(format!("{who}: {}", signature.meaning))
        .and(Voice::Plain, reason)
        .and(Voice::Quiet, format!("binds {}", signature.binds))
}

fn deviations(sheet: &mut Sheet, record: &BatchRecord) {
    let columns = [
        Column("Code", 30.0, Side::Left),
        Column("Opened", 34.0, Side::Left),
        Column("By", 52.0, Side::Left),
        Column("Resolved", 0.0, Side::Left),
    ];
    let mut table = Table::titled(sheet, "Deviations", "", &columns);
    for deviation in &record.deviations {
        table.row(deviation_row(deviation));
    }
    table.end();
}

fn deviation_row(deviation: &Deviation) -> Row {
    let resolved = if deviation.resolved_at.is_empty() {
        Cell::strong("open")
    } else {
        Cell::from(join(&[&deviation.resolved_at, &deviation.resolved_by]))
    };
    let mut row = Row::new([
        Cell::strong(&*deviation.code),
        Cell::from(&*deviation.opened),
        Cell::from(&*deviation.by),
        resolved,
    ]);
    for finding in &deviation.findings {
        row.note("Opened for", &**finding);
    }
    for (lead, text) in [("Cause", &deviation.cause), ("Action", &deviation.action)] {
        let text = if text.is_empty() { "not yet stated" } else { text };
        row.note(lead, text);
    }
    if !deviation.conclusion.is_empty() {
        row.note("Conclusion", &*deviation.conclusion);
    }
    if let Some(signature) = &deviation.signature {
        row.note("Signed", signed(signature));
    }
    row
}
