//! The log itself: its entries, and in [`head`](mod@head) how far it has come.

pub mod head;

use std::collections::HashMap;

use domain::book::subject::Subject;
use domain::ids::EntryId;
use domain::ledger::entry::Entry;
use domain::ledger::tree::Hash;
use sqlx::QueryBuilder;

pub use self::head::{Head, KeptHead, head, keep_head, kept_heads};
pub(crate) use self::head::{lock_head, start};
use crate::StoreError;
use crate::bulk::padded;
use crate::db::{Conn, on};
use crate::sites::SiteNumber;

/// An entry as stored.
#[derive(Clone, Debug, Eq, PartialEq)]
pub struct Stored {
    /// Its number in the log.
    pub seq: u64,
    /// Its canonical bytes.
    pub bytes: Vec<u8>,
    /// Its leaf hash.
    pub leaf_hash: Hash,
}

impl Stored {
    /// Reads it.
    ///
    /// # Errors
    /// [`StoreError::Inconsistent`] if the bytes are no entry.
    pub fn entry(&self) -> Result<Entry, StoreError> {
        Entry::of_bytes(&self.bytes)
            .map_err(|e| StoreError::inconsistent(format!("entry {}: {e}", self.seq)))
    }
}

type EntryRow = (i64, Vec<u8>, Vec<u8>);

const ENTRY: &str = "select seq, bytes, leaf_hash from entry where site = $1 and seq = $2";
const ENTRY_BY_ID: &str = "select e.seq, e.bytes, e.leaf_hash from entry_index i \
    join entry e on e.site = i.site and e.seq = i.seq where i.site = $1 and i.id = $2";
const ENTRIES: &str = "select seq, bytes, leaf_hash from entry \
    where site = $1 and seq >= $2 order by seq limit $3";
const ENTRIES_OF: &str = "select s.n, e.seq, e.bytes, e.leaf_hash from subject_entry s \
    join entry e on e.site = s.site and e.seq = s.seq \
    where s.site = $1 and s.subject = $2 and s.n > $3 order by s.n limit $4";
const COUNT_OF: &str = "select n from subject where site = $1 and subject = $2";
/// Goes on with the site.
const COUNT_OF_EACH: &str = "select n from subject where subject = column1 and site = ";
const LEAF_HASHES: &str = "select leaf_hash from entry \
    where site = $1 and seq >= $2 and seq < $3 order by seq";

#[cfg(test)]
pub(crate) const TEXTS: &[&str] = &[ENTRY, ENTRY_BY_ID, ENTRIES, ENTRIES_OF, COUNT_OF, LEAF_HASHES];

/// One entry by its number.
///
/// # Errors
/// [`StoreError`].
pub async fn entry(
    conn: &mut Conn<'_>,
    site: SiteNumber,
    seq: u64,
) -> Result<Option<Stored>, StoreError> {
    let seq = signed(seq)?;
    let row: Option<EntryRow> =
        on!(conn, |c| sqlx::query_as(ENTRY).bind(site.0).bind(seq).fetch_optional(c).await)?;
    row.map(stored).transpose()
}

/// One entry by its id.
///
/// # Errors
/// [`StoreError`].
pub async fn entry_by_id(
    conn: &mut Conn<'_>,
    site: SiteNumber,
    id: EntryId,
) -> Result<Option<Stored>, StoreError> {
    let row: Option<EntryRow> = on!(conn, |c| sqlx::query_as(ENTRY_BY_ID)
        .bind(site.0)
        .bind(id.0.as_bytes().as_slice())
        .fetch_optional(c)
        .await)?;
    row.map(stored).transpose()
}

/// At most `limit` entries from `from` on, in order.
///
/// # Errors
/// [`StoreError`].
pub async fn entries(
    conn: &mut Conn<'_>,
    site: SiteNumber,
    from: u64,
    limit: i64,
) -> Result<Vec<Stored>, StoreError> {
    let from = signed(from)?;
    let rows: Vec<EntryRow> = on!(conn, |c| sqlx::query_as(ENTRIES)
        .bind(site.0)
        .bind(from)
        .bind(limit)
        .fetch_all(c)
        .await)?;
    rows.into_iter().map(stored).collect()
}

