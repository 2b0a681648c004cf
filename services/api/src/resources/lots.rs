//! Lots: receipts, stock, and whether they may be used.

use axum::Json;
use axum::extract::{Path, Query, State};
use axum::http::{HeaderMap, StatusCode, header};
use axum::response::{IntoResponse, Response};
use domain::book::Loaded;
use domain::book::body::LotStatus;
use domain::book::command::{Act, Receive};
use domain::book::state::State as Folded;
use domain::ids::LotId;
use domain::stamp::Micros;
use domain::units::{Dimension, Quantity};
use house::House;
use serde::{Deserialize, Serialize};
use utoipa::{IntoParams, ToSchema};
use uuid::Uuid;

use crate::amounts::{Amount, Faults, stated_time};
use crate::asking::{asked, expecting, print};
use crate::caller::Caller;
use crate::etag::{IfMatch, etag, unchanged};
use crate::idempotency::IdempotencyKey;
use crate::problem::{Kind, Problem, ProblemDocument};
use crate::resources::things::{NewComponent, composition};
use crate::strict::Strict;
use crate::views::{Listed, Recorded};

/// A lot that came in.
#[derive(Deserialize, ToSchema)]
#[serde(deny_unknown_fields)]
pub(crate) struct NewLot {
    /// Our code, unique in the site.
    #[schema(example = "DP-0412", min_length = 1, max_length = 40)]
    code: String,
    /// The material's id.
    material: Uuid,
    /// The supplier's id; leave out what you made yourself.
    supplier: Option<Uuid>,
    /// The supplier's own lot code.
    #[schema(min_length = 1, max_length = 200)]
    supplier_lot: Option<String>,
    /// How much came in.
    amount: Amount,
    /// When.
    #[schema(format = DateTime)]
    received_at: String,
    /// Not to be used from then on.
    #[schema(format = DateTime)]
    expires_at: Option<String>,
    /// Delivery note or invoice.
    #[schema(min_length = 1, max_length = 200)]
    document: Option<String>,
    /// This lot's own analysis, in place of the material's.
    #[serde(default)]
    #[schema(max_items = 100)]
    composition: Vec<NewComponent>,
    /// `released` (may be used at once) or `held`.
    #[schema(example = "released")]
    status: String,
}

impl NewLot {
    /// What it asks of the book.
    pub(crate) fn read(self, faults: &mut Faults, lot: LotId, now: Micros) -> Option<Receive> {
        faults.code("/code", self.code.as_str());
        faults.name("/supplier_lot", self.supplier_lot.as_deref());
        faults.name("/document", self.document.as_deref());
        let amount =
            faults.at("/amount", Quantity::parse_any(&self.amount.value, &self.amount.unit));
        let received_at = faults.at("/received_at", stated_time(&self.received_at, now));
        let expires_at = self
            .expires_at
            .as_deref()
            .and_then(|text| faults.at("/expires_at", domain::stamp::Stamp::parse(text)));
        let composition = composition(faults, &self.composition);
        let status = faults.at("/status", status(&self.status));
        let whole = amount.zip(received_at).zip(status);
        whole.map(|((amount, received_at), status)| Receive {
            lot,
            code: self.code,
            material: self.material.into(),
            supplier: self.supplier.map(Into::into),
            supplier_lot: self.supplier_lot,
            amount,
            received_at,
            expires_at,
            document: self.document,
            composition,
            status,
        })
    }
}

fn status(word: &str) -> Result<LotStatus, &'static str> {
    match word {
        "held" => Ok(LotStatus::Held),
        "rejected" => Ok(LotStatus::Rejected),
        "released" => Ok(LotStatus::Released),
        _ => Err("use released, held or rejected"),
    }
}

/// A lot as it stands.
#[derive(Clone, Debug, Serialize, ToSchema)]
pub(crate) struct LotView {
    /// Its id.
    id: Uuid,
    /// Our code.
    code: String,
    /// The material's id.
    material: Uuid,
    /// The supplier's id.
    #[serde(skip_serializing_if = "Option::is_none")]
    supplier: Option<Uuid>,
    /// The supplier's own lot code.
    #[serde(skip_serializing_if = "Option::is_none")]
    supplier_lot: Option<String>,
    /// `released`, `held` or `rejected`.
    status: &'static str,
    /// Why it stands so.
    #[serde(skip_serializing_if = "Option::is_none")]
    status_reason: Option<String>,
    /// When it came in.
    received_at: String,
    /// Not to be used from then on.
    #[serde(skip_serializing_if = "Option::is_none")]
    expires_at: Option<String>,
    /// What came in.
    received: Amount,
    /// What is left, in base units: µg, µL or pieces.
    remaining: Amount,
    /// Running number: its `ETag`.
    n: u64,
}

fn view(loaded: &Loaded) -> Option<LotView> {
    let Folded::Lot(state) = &loaded.state else { return None };
    let (at, received) = state.received.as_ref()?;
    let dimension = received.amount.dimension().unwrap_or(Dimension::Mass);
    Some(LotView {
        id: state.lot.0,
        code: received.code.clone(),
        material: received.material.0,
        supplier: received.supplier.map(|party| party.0),
        supplier_lot: received.supplier_lot.clone(),
        status: state.status.name(),
        status_reason: state.status_reason.clone(),
        received_at: at.to_string(),
        expires_at: received.expires_at.map(|at| at.to_string()),
        received: (&received.amount).into(),
        remaining: (&Quantity::computed(state.remaining_base(), dimension)).into(),
        n: loaded.n,
    })
}

