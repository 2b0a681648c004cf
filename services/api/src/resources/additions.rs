//! What was added.

use axum::Json;
use axum::extract::{Path, State};
use axum::http::StatusCode;
use domain::book::command::{Act, Add};
use domain::ids::BatchId;
use domain::stamp::Micros;
use domain::units::Dimension;
use house::House;
use serde::{Deserialize, Serialize};
use serde_json::Value;
use utoipa::ToSchema;
use uuid::Uuid;

use crate::amounts::{Amount, Faults, stated_time};
use crate::asking::{asked, print};
use crate::caller::Caller;
use crate::idempotency::IdempotencyKey;
use crate::problem::{Problem, ProblemDocument};
use crate::resources::batches::{NewDraw, draws};
use crate::resources::proposals::preparation;
use crate::strict::Strict;
use crate::views::{EntryView, Listed, Recorded};

/// What was added: with the proposal that it carries out, or already done with a reason.
#[derive(Deserialize, ToSchema)]
#[serde(deny_unknown_fields)]
pub(crate) struct NewAddition {
    /// The proposal that this carries out.
    proposal: Option<Uuid>,
    /// It was done before anybody asked: always recorded; `reason` is then needed.
    #[serde(default)]
    already_done: bool,
    /// Why it was done before anybody asked.
    #[schema(min_length = 1, max_length = 2000)]
    reason: Option<String>,
    /// When it was done.
    #[schema(format = DateTime)]
    done_at: String,
    /// The device's clock, if typed without network.
    #[schema(format = DateTime)]
    captured_at: Option<String>,
    /// Which lots, and how much of each.
    lines: Vec<NewDraw>,
    /// Water that carried it in.
    carrier_water: Option<Amount>,
    /// `powder`, `slurry`, `solution` or `as_delivered`.
    preparation: String,
}

impl NewAddition {
    /// What it asks of the book.
    pub(crate) fn read(self, faults: &mut Faults, batch: BatchId, now: Micros) -> Option<Add> {
        let done_at = faults.at("/done_at", stated_time(&self.done_at, now));
        let captured_at = self
            .captured_at
            .as_deref()
            .and_then(|text| faults.at("/captured_at", stated_time(text, now)));
        let draws = draws(faults, "/lines", &self.lines);
        let carrier_water = self
            .carrier_water
            .as_ref()
            .and_then(|water| faults.amount("/carrier_water", water, Dimension::Volume));
        let preparation = faults.at("/preparation", preparation(&self.preparation));
        let already_done = match (self.already_done, self.reason) {
            (true, Some(reason)) => {
                faults.words("/reason", reason.as_str());
                Some(reason)
            }
            (true, None) => {
                faults.note("/reason", "say why it was done before anybody asked");
                None
            }
            (false, Some(_)) => {
                faults.note("/reason", "a reason belongs to already_done; leave it out");
                None
            }
            (false, None) => None,
        };
        Some(Add {
            batch,
            proposal: self.proposal.map(Into::into),
            done_at: done_at?,
            captured_at,
            draws,
            carrier_water,
            preparation: preparation?,
            already_done,
        })
    }
}

/// What was recorded, with the answer for what was done.
#[derive(Serialize, ToSchema)]
pub(crate) struct Added {
    /// What was recorded; a deviation too where one was opened.
    #[serde(flatten)]
    recorded: Recorded,
    /// `clear`, `advise`, `refer` or `refuse`, as of when it was done.
    verdict: String,
    /// The deviation that was opened, if one was.
    #[serde(skip_serializing_if = "Option::is_none")]
    deviation: Option<Uuid>,
    /// A limit shown is never legal advice.
    notice: &'static str,
}

/// Records what was added. 409 and nothing recorded if the proposal does not cover it; what is already done is always
/// recorded.
#[utoipa::path(post, path = "/v1/batches/{id}/additions", operation_id = "record_addition", tag = "batches", request_body = NewAddition, security(("bearer" = [])),
    params(("id" = Uuid, Path), ("Idempotency-Key" = Uuid, Header, description = "A UUID of your own for this request")),
    responses((status = 201, body = Added), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn add(
    State(house): State<House>,
    caller: Caller,
    Path(id): Path<Uuid>,
    IdempotencyKey(key): IdempotencyKey,
    Strict { value, raw }: Strict<NewAddition>,
) -> Result<(StatusCode, Json<Added>), Problem> {
    let print = print("POST", &format!("/v1/batches/{id}/additions"), &raw)?;
    let mut faults = Faults::default();
    let read = value.read(&mut faults, BatchId(id), house.now());
    let act = Act::Add(Box::new(faults.finish(read)?));
    let receipt = house.submit(asked(&caller, key, print, act)).await?;
    let verdict = receipt
        .entries
        .first()
        .and_then(|entry| entry.body.pointer("/assessment/verdict"))
        .and_then(Value::as_str)
        .unwrap_or_default()
        .to_owned();
    let deviation = receipt
        .entries
        .iter()
        .find(|entry| entry.kind == "deviation.opened")
        .and_then(|entry| crate::views::id_in(entry, "deviation"));
    let recorded = Recorded::entry(&receipt);
    let added = Added { recorded, verdict, deviation, notice: crate::NOTICE };
    Ok((StatusCode::CREATED, Json(added)))
}

/// Additions to a batch as they were recorded, newest first.
#[utoipa::path(get, path = "/v1/batches/{id}/additions", operation_id = "list_additions", tag = "batches", params(("id" = Uuid, Path)), security(("bearer" = [])),
    responses((status = 200, body = Listed<EntryView>), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn list(
    State(house): State<House>,
    caller: Caller,
    Path(id): Path<Uuid>,
) -> Result<Json<Listed<EntryView>>, Problem> {
    super::entries::of_kind(&house, &caller, BatchId(id), "addition.recorded").await
}
