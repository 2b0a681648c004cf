//! Makes the projection tables from their definitions in the book.
//!
//! The text that makes them is its own version: when it differs from the stored one, or the book's fold has
//! changed, the tables are dropped and made anew, to be filled from the log.

use std::fmt::Write as _;

use domain::book::table::{CellKind, Column, Table};
use domain::book::tables::{PROJECTION_VERSION, tables};
use sqlx::AssertSqlSafe;

use crate::StoreError;
use crate::db::{Conn, on};

/// The name of the integer that every table keeps a site under.
pub(crate) const SITE: &str = "site";

/// Makes the projection tables anew, empty.
pub(crate) async fn make_anew(conn: &mut Conn<'_>) -> Result<(), StoreError> {
    let stored = stored_version(conn).await?.unwrap_or_default();
    for name in stored.lines().filter_map(|line| line.strip_prefix("create table ")) {
        let name = name.split(' ').next().unwrap_or_default();
        run(conn, format!("drop table if exists {name}")).await?;
    }
    for table in tables() {
        run(conn, format!("drop table if exists {}", table.name)).await?;
        for text in definition(table, engine(conn)) {
            run(conn, text).await?;
        }
        if let Conn::Postgres(_) = conn {
            run(
                conn,
                format!("grant select, insert, update, delete on {} to tallystave_app", table.name),
            )
            .await?;
        }
    }
    let version = version();
    on!(conn, |c| sqlx::query(PUT_VERSION).bind(&version).execute(c).await.map(drop))?;
    Ok(())
}

/// Whether the projection tables are those of this program.
pub(crate) async fn is_current(conn: &mut Conn<'_>) -> Result<bool, StoreError> {
    Ok(stored_version(conn).await?.is_some_and(|stored| stored == version()))
}

const VERSION: &str = "select version from projection_version where one = 1";
const PUT_VERSION: &str = "insert into projection_version (one, version) values (1, $1) \
    on conflict (one) do update set version = excluded.version";

#[cfg(test)]
pub(crate) const TEXTS: &[&str] = &[VERSION, PUT_VERSION];

async fn stored_version(conn: &mut Conn<'_>) -> Result<Option<String>, StoreError> {
    Ok(on!(conn, |c| sqlx::query_scalar(VERSION).fetch_optional(c).await)?)
}

/// The fold's version and every definition, in one engine's words: both engines keep the same text.
fn version() -> String {
    let mut text = format!("fold {PROJECTION_VERSION}\n");
    for statement in tables().iter().flat_map(|table| definition(table, Engine::Sqlite)) {
        let _ = writeln!(text, "{statement}");
    }
    text
}

async fn run(conn: &mut Conn<'_>, text: String) -> Result<(), StoreError> {
    on!(conn, |c| sqlx::raw_sql(AssertSqlSafe(text)).execute(c).await.map(drop))?;
    Ok(())
}

#[derive(Clone, Copy)]
enum Engine {
    Sqlite,
    Postgres,
}

const fn engine(conn: &Conn<'_>) -> Engine {
    match conn {
        Conn::Sqlite(_) => Engine::Sqlite,
        Conn::Postgres(_) => Engine::Postgres,
    }
}

impl Engine {
    const fn kind(self, kind: CellKind) -> &'static str {
        match (self, kind) {
            (Self::Sqlite, CellKind::Int) => "integer",
            (Self::Postgres, CellKind::Int) => "bigint",
            (Self::Sqlite, CellKind::Bytes) => "blob",
            (Self::Postgres, CellKind::Bytes) => "bytea",
            (_, CellKind::Text) => "text",
        }
    }

    /// Small rows live in the key's own tree; larger ones would make it slow and the file big.
    fn options(self, table: &Table) -> &'static str {
        match self {
            Self::Postgres => "",
            Self::Sqlite if table.columns.len() <= table.key + 3 => " strict, without rowid",
            Self::Sqlite => " strict",
        }
    }
}

/// The statements that make one table and its indexes.
fn definition(table: &Table, engine: Engine) -> Vec<String> {
    let columns: Vec<String> = table.columns.iter().map(|c| column(c, engine)).collect();
    let key: Vec<&str> = table.columns[..table.key].iter().map(|c| c.name).collect();
    let mut texts = vec![format!(
        "create table {name} ({SITE} {int} not null, {columns}, primary key ({SITE}, {key})){options}",
        name = table.name,
        int = engine.kind(CellKind::Int),
        columns = columns.join(", "),
        key = key.join(", "),
        options = engine.options(table),
    )];
    texts.extend(table.indexes.iter().map(|index| {
        let (name, columns) = (index.join("_"), index.join(", "));
        format!("create index {table}_by_{name} on {table} ({SITE}, {columns})", table = table.name)
    }));
    texts
}

fn column(column: &Column, engine: Engine) -> String {
    let mut text = format!("{} {}", column.name, engine.kind(column.kind));
    if !column.nullable {
        text.push_str(" not null");
    }
    if let Some(check) = column.check {
        let _ = write!(text, " check ({check})");
    }
    text
}
