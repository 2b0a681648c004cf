//! Reference data: materials, parties, vessels, instruments. They share their shape: list, read, describe, describe
//! again with `If-Match`.

use axum::Json;
use axum::extract::{Path, State};
use axum::http::{HeaderMap, StatusCode, header};
use axum::response::{IntoResponse, Response};
use domain::book::body::{
    Component, InstrumentDescribed, MaterialDescribed, PartyDescribed, VesselDescribed,
};
use domain::book::command::Act;
use domain::book::state::State as Folded;
use domain::book::subject::{Subject, SubjectKind};
use domain::checks::Category;
use domain::units::Dimension;
use house::House;
use serde::{Deserialize, Serialize};
use serde_json::Value;
use utoipa::ToSchema;
use uuid::Uuid;

use crate::amounts::{Amount, Faults, LONGEST_LIST, MOST_SUBSTANCES};
use crate::asking::{asked, expecting, print};
use crate::caller::Caller;
use crate::etag::{IfMatch, etag, unchanged};
use crate::idempotency::IdempotencyKey;
use crate::problem::{Kind, Problem, ProblemDocument};
use crate::strict::Strict;
use crate::views::{Listed, Recorded};

/// A described thing as it is now.
#[derive(Clone, Debug, Serialize, ToSchema)]
pub(crate) struct ThingView {
    /// Its id.
    pub(crate) id: Uuid,
    /// Its code.
    pub(crate) code: String,
    /// Its name.
    pub(crate) name: String,
    /// Running number: its `ETag`.
    pub(crate) n: u64,
    /// The whole description as entered.
    #[schema(value_type = Object)]
    pub(crate) description: Value,
}

/// A material.
#[derive(Deserialize, ToSchema)]
#[serde(deny_unknown_fields)]
pub(crate) struct NewMaterial {
    /// Short code, unique in the site.
    #[schema(example = "DAP", min_length = 1, max_length = 40)]
    code: String,
    /// Name as printed.
    #[schema(example = "diammonium phosphate", min_length = 1, max_length = 200)]
    name: String,
    /// nutrient, yeast, sulfite, enzyme, sugar, fruit, water, base, other.
    #[schema(example = "nutrient")]
    category: String,
    /// mass, volume or count: what its lots are counted in.
    #[schema(example = "mass")]
    dimension: String,
    /// The names under which positive lists know it.
    #[serde(default)]
    #[schema(max_items = 50)]
    listed_as: Vec<String>,
    /// What it holds, as mass fractions.
    #[serde(default)]
    #[schema(max_items = 100)]
    composition: Vec<NewComponent>,
}

/// A substance in a material.
#[derive(Deserialize, ToSchema)]
#[serde(deny_unknown_fields)]
pub(crate) struct NewComponent {
    /// The substance, named as rules name it.
    #[schema(example = "diammonium_phosphate", min_length = 1, max_length = 200)]
    pub(crate) substance: String,
    /// Mass fraction: `%`, `g/kg`, `mg/kg` or `g/g`.
    pub(crate) fraction: Amount,
}

/// Reads a composition.
pub(crate) fn composition(faults: &mut Faults, parts: &[NewComponent]) -> Vec<Component> {
    faults.list("/composition", parts, MOST_SUBSTANCES, |faults, at, part| {
        faults.name(&format!("{at}/substance"), part.substance.as_str());
    });
    let mut total = 0;
    let mut read = Vec::new();
    for (index, part) in parts.iter().enumerate() {
        let at = format!("/composition/{index}/fraction");
        if let Some(fraction) = faults.amount(&at, &part.fraction, Dimension::Fraction) {
            total += fraction.base();
            read.push(Component { substance: part.substance.clone(), fraction });
        }
    }
    if total > Dimension::Fraction.largest() {
        faults.note("/composition", "the parts come to more than the whole: check the fractions");
    }
    read
}

/// A supplier or customer.
#[derive(Deserialize, ToSchema)]
#[serde(deny_unknown_fields)]
pub(crate) struct NewParty {
    /// Short code, unique in the site.
    #[schema(min_length = 1, max_length = 40)]
    code: String,
    /// The firm.
    #[schema(min_length = 1, max_length = 200)]
    name: String,
    /// Postal address.
    #[schema(min_length = 1, max_length = 2000)]
    address: Option<String>,
    /// Licence or permit number.
    #[schema(min_length = 1, max_length = 200)]
    licence: Option<String>,
}

/// A vessel.
#[derive(Deserialize, ToSchema)]
#[serde(deny_unknown_fields)]
pub(crate) struct NewVessel {
    /// Name on its plate, unique in the site.
    #[schema(example = "T-12", min_length = 1, max_length = 40)]
    code: String,
    /// What it is.
    #[schema(min_length = 1, max_length = 200)]
    name: String,
    /// Working capacity.
    capacity: Amount,
    /// The premises it stands on, by code.
    #[schema(min_length = 1, max_length = 40)]
    premises: String,
}

