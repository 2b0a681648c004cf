//! Records that leave the house: drawn from the log, handed out, handed out again.
//!
//! A record is a function of the log up to a size, the batch, and the names in the directory. So the record of a
//! batch's first n entries has the same bytes whenever it is drawn, as long as nobody it names was erased.

mod additions;
mod assurance;
mod evidence;
mod front;
mod readings;
mod struck;
mod structured;
mod words;

use domain::book::body::{Body, RecordIssued};
use domain::book::command::{Act, Blob, Issue, Refusal, RefusalKind};
use domain::ids::{BatchId, CommandId, EntryId};
use domain::ledger::canonical;
use domain::ledger::tree::Hash;
use domain::stamp::Stamp;
use records::BatchRecord;
use serde_json::Value;
use store::blobs;
use store::log;
use store::sites::Site;
use store::writer::Receipt;

use self::evidence::{Evidence, tidy};
use crate::caller::Caller;
use crate::error::HouseError;
use crate::house::{Asked, House};

/// How often a record is drawn again because something was recorded meanwhile.
const ROUNDS: usize = 5;

/// The longest name of a recipient: the ledger's bound on free text.
const LONGEST_NAME: usize = 2_000;

/// A record just drawn.
#[derive(Clone, Debug, PartialEq)]
pub struct Drawn {
    /// For people.
    pub pdf: Vec<u8>,
    /// For programs.
    pub json: Value,
    /// The batch's newest entry that it covers.
    pub batch_n: u64,
    /// The size of the log that it rests on.
    pub log_size: u64,
    /// SHA-256 over the leaf hashes of the batch's entries 1 to n, hexadecimal.
    pub entries_digest: String,
}

impl Drawn {
    /// The JSON record in canonical form: the bytes that are kept and whose digest is in the ledger.
    ///
    /// # Errors
    /// [`HouseError::Failed`] if it has no canonical form, which none of ours lacks.
    pub fn json_bytes(&self) -> Result<Vec<u8>, HouseError> {
        canonical::document(&self.json).map_err(|e| HouseError::Failed(e.to_string()))
    }
}

/// A record handed out.
#[derive(Clone, Debug)]
pub struct Issued {
    /// What was written: `record.issued`.
    pub receipt: Receipt,
    /// SHA-256 of the PDF, hexadecimal.
    pub pdf: String,
    /// SHA-256 of the JSON record, hexadecimal.
    pub json: String,
}

impl House {
    /// A batch's record as a preview, of its first `as_of_n` entries or of all.
    ///
    /// # Errors
    /// [`HouseError::Refused`] if there is no such batch or no such entry of it.
    pub async fn batch_record(
        &self,
        caller: &Caller,
        batch: BatchId,
        as_of_n: Option<u64>,
    ) -> Result<Drawn, HouseError> {
        let site = self.site(caller.site).await?;
        draw(self.evidence(site, batch, as_of_n).await?, None).await
    }

    /// Draws a batch's record, writes into the book that it was handed out, and keeps its documents and its head in the
    /// same transaction.
    /// Sent again with the same key it gives the first answer.
    ///
    /// # Errors
    /// [`HouseError::Refused`] for a role that may not, an unknown batch, or a recipient that cannot be printed.
    pub async fn issue_record(
        &self,
        caller: Caller,
        key: CommandId,
        print: [u8; 32],
        batch: BatchId,
        to: String,
    ) -> Result<Issued, HouseError> {
        let to = recipient(&to)?;
        let site = self.site(caller.site).await?;
        let mut round = 1;
        loop {
            let act = self.drawn_to_issue(&site, batch, &to).await?;
            let drawn_n = act.batch_n;
            let caller = caller.clone();
            let asked = Asked { caller, key, print, expects: None, act: Act::Issue(act) };
            match self.submit(asked).await {
                Ok(receipt) => return issued(receipt),
                Err(HouseError::Refused(refusal))
                    if refusal.kind == RefusalKind::Conflict
                        && round < ROUNDS
                        && self.count(&site, batch).await? != drawn_n =>
                {
                    round += 1;
                }
                Err(error) => return Err(error),
            }
        }
    }

    async fn drawn_to_issue(
        &self,
        site: &Site,
        batch: BatchId,
        to: &str,
    ) -> Result<Issue, HouseError> {
        let evidence = self.evidence(site.clone(), batch, None).await?;
        let issued_at = Stamp::in_zone(self.now(), evidence.zone());
        let issued = records::Issued {
            at: evidence.clock(issued_at.at),
            to: to.to_owned(),
            log_size: evidence.log_size,
            entries_n: evidence.n,
        };
        let drawn = draw(evidence, Some(issued)).await?;
        let json = drawn.json_bytes()?;
        let documents = vec![blob("application/pdf", drawn.pdf)?, blob("application/json", json)?];
        let digest = |at: usize| Hash(documents[at].digest).to_string();
        Ok(Issue {
            batch,
            batch_n: drawn.batch_n,
            log_size: drawn.log_size,
            pdf: digest(0),
            json: digest(1),
            entries: drawn.entries_digest,
            to: to.to_owned(),
            issued_at,
            documents,
        })
    }

