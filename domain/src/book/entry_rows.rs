//! The rows that one entry in force makes by itself, whatever else happened.

use super::body::{Body, Leg, Reading};
use super::in_force::InForce;
use super::table::{Cell, Row};
use super::tables::{ADDITION, ENTRY_INDEX, LEG, PROPOSAL, READING, RECORD, SIGNOFF};

/// Its rows. A voided entry keeps only its line in the index.
pub(crate) fn entry_rows(entry: &InForce) -> Vec<Row> {
    let mut rows = vec![index_row(entry)];
    if entry.void {
        return rows;
    }
    rows.extend(entry.body.legs().iter().enumerate().map(|(i, leg)| leg_row(entry, i, leg)));
    let at = Cell::from(entry.occurred_at.at.0);
    let seq = seq_cell(entry.seq);
    match entry.body.as_ref() {
        Body::ReadingTaken(body) => {
            rows.extend(body.values.iter().enumerate().map(|(i, value)| {
                reading_row(entry, [body.batch.0.into(), body.holding.0.into()], i, value)
            }));
        }
        Body::AdditionRecorded(body) => {
            let verdict = body.assessment.verdict.name();
            rows.extend(body.lines.iter().enumerate().map(|(i, line)| Row {
                table: &ADDITION,
                cells: vec![
                    seq.clone(),
                    place(i),
                    body.batch.0.into(),
                    body.holding.0.into(),
                    line.lot.0.into(),
                    line.material.0.into(),
                    at.clone(),
                    line.amount.dimension().map_or("", |d| d.name()).into(),
                    line.amount.base().into(),
                    verdict.into(),
                ],
            }));
        }
        Body::ProposalAssessed(body) => rows.push(Row {
            table: &PROPOSAL,
            cells: vec![
                body.proposal.0.into(),
                seq,
                body.batch.0.into(),
                body.planned_at.at.0.into(),
                body.lapses_at.at.0.into(),
                body.assessment.verdict.name().into(),
            ],
        }),
        Body::SignoffGiven(body) => rows.push(Row {
            table: &SIGNOFF,
            cells: vec![
                seq,
                seq_cell(body.target_seq),
                entry.actor.to_string().into(),
                body.meaning.as_str().into(),
                body.binds.as_str().into(),
                at,
            ],
        }),
        Body::RecordIssued(body) => rows.push(Row {
            table: &RECORD,
            cells: vec![
                seq,
                body.batch.0.into(),
                seq_cell(body.batch_n),
                seq_cell(body.log_size),
                body.pdf.as_str().into(),
                body.to.as_str().into(),
                at,
            ],
        }),
        _ => {}
    }
    rows
}

fn index_row(entry: &InForce) -> Row {
    let standing = match (entry.void, entry.amendments.is_empty()) {
        (true, _) => 2_i64,
        (false, false) => 1,
        (false, true) => 0,
    };
    Row {
        table: &ENTRY_INDEX,
        cells: vec![
            seq_cell(entry.seq),
            entry.id.0.into(),
            entry.body.kind().0.into(),
            entry.occurred_at.at.0.into(),
            entry.recorded_at.0.into(),
            entry.actor.to_string().into(),
            entry.command.0.into(),
            standing.into(),
            entry.amendments.last().map(|amendment| amendment.seq.cast_signed()).into(),
        ],
    }
}

fn leg_row(entry: &InForce, place_of: usize, leg: &Leg) -> Row {
    Row {
        table: &LEG,
        cells: vec![
            seq_cell(entry.seq),
            place(place_of),
            leg.holding.0.into(),
            leg.direction.sign().into(),
            leg.amount.dimension().map_or("", |d| d.name()).into(),
            leg.amount.base().into(),
            entry.occurred_at.at.0.into(),
        ],
    }
}

fn reading_row(entry: &InForce, [batch, holding]: [Cell; 2], item: usize, value: &Reading) -> Row {
    Row {
        table: &READING,
        cells: vec![
            seq_cell(entry.seq),
            place(item),
            batch,
            holding,
            value.quantity.as_str().into(),
            entry.occurred_at.at.0.into(),
            value.value.as_str().into(),
            value.unit.as_str().into(),
            value.qualifier.as_deref().into(),
            value.corrected.as_ref().map(|c| c.sg_20_20.as_str()).into(),
        ],
    }
}

/// Numbers of the log stay far below 2^53.
pub(crate) const fn seq_cell(seq: u64) -> Cell {
    Cell::Int(seq.cast_signed())
}

fn place(index: usize) -> Cell {
    Cell::Int(i64::try_from(index).unwrap_or(i64::MAX))
}
