//! The batch record: previewed, or handed out.

use axum::Json;
use axum::extract::{Path, Query, State};
use axum::http::{HeaderMap, StatusCode};
use axum::response::{IntoResponse, Response};
use domain::ids::{BatchId, EntryId};
use house::House;
use serde::{Deserialize, Serialize};
use utoipa::{IntoParams, ToSchema};
use uuid::Uuid;

use crate::amounts::Faults;
use crate::asking::print;
use crate::caller::Caller;
use crate::idempotency::IdempotencyKey;
use crate::problem::{Problem, ProblemDocument};
use crate::resources::entries::{document, not_acceptable, wants_pdf};
use crate::strict::Strict;
use crate::views::Recorded;

/// Which record.
#[derive(Deserialize, IntoParams)]
#[serde(deny_unknown_fields)]
pub(crate) struct RecordQuery {
    /// As of the batch's n-th entry: the same bytes however much was recorded later.
    #[param(minimum = 1)]
    as_of: Option<u64>,
}

/// The batch record as PDF or JSON, by `Accept`; a preview, marked as not issued.
#[utoipa::path(get, path = "/v1/batches/{id}/record", operation_id = "show_record", tag = "records", params(("id" = Uuid, Path), RecordQuery), security(("bearer" = [])),
    responses((status = 200, description = "PDF or JSON", content_type = "application/pdf"), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn show(
    State(house): State<House>,
    caller: Caller,
    Path(id): Path<Uuid>,
    Query(query): Query<RecordQuery>,
    headers: HeaderMap,
) -> Result<Response, Problem> {
    let accept = headers.get("accept").and_then(|accept| accept.to_str().ok()).unwrap_or("*/*");
    let json = accept.contains("json") || accept.contains("*/*");
    if !wants_pdf(&headers) && !json {
        return Err(not_acceptable("application/pdf and application/json"));
    }
    let drawn = house.batch_record(&(&caller).into(), BatchId(id), query.as_of).await?;
    if wants_pdf(&headers) {
        let name = format!("batch-record-{}.pdf", drawn.batch_n);
        return Ok(document("application/pdf", &name, drawn.pdf));
    }
    Ok(Json(drawn.json).into_response())
}

/// To whom a record is handed out.
#[derive(Deserialize, ToSchema)]
#[serde(deny_unknown_fields)]
pub(crate) struct NewIssue {
    /// To whom.
    #[schema(min_length = 1, max_length = 200)]
    to: String,
}

/// A record handed out.
#[derive(Serialize, ToSchema)]
pub(crate) struct IssuedView {
    /// The entry that says so, with the digests of the documents.
    #[serde(flatten)]
    recorded: Recorded,
    /// SHA-256 of the PDF.
    pdf: String,
    /// SHA-256 of the JSON record.
    json: String,
}

/// Hands out the record of a batch as it is now: an entry says to whom, with the digests.
#[utoipa::path(post, path = "/v1/batches/{id}/record", operation_id = "issue_record", tag = "records", request_body = NewIssue, security(("bearer" = [])),
    params(("id" = Uuid, Path), ("Idempotency-Key" = Uuid, Header, description = "A UUID of your own for this request")),
    responses((status = 201, body = IssuedView), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn issue(
    State(house): State<House>,
    caller: Caller,
    Path(id): Path<Uuid>,
    IdempotencyKey(key): IdempotencyKey,
    Strict { value, raw }: Strict<NewIssue>,
) -> Result<(StatusCode, Json<IssuedView>), Problem> {
    let print = print("POST", &format!("/v1/batches/{id}/record"), &raw)?;
    let mut faults = Faults::default();
    faults.name("/to", value.to.as_str());
    faults.finish(Some(()))?;
    let issued = house.issue_record((&caller).into(), key, print, BatchId(id), value.to).await?;
    let view = IssuedView {
        recorded: Recorded::entry(&issued.receipt),
        pdf: issued.pdf,
        json: issued.json,
    };
    Ok((StatusCode::CREATED, Json(view)))
}

/// A record that was handed out, byte for byte as it was: PDF or JSON, by `Accept`.
#[utoipa::path(get, path = "/v1/records/{id}", operation_id = "show_issued_record", tag = "records", params(("id" = Uuid, Path, description = "The entry that says it was handed out")), security(("bearer" = [])),
    responses((status = 200, description = "PDF or JSON", content_type = "application/pdf"), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn handed_out(
    State(house): State<House>,
    caller: Caller,
    Path(id): Path<Uuid>,
    headers: HeaderMap,
) -> Result<Response, Problem> {
    let caller = (&caller).into();
    if wants_pdf(&headers) {
        let bytes = house.issued_document(&caller, EntryId(id)).await?;
        return Ok(document("application/pdf", &format!("batch-record-{id}.pdf"), bytes));
    }
    let bytes = house.issued_json(&caller, EntryId(id)).await?;
    Ok(document("application/json", &format!("batch-record-{id}.json"), bytes))
}