/// An instrument.
#[derive(Deserialize, ToSchema)]
#[serde(deny_unknown_fields)]
pub(crate) struct NewInstrument {
    /// Short code, unique in the site.
    #[schema(min_length = 1, max_length = 40)]
    code: String,
    /// What it is.
    #[schema(min_length = 1, max_length = 200)]
    name: String,
    /// Last calibration, `YYYY-MM-DD`.
    calibrated_on: Option<String>,
    /// Due again by, `YYYY-MM-DD`.
    calibration_due: Option<String>,
    /// Number of the certificate.
    #[schema(min_length = 1, max_length = 200)]
    certificate: Option<String>,
}

/// What all four have in common.
fn named(code: &str, name: &str) -> Faults {
    let mut faults = Faults::default();
    faults.code("/code", code);
    faults.name("/name", name);
    faults
}

fn material(id: Uuid, new: NewMaterial) -> Result<Act, Problem> {
    let mut faults = named(&new.code, &new.name);
    faults.list("/listed_as", &new.listed_as, LONGEST_LIST, |faults, at, name| {
        faults.name(at, name.as_str());
    });
    if Category::of(&new.category).is_none() {
        let names: Vec<_> = Category::ALL.iter().map(|category| category.name()).collect();
        faults.note("/category", format!("use one of {}", names.join(", ")));
    }
    if !["mass", "volume", "count"].contains(&new.dimension.as_str()) {
        faults.note("/dimension", "use mass, volume or count");
    }
    let composition = composition(&mut faults, &new.composition);
    faults.finish(Some(Act::DescribeMaterial(MaterialDescribed {
        material: id.into(),
        code: new.code,
        name: new.name,
        category: new.category,
        dimension: new.dimension,
        listed_as: new.listed_as,
        composition,
    })))
}

fn party(id: Uuid, new: NewParty) -> Result<Act, Problem> {
    let mut faults = named(&new.code, &new.name);
    faults.words("/address", new.address.as_deref());
    faults.name("/licence", new.licence.as_deref());
    faults.finish(Some(Act::DescribeParty(PartyDescribed {
        party: id.into(),
        code: new.code,
        name: new.name,
        address: new.address,
        licence: new.licence,
    })))
}

fn vessel(id: Uuid, new: NewVessel) -> Result<Act, Problem> {
    let mut faults = named(&new.code, &new.name);
    faults.code("/premises", new.premises.as_str());
    let capacity = faults.amount("/capacity", &new.capacity, Dimension::Volume);
    faults.finish(capacity.map(|capacity| {
        Act::DescribeVessel(VesselDescribed {
            vessel: id.into(),
            code: new.code,
            name: new.name,
            capacity,
            premises: new.premises,
        })
    }))
}

fn instrument(id: Uuid, new: NewInstrument) -> Result<Act, Problem> {
    let mut faults = named(&new.code, &new.name);
    faults.name("/certificate", new.certificate.as_deref());
    for (pointer, date) in
        [("/calibrated_on", &new.calibrated_on), ("/calibration_due", &new.calibration_due)]
    {
        if date.as_ref().is_some_and(|date| date.parse::<jiff::civil::Date>().is_err()) {
            faults.note(pointer, "a date is written YYYY-MM-DD");
        }
    }
    faults.finish(Some(Act::DescribeInstrument(InstrumentDescribed {
        instrument: id.into(),
        code: new.code,
        name: new.name,
        calibrated_on: new.calibrated_on,
        calibration_due: new.calibration_due,
        certificate: new.certificate,
    })))
}

/// One thing as it lies on a desk.
fn view(loaded: &domain::book::Loaded) -> Option<ThingView> {
    macro_rules! of {
        ($state:expr, $id:ident) => {
            $state.current.as_ref().map(|(_, body)| ThingView {
                id: body.$id.0,
                code: body.code.clone(),
                name: body.name.clone(),
                n: loaded.n,
                description: serde_json::to_value(body).unwrap_or_default(),
            })
        };
    }
    match &loaded.state {
        Folded::Material(state) => of!(state, material),
        Folded::Party(state) => of!(state, party),
        Folded::Vessel(state) => of!(state, vessel),
        Folded::Instrument(state) => of!(state, instrument),
        _ => None,
    }
}

async fn listed(
    house: &House,
    caller: &Caller,
    kind: SubjectKind,
) -> Result<Json<Listed<ThingView>>, Problem> {
    let site = house.site(caller.site).await?;
    let subjects: Vec<_> =
        house.described(&site, kind).await?.into_iter().map(|id| Subject { kind, id }).collect();
    let desk = house.desk(&site, &subjects).await?;
    let items = subjects.iter().filter_map(|subject| view(desk.loaded(subject)?)).collect();
    Ok(Json(Listed { items }))
}

