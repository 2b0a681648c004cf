//! The site: who it is, its settings, the rule sets that bind.

use std::collections::BTreeMap;

use crate::book::body::{Body, RulesetAdopted, SiteFounded};
use crate::book::in_force::InForce;
use crate::book::table::Row;
use crate::book::tables::{ADOPTION, SETTING};
use crate::stamp::{Micros, Stamp};

/// A site as its entries say.
#[derive(Clone, Debug, Default)]
pub struct SiteState {
    /// The founding; absent before it.
    pub founded: Option<SiteFounded>,
    /// Settings that differ from the defaults.
    pub settings: BTreeMap<String, String>,
    /// Rule sets that bind, by set and standing, with since when.
    pub adopted: BTreeMap<(String, String), (Stamp, RulesetAdopted)>,
    /// Every adoption, by time: what bound before, and what will bind.
    adoptions: Vec<(Stamp, RulesetAdopted)>,
}

impl SiteState {
    pub(crate) fn apply(&mut self, entry: &InForce) {
        match entry.body.as_ref() {
            Body::SiteFounded(body) => self.founded = Some(body.clone()),
            Body::SettingsChanged(body) => {
                self.settings.extend(body.settings.iter().map(|(k, v)| (k.clone(), v.clone())));
            }
            Body::RulesetAdopted(body) => {
                let key = (body.set.clone(), body.standing.to_string());
                self.adopted.insert(key, (entry.occurred_at, body.clone()));
                self.adoptions.push((entry.occurred_at, body.clone()));
            }
            _ => {}
        }
    }

    /// The rule sets that bind at that moment: of each set and standing the latest version adopted by then. A version
    /// adopted from a later day on does not end the one before it until that day.
    pub fn binding_at(&self, at: Micros) -> impl Iterator<Item = &RulesetAdopted> {
        let mut binding = BTreeMap::new();
        for (_, adopted) in self.adoptions.iter().filter(|(since, _)| since.at <= at) {
            binding.insert((&adopted.set, adopted.standing.to_string()), adopted);
        }
        binding.into_values()
    }

    pub(crate) fn rows(&self) -> Vec<Row> {
        let settings = self.settings.iter().map(|(name, value)| Row {
            table: &SETTING,
            cells: vec![name.as_str().into(), value.as_str().into()],
        });
        let adoptions = self.adopted.iter().map(|((set, standing), (since, body))| Row {
            table: &ADOPTION,
            cells: vec![
                set.as_str().into(),
                standing.as_str().into(),
                body.version.as_str().into(),
                body.digest.as_str().into(),
                since.at.0.into(),
            ],
        });
        settings.chain(adoptions).collect()
    }
}
