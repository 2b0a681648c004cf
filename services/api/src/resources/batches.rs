//! Batches: opening, and how they stand.

use axum::Json;
use axum::extract::{Path, Query, State};
use axum::http::{HeaderMap, StatusCode, header};
use axum::response::{IntoResponse, Response};
use domain::book::Loaded;
use domain::book::command::{Act, Draw, OpenBatch};
use domain::book::state::{BatchState, State as Folded};
use domain::ids::BatchId;
use domain::stamp::Micros;
use domain::units::{Decimal, Dimension, Quantity};
use house::House;
use serde::{Deserialize, Serialize};
use utoipa::{IntoParams, ToSchema};
use uuid::Uuid;

use crate::amounts::{Amount, Faults, LONGEST_LIST, stated_time};
use crate::asking::{asked, print};
use crate::caller::Caller;
use crate::etag::{etag, unchanged};
use crate::idempotency::IdempotencyKey;
use crate::problem::{Kind, Problem, ProblemDocument};
use crate::strict::Strict;
use crate::views::{EntryView, Listed, Recorded};

/// A lot and how much of it.
#[derive(Deserialize, ToSchema)]
#[serde(deny_unknown_fields)]
pub(crate) struct NewDraw {
    /// The lot's id.
    lot: Uuid,
    /// How much.
    amount: Amount,
}

/// Reads lots and amounts at a place of the body.
pub(crate) fn draws(faults: &mut Faults, at: &str, draws: &[NewDraw]) -> Vec<Draw> {
    draws
        .iter()
        .enumerate()
        .filter_map(|(index, draw)| {
            let amount = faults.at(
                &format!("{at}/{index}/amount"),
                Quantity::parse_any(&draw.amount.value, &draw.amount.unit),
            )?;
            Some(Draw { lot: draw.lot.into(), amount })
        })
        .collect()
}

/// A gravity that is expected, not measured.
#[derive(Deserialize, ToSchema)]
#[serde(deny_unknown_fields)]
pub(crate) struct NewExpectedFinal {
    /// Decimal text.
    #[schema(example = "0.9920")]
    value: String,
    /// A scale of density: `sg_20_20`, `sg_60_60`, `plato`, `brix`, `oechsle`, `kmw` or `baume_145`.
    #[schema(example = "sg_20_20")]
    scale: String,
    /// From what it follows: composition, laboratory, earlier batches.
    #[schema(min_length = 1, max_length = 2000)]
    basis: String,
}

/// Sugar that yeast can take.
#[derive(Deserialize, ToSchema)]
#[serde(deny_unknown_fields)]
pub(crate) struct NewFermentableSugar {
    /// g/L, decimal text.
    #[schema(example = "119.3")]
    g_per_l: String,
    /// From what it follows.
    #[schema(min_length = 1, max_length = 2000)]
    basis: String,
}

/// A batch to be opened.
#[derive(Deserialize, ToSchema)]
#[serde(deny_unknown_fields)]
pub(crate) struct NewBatch {
    /// Our code, unique in the site.
    #[schema(example = "EXW-25-B1", min_length = 1, max_length = 40)]
    code: String,
    /// Name as printed.
    #[schema(min_length = 1, max_length = 200)]
    name: Option<String>,
    /// `grape_wine`, `fruit_wine`, `mead`, `cider`, `perry`, `beer`, `wash`, `fruit_mash`, `marc`, `wine_spirit_base`.
    product_class: String,
    /// The premises it is made on, by code.
    #[schema(min_length = 1, max_length = 40)]
    premises: String,
    /// Markets it is meant for, by code.
    #[serde(default)]
    #[schema(max_items = 50)]
    destinations: Vec<String>,
    /// Claims it carries, by code.
    #[serde(default)]
    #[schema(max_items = 50)]
    claims: Vec<String>,
    /// The vessel's id.
    vessel: Uuid,
    /// When.
    #[schema(format = DateTime)]
    opened_at: String,
    /// What was filled.
    volume: Amount,
    /// How the volume was measured.
    #[schema(example = "dip rod", min_length = 1, max_length = 200)]
    volume_basis: String,
    /// The liquid in it, on which every dose is judged; the whole volume unless told.
    liquid: Option<Amount>,
    /// The liquid when filling is over.
    liquid_planned: Option<Amount>,
    /// Where the fermentation is expected to end.
    expected_final: Option<NewExpectedFinal>,
    /// Sugar that yeast can take, where the gravity does not say it.
    fermentable_sugar: Option<NewFermentableSugar>,
    /// How hungry the yeast is: low, medium, high.
    #[schema(example = "medium")]
    demand: String,
    /// What goes in.
    #[serde(default)]
    ingredients: Vec<NewDraw>,
}

