//! The site's thresholds.

use std::collections::BTreeMap;

use axum::Json;
use axum::extract::State;
use domain::book::command::Act;
use domain::settings::Settings;
use house::House;
use serde::{Deserialize, Serialize};
use utoipa::ToSchema;

use crate::amounts::Faults;
use crate::asking::{asked, print};
use crate::caller::Caller;
use crate::idempotency::IdempotencyKey;
use crate::problem::{Problem, ProblemDocument};
use crate::strict::Strict;
use crate::views::{Listed, Recorded};

/// One threshold: chosen by the site, never a published limit.
#[derive(Serialize, ToSchema)]
pub(crate) struct SettingView {
    /// Its name.
    name: &'static str,
    /// Its value now.
    value: String,
    /// The default, from common practice.
    default: &'static str,
    /// The least value accepted.
    least: &'static str,
    /// The largest value accepted.
    most: &'static str,
    /// The unit.
    unit: &'static str,
    /// What it decides.
    meaning: &'static str,
}

/// Every threshold with its value, default and range.
#[utoipa::path(get, path = "/v1/settings", operation_id = "list_settings", tag = "rules", security(("bearer" = [])),
    responses((status = 200, body = Listed<SettingView>), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn list(
    State(house): State<House>,
    caller: Caller,
) -> Result<Json<Listed<SettingView>>, Problem> {
    let site = house.site(caller.site).await?;
    let desk = house.desk(&site, &[site.id.into()]).await?;
    let changed = desk.site().map(|state| state.settings.clone()).unwrap_or_default();
    let items = Settings::table()
        .iter()
        .map(|row| SettingView {
            name: row.name,
            value: changed.get(row.name).cloned().unwrap_or_else(|| row.default.to_owned()),
            default: row.default,
            least: row.least,
            most: row.most,
            unit: row.unit,
            meaning: row.meaning,
        })
        .collect();
    Ok(Json(Listed { items }))
}

/// Thresholds to be changed; the others stay.
#[derive(Deserialize, ToSchema)]
#[serde(deny_unknown_fields)]
pub(crate) struct ChangeSettings {
    /// Name → decimal text.
    settings: BTreeMap<String, String>,
    /// Why.
    #[schema(min_length = 1, max_length = 2000)]
    reason: String,
}

/// Changes thresholds.
#[utoipa::path(patch, path = "/v1/settings", operation_id = "change_settings", tag = "rules", request_body = ChangeSettings, security(("bearer" = [])),
    params(("Idempotency-Key" = Uuid, Header, description = "A UUID of your own for this request")),
    responses((status = 200, body = Recorded), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn change(
    State(house): State<House>,
    caller: Caller,
    IdempotencyKey(key): IdempotencyKey,
    Strict { value, raw }: Strict<ChangeSettings>,
) -> Result<Json<Recorded>, Problem> {
    let print = print("PATCH", "/v1/settings", &raw)?;
    let mut faults = Faults::default();
    faults.words("/reason", value.reason.as_str());
    faults.finish(Some(()))?;
    let act = Act::ChangeSettings(value.settings, value.reason);
    let receipt = house.submit(asked(&caller, key, print, act)).await?;
    Ok(Json(Recorded::of(&receipt, "", caller.site.0)))
}