async fn shown(
    house: &House,
    caller: &Caller,
    headers: &HeaderMap,
    subject: Subject,
) -> Result<Response, Problem> {
    let site = house.site(caller.site).await?;
    let desk = house.desk(&site, &[subject]).await?;
    let view = desk.loaded(&subject).and_then(|loaded| view(loaded)).ok_or_else(|| {
        Problem::new(
            Kind::NotFound,
            format!("there is no such {} at this site", subject.kind.name()),
        )
    })?;
    if let Some(response) = unchanged(headers, view.n) {
        return Ok(response);
    }
    Ok(([(header::ETAG, etag(view.n))], Json(view)).into_response())
}

macro_rules! thing {
    ($module:ident, $new:ident, $act:ident, $kind:ident, $path:literal, $one:literal, $what:literal) => {
        pub(crate) mod $module {
            use super::*;

            #[doc = concat!("Every ", $what, " as last described, by code.")]
            #[utoipa::path(get, path = $path, operation_id = concat!("list_", stringify!($module)), summary = concat!("Every ", $what, " as last described, by code."), tag = "reference data", security(("bearer" = [])),
                responses((status = 200, body = Listed<ThingView>), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
            pub(crate) async fn list(
                State(house): State<House>,
                caller: Caller,
            ) -> Result<Json<Listed<ThingView>>, Problem> {
                listed(&house, &caller, SubjectKind::$kind).await
            }

            #[doc = concat!("One ", $what, ".")]
            #[utoipa::path(get, path = $one, operation_id = concat!("show_", stringify!($module)), summary = concat!("One ", $what, "."), tag = "reference data", security(("bearer" = [])),
                params(("id" = Uuid, Path)),
                responses((status = 200, body = ThingView), (status = 304), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
            pub(crate) async fn show(
                State(house): State<House>,
                caller: Caller,
                Path(id): Path<Uuid>,
                headers: HeaderMap,
            ) -> Result<Response, Problem> {
                shown(&house, &caller, &headers, Subject { kind: SubjectKind::$kind, id }).await
            }

            #[doc = concat!("Describes a new ", $what, ".")]
            #[utoipa::path(post, path = $path, operation_id = concat!("describe_", stringify!($module)), summary = concat!("Describes a new ", $what, "."), tag = "reference data", request_body = $new, security(("bearer" = [])),
                params(("Idempotency-Key" = Uuid, Header, description = "A UUID of your own for this request")),
                responses((status = 201, body = Recorded), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
            pub(crate) async fn describe(
                State(house): State<House>,
                caller: Caller,
                IdempotencyKey(key): IdempotencyKey,
                Strict { value, raw }: Strict<$new>,
            ) -> Result<(StatusCode, Json<Recorded>), Problem> {
                let print = print("POST", $path, &raw)?;
                let act = $act(house.draw()?, value)?;
                let receipt = house.submit(asked(&caller, key, print, act)).await?;
                let recorded = Recorded::of(&receipt, stringify!($act), Uuid::nil());
                Ok((StatusCode::CREATED, Json(recorded)))
            }

            #[doc = concat!("Describes a ", $what, " anew; needs `If-Match`.")]
            #[utoipa::path(put, path = $one, operation_id = concat!("redescribe_", stringify!($module)), summary = concat!("Describes a ", $what, " anew; needs `If-Match`."), tag = "reference data", request_body = $new, security(("bearer" = [])),
                params(("id" = Uuid, Path), ("If-Match" = String, Header, description = "The ETag last seen"), ("Idempotency-Key" = Uuid, Header, description = "A UUID of your own for this request")),
                responses((status = 200, body = Recorded), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
            pub(crate) async fn redescribe(
                State(house): State<House>,
                caller: Caller,
                Path(id): Path<Uuid>,
                condition: IfMatch,
                IdempotencyKey(key): IdempotencyKey,
                Strict { value, raw }: Strict<$new>,
            ) -> Result<Json<Recorded>, Problem> {
                let subject = Subject { kind: SubjectKind::$kind, id };
                let site = house.site(caller.site).await?;
                let desk = house.desk(&site, &[subject]).await?;
                let n = desk.loaded(&subject).map_or(0, |loaded| loaded.n);
                let path = format!("{}/{id}", $path);
                let asked = asked(&caller, key, print("PUT", &path, &raw)?, $act(id, value)?);
                let asked = expecting(asked, subject, condition.seen(n));
                let receipt = house.submit(asked).await?;
                Ok(Json(Recorded::of(&receipt, stringify!($act), id)))
            }
        }
    };
}
thing!(
    materials,
    NewMaterial,
    material,
    Material,
    "/v1/materials",
    "/v1/materials/{id}",
    "material"
);
thing!(parties, NewParty, party, Party, "/v1/parties", "/v1/parties/{id}", "party");
thing!(vessels, NewVessel, vessel, Vessel, "/v1/vessels", "/v1/vessels/{id}", "vessel");
thing!(
    instruments,
    NewInstrument,
    instrument,
    Instrument,
    "/v1/instruments",
    "/v1/instruments/{id}",
    "instrument"
);