    async fn count(&self, site: &Site, batch: BatchId) -> Result<u64, HouseError> {
        let mut held = self.inner.db.reader().await?;
        Ok(log::count_of(&mut held.conn(), site.number, &batch.into()).await?)
    }

    /// The PDF that the entry `record.issued` of that id names, byte for byte as it was handed out.
    ///
    /// # Errors
    /// [`HouseError::Refused`] if it is no such entry of the caller's site.
    pub async fn issued_document(
        &self,
        caller: &Caller,
        entry: EntryId,
    ) -> Result<Vec<u8>, HouseError> {
        self.issued_blob(caller, entry, |body| body.pdf).await
    }

    /// The JSON record of the same.
    ///
    /// # Errors
    /// As [`House::issued_document`].
    pub async fn issued_json(
        &self,
        caller: &Caller,
        entry: EntryId,
    ) -> Result<Vec<u8>, HouseError> {
        self.issued_blob(caller, entry, |body| body.json).await
    }

    async fn issued_blob(
        &self,
        caller: &Caller,
        entry: EntryId,
        digest: impl FnOnce(RecordIssued) -> String,
    ) -> Result<Vec<u8>, HouseError> {
        let site = self.site(caller.site).await?;
        let unknown = || HouseError::Refused(Refusal::unknown("issued record"));
        let mut held = self.inner.db.reader().await?;
        let stored = log::entry_by_id(&mut held.conn(), site.number, entry).await?;
        let entry = stored.ok_or_else(unknown)?.entry()?;
        let body = issue_of(&entry.kind, entry.kv, &entry.body)?.ok_or_else(unknown)?;
        let name: Hash = digest(body).parse().map_err(|_| unknown())?;
        let found = blobs::find(&mut held.conn(), site.number, &name).await?;
        found.map(|(_, bytes)| bytes).ok_or_else(|| {
            HouseError::Failed(format!("the issued document {name} is gone from the database"))
        })
    }
}

/// The answer to an issue, the first one or a repeat.
fn issued(receipt: Receipt) -> Result<Issued, HouseError> {
    let entry = receipt.entries.first();
    let body = entry.map(|entry| issue_of(&entry.kind, entry.kv, &entry.body)).transpose()?;
    let RecordIssued { pdf, json, .. } =
        body.flatten().ok_or_else(|| HouseError::Failed("nothing was issued".to_owned()))?;
    Ok(Issued { receipt, pdf, json })
}

/// The body of a `record.issued`; `None` for any other kind.
fn issue_of(kind: &str, kv: u32, body: &Value) -> Result<Option<RecordIssued>, HouseError> {
    match Body::read(kind, kv, body) {
        Ok(Body::RecordIssued(body)) => Ok(Some(body)),
        Ok(_) => Ok(None),
        Err(error) => Err(HouseError::Failed(error.to_string())),
    }
}

/// A recipient's name as the ledger takes it.
fn recipient(to: &str) -> Result<String, HouseError> {
    let to = tidy(to.trim());
    if to.is_empty() || to.chars().count() > LONGEST_NAME {
        return Err(HouseError::Refused(Refusal::meaningless(
            "/to",
            format!("say to whom the record is handed, in 1 to {LONGEST_NAME} characters"),
        )));
    }
    Ok(to)
}

fn blob(media_type: &str, bytes: Vec<u8>) -> Result<Blob, HouseError> {
    if bytes.len() > blobs::LARGEST {
        return Err(HouseError::Failed(format!(
            "the record has {} bytes, but a document may have {}",
            bytes.len(),
            blobs::LARGEST
        )));
    }
    Ok(Blob { digest: Hash::of(&bytes).0, media_type: media_type.to_owned(), bytes })
}

/// Sets a record on pages, off the threads that answer requests.
async fn draw(evidence: Evidence, issued: Option<records::Issued>) -> Result<Drawn, HouseError> {
    let task = tokio::task::spawn_blocking(move || {
        let json = evidence.structured(issued.as_ref())?;
        let record = evidence.printed(issued);
        let pdf = records::batch_record(&record).map_err(|e| HouseError::Failed(e.to_string()))?;
        Ok(Drawn {
            pdf,
            json,
            batch_n: evidence.n,
            log_size: evidence.log_size,
            entries_digest: evidence.entries_digest().to_string(),
        })
    });
    task.await.map_err(|e| HouseError::Failed(e.to_string()))?
}

impl Evidence {
    /// The record in words, ready to be set on pages.
    fn printed(&self, issued: Option<records::Issued>) -> BatchRecord {
        BatchRecord {
            site: self.printed_site(),
            simulation: self.founded.simulation,
            drawn_up: Stamp::in_zone(self.drawn_up, self.zone()).to_string(),
            issued,
            batch: self.printed_batch(),
            entries_n: self.n,
            materials: self.printed_materials(),
            readings: self.printed_readings(),
            chart: self.chart(),
            additions: self.printed_additions(),
            proposals: self.printed_proposals(),
            deviations: self.printed_deviations(),
            account: self.account(),
            rule_sets: self.printed_sets(),
            head: self.printed_head(),
            people: self.people().into_iter().map(|(_, person)| person).collect(),
            engine: self.printed_engine(),
            cautions: self.cautions(),
            absent: assurance::absent(),
        }
    }
}
