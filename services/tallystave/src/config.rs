//! Configuration: flags over environment variables over defaults, each said once.

use std::net::SocketAddr;
use std::path::PathBuf;

use clap::{Args, Parser, Subcommand};
use store::Place;

/// The batch ledger for people who ferment.
#[derive(Debug, Parser)]
#[command(name = "tallystave", version, about)]
pub(crate) struct Cli {
    /// What to do.
    #[command(subcommand)]
    pub(crate) command: Command,
}

/// What the program does.
#[derive(Debug, Subcommand)]
pub(crate) enum Command {
    /// Serves the REST interface.
    Serve(Serve),
    /// Makes or updates the tables of a PostgreSQL database, as their owner.
    Migrate(Book),
    /// Reads every log and holds it against everything it promises; exits 1 at the first fault.
    Verify(Book),
    /// Builds the projection tables anew from the logs.
    Rebuild(Rebuild),
    /// Prints a one-time link for founding a first or a further site.
    FoundingLink(FoundingLink),
    /// Says in the book that the server's clock was set back for good, so that writing can go on.
    CorrectClock(CorrectClock),
    /// Lists the shipped rule sets: each rule with its number, source, and whether it works.
    Rules(Rules),
    /// Computes what is asked, one JSON object a line on standard input; exits 1 if a line could not be computed.
    Compute(Compute),
    /// Prints the description of the REST interface, OpenAPI 3.1.
    Openapi,
    /// Founds a simulated book and runs the main job on the invented demo scenario.
    Demo(Demo),
}

/// Where the book is kept, and the secrets beside it.
#[derive(Args, Clone, Debug)]
pub(crate) struct Book {
    /// Data directory: the SQLite file, unless a database is named, and the secrets.
    #[arg(long, env = "TALLYSTAVE_DATA", default_value = "data")]
    pub(crate) data: PathBuf,
    /// PostgreSQL address, instead of the file; several hosts may be named.
    #[arg(long, env = "TALLYSTAVE_DATABASE")]
    pub(crate) database: Option<String>,
    /// Directory of the keys, mode 0700; by default `secrets` within the data directory.
    #[arg(long, env = "TALLYSTAVE_SECRETS")]
    pub(crate) secrets: Option<PathBuf>,
}

impl Book {
    /// Where the database is.
    pub(crate) fn place(&self) -> Place {
        match &self.database {
            Some(url) => Place::Url(url.clone()),
            None => Place::Directory(self.data.clone()),
        }
    }

    /// Where the keys are.
    pub(crate) fn secrets(&self) -> PathBuf {
        self.secrets.clone().unwrap_or_else(|| self.data.join("secrets"))
    }
}

/// See [`Command::Rules`].
#[derive(Args, Clone, Debug)]
pub(crate) struct Rules {
    /// Only this set.
    #[arg(long)]
    pub(crate) set: Option<String>,
    /// Something else than listing.
    #[command(subcommand)]
    pub(crate) command: Option<RulesCommand>,
}

/// What else is done with rule sets.
#[derive(Clone, Debug, Subcommand)]
pub(crate) enum RulesCommand {
    /// Reads a site's own rule set and tells every fault with its line and column; exits 1 if there is one.
    Check {
        /// The TOML file.
        file: PathBuf,
    },
}

/// See [`Command::Compute`].
#[derive(Args, Clone, Debug)]
pub(crate) struct Compute {
    /// What to compute.
    pub(crate) name: Option<String>,
    /// Describes every computation with its members, units and source.
    #[arg(long, conflicts_with = "name")]
    pub(crate) list: bool,
}

/// See [`Command::Serve`].
#[derive(Args, Clone, Debug)]
pub(crate) struct Serve {
    /// The book.
    #[command(flatten)]
    pub(crate) book: Book,
    /// Address to listen on. Put a TLS proxy in front of anything but the loopback.
    #[arg(long, env = "TALLYSTAVE_LISTEN", default_value = "127.0.0.1:7420")]
    pub(crate) listen: SocketAddr,
    /// The address people use, if it is another: printed in links.
    #[arg(long, env = "TALLYSTAVE_PUBLIC_URL")]
    pub(crate) public_url: Option<String>,
    /// Clients reach us over TLS, ended by a proxy in front: sends Strict-Transport-Security.
    #[arg(long, env = "TALLYSTAVE_BEHIND_TLS")]
    pub(crate) behind_tls: bool,
    /// Runs on a driven clock that starts at this time; opens only books founded as simulations.
    #[arg(long, env = "TALLYSTAVE_SIMULATED_FROM")]
    pub(crate) simulated_from: Option<String>,
}

/// See [`Command::Rebuild`].
#[derive(Args, Clone, Debug)]
pub(crate) struct Rebuild {
    /// The book.
    #[command(flatten)]
    pub(crate) book: Book,
    /// Changes nothing: compares each table with a fresh replay and exits 1 naming table and key of what differs.
    #[arg(long)]
    pub(crate) check: bool,
}

/// See [`Command::FoundingLink`].
#[derive(Args, Clone, Debug)]
pub(crate) struct FoundingLink {
    /// The book.
    #[command(flatten)]
    pub(crate) book: Book,
    /// The address people use.
    #[arg(long, env = "TALLYSTAVE_PUBLIC_URL", default_value = "http://127.0.0.1:7420")]
    pub(crate) public_url: String,
}

/// See [`Command::CorrectClock`].
#[derive(Args, Clone, Debug)]
pub(crate) struct CorrectClock {
    /// The book.
    #[command(flatten)]
    pub(crate) book: Book,
    /// Code of the site.
    #[arg(long)]
    pub(crate) site: String,
    /// Why the clock was wrong.
    #[arg(long)]
    pub(crate) reason: String,
}

/// See [`Command::Demo`].
#[derive(Args, Clone, Debug)]
pub(crate) struct Demo {
    /// Directory of the demo's books; each run makes a new dated one.
    #[arg(long, default_value = "books")]
    pub(crate) books: PathBuf,
    /// Address to listen on.
    #[arg(long, default_value = "127.0.0.1:7420")]
    pub(crate) listen: SocketAddr,
    /// Stops after the scenario instead of serving on.
    #[arg(long)]
    pub(crate) once: bool,
    /// Removes the simulated books of earlier runs first; a real book is never touched.
    #[arg(long)]
    pub(crate) fresh: bool,
}
