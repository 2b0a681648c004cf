//! Signing in, founding, the clock of a simulation, and whether the program is well.

use axum::Json;
use axum::extract::State;
use axum::http::StatusCode;
use domain::book::body::Premises;
use domain::stamp::Micros;
use house::founding::{Founding, NewPerson};
use house::{House, HouseError};
use serde::{Deserialize, Serialize};
use utoipa::ToSchema;
use uuid::Uuid;

use crate::amounts::{Faults, LONGEST_LIST};
use crate::asking::{print, without};
use crate::caller::Caller;
use crate::idempotency::IdempotencyKey;
use crate::problem::{Kind, Problem, ProblemDocument};
use crate::strict::Strict;

/// Who signs in where.
#[derive(Deserialize, ToSchema)]
#[serde(deny_unknown_fields)]
pub(crate) struct NewSession {
    /// The site's code.
    #[schema(example = "EXW", max_length = 40)]
    site: String,
    /// The login.
    #[schema(max_length = 200)]
    login: String,
    /// The password.
    #[schema(max_length = 1024)]
    password: String,
}

/// A session.
#[derive(Serialize, ToSchema)]
pub(crate) struct SessionView {
    /// Put it into `Authorization: Bearer …`.
    access_token: String,
    /// Always `Bearer`.
    token_type: &'static str,
    /// Seconds until it runs out.
    expires_in: i64,
    /// Who signed in.
    me: MeView,
}

/// A signed-in person.
#[derive(Serialize, ToSchema)]
pub(crate) struct MeView {
    /// The pseudonym under which entries name the person.
    person: Uuid,
    /// The one site that the token is for.
    site: Uuid,
    /// What the person may be there now.
    roles: Vec<&'static str>,
}

impl From<&Caller> for MeView {
    fn from(caller: &Caller) -> Self {
        Self {
            person: caller.person.0,
            site: caller.site.0,
            roles: caller.roles.iter().map(|role| role.name()).collect(),
        }
    }
}