impl NewBatch {
    fn texts(&self, faults: &mut Faults) {
        let codes = |faults: &mut Faults, at: &str, code: &String| faults.code(at, code.as_str());
        faults.code("/code", self.code.as_str());
        faults.name("/name", self.name.as_deref());
        faults.code("/premises", self.premises.as_str());
        faults.list("/destinations", &self.destinations, LONGEST_LIST, codes);
        faults.list("/claims", &self.claims, LONGEST_LIST, codes);
        faults.name("/volume_basis", self.volume_basis.as_str());
        let basis = self.expected_final.as_ref().map(|end| end.basis.as_str());
        faults.words("/expected_final/basis", basis);
        let basis = self.fermentable_sugar.as_ref().map(|sugar| sugar.basis.as_str());
        faults.words("/fermentable_sugar/basis", basis);
    }

    /// What it asks of the book.
    pub(crate) fn read(
        self,
        faults: &mut Faults,
        batch: BatchId,
        now: Micros,
    ) -> Option<OpenBatch> {
        self.texts(faults);
        let volume = faults.amount("/volume", &self.volume, Dimension::Volume);
        let liquid = match &self.liquid {
            Some(liquid) => faults.amount("/liquid", liquid, Dimension::Volume),
            None => volume.clone(),
        };
        let liquid_planned = self
            .liquid_planned
            .as_ref()
            .and_then(|planned| faults.amount("/liquid_planned", planned, Dimension::Volume));
        let opened_at = faults.at("/opened_at", stated_time(&self.opened_at, now));
        let ingredients = draws(faults, "/ingredients", &self.ingredients);
        if let Some(sugar) = &self.fermentable_sugar {
            let read = Decimal::parse(&sugar.g_per_l);
            if read.as_ref().is_ok_and(|number| !(0.0..=1_000.0).contains(&number.to_f64())) {
                faults.note("/fermentable_sugar/g_per_l", "sugar lies between 0 and 1,000 g/L");
            }
            faults.at("/fermentable_sugar/g_per_l", read);
        }
        let whole = volume.zip(liquid).zip(opened_at);
        whole.map(|((volume, liquid), opened_at)| OpenBatch {
            batch,
            code: self.code,
            name: self.name,
            product_class: self.product_class,
            premises: self.premises,
            destinations: self.destinations,
            claims: self.claims,
            vessel: self.vessel.into(),
            opened_at,
            volume,
            volume_basis: self.volume_basis,
            liquid,
            liquid_planned,
            expected_final: self.expected_final.map(|end| (end.value, end.scale, end.basis)),
            fermentable_sugar: self.fermentable_sugar.map(|sugar| (sugar.g_per_l, sugar.basis)),
            demand: self.demand,
            ingredients,
        })
    }
}

/// A batch as it stands.
#[derive(Clone, Debug, Serialize, ToSchema)]
pub(crate) struct BatchView {
    /// Its id.
    id: Uuid,
    /// Its code.
    code: String,
    /// What the law takes it for.
    product_class: String,
    /// Its vessel.
    vessel: Uuid,
    /// Its holding there.
    holding: Uuid,
    /// When it was opened.
    opened_at: String,
    /// The liquid on which doses are judged.
    liquid: Amount,
    /// The newest gravity at 20 °C, specific gravity 20/20.
    #[serde(skip_serializing_if = "Option::is_none")]
    last_gravity: Option<GravityView>,
    /// How many additions were made.
    additions: usize,
    /// Proposals that were answered and not carried out.
    open_proposals: usize,
    /// Deviations on it.
    deviations: Vec<Uuid>,
    /// Running number: its `ETag`.
    n: u64,
}

/// A gravity.
#[derive(Clone, Debug, Serialize, ToSchema)]
pub(crate) struct GravityView {
    /// Specific gravity 20/20 °C.
    sg_20_20: String,
    /// Apparent extract, % by mass.
    apparent_extract: String,
    /// When, UTC.
    at: String,
}

fn view(loaded: &Loaded) -> Option<BatchView> {
    let Folded::Batch(state) = &loaded.state else { return None };
    let state: &BatchState = state;
    let (at, opened) = state.opened.as_ref()?;
    Some(BatchView {
        id: state.batch.0,
        code: opened.code.clone(),
        product_class: opened.product_class.clone(),
        vessel: opened.vessel.0,
        holding: opened.holding.0,
        opened_at: at.to_string(),
        liquid: (&opened.liquid).into(),
        last_gravity: state.gravities.last().map(|gravity| GravityView {
            sg_20_20: format!("{:.4}", gravity.sg),
            apparent_extract: format!("{:.2}", gravity.extract),
            at: gravity.at.to_string(),
        }),
        additions: state.additions.len(),
        open_proposals: state.proposals.values().filter(|p| p.done_by.is_none()).count(),
        deviations: state.deviations.iter().map(|deviation| deviation.0).collect(),
        n: loaded.n,
    })
}

/// Which batches to list.
#[derive(Deserialize, IntoParams)]
#[serde(deny_unknown_fields)]
pub(crate) struct BatchFilter {
    /// Only the batch of this code.
    code: Option<String>,
    /// At most so many, 1 to 1,000.
    #[param(minimum = 1, maximum = 1000)]
    limit: Option<u16>,
}

