//! Computations offered on their own; nothing of them is recorded.

use axum::Json;
use axum::extract::Path;
use domain::compute::{Calculation, Fault, calculations};
use serde::Serialize;
use serde_json::Value;
use utoipa::ToSchema;

use crate::caller::Caller;
use crate::problem::{Kind, Problem, ProblemDocument};
use crate::strict::Plain;
use crate::views::Listed;

/// Objects computed in one request.
const MOST: usize = 1_000;

/// One computation.
#[derive(Serialize, ToSchema)]
pub(crate) struct CalculationView {
    /// Its name.
    name: &'static str,
    /// What it is for.
    meaning: &'static str,
    /// What it takes.
    fields: Vec<FieldView>,
    /// What it gives, beside `method` and `notes`.
    gives: &'static [&'static str],
    /// Where the formula is from.
    source: &'static str,
}

/// One member of an input.
#[derive(Serialize, ToSchema)]
pub(crate) struct FieldView {
    /// Its name.
    name: &'static str,
    /// Unit and range, or what it may say.
    takes: &'static str,
}

/// Every computation with its members, units and source.
#[utoipa::path(get, path = "/v1/calculations", operation_id = "list_calculations", tag = "calculations", security(("bearer" = [])),
    responses((status = 200, body = Listed<CalculationView>), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn list(_: Caller) -> Json<Listed<CalculationView>> {
    let items = calculations()
        .map(|calculation| CalculationView {
            name: calculation.name,
            meaning: calculation.meaning,
            fields: calculation
                .fields
                .iter()
                .map(|field| FieldView { name: field.name, takes: field.takes })
                .collect(),
            gives: calculation.gives,
            source: calculation.source,
        })
        .collect();
    Json(Listed { items })
}

/// Computes one object, or a list of up to 1,000. Numbers are plain JSON numbers; every result says its method and
/// notes. In a list, what cannot be computed is answered by an `error` in its place.
#[utoipa::path(post, path = "/v1/calculations/{name}", operation_id = "calculate", tag = "calculations", security(("bearer" = [])),
    params(("name" = String, Path, description = "As `GET /v1/calculations` lists it")), request_body = Object,
    responses((status = 200, body = Object), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn calculate(
    _: Caller,
    Path(name): Path<String>,
    Plain(asked): Plain,
) -> Result<Json<Value>, Problem> {
    let Some(calculation) = Calculation::of(&name) else {
        return Err(Problem::new(
            Kind::NotFound,
            "there is no such computation: `GET /v1/calculations` lists them",
        ));
    };
    let Value::Array(items) = asked else {
        return calculation.compute(&asked).map(Json).map_err(|fault| refused(&fault));
    };
    if items.len() > MOST {
        let detail =
            format!("{} objects, but at most {MOST} at once: send them in parts", items.len());
        return Err(Problem::at(Kind::Meaningless, "", detail));
    }
    let results = items
        .iter()
        .map(|item| calculation.compute(item).unwrap_or_else(|fault| fault.to_json()))
        .collect();
    Ok(Json(results))
}

fn refused(fault: &Fault) -> Problem {
    let pointer = fault.field.as_ref().map(|field| format!("/{field}")).unwrap_or_default();
    Problem::at(Kind::Meaningless, pointer, fault.detail.as_str())
}
