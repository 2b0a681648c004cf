//! Deviations.

use axum::Json;
use axum::extract::{Path, State};
use axum::http::StatusCode;
use domain::book::Loaded;
use domain::book::command::{Act, OpenDeviation, ResolveDeviation};
use domain::book::state::State as Folded;
use domain::ids::DeviationId;
use house::House;
use serde::{Deserialize, Serialize};
use utoipa::ToSchema;
use uuid::Uuid;

use crate::amounts::{Faults, stated_time};
use crate::asking::{asked, print, without};
use crate::caller::Caller;
use crate::idempotency::IdempotencyKey;
use crate::problem::{Kind, Problem, ProblemDocument};
use crate::strict::Strict;
use crate::views::{Listed, Recorded};

/// A deviation as it stands.
#[derive(Clone, Debug, Serialize, ToSchema)]
pub(crate) struct DeviationView {
    /// Its id.
    id: Uuid,
    /// Our code.
    code: String,
    /// What happened.
    title: String,
    /// The batch it concerns.
    #[serde(skip_serializing_if = "Option::is_none")]
    batch: Option<Uuid>,
    /// When it was opened.
    opened_at: String,
    /// What was found.
    #[schema(value_type = Vec<Object>)]
    findings: Vec<serde_json::Value>,
    /// How it was resolved, if it was.
    #[serde(skip_serializing_if = "Option::is_none")]
    resolution: Option<ResolutionView>,
    /// Running number.
    n: u64,
}

/// How a deviation ended.
#[derive(Clone, Debug, Serialize, ToSchema)]
pub(crate) struct ResolutionView {
    /// When.
    at: String,
    /// By whom: a pseudonym.
    by: String,
    /// Why it happened.
    cause: String,
    /// What was done.
    action: String,
    /// What it means for the batch.
    conclusion: String,
}

fn view(loaded: &Loaded) -> Option<DeviationView> {
    let Folded::Deviation(state) = &loaded.state else { return None };
    let (at, _, opened) = state.opened.as_ref()?;
    Some(DeviationView {
        id: state.deviation.0,
        code: opened.code.clone(),
        title: opened.title.clone(),
        batch: opened.batch.map(|batch| batch.0),
        opened_at: at.to_string(),
        findings: opened
            .findings
            .iter()
            .map(|finding| serde_json::to_value(finding).unwrap_or_default())
            .collect(),
        resolution: state.resolved.as_ref().map(|(at, by, body)| ResolutionView {
            at: at.to_string(),
            by: by.to_string(),
            cause: body.cause.clone(),
            action: body.action.clone(),
            conclusion: body.conclusion.clone(),
        }),
        n: loaded.n,
    })
}

