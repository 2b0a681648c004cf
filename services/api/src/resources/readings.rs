//! Readings.

use axum::Json;
use axum::extract::{Path, State};
use axum::http::StatusCode;
use domain::book::body::readings::Temperature;
use domain::book::body::{Body, Reading};
use domain::book::command::{Act, TakeReading};
use domain::ids::BatchId;
use domain::stamp::{Micros, Stamp};
use house::House;
use serde::{Deserialize, Serialize};
use utoipa::ToSchema;
use uuid::Uuid;

use crate::amounts::{Amount, Faults, stated_time};
use crate::asking::{asked, print};
use crate::caller::Caller;
use crate::idempotency::IdempotencyKey;
use crate::problem::{Problem, ProblemDocument};
use crate::resources::batches::no_batch;
use crate::strict::Strict;
use crate::views::{Listed, Recorded};

/// What was measured.
#[derive(Deserialize, ToSchema)]
#[serde(deny_unknown_fields)]
pub(crate) struct NewReading {
    /// When it was read, or the sample taken.
    #[schema(format = DateTime)]
    taken_at: String,
    /// The device's clock, if typed without network.
    #[schema(format = DateTime)]
    captured_at: Option<String>,
    /// When the laboratory answered.
    #[schema(format = DateTime)]
    reported_at: Option<String>,
    /// Number of the sample.
    #[schema(min_length = 1, max_length = 200)]
    sample: Option<String>,
    /// The laboratory.
    #[schema(min_length = 1, max_length = 200)]
    laboratory: Option<String>,
    /// The values, 1 to 50.
    #[schema(min_items = 1, max_items = 50)]
    values: Vec<NewValue>,
    /// A remark.
    #[schema(min_length = 1, max_length = 2000)]
    note: Option<String>,
}

/// One value.
#[derive(Deserialize, ToSchema)]
#[serde(deny_unknown_fields)]
pub(crate) struct NewValue {
    /// gravity, temperature, ammonium, `primary_amino_nitrogen`, sugar, ph, ethanol, urea, `ethyl_carbamate` …
    #[schema(example = "gravity")]
    quantity: String,
    /// Decimal text.
    #[schema(example = "1.0665")]
    value: String,
    /// UCUM unit, or for a gravity its scale: `sg_20_20`, `sg_60_60`, `plato`, `brix`, `oechsle`, `kmw`, `baume_145`,
    /// or `refractometer_brix` of unfermented liquid.
    #[schema(example = "sg_20_20")]
    unit: String,
    /// `<`, `>` or `about`.
    qualifier: Option<String>,
    /// For ammonium: `NH4`, `NH3` or `N`.
    expressed_as: Option<String>,
    /// Temperature of the sample, `Cel` or `[degF]`: a gravity is corrected with it.
    sample_temperature: Option<Amount>,
    /// How it was measured.
    #[schema(min_length = 1, max_length = 200)]
    method: Option<String>,
    /// The instrument's id.
    instrument: Option<Uuid>,
}

impl NewValue {
    /// The value, its words checked; its number is checked by the book.
    pub(crate) fn read(self, faults: &mut Faults, at: &str) -> Reading {
        faults.name(&format!("{at}/method"), self.method.as_deref());
        if self.qualifier.as_deref().is_some_and(|q| !["<", ">", "about"].contains(&q)) {
            faults.note(&format!("{at}/qualifier"), "use <, > or about");
        }
        if self.expressed_as.as_deref().is_some_and(|e| !["NH4", "NH3", "N"].contains(&e)) {
            faults.note(&format!("{at}/expressed_as"), "use NH4, NH3 or N");
        }
        Reading {
            quantity: self.quantity,
            value: self.value,
            qualifier: self.qualifier,
            unit: self.unit,
            expressed_as: self.expressed_as,
            sample_temperature: self
                .sample_temperature
                .map(|given| Temperature { value: given.value, unit: given.unit }),
            method: self.method,
            instrument: self.instrument.map(Into::into),
            corrected: None,
            left_as_read: None,
        }
    }
}

