//! Reads a whole log and holds it against everything it promises.
//!
//! What this proves: the entries are in canonical form, numbered without gaps, hashed into the signed tree, and the
//! documents they name are unaltered. It takes nothing from the projection tables; [`crate::rebuild`] compares those.
//! It cannot prove that nothing was cut off the end: only an older head, kept elsewhere, can.

mod entries;
mod walk;

use std::fmt;

use domain::ledger::note::Fingerprint;
use domain::ledger::tree::{Hash, TreeHead};

use self::entries::read_all;
use self::walk::Walk;
use crate::sites::{Site, SiteNumber};
use crate::{Conn, Db, StoreError, blobs, log, tiles};

/// Entries fetched at a time.
const PAGE: i64 = 4_000;

/// What a log turned out to be.
#[derive(Clone, Debug, Eq, PartialEq)]
pub struct Report {
    /// Entries read.
    pub entries: u64,
    /// Documents read.
    pub blobs: u64,
    /// Full tiles compared.
    pub tiles: u64,
    /// Size and root as recomputed.
    pub head: TreeHead,
    /// The key that the founding entry names, as people compare it.
    pub key: Option<Fingerprint>,
    /// The first thing that is not as it must be.
    pub fault: Option<Fault>,
}

/// Something that is not as it must be.
#[derive(Clone, Debug, Eq, PartialEq)]
pub struct Fault {
    /// The entry it was noticed at, if at one.
    pub seq: Option<u64>,
    /// What it is.
    pub what: String,
}

impl Fault {
    fn at(seq: u64, what: impl fmt::Display) -> Self {
        Self { seq: Some(seq), what: what.to_string() }
    }

    fn of_log(what: impl fmt::Display) -> Self {
        Self { seq: None, what: what.to_string() }
    }
}

impl fmt::Display for Fault {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self.seq {
            Some(seq) => write!(f, "entry {seq}: {}", self.what),
            None => f.write_str(&self.what),
        }
    }
}

/// Why the walk stopped before the end.
enum Stopped {
    Fault(Fault),
    Store(StoreError),
}

impl From<Fault> for Stopped {
    fn from(fault: Fault) -> Self {
        Self::Fault(fault)
    }
}

impl From<StoreError> for Stopped {
    fn from(error: StoreError) -> Self {
        Self::Store(error)
    }
}

/// Verifies one site's log and documents, up to the first fault.
///
/// # Errors
/// [`StoreError`] if the database cannot be read; what it holds is judged in the report.
pub async fn verify(db: &Db, site: &Site) -> Result<Report, StoreError> {
    let mut snapshot = db.snapshot().await?;
    let mut conn = snapshot.conn();
    let mut walk = Walk::new(site.id);
    let mut blobs = 0;
    let fault = match check(&mut conn, site, &mut walk, &mut blobs).await {
        Ok(()) => None,
        Err(Stopped::Fault(fault)) => Some(fault),
        Err(Stopped::Store(StoreError::Inconsistent(what))) => Some(Fault::of_log(what)),
        Err(Stopped::Store(error)) => return Err(error),
    };
    snapshot.rollback().await?;
    Ok(Report {
        entries: walk.edge.size(),
        blobs,
        tiles: walk.tiles,
        head: walk.edge.frontier().head(),
        key: walk.key.as_ref().map(domain::ledger::note::VerifierKey::fingerprint),
        fault,
    })
}

async fn check(
    conn: &mut Conn<'_>,
    site: &Site,
    walk: &mut Walk,
    blobs: &mut u64,
) -> Result<(), Stopped> {
    let head = log::head(conn, site.number).await?;
    walk.expect(log::kept_heads(conn, site.number).await?);
    let mut page = log::entries(conn, site.number, 0, PAGE).await?;
    while let Some(last) = page.last() {
        // The next page is fetched while this one is checked.
        let next = log::entries(conn, site.number, last.seq + 1, PAGE);
        let (next, checked) = tokio::join!(next, read_all(page));
        for checked in checked {
            for tile in walk.take(checked?)? {
                let stored = tiles::find(conn, site.number, tile.id()).await?;
                walk.compare_tile(&tile, stored.as_ref())?;
            }
        }
        // What is wrong with this page was told first.
        page = next?;
    }
    walk.finish(&head)?;
    let stored = tiles::count(conn, site.number).await?;
    if u64::try_from(stored) != Ok(walk.tiles) {
        let what = format!("{stored} tiles are stored, but the log has {} full ones", walk.tiles);
        return Err(Fault::of_log(what).into());
    }
    *blobs = check_blobs(conn, site.number, walk).await?;
    Ok(())
}

async fn check_blobs(conn: &mut Conn<'_>, site: SiteNumber, walk: &Walk) -> Result<u64, Stopped> {
    let names = blobs::digests(conn, site).await?;
    for (digest, seq) in &walk.documents {
        if !names.contains(digest) {
            return Err(Fault::at(*seq, format!("the document {digest} is missing")).into());
        }
    }
    for name in &names {
        let found = blobs::find(conn, site, name).await?;
        if found.is_none_or(|(_, bytes)| Hash::of(&bytes) != *name) {
            return Err(Fault::of_log(format!("the document {name} was altered")).into());
        }
    }
    Ok(names.len() as u64)
}
