//! What can go wrong between the book and the disk.

/// Why the store could not do what was asked.
#[derive(Debug, thiserror::Error)]
pub enum StoreError {
    /// The database refused or cannot be reached.
    #[error("the database could not do it")]
    Database(#[from] sqlx::Error),
    /// The tables could not be brought to this program's version.
    #[error("the tables could not be brought up to date")]
    Migration(#[from] sqlx::migrate::MigrateError),
    /// The database holds what our own writes could not have made.
    #[error("the database is inconsistent: {0}")]
    Inconsistent(String),
    /// No such site.
    #[error("no site {0}")]
    NoSite(String),
    /// The projections were made by another version; the owner has to migrate.
    #[error("the tables belong to another version of the program: run its migration as the owner")]
    WrongVersion,
    /// A table or column was asked for that no definition names.
    #[error("no column {column} in table {table}")]
    NoColumn {
        /// The table.
        table: String,
        /// The column.
        column: String,
    },
}

impl StoreError {
    pub(crate) fn inconsistent(what: impl Into<String>) -> Self {
        Self::Inconsistent(what.into())
    }

    /// Whether the server is out of reach, shutting down or a standby, so that only later is another matter.
    pub fn is_unavailable(&self) -> bool {
        match self {
            Self::Database(sqlx::Error::Database(told)) => {
                told.code().is_some_and(|code| PASSING.contains(&code.as_ref()))
            }
            Self::Database(error) => matches!(
                error,
                sqlx::Error::Io(_)
                    | sqlx::Error::Tls(_)
                    | sqlx::Error::PoolTimedOut
                    | sqlx::Error::PoolClosed
                    | sqlx::Error::WorkerCrashed
            ),
            _ => false,
        }
    }
}

/// PostgreSQL's words for: read-only, shut down by an administrator, crashed, not yet up, too many connections
/// (its manual, appendix A).
const PASSING: &[&str] = &["25006", "57P01", "57P02", "57P03", "53300"];

/// An error with all its causes, in one line.
pub(crate) fn chain(error: &dyn std::error::Error) -> String {
    let causes = std::iter::successors(error.source(), |cause| cause.source());
    causes.fold(error.to_string(), |text, cause| format!("{text}: {cause}"))
}