/// Deviations, newest first.
#[utoipa::path(get, path = "/v1/deviations", operation_id = "list_deviations", tag = "deviations", security(("bearer" = [])),
    responses((status = 200, body = Listed<DeviationView>), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn list(
    State(house): State<House>,
    caller: Caller,
) -> Result<Json<Listed<DeviationView>>, Problem> {
    let site = house.site(caller.site).await?;
    let subjects: Vec<_> =
        house.deviations(&site, 1_000).await?.into_iter().map(Into::into).collect();
    let desk = house.desk(&site, &subjects).await?;
    let items = subjects.iter().filter_map(|subject| view(desk.loaded(subject)?)).collect();
    Ok(Json(Listed { items }))
}

/// One deviation.
#[utoipa::path(get, path = "/v1/deviations/{id}", operation_id = "show_deviation", tag = "deviations", params(("id" = Uuid, Path)), security(("bearer" = [])),
    responses((status = 200, body = DeviationView), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn show(
    State(house): State<House>,
    caller: Caller,
    Path(id): Path<Uuid>,
) -> Result<Json<DeviationView>, Problem> {
    let site = house.site(caller.site).await?;
    let subject = DeviationId(id).into();
    let desk = house.desk(&site, &[subject]).await?;
    let view = desk.loaded(&subject).and_then(|loaded| view(loaded));
    view.map(Json)
        .ok_or_else(|| Problem::new(Kind::NotFound, "there is no such deviation at this site"))
}

/// A deviation that a person noticed.
#[derive(Deserialize, ToSchema)]
#[serde(deny_unknown_fields)]
pub(crate) struct NewDeviation {
    /// Our code, unique in the site.
    #[schema(min_length = 1, max_length = 40)]
    code: String,
    /// What happened.
    #[schema(min_length = 1, max_length = 200)]
    title: String,
    /// The batch it concerns.
    batch: Option<Uuid>,
    /// When it was noticed.
    #[schema(format = DateTime)]
    opened_at: String,
}

/// Opens a deviation.
#[utoipa::path(post, path = "/v1/deviations", operation_id = "open_deviation", tag = "deviations", request_body = NewDeviation, security(("bearer" = [])),
    params(("Idempotency-Key" = Uuid, Header, description = "A UUID of your own for this request")),
    responses((status = 201, body = Recorded), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn open(
    State(house): State<House>,
    caller: Caller,
    IdempotencyKey(key): IdempotencyKey,
    Strict { value, raw }: Strict<NewDeviation>,
) -> Result<(StatusCode, Json<Recorded>), Problem> {
    let print = print("POST", "/v1/deviations", &raw)?;
    let mut faults = Faults::default();
    faults.code("/code", value.code.as_str());
    faults.name("/title", value.title.as_str());
    let opened_at = faults.at("/opened_at", stated_time(&value.opened_at, house.now()));
    let act = Act::OpenDeviation(OpenDeviation {
        deviation: house.draw()?,
        code: value.code,
        title: value.title,
        batch: value.batch.map(Into::into),
        opened_at: faults.finish(opened_at)?,
    });
    let receipt = house.submit(asked(&caller, key, print, act)).await?;
    Ok((StatusCode::CREATED, Json(Recorded::of(&receipt, "deviation", Uuid::nil()))))
}

/// How a deviation is resolved.
#[derive(Deserialize, ToSchema)]
#[serde(deny_unknown_fields)]
pub(crate) struct NewResolution {
    /// Why it happened.
    #[schema(min_length = 1, max_length = 2000)]
    cause: String,
    /// What was done.
    #[schema(min_length = 1, max_length = 2000)]
    action: String,
    /// What it means for the batch.
    #[schema(min_length = 1, max_length = 2000)]
    conclusion: String,
    /// The signer's password, asked again.
    secret: String,
}

/// Resolves a deviation; signed.
#[utoipa::path(post, path = "/v1/deviations/{id}/resolution", operation_id = "resolve_deviation", tag = "deviations", request_body = NewResolution, security(("bearer" = [])),
    params(("id" = Uuid, Path), ("Idempotency-Key" = Uuid, Header, description = "A UUID of your own for this request")),
    responses((status = 201, body = Recorded), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn resolve(
    State(house): State<House>,
    caller: Caller,
    Path(id): Path<Uuid>,
    IdempotencyKey(key): IdempotencyKey,
    Strict { value, raw }: Strict<NewResolution>,
) -> Result<(StatusCode, Json<Recorded>), Problem> {
    let path = format!("/v1/deviations/{id}/resolution");
    let print = print("POST", &path, &without(raw, &["/secret"]))?;
    let mut faults = Faults::default();
    faults.words("/cause", value.cause.as_str());
    faults.words("/action", value.action.as_str());
    faults.words("/conclusion", value.conclusion.as_str());
    faults.finish(Some(()))?;
    house.confirm_secret(&(&caller).into(), &value.secret).await?;
    let site = house.site(caller.site).await?;
    let act = Act::ResolveDeviation(ResolveDeviation {
        deviation: DeviationId(id),
        cause: value.cause,
        action: value.action,
        conclusion: value.conclusion,
        resolved_at: house.local_now(&site).await?,
    });
    let receipt = house.submit(asked(&caller, key, print, act)).await?;
    Ok((StatusCode::CREATED, Json(Recorded::of(&receipt, "deviation", id))))
}