/// Which lots to list.
#[derive(Deserialize, IntoParams)]
#[serde(deny_unknown_fields)]
pub(crate) struct LotFilter {
    /// Only the lot of this code.
    code: Option<String>,
    /// Only lots of this status: released, held, rejected.
    status: Option<String>,
    /// At most so many, 1 to 1,000.
    #[param(minimum = 1, maximum = 1000)]
    limit: Option<u16>,
}

/// Lots, newest first.
#[utoipa::path(get, path = "/v1/lots", operation_id = "list_lots", tag = "lots", params(LotFilter), security(("bearer" = [])),
    responses((status = 200, body = Listed<LotView>), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn list(
    State(house): State<House>,
    caller: Caller,
    Query(filter): Query<LotFilter>,
) -> Result<Json<Listed<LotView>>, Problem> {
    let site = house.site(caller.site).await?;
    let limit = filter.limit.unwrap_or(200).clamp(1, 1_000);
    let lots = house.lots(&site, filter.code.as_deref(), filter.status.as_deref(), limit).await?;
    let subjects: Vec<_> = lots.into_iter().map(Into::into).collect();
    let desk = house.desk(&site, &subjects).await?;
    let items = subjects.iter().filter_map(|subject| view(desk.loaded(subject)?)).collect();
    Ok(Json(Listed { items }))
}

/// One lot.
#[utoipa::path(get, path = "/v1/lots/{id}", operation_id = "show_lot", tag = "lots", params(("id" = Uuid, Path)), security(("bearer" = [])),
    responses((status = 200, body = LotView), (status = 304), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn show(
    State(house): State<House>,
    caller: Caller,
    Path(id): Path<Uuid>,
    headers: HeaderMap,
) -> Result<Response, Problem> {
    let site = house.site(caller.site).await?;
    let subject = LotId(id).into();
    let desk = house.desk(&site, &[subject]).await?;
    let view = desk
        .loaded(&subject)
        .and_then(|loaded| view(loaded))
        .ok_or_else(|| Problem::new(Kind::NotFound, "there is no such lot at this site"))?;
    if let Some(response) = unchanged(&headers, view.n) {
        return Ok(response);
    }
    Ok(([(header::ETAG, etag(view.n))], Json(view)).into_response())
}

/// Receives a lot.
#[utoipa::path(post, path = "/v1/lots", operation_id = "receive_lot", tag = "lots", request_body = NewLot, security(("bearer" = [])),
    params(("Idempotency-Key" = Uuid, Header, description = "A UUID of your own for this request")),
    responses((status = 201, body = Recorded), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn receive(
    State(house): State<House>,
    caller: Caller,
    IdempotencyKey(key): IdempotencyKey,
    Strict { value, raw }: Strict<NewLot>,
) -> Result<(StatusCode, Json<Recorded>), Problem> {
    let print = print("POST", "/v1/lots", &raw)?;
    let mut faults = Faults::default();
    let receive = value.read(&mut faults, house.draw()?, house.now());
    let act = Act::Receive(Box::new(faults.finish(receive)?));
    let receipt = house.submit(asked(&caller, key, print, act)).await?;
    Ok((StatusCode::CREATED, Json(Recorded::of(&receipt, "lot", Uuid::nil()))))
}

/// Whether a lot may be used from now on.
#[derive(Deserialize, ToSchema)]
#[serde(deny_unknown_fields)]
pub(crate) struct NewStatus {
    /// released, held or rejected.
    status: String,
    /// Why.
    #[schema(min_length = 1, max_length = 2000)]
    reason: String,
}

/// Holds, releases or rejects a lot; needs `If-Match`.
#[utoipa::path(post, path = "/v1/lots/{id}/status", operation_id = "change_lot_status", tag = "lots", request_body = NewStatus, security(("bearer" = [])),
    params(("id" = Uuid, Path), ("If-Match" = String, Header, description = "The ETag last seen"), ("Idempotency-Key" = Uuid, Header, description = "A UUID of your own for this request")),
    responses((status = 201, body = Recorded), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn change_status(
    State(house): State<House>,
    caller: Caller,
    Path(id): Path<Uuid>,
    condition: IfMatch,
    IdempotencyKey(key): IdempotencyKey,
    Strict { value, raw }: Strict<NewStatus>,
) -> Result<(StatusCode, Json<Recorded>), Problem> {
    let mut faults = Faults::default();
    faults.words("/reason", value.reason.as_str());
    let status = faults.at("/status", status(&value.status));
    let status = faults.finish(status)?;
    let subject = LotId(id).into();
    let site = house.site(caller.site).await?;
    let desk = house.desk(&site, &[subject]).await?;
    let n = desk.loaded(&subject).map_or(0, |loaded| loaded.n);
    let print = print("POST", &format!("/v1/lots/{id}/status"), &raw)?;
    let act = Act::ChangeLotStatus(LotId(id), status, value.reason);
    let asked = expecting(asked(&caller, key, print, act), subject, condition.seen(n));
    let receipt = house.submit(asked).await?;
    Ok((StatusCode::CREATED, Json(Recorded::of(&receipt, "lot", id))))
}
