//! Which lots may be used: released, and in date.

use serde::Deserialize;

use crate::checks::case::{Case, Mark, Noticed};
use crate::checks::situation::{LotStatus, ProposedLine};
use crate::checks::{Basis, Finding, Verdict};

use super::rows::Rows;
use super::{Source, Status};

/// What the state of a lot means for its use.
#[derive(Clone, Debug, Deserialize, PartialEq)]
#[serde(deny_unknown_fields)]
pub struct LotStatusRule {
    /// Unique in the set.
    pub id: String,
    /// The collected rows it stands on.
    #[serde(default)]
    pub row: Rows,
    /// The lot is on hold.
    pub held: Verdict,
    /// The lot is rejected.
    pub rejected: Verdict,
    /// The lot is out of date.
    pub expired: Verdict,
    /// Where it comes from.
    pub source: Source,
}

impl LotStatusRule {
    /// What holds where no adopted set says anything: a hold that nobody checks is no hold.
    pub(crate) fn house() -> Self {
        Self {
            id: "status".to_owned(),
            row: Rows::default(),
            held: Verdict::Refuse,
            rejected: Verdict::Refuse,
            expired: Verdict::Refer,
            source: Source {
                citation: "common practice".to_owned(),
                as_read: None,
                status: Status::Read,
                basis: Basis::CommonPractice,
                on: true,
                why: None,
            },
        }
    }

    pub(crate) fn check(&self, case: &Case<'_>, mark: &Mark<'_>) -> Vec<Noticed> {
        let lines = &case.proposed.lines;
        let status = lines.iter().filter_map(|line| self.status(line, mark));
        let date = lines.iter().filter_map(|line| self.date(case, line, mark));
        status.chain(date).map(Noticed::from).collect()
    }

    fn status(&self, line: &ProposedLine, mark: &Mark<'_>) -> Option<Finding> {
        let lot = &line.line.lot_code;
        let why = line.hold_reason.as_deref().map_or_else(String::new, |why| format!(": {why}"));
        let (verdict, sentence, remedy) = match line.lot_status {
            LotStatus::Released => return None,
            LotStatus::Held => (
                self.held,
                format!("Lot {lot} is on hold{why}."),
                "Have quality release it with what is missing, or take another lot.",
            ),
            LotStatus::Rejected => {
                (self.rejected, format!("Lot {lot} is rejected{why}."), "Take another lot.")
            }
        };
        Some(mark.finding(&self.id, &self.source, verdict, sentence).cured_by(remedy))
    }

    fn date(&self, case: &Case<'_>, line: &ProposedLine, mark: &Mark<'_>) -> Option<Finding> {
        let end = line.expires_at.filter(|end| *end < case.proposed.planned_at)?;
        let day: String = end.to_string().chars().take(10).collect();
        let sentence = format!("Lot {} is out of date since {day}.", line.line.lot_code);
        let finding = mark.finding(&self.id, &self.source, self.expired, sentence);
        Some(finding.cured_by("Take a lot that is in date."))
    }
}
