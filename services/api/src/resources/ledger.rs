//! The log itself: its signed head, its entries as stored, and proofs that need no trust in this program.

use axum::Json;
use axum::extract::{Path, Query, State};
use base64::Engine as _;
use base64::engine::general_purpose::STANDARD;
use domain::ids::SiteId;
use house::House;
use serde::{Deserialize, Serialize};
use utoipa::{IntoParams, ToSchema};
use uuid::Uuid;

use crate::caller::Caller;
use crate::problem::{Kind, Problem, ProblemDocument};

/// The newest signed head.
#[derive(Serialize, ToSchema)]
pub(crate) struct HeadView {
    /// The name of the log and its key.
    origin: String,
    /// How many entries.
    size: u64,
    /// Root hash (RFC 9162), hexadecimal.
    root: String,
    /// The signed note: a C2SP checkpoint with an Ed25519 signature.
    note: String,
    /// The public key as a C2SP vkey.
    key: String,
    /// What people compare: SHA-256 of the public key.
    fingerprint: String,
}

/// The caller's own site, and no other.
async fn own(house: &House, caller: &Caller, site: Uuid) -> Result<store::sites::Site, Problem> {
    if caller.site != SiteId(site) {
        return Err(Problem::new(Kind::NotFound, "there is no such site"));
    }
    Ok(house.site(caller.site).await?)
}

/// The newest signed head of the log.
#[utoipa::path(get, path = "/v1/sites/{site}/ledger/head", operation_id = "show_ledger_head", tag = "ledger", params(("site" = Uuid, Path)), security(("bearer" = [])),
    responses((status = 200, body = HeadView), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn head(
    State(house): State<House>,
    caller: Caller,
    Path(site): Path<Uuid>,
) -> Result<Json<HeadView>, Problem> {
    let site = own(&house, &caller, site).await?;
    let head = house.head(&site).await?;
    let key = house.verifier(&site.origin)?;
    Ok(Json(HeadView {
        size: head.frontier.size(),
        root: head.root.to_string(),
        note: head.note,
        fingerprint: key.fingerprint().to_string(),
        key: key.to_string(),
        origin: site.origin,
    }))
}

/// Which entries.
#[derive(Deserialize, IntoParams)]
#[serde(deny_unknown_fields)]
pub(crate) struct Range {
    /// From this number on.
    #[serde(default)]
    from: u64,
    /// At most so many, 1 to 1,000.
    #[param(minimum = 1, maximum = 1000)]
    limit: Option<u16>,
}

/// Entries as stored.
#[derive(Serialize, ToSchema)]
pub(crate) struct StoredEntries {
    /// In the log's order.
    entries: Vec<StoredEntry>,
}

/// An entry as stored.
#[derive(Serialize, ToSchema)]
pub(crate) struct StoredEntry {
    /// Its number.
    seq: u64,
    /// Its canonical bytes (RFC 8785), base64: exactly what was hashed.
    bytes: String,
    /// SHA-256 over 0x00 and the bytes, hexadecimal.
    leaf_hash: String,
}

/// Entries as stored, byte for byte, in the log's order.
#[utoipa::path(get, path = "/v1/sites/{site}/ledger/entries", operation_id = "list_ledger_entries", tag = "ledger", params(("site" = Uuid, Path), Range), security(("bearer" = [])),
    responses((status = 200, body = StoredEntries), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn entries(
    State(house): State<House>,
    caller: Caller,
    Path(site): Path<Uuid>,
    Query(range): Query<Range>,
) -> Result<Json<StoredEntries>, Problem> {
    let site = own(&house, &caller, site).await?;
    let limit = range.limit.unwrap_or(256).clamp(1, 1_000);
    let stored = house.stored_entries(&site, range.from, limit).await?;
    let entries = stored
        .into_iter()
        .map(|stored| StoredEntry {
            seq: stored.seq,
            bytes: STANDARD.encode(&stored.bytes),
            leaf_hash: stored.leaf_hash.to_string(),
        })
        .collect();
    Ok(Json(StoredEntries { entries }))
}

/// A proof.
#[derive(Serialize, ToSchema)]
pub(crate) struct ProofView {
    /// Hashes from the leaf up (RFC 9162), hexadecimal.
    hashes: Vec<String>,
}

/// Which entry in which tree.
#[derive(Deserialize, IntoParams)]
#[serde(deny_unknown_fields)]
pub(crate) struct Inclusion {
    /// The entry's number.
    index: u64,
    /// The tree's size.
    size: u64,
}

/// Proves that an entry is among the first `size` ones (RFC 9162, section 2.1.3).
#[utoipa::path(get, path = "/v1/sites/{site}/ledger/inclusion", operation_id = "prove_inclusion", tag = "ledger", params(("site" = Uuid, Path), Inclusion), security(("bearer" = [])),
    responses((status = 200, body = ProofView), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn inclusion(
    State(house): State<House>,
    caller: Caller,
    Path(site): Path<Uuid>,
    Query(asked): Query<Inclusion>,
) -> Result<Json<ProofView>, Problem> {
    let site = own(&house, &caller, site).await?;
    let hashes = house.inclusion(&site, asked.index, asked.size).await?;
    Ok(Json(ProofView { hashes: hashes.iter().map(ToString::to_string).collect() }))
}

/// Which two sizes.
#[derive(Deserialize, IntoParams)]
#[serde(deny_unknown_fields)]
pub(crate) struct Consistency {
    /// The older size, at least 1.
    old: u64,
    /// The newer size.
    new: u64,
}

/// Proves that the newer log begins with the older (RFC 9162, section 2.1.4).
#[utoipa::path(get, path = "/v1/sites/{site}/ledger/consistency", operation_id = "prove_consistency", tag = "ledger", params(("site" = Uuid, Path), Consistency), security(("bearer" = [])),
    responses((status = 200, body = ProofView), (status = "4XX", body = ProblemDocument, content_type = "application/problem+json")))]
pub(crate) async fn consistency(
    State(house): State<House>,
    caller: Caller,
    Path(site): Path<Uuid>,
    Query(asked): Query<Consistency>,
) -> Result<Json<ProofView>, Problem> {
    let site = own(&house, &caller, site).await?;
    let hashes = house.consistency(&site, asked.old, asked.new).await?;
    Ok(Json(ProofView { hashes: hashes.iter().map(ToString::to_string).collect() }))
}
