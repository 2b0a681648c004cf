//! May I add this now? Proposals, and assessments that record nothing.

use axum::Json;
use axum::extract::{Path, State};
use axum::http::StatusCode;
use domain::book::assessing::Question;
use domain::book::body::Preparation;
use domain::book::command::{Act, Propose};
use domain::ids::BatchId;
use domain::ledger::entry::Actor;
use domain::stamp::Stamp;
use domain::units::Dimension;
use house::House;
use serde::{Deserialize, Serialize};
use serde_json::Value;
use utoipa::ToSchema;
use uuid::Uuid;

use crate::amounts::{Amount, Faults};
use crate::asking::{asked, print};
use crate::caller::Caller;
use crate::idempotency::IdempotencyKey;
use crate::problem::{Problem, ProblemDocument};
use crate::resources::batches::{NewDraw, draws, no_batch};
use crate::strict::Strict;
use crate::views::{EntryView, Listed, id_in};

/// What is to be added, and when.
#[derive(Deserialize, ToSchema)]
#[serde(deny_unknown_fields)]
pub(crate) struct NewProposal {
    /// When it is to be done.
    #[schema(format = DateTime)]
    planned_at: String,
    /// Which lots, and how much of each.
    lines: Vec<NewDraw>,
    /// Water that carries it in.
    carrier_water: Option<Amount>,
    /// `powder`, `slurry`, `solution` or `as_delivered`.
    #[schema(example = "slurry")]
    preparation: String,
    /// What for.
    #[schema(min_length = 1, max_length = 2000)]
    purpose: Option<String>,
}

/// The form in which something goes in, by its word.
pub(crate) fn preparation(word: &str) -> Result<Preparation, &'static str> {
    match word {
        "as_delivered" => Ok(Preparation::AsDelivered),
        "powder" => Ok(Preparation::Powder),
        "slurry" => Ok(Preparation::Slurry),
        "solution" => Ok(Preparation::Solution),
        _ => Err("use powder, slurry, solution or as_delivered"),
    }
}

impl NewProposal {
    fn read(self, house: &House, batch: BatchId, asked_at: Stamp) -> Result<Propose, Problem> {
        let mut faults = Faults::default();
        faults.words("/purpose", self.purpose.as_deref());
        let planned_at = faults.at("/planned_at", Stamp::parse(&self.planned_at));
        let draws = draws(&mut faults, "/lines", &self.lines);
        let carrier_water = self
            .carrier_water
            .as_ref()
            .and_then(|water| faults.amount("/carrier_water", water, Dimension::Volume));
        let preparation = faults.at("/preparation", preparation(&self.preparation));
        let proposal = house.draw()?;
        let whole = planned_at.zip(preparation);
        faults.finish(whole.map(|(planned_at, preparation)| Propose {
            proposal,
            batch,
            asked_at,
            planned_at,
            draws,
            carrier_water,
            preparation,
            purpose: self.purpose,
            prepared: None,
        }))
    }
}

/// The answer to "may I add this now?".
#[derive(Serialize, ToSchema)]
pub(crate) struct Answered {
    /// The proposal's id, to be named when it is carried out.
    proposal: Uuid,
    /// The entry that records it, to be signed where that is needed.
    entry: Uuid,
    /// `clear`, `advise`, `refer` (a second person signs) or `refuse`.
    verdict: String,
    /// After that it has lapsed.
    lapses_at: String,
    /// What a signature binds: sign exactly this.
    shown: String,
    /// Everything that was found, worst first, with remedies and sources; the account before and after; cautions.
    #[schema(value_type = Object)]
    assessment: Value,
    /// A limit shown is never legal advice.
    notice: &'static str,
}

/// Asks whether something may be added. The question and its answer are recorded, whatever the answer is.
#[utoipa::path(post, path = "/v1/batches/{id}/proposals", operation_id = "propose_addition", tag = "batches", request_body = NewProposal, security(("bearer" = [])),
    params(("id" = Uuid, Path), ("Idempotency-Key" = Uuid, Header, description = "A UUID of your own for this request")),
    responses((status = 201, body = Answered), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn propose(
    State(house): State<House>,
    caller: Caller,
    Path(id): Path<Uuid>,
    IdempotencyKey(key): IdempotencyKey,
    Strict { value, raw }: Strict<NewProposal>,
) -> Result<(StatusCode, Json<Answered>), Problem> {
    let print = print("POST", &format!("/v1/batches/{id}/proposals"), &raw)?;
    let site = house.site(caller.site).await?;
    let asked_at = house.local_now(&site).await?;
    let propose = value.read(&house, BatchId(id), asked_at)?;
    let ask = |propose| asked(&caller, key, print, Act::Propose(Box::new(propose)));
    let receipt = house.propose((&caller).into(), ask, propose).await?;
    let Some(entry) = receipt.entries.first() else { return Err(no_batch()) };
    let text = |pointer: &str| {
        entry.body.pointer(pointer).and_then(Value::as_str).unwrap_or_default().to_owned()
    };
    let answered = Answered {
        proposal: id_in(entry, "proposal").unwrap_or_default(),
        entry: entry.id.0,
        verdict: text("/assessment/verdict"),
        lapses_at: text("/lapses_at"),
        shown: text("/shown"),
        assessment: entry.body.get("assessment").cloned().unwrap_or_default(),
        notice: crate::NOTICE,
    };
    Ok((StatusCode::CREATED, Json(answered)))
}

/// An answer that was not recorded.
#[derive(Serialize, ToSchema)]
pub(crate) struct Assessed {
    /// `clear`, `advise`, `refer` or `refuse`.
    verdict: String,
    /// Everything that was found.
    #[schema(value_type = Object)]
    assessment: Value,
    /// A limit shown is never legal advice.
    notice: &'static str,
}

/// The same answer as a proposal gets, with nothing recorded: for checking while typing.
#[utoipa::path(post, path = "/v1/batches/{id}/assessments", operation_id = "assess_addition", tag = "batches", request_body = NewProposal, security(("bearer" = [])),
    params(("id" = Uuid, Path)),
    responses((status = 200, body = Assessed), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn assess(
    State(house): State<House>,
    caller: Caller,
    Path(id): Path<Uuid>,
    Strict { value, .. }: Strict<NewProposal>,
) -> Result<Json<Assessed>, Problem> {
    let site = house.site(caller.site).await?;
    let asked_at = house.local_now(&site).await?;
    let propose = value.read(&house, BatchId(id), asked_at)?;
    let question = Question {
        batch: propose.batch,
        at: propose.planned_at.at,
        draws: propose.draws,
        carrier_water: propose.carrier_water,
        preparation: propose.preparation,
        already_done: false,
        actor: Actor::Person(caller.person),
    };
    let prepared = house.assess(&(&caller).into(), &question).await?;
    Ok(Json(Assessed {
        verdict: prepared.assessment.verdict.name().to_owned(),
        assessment: serde_json::to_value(&prepared.assessment).unwrap_or_default(),
        notice: crate::NOTICE,
    }))
}

/// Proposals of a batch, newest first, as they were recorded.
#[utoipa::path(get, path = "/v1/batches/{id}/proposals", operation_id = "list_proposals", tag = "batches", params(("id" = Uuid, Path)), security(("bearer" = [])),
    responses((status = 200, body = Listed<EntryView>), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn list(
    State(house): State<House>,
    caller: Caller,
    Path(id): Path<Uuid>,
) -> Result<Json<Listed<EntryView>>, Problem> {
    super::entries::of_kind(&house, &caller, BatchId(id), "proposal.assessed").await
}
