//! What a record rests on, and what it does not hold.

use std::collections::{BTreeMap, BTreeSet};

use domain::checks;
use domain::ids::PersonId;
use domain::ledger::entry::Actor;
use domain::rules::RuleSet;
use domain::stamp::Micros;
use records::{Absent, Caution, Head, Person};

use super::evidence::Evidence;
use super::words;

/// A rule set that bound the site at the end, or that judged this batch before.
pub(crate) struct SetTold<'a> {
    pub(crate) id: String,
    pub(crate) version: String,
    pub(crate) digest: String,
    pub(crate) standing: String,
    pub(crate) text: Option<&'a RuleSet>,
    /// Since when it was adopted, if it still was at the end.
    pub(crate) since: Option<Micros>,
    /// How many assessments of this batch it judged.
    pub(crate) judged: usize,
}

impl Evidence {
    /// Adopted sets and those the assessments name, by id, version and standing.
    pub(crate) fn sets_told(&self) -> Vec<SetTold<'_>> {
        let mut sets: BTreeMap<(String, String, String), SetTold<'_>> = BTreeMap::new();
        let adopted = self.desk.site().map(|state| &state.adopted).ok();
        for (since, body) in adopted.into_iter().flat_map(|adopted| adopted.values()) {
            let standing = body.standing.to_string();
            let key = (body.set.clone(), body.digest.clone(), standing.clone());
            let told = SetTold {
                id: body.set.clone(),
                version: body.version.clone(),
                digest: body.digest.clone(),
                standing,
                text: self.rule_sets.get(&body.digest),
                since: Some(since.at),
                judged: 0,
            };
            sets.insert(key, told);
        }
        let used = self.assessments().into_iter().flat_map(|(_, found)| &found.rule_sets);
        for set in used {
            // Assessments write `market:EU`, adoptions print `market EU`.
            let standing = set.standing.replacen(':', " ", 1);
            let key = (set.id.clone(), set.digest.clone(), standing.clone());
            let told = sets.entry(key).or_insert_with(|| SetTold {
                id: set.id.clone(),
                version: set.version.clone(),
                digest: set.digest.clone(),
                standing,
                text: self.rule_sets.get(&set.digest),
                since: None,
                judged: 0,
            });
            told.judged += 1;
        }
        sets.into_values().collect()
    }

    pub(super) fn printed_sets(&self) -> Vec<records::RuleSet> {
        let row = |set: SetTold<'_>| records::RuleSet {
            effective: set.text.map(in_force).unwrap_or_default(),
            standing: self.standing(&set),
            id: set.id,
            version: set.version,
            digest: set.digest,
        };
        self.sets_told().into_iter().map(row).collect()
    }

    fn standing(&self, set: &SetTold<'_>) -> String {
        let since = set.since.map_or_else(
            || "adopted earlier, replaced since".to_owned(),
            |since| format!("adopted from {}", self.clock(since)),
        );
        format!("{}; {since}; judged {} assessments of this batch", set.standing, set.judged)
    }

    pub(super) fn printed_head(&self) -> Head {
        Head {
            origin: self.head.origin.clone(),
            size: self.head.size,
            root: self.head.root.to_string(),
            note: self.head.note.lines().map(str::to_owned).collect(),
            key_fingerprint: self.head.fingerprint.clone(),
        }
    }

    /// Everybody who acted, with the roles they had at the end; by name.
    pub(crate) fn people(&self) -> Vec<(PersonId, Person)> {
        let person = |(id, name): (&PersonId, &String)| {
            let role = self.roles(Actor::Person(*id), self.log_size);
            let role = if role.is_empty() { "no role at the end".to_owned() } else { role };
            (*id, Person { name: name.clone(), role })
        };
        let mut people: Vec<_> = self.names.iter().map(person).collect();
        people.sort_by(|(_, one), (_, other)| one.name.cmp(&other.name));
        people
    }

    /// The engines that assessed.
    pub(crate) fn engines(&self) -> BTreeSet<String> {
        self.assessments().into_iter().map(|(_, found)| found.engine.clone()).collect()
    }

    pub(super) fn printed_engine(&self) -> String {
        let engines: Vec<_> = self.engines().into_iter().collect();
        if engines.is_empty() { "nothing was assessed".to_owned() } else { engines.join(", ") }
    }

    /// The cautions every record has, and those of the assessments; each text once.
    pub(crate) fn cautions(&self) -> Vec<Caution> {
        let mut told: Vec<checks::Caution> = checks::always_cautions().into();
        for (_, found) in self.assessments() {
            for caution in &found.cautions {
                if !told.contains(caution) {
                    told.push(caution.clone());
                }
            }
        }
        let row = |one: checks::Caution| Caution {
            topic: one.topic.replace('-', " "),
            text: one.text,
            source: one.source,
        };
        told.into_iter().map(row).collect()
    }
}

fn in_force(set: &RuleSet) -> String {
    let from = words::date(set.effective_from.start(), "UTC");
    match set.effective_to {
        Some(end) => format!("{from} until before {}", words::date(end.start(), "UTC")),
        None => format!("from {from} on"),
    }
}

/// What the strictest of the record rules ask for and this book does not keep.
pub(crate) fn absent() -> Vec<Absent> {
    const NOT_YET: &str = "this book does not record it yet; keep it as you do now";
    let rows = [
        ("Movements, rackings, blends and their losses", NOT_YET),
        ("Volume and temperature after the filling, by actual measurement", NOT_YET),
        ("Distillation: charges, cuts, gauges, pure alcohol", NOT_YET),
        ("Packaging, lot marks, labels, samples kept", NOT_YET),
        ("Consignees: who received which part", NOT_YET),
        (
            "Release, and the state of each market",
            "destinations are listed as stated; this book gives no release yet",
        ),
        ("Carrier, pack and storage place of received lots", NOT_YET),
        ("Stock-take, destruction, returns, balance of materials", NOT_YET),
        (
            "Running totals against each limit",
            "not drawn up as a table: each addition shows the findings it was judged by, with number, limit and source",
        ),
        (
            "Ethyl carbamate outlook",
            "no model of it is run; what was measured is among the readings",
        ),
        ("Retention date and legal hold", "not computed: the law of the place decides"),
        (
            "Entries and inclusion proofs",
            "not attached: ask the house for them; the head fixes them, and the digest of their list is in the ledger when this is issued",
        ),
    ];
    rows.map(|(what, why)| Absent { what: what.to_owned(), why: why.to_owned() }).into()
}