/// Signs in at one site.
#[utoipa::path(post, path = "/v1/sessions", operation_id = "sign_in", tag = "doors", request_body = NewSession,
    responses((status = 201, body = SessionView), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn sign_in(
    State(house): State<House>,
    Strict { value, .. }: Strict<NewSession>,
) -> Result<(StatusCode, Json<SessionView>), Problem> {
    let signed_in = house.sign_in(&value.site, &value.login, &value.password).await;
    let session = signed_in.map_err(|error| match error {
        HouseError::Unauthorised => {
            Problem::new(Kind::CredentialsRefused, Kind::CredentialsRefused.advice())
        }
        other => other.into(),
    })?;
    let me = MeView {
        person: session.caller.person.0,
        site: session.caller.site.0,
        roles: session.caller.roles.iter().map(|role| role.name()).collect(),
    };
    let view = SessionView {
        access_token: session.token,
        token_type: "Bearer",
        expires_in: session.expires_in,
        me,
    };
    Ok((StatusCode::CREATED, Json(view)))
}

/// Who is signed in.
#[utoipa::path(get, path = "/v1/me", operation_id = "show_me", tag = "doors", security(("bearer" = [])),
    responses((status = 200, body = MeView), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn me(caller: Caller) -> Json<MeView> {
    Json((&caller).into())
}

/// Whether a first book is waiting to be founded.
#[derive(Serialize, ToSchema)]
pub(crate) struct FoundingState {
    /// A founding token was printed on the console and not used yet.
    open: bool,
    /// What to do.
    next: &'static str,
}

/// Whether a book may be founded, and how.
#[utoipa::path(get, path = "/v1/founding", operation_id = "show_founding", tag = "doors", responses((status = 200, body = FoundingState)))]
pub(crate) async fn founding(State(house): State<House>) -> Result<Json<FoundingState>, Problem> {
    let open = house.awaits_founding().await?;
    let next = if open {
        "POST to this address the token behind the # of the link on the console, with the site and its first administrator"
    } else {
        "sign in at /v1/sessions; a further site is founded with a token from the operator's console"
    };
    Ok(Json(FoundingState { open, next }))
}

/// A book to be founded, with its first administrator.
#[derive(Deserialize, ToSchema)]
#[serde(deny_unknown_fields)]
pub(crate) struct NewBook {
    /// The one-time token from the console.
    token: String,
    /// Short code of the site.
    #[schema(example = "EXW", min_length = 1, max_length = 40)]
    code: String,
    /// Its name as printed.
    #[schema(example = "Example Works", min_length = 1, max_length = 200)]
    name: String,
    /// Name of its log and key, fixed for ever: best a name under a domain of your own.
    #[schema(example = "works.example/book", min_length = 1, max_length = 200)]
    origin: String,
    /// IANA time zone.
    #[schema(example = "America/Los_Angeles")]
    time_zone: String,
    /// Licence or permit number.
    #[schema(min_length = 1, max_length = 200)]
    licence: Option<String>,
    /// What may be done where.
    #[schema(min_items = 1, max_items = 50)]
    premises: Vec<NewPremises>,
    /// Only a simulation may run on a driven clock; everything that leaves it says so.
    simulation: bool,
    /// One person may give both signatures; the record says so.
    #[serde(default)]
    single_handed: bool,
    /// The first administrator.
    admin: NewAdmin,
}

/// A part of the site that the law treats as one.
#[derive(Deserialize, ToSchema)]
#[serde(deny_unknown_fields)]
pub(crate) struct NewPremises {
    /// Short code.
    #[schema(example = "BW", min_length = 1, max_length = 40)]
    code: String,
    /// What it is to the law: `bonded_wine_premises`, `distilled_spirits_plant`, `brewery` …
    #[schema(example = "bonded_wine_premises", min_length = 1, max_length = 200)]
    kind: String,
    /// Name as printed.
    #[schema(min_length = 1, max_length = 200)]
    name: String,
}

/// The first administrator.
#[derive(Deserialize, ToSchema)]
#[serde(deny_unknown_fields)]
pub(crate) struct NewAdmin {
    /// What they sign in with.
    #[schema(min_length = 1, max_length = 200)]
    login: String,
    /// Printed name.
    #[schema(min_length = 1, max_length = 200)]
    name: String,
    /// At least 15 characters.
    password: String,
}

impl NewBook {
    fn read(self) -> Result<Founding, Problem> {
        let mut faults = Faults::default();
        faults.code("/code", self.code.as_str());
        faults.name("/name", self.name.as_str());
        faults.name("/origin", self.origin.as_str());
        faults.name("/licence", self.licence.as_deref());
        faults.list("/premises", &self.premises, LONGEST_LIST, |faults, at, premises| {
            faults.code(&format!("{at}/code"), premises.code.as_str());
            faults.name(&format!("{at}/kind"), premises.kind.as_str());
            faults.name(&format!("{at}/name"), premises.name.as_str());
        });
        faults.name("/admin/login", self.admin.login.as_str());
        faults.name("/admin/name", self.admin.name.as_str());
        let premises = self.premises.into_iter();
        faults.finish(Some(Founding {
            token: self.token,
            code: self.code,
            name: self.name,
            origin: self.origin,
            time_zone: self.time_zone,
            licence: self.licence,
            premises: premises
                .map(|p| Premises { code: p.code, kind: p.kind, name: p.name })
                .collect(),
            simulation: self.simulation,
            single_handed: self.single_handed,
            admin: NewPerson {
                login: self.admin.login,
                name: self.admin.name,
                password: self.admin.password,
            },
        }))
    }
}

/// A book just founded.
#[derive(Serialize, ToSchema)]
pub(crate) struct BookView {
    /// The site's id.
    site: Uuid,
    /// The administrator's pseudonym.
    admin: Uuid,
}

/// Founds a book with the one-time token of the console.
#[utoipa::path(post, path = "/v1/founding", operation_id = "found_book", tag = "doors", request_body = NewBook,
    params(("Idempotency-Key" = Uuid, Header, description = "A UUID of your own for this request")),
    responses((status = 201, body = BookView), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn found(
    State(house): State<House>,
    IdempotencyKey(key): IdempotencyKey,
    Strict { value, raw }: Strict<NewBook>,
) -> Result<(StatusCode, Json<BookView>), Problem> {
    let print = print("POST", "/v1/founding", &without(raw, &["/token", "/admin/password"]))?;
    let founding = value.read()?;
    let founded = house.found(founding, key, print).await;
    let (site, admin) = founded.map_err(|error| match error {
        HouseError::Weak(weakness) => {
            Problem::at(Kind::Meaningless, "/admin/password", weakness.to_string())
        }
        other => other.into(),
    })?;
    Ok((StatusCode::CREATED, Json(BookView { site: site.0, admin: admin.0 })))
}

/// A simulation's clock.
#[derive(Deserialize, ToSchema)]
#[serde(deny_unknown_fields)]
pub(crate) struct NewTime {
    /// What it is to show; only forward.
    #[schema(format = DateTime, example = "2025-09-08T08:00:00-07:00")]
    now: String,
}

/// What the clock shows.
#[derive(Serialize, ToSchema)]
pub(crate) struct TimeView {
    /// UTC.
    #[schema(format = DateTime)]
    now: String,
}

/// Drives the clock of a simulation forward.
#[utoipa::path(post, path = "/v1/clock", operation_id = "set_clock", tag = "doors", request_body = NewTime, security(("bearer" = [])),
    responses((status = 200, body = TimeView), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn set_clock(
    State(house): State<House>,
    _caller: Caller,
    Strict { value, .. }: Strict<NewTime>,
) -> Result<Json<TimeView>, Problem> {
    let to = Micros::parse(&value.now)
        .map_err(|error| Problem::at(Kind::Meaningless, "/now", error.to_string()))?;
    house.set_clock(to)?;
    Ok(Json(TimeView { now: house.now().to_string() }))
}

/// Alive.
#[derive(Serialize, ToSchema)]
pub(crate) struct HealthView {
    /// `pass`, or the answer is a problem.
    status: &'static str,
}

/// Whether the program is alive.
#[utoipa::path(get, path = "/healthz", operation_id = "show_health", tag = "doors", responses((status = 200, body = HealthView)))]
pub(crate) async fn alive() -> Json<HealthView> {
    Json(HealthView { status: "pass" })
}

/// Whether the database answers, its tables are current and the heads are signed as they should be.
#[utoipa::path(get, path = "/readyz", operation_id = "show_readiness", tag = "doors",
    responses((status = 200, body = HealthView), (status = 503, body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn ready(State(house): State<House>) -> Result<Json<HealthView>, Problem> {
    house.ready().await.map_err(|error| {
        tracing::warn!(%error, "not ready");
        Problem::new(Kind::Unavailable, "not ready: see the service's log")
    })?;
    Ok(Json(HealthView { status: "pass" }))
}
