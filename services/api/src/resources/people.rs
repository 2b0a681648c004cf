//! People and their roles.

use axum::Json;
use axum::extract::{Path, State};
use axum::http::StatusCode;
use domain::book::command::Act;
use domain::book::role::Role;
use domain::ids::PersonId;
use house::House;
use house::founding::NewPerson;
use serde::{Deserialize, Serialize};
use utoipa::ToSchema;
use uuid::Uuid;

use crate::amounts::{Faults, LONGEST_LIST};
use crate::asking::{asked, print, without};
use crate::caller::Caller;
use crate::idempotency::IdempotencyKey;
use crate::problem::{Kind, Problem, ProblemDocument};
use crate::strict::Strict;
use crate::views::{Listed, Recorded};

/// A person of the site.
#[derive(Clone, Debug, Serialize, ToSchema)]
pub(crate) struct PersonView {
    /// The pseudonym under which entries name the person.
    id: Uuid,
    /// What they sign in with.
    login: String,
    /// Printed name.
    name: String,
    /// What they may be; none: disabled.
    roles: Vec<&'static str>,
}

/// Everybody of the site.
#[utoipa::path(get, path = "/v1/people", operation_id = "list_people", tag = "people", security(("bearer" = [])),
    responses((status = 200, body = Listed<PersonView>), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn list(
    State(house): State<House>,
    caller: Caller,
) -> Result<Json<Listed<PersonView>>, Problem> {
    let people = house.people(&(&caller).into()).await?;
    let items = people
        .into_iter()
        .map(|person| PersonView {
            id: person.person.0,
            login: person.login,
            name: person.name,
            roles: person.roles.iter().map(|role| role.name()).collect(),
        })
        .collect();
    Ok(Json(Listed { items }))
}

/// A person to be enrolled.
#[derive(Deserialize, ToSchema)]
#[serde(deny_unknown_fields)]
pub(crate) struct EnrolPerson {
    /// What they will sign in with, unique in the site.
    #[schema(min_length = 1, max_length = 200)]
    login: String,
    /// Printed name, as it will stand under signatures.
    #[schema(min_length = 1, max_length = 200)]
    name: String,
    /// First password, at least 15 characters.
    password: String,
    /// Roles from the start: cellar, lead, quality, admin, auditor.
    #[schema(max_items = 50)]
    roles: Vec<String>,
}

/// Enrols a person.
#[utoipa::path(post, path = "/v1/people", operation_id = "enrol_person", tag = "people", request_body = EnrolPerson, security(("bearer" = [])),
    params(("Idempotency-Key" = Uuid, Header, description = "A UUID of your own for this request")),
    responses((status = 201, body = Recorded), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn enrol(
    State(house): State<House>,
    caller: Caller,
    IdempotencyKey(key): IdempotencyKey,
    Strict { value, raw }: Strict<EnrolPerson>,
) -> Result<(StatusCode, Json<Recorded>), Problem> {
    let print = print("POST", "/v1/people", &without(raw, &["/password"]))?;
    let mut faults = Faults::default();
    faults.name("/login", value.login.as_str());
    faults.name("/name", value.name.as_str());
    faults.list("/roles", &value.roles, LONGEST_LIST, |_, _, _| {});
    faults.finish(Some(()))?;
    let roles = value.roles.iter().map(|name| role(name)).collect::<Result<Vec<_>, _>>()?;
    let new = NewPerson { login: value.login, name: value.name, password: value.password };
    let (person, receipt) = house.enrol((&caller).into(), key, print, new, roles).await?;
    Ok((StatusCode::CREATED, Json(Recorded::of(&receipt, "person", person.0))))
}

/// Grants a role; 409 if the person has it already.
#[utoipa::path(put, path = "/v1/people/{id}/roles/{role}", operation_id = "grant_role", tag = "people", security(("bearer" = [])),
    params(("id" = Uuid, Path), ("role" = String, Path), ("Idempotency-Key" = Uuid, Header, description = "A UUID of your own for this request")),
    responses((status = 200, body = Recorded), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn grant(
    State(house): State<House>,
    caller: Caller,
    Path((id, name)): Path<(Uuid, String)>,
    IdempotencyKey(key): IdempotencyKey,
) -> Result<Json<Recorded>, Problem> {
    let path = format!("/v1/people/{id}/roles/{name}");
    let act = Act::Grant(PersonId(id), role(&name)?);
    let print = print("PUT", &path, &serde_json::Value::Bool(true))?;
    let receipt = house.submit(asked(&caller, key, print, act)).await?;
    Ok(Json(Recorded::of(&receipt, "person", id)))
}

/// Withdraws a role. Who has none left is disabled at once.
#[utoipa::path(delete, path = "/v1/people/{id}/roles/{role}", operation_id = "withdraw_role", tag = "people", security(("bearer" = [])),
    params(("id" = Uuid, Path), ("role" = String, Path), ("Idempotency-Key" = Uuid, Header, description = "A UUID of your own for this request")),
    responses((status = 200, body = Recorded), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn withdraw(
    State(house): State<House>,
    caller: Caller,
    Path((id, name)): Path<(Uuid, String)>,
    IdempotencyKey(key): IdempotencyKey,
) -> Result<Json<Recorded>, Problem> {
    let path = format!("/v1/people/{id}/roles/{name}");
    let act = Act::Withdraw(PersonId(id), role(&name)?, None);
    let print = print("DELETE", &path, &serde_json::Value::Bool(true))?;
    let receipt = house.submit(asked(&caller, key, print, act)).await?;
    Ok(Json(Recorded::of(&receipt, "person", id)))
}

fn role(name: &str) -> Result<Role, Problem> {
    Role::parse(name).ok_or_else(|| {
        let names: Vec<_> = Role::ALL.iter().map(|role| role.name()).collect();
        Problem::at(
            Kind::Meaningless,
            "/roles",
            format!("{name:?} is no role: use {}", names.join(", ")),
        )
    })
}