impl NewReading {
    /// What it asks of the book.
    pub(crate) fn read(
        self,
        faults: &mut Faults,
        batch: BatchId,
        now: Micros,
    ) -> Option<TakeReading> {
        faults.name("/sample", self.sample.as_deref());
        faults.name("/laboratory", self.laboratory.as_deref());
        faults.words("/note", self.note.as_deref());
        let taken_at = faults.at("/taken_at", stated_time(&self.taken_at, now));
        let optional = |faults: &mut Faults, at: &str, text: Option<&str>| -> Option<Stamp> {
            text.and_then(|text| faults.at(at, stated_time(text, now)))
        };
        let captured_at = optional(faults, "/captured_at", self.captured_at.as_deref());
        let reported_at = optional(faults, "/reported_at", self.reported_at.as_deref());
        let values = self
            .values
            .into_iter()
            .enumerate()
            .map(|(index, value)| value.read(faults, &format!("/values/{index}")))
            .collect();
        Some(TakeReading {
            batch,
            taken_at: taken_at?,
            captured_at,
            reported_at,
            sample: self.sample,
            laboratory: self.laboratory,
            values,
            note: self.note,
        })
    }
}

/// Records what was measured. A gravity comes back as SG 20/20 and apparent extract, with the method; one that cannot
/// be (a refractometer's once yeast is at work) comes back as it was read, with the reason in `left_as_read`.
#[utoipa::path(post, path = "/v1/batches/{id}/readings", operation_id = "take_reading", tag = "batches", request_body = NewReading, security(("bearer" = [])),
    params(("id" = Uuid, Path), ("Idempotency-Key" = Uuid, Header, description = "A UUID of your own for this request")),
    responses((status = 201, body = Recorded), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn take(
    State(house): State<House>,
    caller: Caller,
    Path(id): Path<Uuid>,
    IdempotencyKey(key): IdempotencyKey,
    Strict { value, raw }: Strict<NewReading>,
) -> Result<(StatusCode, Json<Recorded>), Problem> {
    let print = print("POST", &format!("/v1/batches/{id}/readings"), &raw)?;
    let mut faults = Faults::default();
    let read = value.read(&mut faults, BatchId(id), house.now());
    let act = Act::TakeReading(Box::new(faults.finish(read)?));
    let receipt = house.submit(asked(&caller, key, print, act)).await?;
    Ok((StatusCode::CREATED, Json(Recorded::entry(&receipt))))
}

/// A reading in force.
#[derive(Serialize, ToSchema)]
pub(crate) struct ReadingView {
    /// The entry that records it.
    entry: u64,
    /// When it was read, or the sample taken.
    taken_at: String,
    /// The values, corrected where that applies, and the nitrogen they come to.
    #[schema(value_type = Object)]
    reading: serde_json::Value,
    /// How many amendments made it read like this.
    amendments: usize,
}

/// Readings of a batch in force, oldest first.
#[utoipa::path(get, path = "/v1/batches/{id}/readings", operation_id = "list_readings", tag = "batches", params(("id" = Uuid, Path)), security(("bearer" = [])),
    responses((status = 200, body = Listed<ReadingView>), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn list(
    State(house): State<House>,
    caller: Caller,
    Path(id): Path<Uuid>,
) -> Result<Json<Listed<ReadingView>>, Problem> {
    let site = house.site(caller.site).await?;
    let subject = BatchId(id).into();
    let desk = house.desk(&site, &[subject]).await?;
    let loaded = desk.loaded(&subject).filter(|loaded| loaded.n > 0).ok_or_else(no_batch)?;
    let items = loaded
        .entries
        .iter()
        .filter(|entry| !entry.void)
        .filter_map(|entry| match entry.body.as_ref() {
            Body::ReadingTaken(body) => Some(ReadingView {
                entry: entry.seq,
                taken_at: entry.occurred_at.to_string(),
                reading: serde_json::to_value(body).unwrap_or_default(),
                amendments: entry.amendments.len(),
            }),
            _ => None,
        })
        .collect();
    Ok(Json(Listed { items }))
}
