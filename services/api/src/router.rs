//! The routes, who may call them, and the description that is generated from them.

use std::sync::Arc;

use axum::Router;
use axum::extract::{MatchedPath, Request, State};
use axum::http::header;
use axum::middleware::{Next, from_fn_with_state};
use axum::response::{IntoResponse, Response};
use axum::routing::get;
use house::permissions::{Decision, allowed};
use house::{House, HouseError};
use utoipa::openapi::security::{HttpAuthScheme, HttpBuilder, SecurityScheme};
use utoipa::openapi::{OpenApi as Document, RefOr};
use utoipa::{Modify, OpenApi};
use utoipa_axum::router::OpenApiRouter;
use utoipa_axum::routes;

use crate::caller::{Caller, bearer};
use crate::middleware::{Surroundings, surround};
use crate::problem::{Kind, Problem};
use crate::resources::{
    additions, batches, calculations, deviations, doors, entries, ledger, lots, people, proposals,
    readings, records, rule_sets, settings, things,
};

/// Says how to sign requests.
#[derive(Debug)]
struct Bearer;

impl Modify for Bearer {
    fn modify(&self, document: &mut Document) {
        let scheme = HttpBuilder::new().scheme(HttpAuthScheme::Bearer).bearer_format("JWT").build();
        document
            .components
            .get_or_insert_default()
            .add_security_scheme("bearer", SecurityScheme::Http(scheme));
    }
}

/// The frame of the description; the paths come from the handlers.
#[derive(OpenApi)]
#[openapi(
    modifiers(&Bearer),
    info(
        title = "tallystave",
        description = "The batch ledger for people who ferment. Every POST that records something needs an \
            `Idempotency-Key`; a repeat gives the first answer. Amounts are decimal texts with UCUM units. Local \
            requirements prevail; a limit shown is never legal advice, and a model is never a laboratory analysis.",
        license(name = "MIT OR Apache-2.0", identifier = "MIT OR Apache-2.0")
    )
)]
struct Frame;

fn described() -> (Router<House>, Document) {
    let (routes, mut document) = routes();
    describe_answers(&mut document);
    (routes, document)
}

/// OpenAPI 3.1 wants a description of every answer; where a handler gives none, the status says what it is.
fn describe_answers(document: &mut Document) {
    let answers = document
        .paths
        .paths
        .values_mut()
        .flat_map(|item| {
            [&mut item.get, &mut item.post, &mut item.put, &mut item.patch, &mut item.delete]
        })
        .flatten()
        .flat_map(|operation| &mut operation.responses.responses);
    for (status, answer) in answers {
        if let RefOr::T(answer) = answer
            && answer.description.is_empty()
        {
            meaning(status).clone_into(&mut answer.description);
        }
    }
}

fn meaning(status: &str) -> &'static str {
    match status {
        "200" => "As asked.",
        "201" => "Recorded; a repeat with the same key gives the same answer.",
        "304" => "Unchanged since the `ETag` you named.",
        "503" => "Not possible at this moment.",
        _ => "Refused: a problem document says why and what to do.",
    }
}

fn routes() -> (Router<House>, Document) {
    OpenApiRouter::with_openapi(Frame::openapi())
        .routes(routes!(doors::sign_in))
        .routes(routes!(doors::me))
        .routes(routes!(doors::founding, doors::found))
        .routes(routes!(doors::set_clock))
        .routes(routes!(doors::alive))
        .routes(routes!(doors::ready))
        .routes(routes!(people::list, people::enrol))
        .routes(routes!(people::grant, people::withdraw))
        .routes(routes!(settings::list, settings::change))
        .routes(routes!(rule_sets::list))
        .routes(routes!(rule_sets::adopt))
        .routes(routes!(things::materials::list, things::materials::describe))
        .routes(routes!(things::materials::show, things::materials::redescribe))
        .routes(routes!(things::parties::list, things::parties::describe))
        .routes(routes!(things::parties::show, things::parties::redescribe))
        .routes(routes!(things::vessels::list, things::vessels::describe))
        .routes(routes!(things::vessels::show, things::vessels::redescribe))
        .routes(routes!(things::instruments::list, things::instruments::describe))
        .routes(routes!(things::instruments::show, things::instruments::redescribe))
        .routes(routes!(lots::list, lots::receive))
        .routes(routes!(lots::show))
        .routes(routes!(lots::change_status))
        .routes(routes!(batches::list, batches::open))
        .routes(routes!(batches::show))
        .routes(routes!(batches::entries))
        .routes(routes!(batches::account))
        .routes(routes!(readings::list, readings::take))
        .routes(routes!(proposals::list, proposals::propose))
        .routes(routes!(proposals::assess))
        .routes(routes!(additions::list, additions::add))
        .routes(routes!(records::show, records::issue))
        .routes(routes!(records::handed_out))
        .routes(routes!(entries::show))
        .routes(routes!(entries::amend))
        .routes(routes!(entries::sign))
        .routes(routes!(deviations::list, deviations::open))
        .routes(routes!(deviations::show))
        .routes(routes!(deviations::resolve))
        .routes(routes!(calculations::list))
        .routes(routes!(calculations::calculate))
        .routes(routes!(ledger::head))
        .routes(routes!(ledger::entries))
        .routes(routes!(ledger::inclusion))
        .routes(routes!(ledger::consistency))
        .split_for_parts()
}

