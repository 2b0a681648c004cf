//! What can be checked about an entry by itself, on all processors at once.

use domain::ledger::entry::{ENVELOPE, Envelope, MAX_SUBJECTS};
use domain::ledger::tree::leaf_hash;
use domain::units::Quantity;
use serde_json::Value;

use super::Fault;
use crate::error::chain;
use crate::log::Stored;

/// Entries checked in one go by one processor.
const SHARE: usize = 500;

/// An entry that is good by itself.
pub(super) struct Checked {
    pub(super) stored: Stored,
    pub(super) entry: Envelope,
}

/// Checks a page of entries, in order.
pub(super) async fn read_all(page: Vec<Stored>) -> Vec<Result<Checked, Fault>> {
    let mut page = page.into_iter();
    let mut shares = Vec::new();
    loop {
        let share: Vec<Stored> = page.by_ref().take(SHARE).collect();
        if share.is_empty() {
            break;
        }
        shares.push(tokio::task::spawn_blocking(|| share.into_iter().map(read).collect()));
    }
    let mut all: Vec<Result<Checked, Fault>> = Vec::new();
    for share in shares {
        match share.await {
            Ok(checked) => all.extend::<Vec<_>>(checked),
            Err(error) => all.push(Err(Fault::of_log(format!("the check failed: {error}")))),
        }
    }
    all
}

fn read(stored: Stored) -> Result<Checked, Fault> {
    let seq = stored.seq;
    let entry = Envelope::verify_bytes(&stored.bytes).map_err(|e| Fault::at(seq, chain(&e)))?;
    if leaf_hash(&stored.bytes) != stored.leaf_hash {
        return Err(Fault::at(seq, "its leaf hash is not that of its bytes"));
    }
    if entry.v != ENVELOPE {
        return Err(Fault::at(seq, format!("its envelope is of version {}", entry.v)));
    }
    if entry.subjects.is_empty() || entry.subjects.len() > MAX_SUBJECTS {
        return Err(Fault::at(seq, format!("it has {} subjects", entry.subjects.len())));
    }
    if !entry.subjects.is_sorted_by(|a, b| (&a.kind, a.id) < (&b.kind, b.id)) {
        return Err(Fault::at(seq, "its subjects are not in order"));
    }
    // Only an object with a base is a quantity; in canonical form its name is spelled like this.
    if entry.body.get().contains("\"base\":") {
        let body = entry.body().map_err(|e| Fault::at(seq, chain(&e)))?;
        if let Some(amount) = wrong_amount(&body) {
            return Err(Fault::at(seq, format!("{amount} is not what was entered")));
        }
    }
    Ok(Checked { stored, entry })
}

/// The first quantity whose base is not what its number and unit come to.
fn wrong_amount(value: &Value) -> Option<String> {
    match value {
        Value::Array(items) => items.iter().find_map(wrong_amount),
        Value::Object(members) => {
            let is_quantity = ["entered", "unit", "base"].iter().all(|m| members.contains_key(*m));
            if !is_quantity {
                return members.values().find_map(wrong_amount);
            }
            let read = serde_json::from_value::<Quantity>(value.clone());
            let is_right = read.is_ok_and(|quantity| quantity.is_consistent());
            (!is_right).then(|| value.to_string())
        }
        _ => None,
    }
}

#[cfg(test)]
mod tests {
    use serde_json::json;

    use super::*;

    #[test]
    fn a_base_is_recomputed_wherever_it_stands() {
        let good = json!({"lines": [{"amount": {"entered": "2.5", "unit": "kg", "base": 2_500_000_000_i64}}]});
        assert_eq!(wrong_amount(&good), None);
        let bad = json!({"lines": [{"amount": {"entered": "2.5", "unit": "kg", "base": 2_500_000_001_i64}}]});
        assert!(wrong_amount(&bad).is_some_and(|text| text.contains("2500000001")));
        let odd = json!({"entered": "2.5", "unit": "stone", "base": 1});
        assert!(wrong_amount(&odd).is_some());
    }
}
