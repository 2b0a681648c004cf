//! Entries of the log: reading one, amending it, signing it.

use axum::Json;
use axum::extract::{Path, State};
use axum::http::{HeaderMap, StatusCode, header};
use axum::response::{IntoResponse, Response};
use domain::book::body::Body;
use domain::book::command::{Act, Amend, AmendTo, SignOff};
use domain::book::in_force::InForce;
use domain::ids::{BatchId, EntryId, LotId};
use house::House;
use serde::{Deserialize, Serialize};
use utoipa::ToSchema;
use uuid::Uuid;

use crate::amounts::Faults;
use crate::asking::{asked, print, without};
use crate::caller::Caller;
use crate::idempotency::IdempotencyKey;
use crate::problem::{Kind, Problem, ProblemDocument};
use crate::resources::additions::NewAddition;
use crate::resources::batches::{NewBatch, no_batch};
use crate::resources::lots::NewLot;
use crate::resources::readings::{NewReading, NewValue};
use crate::strict::Strict;
use crate::views::{EntryView, Listed, Recorded};

/// An entry with how it reads now.
#[derive(Serialize, ToSchema)]
pub(crate) struct EntryInForce {
    /// As it was written.
    original: EntryView,
    /// Voided: it did not happen.
    void: bool,
    /// How it reads now, if it was amended.
    #[serde(skip_serializing_if = "Option::is_none")]
    #[schema(value_type = Object)]
    now: Option<serde_json::Value>,
    /// What was done to it, oldest first.
    amendments: Vec<AmendmentView>,
}

/// One amendment.
#[derive(Serialize, ToSchema)]
pub(crate) struct AmendmentView {
    /// The amendment's number in the log.
    seq: u64,
    /// Who.
    actor: String,
    /// When.
    at: String,
    /// Why.
    reason: String,
    /// What the entry said before.
    #[schema(value_type = Object)]
    was: serde_json::Value,
}

fn in_force(original: EntryView, now: &InForce) -> EntryInForce {
    let json = |body: &Body| body.write().unwrap_or_default();
    EntryInForce {
        original,
        void: now.void,
        now: (!now.amendments.is_empty()).then(|| json(&now.body)),
        amendments: now
            .amendments
            .iter()
            .map(|amendment| AmendmentView {
                seq: amendment.seq,
                actor: amendment.actor.to_string(),
                at: amendment.at.to_string(),
                reason: amendment.reason.clone(),
                was: json(&amendment.was.1),
            })
            .collect(),
    }
}

