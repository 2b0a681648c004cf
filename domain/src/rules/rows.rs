//! Which rows of the collected rules a rule stands on, so that a test can hold all of them against what ships.

use serde::Deserialize;

/// One row id or a list of them; empty where a rule stands on no collected row.
#[derive(Clone, Debug, Default, Deserialize, Eq, PartialEq)]
#[serde(from = "Written")]
pub struct Rows(Vec<String>);

#[derive(Deserialize)]
#[serde(untagged)]
enum Written {
    One(String),
    Several(Vec<String>),
}

impl From<Written> for Rows {
    fn from(written: Written) -> Self {
        match written {
            Written::One(id) => Self(vec![id]),
            Written::Several(ids) => Self(ids),
        }
    }
}

impl Rows {
    /// The ids, as written.
    pub fn ids(&self) -> impl Iterator<Item = &str> {
        self.0.iter().map(String::as_str)
    }
}
