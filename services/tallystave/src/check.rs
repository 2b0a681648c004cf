//! Verifying logs and rebuilding tables from the command line.

use anyhow::{Context as _, bail};
use store::{Db, sites};

use crate::config::{Book, Rebuild};

async fn open(book: &Book) -> anyhow::Result<Db> {
    Db::open(&book.place()).await.context("the database cannot be opened")
}

/// Every site of a database.
async fn all(db: &Db) -> anyhow::Result<Vec<sites::Site>> {
    let mut held = db.reader().await?;
    sites::all(&mut held.conn()).await.context("there is no book here: is the place right?")
}

/// Brings the tables up to date.
pub(crate) async fn migrate(book: &Book) -> anyhow::Result<()> {
    let db = open(book).await?;
    store::migrate::migrate(&db).await.context("the tables cannot be brought up to date")?;
    println!("the tables are up to date");
    db.close().await;
    Ok(())
}

/// Verifies every log.
pub(crate) async fn verify(book: &Book) -> anyhow::Result<()> {
    let db = open(book).await?;
    let mut faults = 0;
    for site in all(&db).await? {
        let report = store::verify::verify(&db, &site).await?;
        match &report.fault {
            None => println!(
                "{}: {} entries, {} documents, {} tiles: whole; root {}; key {} (compare it with a record you were handed)",
                site.code,
                report.entries,
                report.blobs,
                report.tiles,
                report.head.root,
                report.key.map_or_else(|| "unknown".to_owned(), |key| key.to_string()),
            ),
            Some(fault) => {
                faults += 1;
                println!("{}: NOT WHOLE: {fault}", site.code);
            }
        }
    }
    db.close().await;
    if faults > 0 {
        bail!("{faults} of the logs are not what they promise");
    }
    Ok(())
}

/// Rebuilds the tables, or only compares them.
pub(crate) async fn rebuild(rebuild: &Rebuild) -> anyhow::Result<()> {
    let db = open(&rebuild.book).await?;
    let mut differing = 0;
    for site in all(&db).await? {
        if rebuild.check {
            let differences = store::rebuild::check(&db, &site).await?;
            for difference in &differences {
                println!("{}: {difference}", site.code);
            }
            differing += differences.len();
        } else {
            store::rebuild::rebuild(&db, &site).await?;
            println!("{}: built anew from the log", site.code);
        }
    }
    db.close().await;
    if differing > 0 {
        bail!("{differing} rows differ from a fresh replay: run `tallystave rebuild`");
    }
    if rebuild.check {
        println!("every table equals a fresh replay");
    }
    Ok(())
}
