//! What may be added at all. A material that is not on the list, or that nobody has named, is refused.

use std::collections::BTreeMap;

use serde::Deserialize;

use crate::checks::case::{Case, Mark, Noticed};
use crate::checks::situation::{Category, Line};
use crate::checks::{Finding, Verdict};

use super::Source;
use super::rows::Rows;

/// A category, as rule sets write it.
#[derive(Clone, Copy, Debug, Deserialize, Eq, PartialEq)]
#[serde(try_from = "String")]
pub struct CategoryName(pub Category);

impl TryFrom<String> for CategoryName {
    type Error = String;

    fn try_from(name: String) -> Result<Self, String> {
        Category::of(&name).map(Self).ok_or_else(|| format!("there is no category {name:?}"))
    }
}

/// A list of materials that may be used; what is not on it may not.
#[derive(Clone, Debug, Deserialize, PartialEq)]
#[serde(deny_unknown_fields)]
pub struct PositiveList {
    /// Unique in the set.
    pub id: String,
    /// The collected rows it stands on.
    #[serde(default)]
    pub row: Rows,
    /// Categories that the list is not about.
    #[serde(default)]
    pub exempt: Vec<CategoryName>,
    /// The materials, as named in compositions and on materials.
    pub listed: Vec<String>,
    /// Of those, the ones without a number: good practice, and the purpose is stated.
    #[serde(default)]
    pub state_purpose: Vec<String>,
    /// Materials whose place on the list could not be settled, and why: pointed out, not refused.
    #[serde(default)]
    pub unsettled: BTreeMap<String, String>,
    /// What an unsettled material means.
    #[serde(default = "advise")]
    pub unsettled_is: Verdict,
    /// What a material that is not listed means, where the list read is not the whole list, or none was found.
    #[serde(default = "refuse")]
    pub unlisted_is: Verdict,
    /// What to say of such a material in place of "is not on the list".
    #[serde(default)]
    pub statement: Option<String>,
    /// What to say more about a material that is not listed.
    #[serde(default)]
    pub remarks: BTreeMap<String, String>,
    /// How to have another material permitted.
    #[serde(default)]
    pub remedy: Option<String>,
    /// Where it comes from.
    pub source: Source,
}

const fn advise() -> Verdict {
    Verdict::Advise
}

const fn refuse() -> Verdict {
    Verdict::Refuse
}

impl PositiveList {
    pub(crate) fn check(&self, case: &Case<'_>, mark: &Mark<'_>) -> Vec<Noticed> {
        case.proposed_lines()
            .filter(|line| !self.exempt.contains(&CategoryName(line.category)))
            .flat_map(|line| self.check_line(line, mark))
            .map(Noticed::from)
            .collect()
    }

    fn check_line(&self, line: &Line, mark: &Mark<'_>) -> Vec<Finding> {
        let names: Vec<String> = line.names().collect();
        if names.is_empty() {
            return vec![self.unnamed(line, mark)];
        }
        names.iter().filter_map(|name| self.check_name(line, name, mark)).collect()
    }

    fn check_name(&self, line: &Line, name: &str, mark: &Mark<'_>) -> Option<Finding> {
        if self.state_purpose.iter().any(|listed| listed == name) {
            let sentence = format!(
                "{} ({}) may be used by good commercial practice to feed the yeast: state the purpose.",
                spoken(name),
                line.lot_code
            );
            return Some(mark.finding(&self.id, &self.source, Verdict::Clear, sentence));
        }
        if self.listed.iter().any(|listed| listed == name) {
            return None;
        }
        if let Some(why) = self.unsettled.get(name) {
            let sentence = format!("{} ({}): {why}", spoken(name), line.lot_code);
            return Some(mark.finding(&self.id, &self.source, self.unsettled_is, sentence));
        }
        Some(self.unlisted(line, name, mark))
    }

    fn unlisted(&self, line: &Line, name: &str, mark: &Mark<'_>) -> Finding {
        let material = spoken(name);
        let mut sentence = match &self.statement {
            Some(statement) => format!("{material} ({}): {statement}", line.lot_code),
            None => format!(
                "{material} ({}) is not on the list of materials that may be added ({}).",
                line.lot_code, self.source.citation
            ),
        };
        if let Some(remark) = self.remarks.get(name) {
            sentence.push(' ');
            sentence.push_str(remark);
        }
        let finding = mark.finding(&self.id, &self.source, self.unlisted_is, sentence);
        if self.unlisted_is == Verdict::Clear {
            return finding;
        }
        finding.cured_by(self.remedy.as_deref().unwrap_or("Use a listed material."))
    }

    fn unnamed(&self, line: &Line, mark: &Mark<'_>) -> Finding {
        let sentence = format!(
            "Nobody has said what {} ({}) is made of, and only listed materials may be added ({}).",
            line.material_name, line.lot_code, self.source.citation
        );
        mark.finding(&self.id, &self.source, self.unlisted_is.max(Verdict::Advise), sentence)
            .cured_by("Enter from its label what it is and what it contains, or use another lot.")
    }
}

/// `yeast_cell_walls` as `Yeast cell walls`.
fn spoken(name: &str) -> String {
    let text = name.replace('_', " ");
    let mut letters = text.chars();
    letters.next().map_or_else(String::new, |first| first.to_uppercase().chain(letters).collect())
}
