//! Rule sets: what is shipped, and what binds here.

use axum::Json;
use axum::extract::{Path, State};
use axum::http::StatusCode;
use domain::book::body::Standing;
use domain::book::command::{Act, Adopt};
use domain::rules::{RuleSet, digest, shipped};
use house::House;
use serde::{Deserialize, Serialize};
use utoipa::ToSchema;

use crate::amounts::{Faults, stated_time};
use crate::asking::{asked, print};
use crate::caller::Caller;
use crate::idempotency::IdempotencyKey;
use crate::problem::{Kind, Problem, ProblemDocument};
use crate::strict::Strict;
use crate::views::{Listed, Recorded};

/// A shipped rule set. A limit shown is never legal advice; local requirements prevail.
#[derive(Serialize, ToSchema)]
pub(crate) struct RuleSetView {
    /// Its id.
    #[schema(example = "us-wine")]
    id: String,
    /// Its version.
    version: String,
    /// What it is.
    title: String,
    /// Where it binds.
    jurisdiction: String,
    /// The instrument it stands on.
    citation: String,
    /// SHA-256 of its text.
    digest: String,
    /// As what it binds here, since when; empty: not adopted.
    adopted: Vec<AdoptedView>,
    /// The whole text, TOML.
    text: &'static str,
}

/// An adoption.
#[derive(Serialize, ToSchema)]
pub(crate) struct AdoptedView {
    /// `production` or `market` and which.
    standing: String,
    /// The version adopted.
    version: String,
    /// SHA-256 of the text adopted.
    digest: String,
    /// Since when.
    #[schema(format = DateTime)]
    since: String,
}

/// Every shipped rule set, with what binds here.
#[utoipa::path(get, path = "/v1/rule-sets", operation_id = "list_rule_sets", tag = "rules", security(("bearer" = [])),
    responses((status = 200, body = Listed<RuleSetView>), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn list(
    State(house): State<House>,
    caller: Caller,
) -> Result<Json<Listed<RuleSetView>>, Problem> {
    let site = house.site(caller.site).await?;
    let desk = house.desk(&site, &[site.id.into()]).await?;
    let adopted = desk.site().map(|state| state.adopted.clone()).unwrap_or_default();
    let mut items = Vec::new();
    for (id, text) in shipped() {
        let set = RuleSet::parse(text).map_err(|error| Problem::internal(&error))?;
        items.push(RuleSetView {
            id: (*id).to_owned(),
            version: set.version,
            title: set.title,
            jurisdiction: set.jurisdiction,
            citation: set.citation,
            digest: digest(text),
            adopted: adopted
                .iter()
                .filter(|((set, _), _)| set == id)
                .map(|((_, standing), (since, body))| AdoptedView {
                    standing: standing.clone(),
                    version: body.version.clone(),
                    digest: body.digest.clone(),
                    since: since.to_string(),
                })
                .collect(),
            text,
        });
    }
    Ok(Json(Listed { items }))
}

/// As what a set is to bind.
#[derive(Deserialize, ToSchema)]
#[serde(deny_unknown_fields)]
pub(crate) struct NewAdoption {
    /// `production`: bound by where we are; a breach is refused. `market`: bound by the destination; a breach closes it.
    #[schema(example = "production")]
    standing: String,
    /// Which market, with `market`.
    #[schema(example = "EU", min_length = 1, max_length = 40)]
    market: Option<String>,
    /// The digest of the text that was read and agreed to.
    digest: String,
    /// From when on.
    #[schema(format = DateTime)]
    from: String,
}

/// Adopts a shipped rule set. Nothing binds that a person did not adopt.
#[utoipa::path(post, path = "/v1/rule-sets/{id}/adoptions", operation_id = "adopt_rule_set", tag = "rules", request_body = NewAdoption, security(("bearer" = [])),
    params(("id" = String, Path), ("Idempotency-Key" = Uuid, Header, description = "A UUID of your own for this request")),
    responses((status = 201, body = Recorded), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn adopt(
    State(house): State<House>,
    caller: Caller,
    Path(id): Path<String>,
    IdempotencyKey(key): IdempotencyKey,
    Strict { value, raw }: Strict<NewAdoption>,
) -> Result<(StatusCode, Json<Recorded>), Problem> {
    let print = print("POST", &format!("/v1/rule-sets/{id}/adoptions"), &raw)?;
    let Some((_, text)) = shipped().iter().find(|(shipped, _)| *shipped == id) else {
        return Err(Problem::new(Kind::NotFound, "there is no such rule set"));
    };
    let mut faults = Faults::default();
    if value.digest != digest(text) {
        faults.note("/digest", "this is not the digest of the shipped text: read it again");
    }
    faults.code("/market", value.market.as_deref());
    let standing = match (value.standing.as_str(), value.market) {
        ("production", None) => Some(Standing::Production),
        ("market", Some(market)) => Some(Standing::Market(market)),
        _ => {
            faults.note("/standing", "use `production`, or `market` with the market");
            None
        }
    };
    let from = faults.at("/from", stated_time(&value.from, house.now()));
    let adopt = faults.finish(standing.zip(from))?;
    let (standing, from) = adopt;
    let act = Act::Adopt(Adopt { text: (*text).to_owned(), standing, from });
    let receipt = house.submit(asked(&caller, key, print, act)).await?;
    Ok((StatusCode::CREATED, Json(Recorded::entry(&receipt))))
}