/// Batches, newest first.
#[utoipa::path(get, path = "/v1/batches", operation_id = "list_batches", tag = "batches", params(BatchFilter), security(("bearer" = [])),
    responses((status = 200, body = Listed<BatchView>), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn list(
    State(house): State<House>,
    caller: Caller,
    Query(filter): Query<BatchFilter>,
) -> Result<Json<Listed<BatchView>>, Problem> {
    let site = house.site(caller.site).await?;
    let limit = filter.limit.unwrap_or(200).clamp(1, 1_000);
    let batches = house.batches(&site, filter.code.as_deref(), limit).await?;
    let subjects: Vec<_> = batches.into_iter().map(Into::into).collect();
    let desk = house.desk(&site, &subjects).await?;
    let items = subjects.iter().filter_map(|subject| view(desk.loaded(subject)?)).collect();
    Ok(Json(Listed { items }))
}

/// One batch.
#[utoipa::path(get, path = "/v1/batches/{id}", operation_id = "show_batch", tag = "batches", params(("id" = Uuid, Path)), security(("bearer" = [])),
    responses((status = 200, body = BatchView), (status = 304), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn show(
    State(house): State<House>,
    caller: Caller,
    Path(id): Path<Uuid>,
    headers: HeaderMap,
) -> Result<Response, Problem> {
    let site = house.site(caller.site).await?;
    let subject = BatchId(id).into();
    let desk = house.desk(&site, &[subject]).await?;
    let view = desk.loaded(&subject).and_then(|loaded| view(loaded)).ok_or_else(no_batch)?;
    if let Some(response) = unchanged(&headers, view.n) {
        return Ok(response);
    }
    Ok(([(header::ETAG, etag(view.n))], Json(view)).into_response())
}

/// The answer for a batch that is not there.
pub(crate) fn no_batch() -> Problem {
    Problem::new(Kind::NotFound, "there is no such batch at this site")
}

/// Opens a batch.
#[utoipa::path(post, path = "/v1/batches", operation_id = "open_batch", tag = "batches", request_body = NewBatch, security(("bearer" = [])),
    params(("Idempotency-Key" = Uuid, Header, description = "A UUID of your own for this request")),
    responses((status = 201, body = Recorded), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn open(
    State(house): State<House>,
    caller: Caller,
    IdempotencyKey(key): IdempotencyKey,
    Strict { value, raw }: Strict<NewBatch>,
) -> Result<(StatusCode, Json<Recorded>), Problem> {
    let print = print("POST", "/v1/batches", &raw)?;
    let mut faults = Faults::default();
    let open = value.read(&mut faults, house.draw()?, house.now());
    let act = Act::OpenBatch(Box::new(faults.finish(open)?));
    let receipt = house.submit(asked(&caller, key, print, act)).await?;
    Ok((StatusCode::CREATED, Json(Recorded::of(&receipt, "batch", Uuid::nil()))))
}

/// Every entry about a batch, in the log's order: originals and amendments both.
#[utoipa::path(get, path = "/v1/batches/{id}/entries", operation_id = "list_entries_of_batch", tag = "batches", params(("id" = Uuid, Path)), security(("bearer" = [])),
    responses((status = 200, body = Listed<EntryView>), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn entries(
    State(house): State<House>,
    caller: Caller,
    Path(id): Path<Uuid>,
) -> Result<Json<Listed<EntryView>>, Problem> {
    let site = house.site(caller.site).await?;
    let entries = house.entries_of(&site, BatchId(id).into()).await?;
    if entries.is_empty() {
        return Err(no_batch());
    }
    Ok(Json(Listed { items: entries.iter().map(EntryView::from).collect() }))
}

/// The nitrogen account of a batch as it is now.
#[derive(Serialize, ToSchema)]
pub(crate) struct AccountView {
    /// mg N per litre of liquid, decimal texts, with the sugar they were computed from.
    #[schema(value_type = Object)]
    account: serde_json::Value,
    /// Fraction of the fermentable sugar used by now, if it can be told.
    #[serde(skip_serializing_if = "Option::is_none")]
    #[schema(value_type = Object)]
    fraction_used: Option<serde_json::Value>,
    /// A model is never a laboratory analysis.
    notice: &'static str,
}

/// The nitrogen account: supply, need, room, shortage, and how far the fermentation is.
#[utoipa::path(get, path = "/v1/batches/{id}/account", operation_id = "show_account", tag = "batches", params(("id" = Uuid, Path)), security(("bearer" = [])),
    responses((status = 200, body = AccountView), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn account(
    State(house): State<House>,
    caller: Caller,
    Path(id): Path<Uuid>,
) -> Result<Json<AccountView>, Problem> {
    let found = house.account(&(&caller).into(), BatchId(id)).await?;
    let fraction_used = found.fraction_used.map(serde_json::to_value);
    Ok(Json(AccountView {
        account: serde_json::to_value(found.account_before).unwrap_or_default(),
        fraction_used: fraction_used.transpose().unwrap_or_default(),
        notice: crate::NOTICE,
    }))
}