/// One entry: as it was written, and how it reads now.
#[utoipa::path(get, path = "/v1/entries/{id}", operation_id = "show_entry", tag = "entries", params(("id" = Uuid, Path)), security(("bearer" = [])),
    responses((status = 200, body = EntryInForce), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn show(
    State(house): State<House>,
    caller: Caller,
    Path(id): Path<Uuid>,
) -> Result<Json<EntryInForce>, Problem> {
    let (entry, now) = house.entry(&(&caller).into(), EntryId(id)).await?;
    Ok(Json(in_force(entry.as_ref().into(), &now)))
}

/// Entries of one kind about a batch, newest first, as they were written.
pub(crate) async fn of_kind(
    house: &House,
    caller: &Caller,
    batch: BatchId,
    kind: &str,
) -> Result<Json<Listed<EntryView>>, Problem> {
    let site = house.site(caller.site).await?;
    let entries = house.entries_of(&site, batch.into()).await?;
    if entries.is_empty() {
        return Err(no_batch());
    }
    let items =
        entries.iter().rev().filter(|entry| entry.kind == kind).map(EntryView::from).collect();
    Ok(Json(Listed { items }))
}

/// A correction of an entry. Exactly one of `void`, `value`, `reading`, `addition`, `lot` and `batch` says what it
/// becomes.
#[derive(Deserialize, ToSchema)]
#[serde(deny_unknown_fields)]
pub(crate) struct NewAmendment {
    /// Why.
    #[schema(min_length = 1, max_length = 2000)]
    reason: String,
    /// It did not happen.
    #[serde(default)]
    void: bool,
    /// One value of a reading, by its place.
    value: Option<AmendedValue>,
    /// The reading as it should have been entered.
    reading: Option<NewReading>,
    /// The addition as it was done; its proposal stays.
    addition: Option<NewAddition>,
    /// The receipt as it was.
    lot: Option<NewLot>,
    /// The opening of the batch as it was.
    batch: Option<NewBatch>,
}

/// One value of a reading.
#[derive(Deserialize, ToSchema)]
#[serde(deny_unknown_fields)]
pub(crate) struct AmendedValue {
    /// Which, from 0.
    index: u32,
    /// How it should read.
    value: NewValue,
}

impl NewAmendment {
    fn read(self, house: &House, target: &InForce) -> Result<AmendTo, Problem> {
        let mut faults = Faults::default();
        faults.words("/reason", self.reason.as_str());
        let given = [
            self.void,
            self.value.is_some(),
            self.reading.is_some(),
            self.addition.is_some(),
            self.lot.is_some(),
            self.batch.is_some(),
        ];
        if given.iter().filter(|given| **given).count() != 1 {
            faults.note("", "say exactly one of void, value, reading, addition, lot and batch");
            return faults.finish(None);
        }
        let now = house.now();
        if let Some(lot) = self.lot {
            let id = match target.body.as_ref() {
                Body::LotReceived(body) => body.lot,
                _ => LotId(Uuid::nil()),
            };
            faults.enter("/lot");
            let receipt = lot.read(&mut faults, id, now);
            return faults.finish(receipt.map(|receipt| AmendTo::Receipt(Box::new(receipt))));
        }
        let batch = batch_of(target);
        if let Some(opening) = self.batch {
            faults.enter("/batch");
            let opening = opening.read(&mut faults, batch, now);
            return faults.finish(opening.map(|opening| AmendTo::Opening(Box::new(opening))));
        }
        let to = match (self.value, self.reading, self.addition) {
            (Some(value), ..) => {
                let read = value.value.read(&mut faults, "/value/value");
                Some(AmendTo::Value(value.index, Box::new(read)))
            }
            (_, Some(reading), _) => {
                faults.enter("/reading");
                let reading = reading.read(&mut faults, batch, now);
                reading.map(|reading| AmendTo::Reading(Box::new(reading)))
            }
            (_, _, Some(addition)) => {
                faults.enter("/addition");
                let addition = addition.read(&mut faults, batch, now);
                addition.map(|addition| AmendTo::Addition(Box::new(addition)))
            }
            _ => Some(AmendTo::Void),
        };
        faults.finish(to)
    }
}

fn batch_of(target: &InForce) -> BatchId {
    match target.body.as_ref() {
        Body::ReadingTaken(body) => body.batch,
        Body::AdditionRecorded(body) => body.batch,
        Body::BatchOpened(body) => body.batch,
        _ => BatchId(Uuid::nil()),
    }
}

/// Amends an entry: a new entry says how it should read; the original stays, and every view shows both.
#[utoipa::path(post, path = "/v1/entries/{id}/amendments", operation_id = "amend_entry", tag = "entries", request_body = NewAmendment, security(("bearer" = [])),
    params(("id" = Uuid, Path), ("Idempotency-Key" = Uuid, Header, description = "A UUID of your own for this request")),
    responses((status = 201, body = Recorded), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn amend(
    State(house): State<House>,
    caller: Caller,
    Path(id): Path<Uuid>,
    IdempotencyKey(key): IdempotencyKey,
    Strict { value, raw }: Strict<NewAmendment>,
) -> Result<(StatusCode, Json<Recorded>), Problem> {
    let print = print("POST", &format!("/v1/entries/{id}/amendments"), &raw)?;
    let site = house.site(caller.site).await?;
    let (_, target) = house.entry(&(&caller).into(), EntryId(id)).await?;
    let reason = value.reason.clone();
    let effect = value.read(&house, &target)?;
    let amended_at = house.local_now(&site).await?;
    let amend = Amend { target: EntryId(id), effect, reason, amended_at };
    let act = Act::Amend(Box::new(amend));
    let receipt = house.submit(asked(&caller, key, print, act)).await?;
    Ok((StatusCode::CREATED, Json(Recorded::entry(&receipt))))
}

/// A signature.
#[derive(Deserialize, ToSchema)]
#[serde(deny_unknown_fields)]
pub(crate) struct NewSignoff {
    /// `performed`, `reviewed`, `approved the exception` or `released`.
    #[schema(example = "approved the exception")]
    meaning: String,
    /// The `shown` of the proposal as it was read: the signature binds exactly that.
    shown: String,
    /// Why.
    #[schema(min_length = 1, max_length = 2000)]
    reason: String,
    /// The signer's password, asked again.
    secret: String,
}

/// Signs a proposal that needs a second person.
#[utoipa::path(post, path = "/v1/entries/{id}/signoffs", operation_id = "sign_entry", tag = "entries", request_body = NewSignoff, security(("bearer" = [])),
    params(("id" = Uuid, Path), ("Idempotency-Key" = Uuid, Header, description = "A UUID of your own for this request")),
    responses((status = 201, body = Recorded), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn sign(
    State(house): State<House>,
    caller: Caller,
    Path(id): Path<Uuid>,
    IdempotencyKey(key): IdempotencyKey,
    Strict { value, raw }: Strict<NewSignoff>,
) -> Result<(StatusCode, Json<Recorded>), Problem> {
    let print = print("POST", &format!("/v1/entries/{id}/signoffs"), &without(raw, &["/secret"]))?;
    let mut faults = Faults::default();
    faults.words("/reason", value.reason.as_str());
    faults.finish(Some(()))?;
    house.confirm_secret(&(&caller).into(), &value.secret).await?;
    let site = house.site(caller.site).await?;
    let act = Act::SignOff(SignOff {
        target: EntryId(id),
        meaning: value.meaning,
        binds: value.shown,
        reason: value.reason,
        signed_at: house.local_now(&site).await?,
    });
    let receipt = house.submit(asked(&caller, key, print, act)).await?;
    Ok((StatusCode::CREATED, Json(Recorded::entry(&receipt))))
}

/// Whether a client asks for PDF.
pub(crate) fn wants_pdf(headers: &HeaderMap) -> bool {
    headers
        .get(header::ACCEPT)
        .and_then(|accept| accept.to_str().ok())
        .is_some_and(|accept| accept.contains("application/pdf"))
}

/// A document for download.
pub(crate) fn document(media_type: &'static str, name: &str, bytes: Vec<u8>) -> Response {
    let safe: String = name
        .chars()
        .map(|c| if c.is_ascii_alphanumeric() || "-_.".contains(c) { c } else { '-' })
        .collect();
    let disposition = format!("attachment; filename=\"{safe}\"");
    (
        [(header::CONTENT_TYPE, media_type.to_owned()), (header::CONTENT_DISPOSITION, disposition)],
        bytes,
    )
        .into_response()
}

/// What a wrong `Accept` is answered.
pub(crate) fn not_acceptable(offered: &str) -> Problem {
    Problem::new(Kind::NotAcceptable, format!("this is given as {offered}"))
}
