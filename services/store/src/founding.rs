//! The one-time token that may found a site: only its hash is kept, and founding uses it up.

use crate::StoreError;
use crate::db::{Conn, on};

const KEEP: &str = "insert into founding_token (one, token_hash) values (1, $1) \
    on conflict (one) do update set token_hash = excluded.token_hash";
const KEPT: &str = "select token_hash from founding_token where one = 1";
const USE_UP: &str = "delete from founding_token where one = 1 and token_hash = $1";

#[cfg(test)]
pub(crate) const TEXTS: &[&str] = &[KEEP, KEPT, USE_UP];

/// Keeps the hash of a new token in place of an older one.
///
/// # Errors
/// [`StoreError::Database`].
pub async fn keep(conn: &mut Conn<'_>, hash: &[u8]) -> Result<(), StoreError> {
    on!(conn, |c| sqlx::query(KEEP).bind(hash).execute(c).await.map(drop))?;
    Ok(())
}

/// The hash of the token that may be used, if there is one.
///
/// # Errors
/// [`StoreError::Database`].
pub async fn kept(conn: &mut Conn<'_>) -> Result<Option<Vec<u8>>, StoreError> {
    Ok(on!(conn, |c| sqlx::query_scalar(KEPT).fetch_optional(c).await)?)
}

/// Uses a token up; `false` if somebody else was first.
///
/// # Errors
/// [`StoreError::Database`].
pub async fn use_up(conn: &mut Conn<'_>, hash: &[u8]) -> Result<bool, StoreError> {
    let gone = on!(conn, |c| sqlx::query(USE_UP).bind(hash).execute(c).await?.rows_affected());
    Ok(gone == 1)
}
