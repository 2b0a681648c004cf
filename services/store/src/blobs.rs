//! Documents, photos, rule texts and issued records, named by their SHA-256 and kept for ever.

use std::collections::BTreeSet;

use domain::book::command::Blob;
use domain::ledger::tree::Hash;

use crate::StoreError;
use crate::db::{Conn, on};
use crate::log::hash;
use crate::sites::SiteNumber;

/// The largest blob: 10 MiB.
pub const LARGEST: usize = 10 * 1024 * 1024;

const GET: &str = "select media_type, bytes from blob where site = $1 and digest = $2";
const HAS: &str = "select count(*) from blob where site = $1 and digest = $2";
const PUT: &str = "insert into blob (site, digest, media_type, bytes) values ($1, $2, $3, $4)";
const DIGESTS: &str = "select digest from blob where site = $1 order by digest";

#[cfg(test)]
pub(crate) const TEXTS: &[&str] = &[GET, HAS, PUT, DIGESTS];

/// A blob's media type and bytes.
///
/// # Errors
/// [`StoreError::Database`].
pub async fn find(
    conn: &mut Conn<'_>,
    site: SiteNumber,
    digest: &Hash,
) -> Result<Option<(String, Vec<u8>)>, StoreError> {
    Ok(on!(conn, |c| sqlx::query_as(GET)
        .bind(site.0)
        .bind(digest.as_bytes().as_slice())
        .fetch_optional(c)
        .await)?)
}

/// Every blob's name.
///
/// # Errors
/// [`StoreError`].
pub async fn digests(conn: &mut Conn<'_>, site: SiteNumber) -> Result<BTreeSet<Hash>, StoreError> {
    let rows: Vec<Vec<u8>> =
        on!(conn, |c| sqlx::query_scalar(DIGESTS).bind(site.0).fetch_all(c).await)?;
    rows.iter().map(|row| hash(row)).collect()
}

/// Writes a blob that may be there already. Its name is taken from its bytes, not from what the caller says.
pub(crate) async fn put(
    conn: &mut Conn<'_>,
    site: SiteNumber,
    blob: &Blob,
) -> Result<(), StoreError> {
    let digest = Hash::of(&blob.bytes);
    if digest.as_bytes() != &blob.digest || blob.bytes.len() > LARGEST {
        return Err(StoreError::inconsistent(format!("blob {digest} is misnamed or too large")));
    }
    let name = digest.as_bytes().as_slice();
    let there: i64 =
        on!(conn, |c| sqlx::query_scalar(HAS).bind(site.0).bind(name).fetch_one(c).await)?;
    if there == 0 {
        on!(conn, |c| sqlx::query(PUT)
            .bind(site.0)
            .bind(name)
            .bind(blob.media_type.as_str())
            .bind(blob.bytes.as_slice())
            .execute(c)
            .await
            .map(drop))?;
    }
    Ok(())
}
