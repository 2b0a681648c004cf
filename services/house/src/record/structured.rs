//! The record as JSON: the same content for programs, in the ledger's canonical form.
//!
//! Bodies stand as the ledger holds them, so decimals are strings and quantities have their base units; absent is
//! absent, never null.

use domain::book::body::Body;
use domain::book::in_force::InForce;
use domain::stamp::Stamp;
use serde_json::{Map, Value, json};

use super::assurance::absent;
use super::evidence::{Evidence, Told};
use crate::error::HouseError;

/// The version of this form.
const FORM: u32 = 1;

impl Evidence {
    /// The whole record.
    ///
    /// # Errors
    /// [`HouseError::Failed`] if a body cannot be written, which none of ours can.
    pub(crate) fn structured(&self, issued: Option<&records::Issued>) -> Result<Value, HouseError> {
        let mut record = json!({
            "form": FORM,
            "record": "batch",
            "simulation": self.founded.simulation,
            "deferral": records::DEFERRAL,
            "issued": issued.is_some(),
            "drawn_up": Stamp::in_zone(self.drawn_up, self.zone()),
            "site": plain(&self.founded)?,
            "batch": self.batch,
            "batch_n": self.n,
            "log_size": self.log_size,
            "entries": self.entry_list(),
            "entries_digest": self.entries_digest().to_string(),
            "head": self.head_value(),
            "materials": self.materials()?,
            "nitrogen_account": self.account_value(),
            "rule_sets": self.sets_value(),
            "people": self.people_value(),
            "engines": self.engines(),
            "cautions": self.cautions().iter().map(|one| {
                json!({ "topic": one.topic, "text": one.text, "source": one.source })
            }).collect::<Vec<_>>(),
            "absent": absent().iter().map(|one| json!({ "what": one.what, "why": one.why }))
                .collect::<Vec<_>>(),
        });
        if let (Some(issued), Value::Object(members)) = (issued, &mut record) {
            members.insert("issued_to".to_owned(), json!(issued.to));
            members.insert("issued_at".to_owned(), json!(issued.at));
        }
        for (name, kind) in [
            ("opening", "batch.opened"),
            ("readings", "reading.taken"),
            ("proposals", "proposal.assessed"),
            ("additions", "addition.recorded"),
            ("signatures", "signoff.given"),
            ("deviations", "deviation.opened"),
            ("resolutions", "deviation.resolved"),
            ("handed_out_before", "record.issued"),
        ] {
            record[name] = self.of_kind(kind)?;
        }
        Ok(record)
    }

    fn entry_list(&self) -> Vec<Value> {
        let each = |original: &super::evidence::Original| {
            json!({
                "n": original.n,
                "seq": original.entry.seq,
                "id": original.entry.id,
                "kind": original.entry.kind,
                "leaf_hash": original.leaf_hash.to_string(),
            })
        };
        self.originals.iter().map(each).collect()
    }

    fn head_value(&self) -> Value {
        json!({
            "origin": self.head.origin,
            "size": self.head.size,
            "root": self.head.root.to_string(),
            "note": self.head.note,
            "key": self.head.key,
            "key_fingerprint": self.head.fingerprint,
        })
    }

    /// The batch's entries of one kind, in the order in which things happened.
    fn of_kind(&self, kind: &str) -> Result<Value, HouseError> {
        let told = self.told.iter().filter(|told| told.read.body.kind().0 == kind);
        told.map(|told| self.entry(told)).collect::<Result<Vec<_>, _>>().map(Value::Array)
    }

    fn entry(&self, told: &Told) -> Result<Value, HouseError> {
        let mut value = self.read(&told.read)?;
        value.insert("n".to_owned(), json!(told.n));
        if let Some(captured_at) = told.captured_at {
            value.insert("captured_at".to_owned(), json!(captured_at));
        }
        if told.moved {
            value.insert("moved_to_another_batch".to_owned(), json!(true));
        }
        Ok(Value::Object(value))
    }

    /// An entry as it reads in the end, with what it said before.
    fn read(&self, entry: &InForce) -> Result<Map<String, Value>, HouseError> {
        let amendments = entry.amendments.iter().map(|amendment| {
            let (occurred_at, body) = &amendment.was;
            let mut value = json!({
                "seq": amendment.seq,
                "by": amendment.actor,
                "at": amendment.at,
                "reason": amendment.reason,
                "was": { "occurred_at": occurred_at, "body": written(body)? },
                "voids": self.voids(amendment),
            });
            let n = self.originals.iter().find(|original| original.entry.seq == amendment.seq);
            if let Some(original) = n {
                value["n"] = json!(original.n);
            }
            Ok(value)
        });
        let value = json!({
            "seq": entry.seq,
            "id": entry.id,
            "occurred_at": entry.occurred_at,
            "recorded_at": entry.recorded_at,
            "by": entry.actor,
            "void": entry.void,
            "body": written(&entry.body)?,
            "amendments": amendments.collect::<Result<Vec<_>, HouseError>>()?,
        });
        match value {
            Value::Object(members) => Ok(members),
            _ => Ok(Map::new()),
        }
    }

    fn materials(&self) -> Result<Vec<Value>, HouseError> {
        let mut list = Vec::new();
        for (lot, uses) in self.uses() {
            let uses: Vec<_> =
                uses.iter().map(|one| json!({ "n": one.n, "amount": one.amount })).collect();
            let mut value = json!({ "lot": lot, "uses": uses });
            if let Some((entry, receipt)) = self.receipt(lot) {
                value["receipt"] = Value::Object(self.read(entry)?);
                if let Ok(state) = self.desk.material(receipt.material)
                    && let Some((_, material)) = &state.current
                {
                    value["material"] = plain(material)?;
                }
                if let Some(party) = receipt.supplier
                    && let Ok(state) = self.desk.party(party)
                    && let Some((_, party)) = &state.current
                {
                    value["supplier"] = plain(party)?;
                }
            }
            list.push(value);
        }
        Ok(list)
    }

    fn account_value(&self) -> Vec<Value> {
        let each = |row: records::AccountRow| {
            json!({
                "at": row.at,
                "what": row.what,
                "ammonium_n_mg_l": row.ammonium_n,
                "other_n_mg_l": row.amino_n,
                "supply_mg_l": row.supply,
                "need_mg_l": row.need,
            })
        };
        self.account().into_iter().map(each).collect()
    }

    fn sets_value(&self) -> Vec<Value> {
        let each = |set: super::assurance::SetTold<'_>| {
            let mut value = json!({
                "set": set.id,
                "version": set.version,
                "digest": set.digest,
                "standing": set.standing,
                "judged": set.judged,
            });
            if let Some(since) = set.since {
                value["adopted_from"] = json!(since);
            }
            if let Some(text) = set.text {
                value["title"] = json!(text.title);
                value["jurisdiction"] = json!(text.jurisdiction);
                value["citation"] = json!(text.citation);
                value["effective_from"] = json!(text.effective_from.start());
                if let Some(end) = text.effective_to {
                    value["effective_to"] = json!(end.start());
                }
            }
            value
        };
        self.sets_told().into_iter().map(each).collect()
    }

    fn people_value(&self) -> Vec<Value> {
        let people = self.people().into_iter();
        people.map(|(id, it)| json!({ "id": id, "name": it.name, "roles": it.role })).collect()
    }
}

fn written(body: &Body) -> Result<Value, HouseError> {
    body.write().map_err(|e| HouseError::Failed(e.to_string()))
}

fn plain<T: serde::Serialize>(body: &T) -> Result<Value, HouseError> {
    serde_json::to_value(body).map_err(|e| HouseError::Failed(e.to_string()))
}
