//! What leaves the house on paper: the batch record.
//!
//! Records are drawn from ready-to-print values, so that this crate needs to know neither the
//! ledger nor the rules. A record is evidence of what the ledger holds, not of what the ledger
//! was never told; it defers to local requirements on every page.

#[cfg(test)]
extern crate self as records;

mod chart;
mod error;
mod finish;
mod font;
mod mark;
mod page;
mod sheet;
mod srgb;
mod table;
mod tags;
mod truetype;

mod batch_record;

pub use batch_record::{
    Absent, AccountRow, Addition, Batch, BatchRecord, Caution, Chart, ChartDose, ChartPoint,
    DEFERRAL, Deviation, DoseLine, Finding, Head, Issued, MaterialLot, Person, ProposalRef,
    Reading, RuleSet, Signature, Site, Struck, Verdict, batch_record, batch_record_exact,
};
pub use error::RecordError;
pub use font::legible;