/// The interface's description, OpenAPI 3.1.
pub fn document() -> Document {
    described().1
}

/// Every route with its methods, as the description lists them; the description's own address too.
pub fn routes_of(document: &Document) -> Vec<(&'static str, String)> {
    let mut routes = vec![("GET", "/v1/openapi.json".to_owned())];
    for (path, item) in &document.paths.paths {
        let methods = [
            ("GET", item.get.is_some()),
            ("POST", item.post.is_some()),
            ("PUT", item.put.is_some()),
            ("PATCH", item.patch.is_some()),
            ("DELETE", item.delete.is_some()),
        ];
        routes.extend(
            methods.into_iter().filter(|(_, there)| *there).map(|(m, _)| (m, path.clone())),
        );
    }
    routes
}

/// The whole interface over a house.
pub fn router(house: House, surroundings: Surroundings) -> Router {
    let (routes, document) = described();
    let description: Arc<str> = document.to_json().unwrap_or_default().into();
    let routes =
        routes
            .route(
                "/v1/openapi.json",
                get(move || {
                    let description = Arc::clone(&description);
                    async move {
                        ([(header::CONTENT_TYPE, "application/json")], description.to_string())
                    }
                }),
            )
            .route_layer(from_fn_with_state(house.clone(), guard));
    surround(routes, surroundings).with_state(house)
}

/// Looks the request up in the permission table by method and matched path, with the roles the caller has now.
async fn guard(State(house): State<House>, mut request: Request, next: Next) -> Response {
    let path = request.extensions().get::<MatchedPath>().map_or("", MatchedPath::as_str).to_owned();
    let method = request.method().as_str().to_owned();
    if allowed(&method, &path, None) == Decision::Allowed {
        return next.run(request).await;
    }
    let token = bearer(request.headers()).map(str::to_owned);
    match admitted(&house, token, &method, &path).await {
        Ok(caller) => {
            request.extensions_mut().insert(caller);
            next.run(request).await
        }
        Err(problem) => problem.into_response(),
    }
}

async fn admitted(
    house: &House,
    token: Result<String, Problem>,
    method: &str,
    path: &str,
) -> Result<Caller, Problem> {
    let known = house.caller(&token?).await.map_err(|error| match error {
        HouseError::Unauthorised => Problem::new(Kind::TokenRefused, Kind::TokenRefused.advice()),
        other => other.into(),
    })?;
    let roles: Vec<_> = known.roles.iter().copied().collect();
    match allowed(method, path, Some(&roles)) {
        Decision::Allowed => Ok(Caller { person: known.person, site: known.site, roles }),
        Decision::SignIn | Decision::Forbidden => {
            Err(Problem::new(Kind::Forbidden, "none of your roles at this site may do this"))
        }
        Decision::NoRow => {
            tracing::error!(method, path, "a route has no row in the permission table");
            Err(Problem::new(Kind::Forbidden, "nobody may do this"))
        }
    }
}

#[cfg(test)]
mod tests {
    use std::collections::BTreeSet;

    use house::permissions::TABLE;

    use super::*;

    #[test]
    fn every_route_has_a_row_in_the_permission_table_and_every_row_a_route() {
        let routes: BTreeSet<(String, String)> = routes_of(&document())
            .into_iter()
            .map(|(method, path)| (method.to_owned(), path))
            .collect();
        let rows: BTreeSet<(String, String)> =
            TABLE.iter().map(|row| (row.method.to_owned(), row.path.to_owned())).collect();
        assert_eq!(routes, rows);
    }

    #[test]
    fn the_description_is_openapi_3_1_and_every_operation_says_what_it_does() {
        let document = serde_json::to_value(document()).unwrap();
        assert_eq!(document["openapi"], "3.1.0");
        let mut ids = BTreeSet::new();
        for (path, item) in document["paths"].as_object().unwrap() {
            for (method, operation) in item.as_object().unwrap() {
                let id = operation["operationId"].as_str().unwrap();
                assert!(operation["summary"].is_string(), "{method} {path}");
                for (status, answer) in operation["responses"].as_object().unwrap() {
                    assert!(answer["description"].is_string(), "{method} {path} {status}");
                }
                ids.insert(id.to_owned());
            }
        }
        assert_eq!(ids.len() + 1, routes_of(&super::document()).len());
    }
}