/// A subject's own entries after its number `after`, at most `limit` of them: a page of its list.
///
/// # Errors
/// [`StoreError::Inconsistent`] if the numbers have a gap, or [`StoreError::Database`].
pub async fn entries_of(
    conn: &mut Conn<'_>,
    site: SiteNumber,
    subject: &Subject,
    after: u64,
    limit: i64,
) -> Result<Vec<Stored>, StoreError> {
    let signed_after = signed(after)?;
    let rows: Vec<(i64, i64, Vec<u8>, Vec<u8>)> = on!(conn, |c| sqlx::query_as(ENTRIES_OF)
        .bind(site.0)
        .bind(subject.key().as_slice())
        .bind(signed_after)
        .bind(limit)
        .fetch_all(c)
        .await)?;
    let mut n = signed_after;
    let mut list = Vec::with_capacity(rows.len());
    for (number, seq, bytes, leaf_hash) in rows {
        n += 1;
        if number != n {
            return Err(StoreError::inconsistent(format!("{subject} has no entry {n}")));
        }
        list.push(stored((seq, bytes, leaf_hash))?);
    }
    Ok(list)
}

/// How many entries a subject has; 0 if there is no such subject.
///
/// # Errors
/// [`StoreError::Database`].
pub async fn count_of(
    conn: &mut Conn<'_>,
    site: SiteNumber,
    subject: &Subject,
) -> Result<u64, StoreError> {
    let n: Option<i64> = on!(conn, |c| sqlx::query_scalar(COUNT_OF)
        .bind(site.0)
        .bind(subject.key().as_slice())
        .fetch_optional(c)
        .await)?;
    unsigned(n.unwrap_or_default())
}

/// How many entries each of these subjects has; those without any are left out.
pub(crate) async fn counts(
    conn: &mut Conn<'_>,
    site: SiteNumber,
    subjects: &[Subject],
) -> Result<HashMap<Subject, u64>, StoreError> {
    let mut found = HashMap::new();
    for list in padded(subjects) {
        let keys = list.iter().map(|subject| subject.key().to_vec());
        for (key, n) in each(conn, site, COUNT_OF_EACH, keys).await? {
            let subject = Subject::of_key(&key)
                .ok_or_else(|| StoreError::inconsistent("a counter is of no subject"))?;
            found.insert(subject, unsigned(n)?);
        }
    }
    Ok(found)
}

/// What a subquery says of each key, for those of which it says anything. Asked so, both engines look each key up in
/// the index; a list behind `in` may be held against every row of a site.
pub(crate) async fn each(
    conn: &mut Conn<'_>,
    site: SiteNumber,
    subquery: &'static str,
    keys: impl IntoIterator<Item = Vec<u8>>,
) -> Result<Vec<(Vec<u8>, i64)>, StoreError> {
    let rows: Vec<(Vec<u8>, Option<i64>)> = on!(conn, |c| {
        let mut query = QueryBuilder::new("select column1, (");
        query.push(subquery).push_bind(site.0).push(") from (");
        query.push_values(keys, |mut values, key| {
            values.push_bind(key);
        });
        query.push(") as wanted").build_query_as().fetch_all(c).await?
    });
    Ok(rows.into_iter().filter_map(|(key, found)| Some((key, found?))).collect())
}

/// The leaf hashes of a range of entries.
pub(crate) async fn leaf_hashes(
    conn: &mut Conn<'_>,
    site: SiteNumber,
    range: std::ops::Range<u64>,
) -> Result<Vec<Hash>, StoreError> {
    let (start, end) = (signed(range.start)?, signed(range.end)?);
    let rows: Vec<Vec<u8>> = on!(conn, |c| sqlx::query_scalar(LEAF_HASHES)
        .bind(site.0)
        .bind(start)
        .bind(end)
        .fetch_all(c)
        .await)?;
    if rows.len() as u64 != range.end - range.start {
        return Err(StoreError::inconsistent(format!("entries are missing in {range:?}")));
    }
    rows.iter().map(|row| hash(row)).collect()
}

fn stored((seq, bytes, leaf_hash): EntryRow) -> Result<Stored, StoreError> {
    Ok(Stored { seq: unsigned(seq)?, bytes, leaf_hash: hash(&leaf_hash)? })
}

pub(crate) fn hash(bytes: &[u8]) -> Result<Hash, StoreError> {
    Hash::try_from(bytes).map_err(|e| StoreError::inconsistent(e.to_string()))
}

pub(crate) fn signed(number: u64) -> Result<i64, StoreError> {
    i64::try_from(number).map_err(|_| StoreError::inconsistent(format!("{number} is too large")))
}

pub(crate) fn unsigned(number: i64) -> Result<u64, StoreError> {
    u64::try_from(number).map_err(|_| StoreError::inconsistent(format!("{number} is negative")))
}
