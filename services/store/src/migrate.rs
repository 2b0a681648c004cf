//! Brings the tables to this program's version, and says what the serving role may do.
//!
//! The owner of the database migrates; on PostgreSQL the program serves as [`SERVING_ROLE`], which can append to
//! the log but not rewrite it. A merged migration is never edited.

use sqlx::migrate::Migrator;

use crate::db::{Conn, Db, on};
use crate::{StoreError, log, rebuild, schema, sites};

/// The role under which the program serves on PostgreSQL. It is made without the right to log in: the operator
/// gives it one (`alter role tallystave_app login password …`) or makes a login role a member of it.
pub const SERVING_ROLE: &str = "tallystave_app";

static SQLITE: Migrator = sqlx::migrate!("../../migrations/sqlite");
static POSTGRES: Migrator = sqlx::migrate!("../../migrations/postgres");

/// Makes or updates all tables; projections of another version are made anew and filled from the logs.
///
/// # Errors
/// [`StoreError::Migration`], or [`StoreError`] if a log cannot be replayed; the projections are then as before.
pub async fn migrate(db: &Db) -> Result<(), StoreError> {
    match db {
        Db::Sqlite { write, .. } => SQLITE.run(write).await?,
        Db::Postgres(server) => POSTGRES.run(server.pool()).await?,
    }
    let mut tx = db.begin().await?;
    only_one(&mut tx.conn()).await?;
    grant(&mut tx.conn()).await?;
    if !schema::is_current(&mut tx.conn()).await? {
        schema::make_anew(&mut tx.conn()).await?;
        for site in sites::all(&mut tx.conn()).await? {
            tracing::info!(site = site.code, "filling the projections from the log");
            log::lock_head(&mut tx.conn(), site.number).await?;
            rebuild::rewrite(&mut tx.conn(), &site).await?;
        }
    }
    tx.commit().await
}

/// Refuses to serve on tables of another version.
///
/// # Errors
/// [`StoreError::WrongVersion`], or [`StoreError::Database`] where there are no tables at all.
pub async fn check(db: &Db) -> Result<(), StoreError> {
    let mut held = db.reader().await?;
    let mut conn = held.conn();
    let applied: Vec<i64> =
        on!(&mut conn, |c| sqlx::query_scalar(APPLIED).fetch_all(c).await).map_err(missing)?;
    let ours: Vec<i64> = versions(&SQLITE);
    if applied != ours || !schema::is_current(&mut conn).await? {
        return Err(StoreError::WrongVersion);
    }
    Ok(())
}

const APPLIED: &str = "select version from _sqlx_migrations where success order by version";

#[cfg(test)]
pub(crate) const TEXTS: &[&str] = &[APPLIED];

/// A database without our tables was never migrated.
fn missing(error: sqlx::Error) -> StoreError {
    match error {
        sqlx::Error::Database(_) => StoreError::WrongVersion,
        other => StoreError::Database(other),
    }
}

fn versions(migrator: &Migrator) -> Vec<i64> {
    migrator.iter().map(|step| step.version).collect()
}

/// Several servers may start at once: the others wait here, and find the work done.
async fn only_one(conn: &mut Conn<'_>) -> Result<(), StoreError> {
    if let Conn::Postgres(c) = conn {
        const LOCK: &str = "lock table projection_version in share row exclusive mode";
        sqlx::raw_sql(LOCK).execute(&mut **c).await?;
    }
    Ok(())
}

/// Gives the serving role exactly its rights. The file of SQLite has no roles: there the hash tree alone guards.
async fn grant(conn: &mut Conn<'_>) -> Result<(), StoreError> {
    if let Conn::Postgres(c) = conn {
        for text in GRANTS {
            sqlx::raw_sql(*text).execute(&mut **c).await?;
        }
    }
    Ok(())
}

const GRANTS: &[&str] = &[
    "do $$ begin
       if not exists (select from pg_roles where rolname = 'tallystave_app') then
         create role tallystave_app nologin;
       end if;
     exception when duplicate_object or unique_violation then null;
     end $$",
    "grant usage on schema public to tallystave_app",
    "grant select, insert on entry, tile, blob, signed_head, log_head, site to tallystave_app",
    "grant update (size, frontier, root, note, last_recorded_at) on log_head to tallystave_app",
    "grant select, insert, update, delete on directory_person, founding_token to tallystave_app",
    "grant select on _sqlx_migrations, projection_version to tallystave_app",
];

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn both_engines_have_the_same_steps() {
        let names = |migrator: &Migrator| -> Vec<(i64, String)> {
            migrator.iter().map(|step| (step.version, step.description.to_string())).collect()
        };
        assert_eq!(names(&SQLITE), names(&POSTGRES));
        assert_eq!(versions(&SQLITE), [1, 2, 3]);
    }
}
