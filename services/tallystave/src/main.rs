//! The program: command line, configuration, start-up and shutdown.
#![forbid(unsafe_code)]

mod check;
mod compute;
mod config;
mod demo;
mod rules;
mod serve;

use std::process::ExitCode;

use clap::Parser as _;
use house::clock::Clock;
use tracing_subscriber::EnvFilter;

use crate::config::{Cli, Command, CorrectClock, FoundingLink};

/// Entries are many small texts: a third of the time of a busy service went into the system's allocator.
#[global_allocator]
static ALLOCATOR: mimalloc::MiMalloc = mimalloc::MiMalloc;

#[tokio::main]
async fn main() -> ExitCode {
    let command = Cli::parse().command;
    tracing_subscriber::fmt()
        .with_env_filter(
            EnvFilter::try_from_env("TALLYSTAVE_LOG").unwrap_or_else(|_| logged(&command).into()),
        )
        .with_writer(std::io::stderr)
        .init();
    match run(command).await {
        Ok(()) => ExitCode::SUCCESS,
        Err(error) => {
            eprintln!("tallystave: {error:#}");
            ExitCode::FAILURE
        }
    }
}

/// What is logged unless `TALLYSTAVE_LOG` says otherwise: requests where there are any, or else what went wrong.
const fn logged(command: &Command) -> &'static str {
    match command {
        Command::Serve(_) => "info,sqlx=error",
        _ => "warn,sqlx=error",
    }
}

async fn run(command: Command) -> anyhow::Result<()> {
    match command {
        Command::Serve(serve) => serve::serve(serve).await,
        Command::Migrate(book) => check::migrate(&book).await,
        Command::Verify(book) => check::verify(&book).await,
        Command::Rebuild(rebuild) => check::rebuild(&rebuild).await,
        Command::FoundingLink(link) => founding_link(link).await,
        Command::CorrectClock(correct) => correct_clock(correct).await,
        Command::Rules(rules) => rules::run(&rules),
        Command::Compute(compute) => {
            anyhow::ensure!(compute::run(&compute)?, "not every line could be computed");
            Ok(())
        }
        Command::Openapi => {
            println!("{}", api::document().to_pretty_json()?);
            Ok(())
        }
        Command::Demo(demo) => demo::run(demo).await,
    }
}

async fn founding_link(link: FoundingLink) -> anyhow::Result<()> {
    let house = serve::open(&link.book, Clock::System).await?;
    let token = house.founding_token().await?;
    println!("{}/v1/founding#{token}", link.public_url);
    house.close().await;
    Ok(())
}

async fn correct_clock(correct: CorrectClock) -> anyhow::Result<()> {
    let house = serve::open(&correct.book, Clock::System).await?;
    let corrected = house.correct_clock(&correct.site, correct.reason).await;
    house.close().await;
    let (previous, now) = corrected?;
    println!("{}: the log ended at {previous}; it goes on from {now}", correct.site);
    Ok(())
}
