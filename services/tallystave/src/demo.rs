//! The demo: a simulated book on which the main job is done through the real REST interface.
//!
//! Everything in the scenario is invented: works, people, suppliers, lots and readings. Every page and record of it
//! says that it is a simulation.

mod batch_a;
mod batch_b;
mod client;
mod setting;
mod stage;

use std::path::{Path, PathBuf};

use anyhow::{Context as _, bail};
use api::Surroundings;
use house::clock::Clock;
use tokio::net::TcpListener;
use tokio::sync::oneshot;

use crate::config::{Book, Demo};
use crate::{check, serve};

/// Marks a directory as a demo's book, so that `--fresh` removes nothing else.
const MARK: &str = "SIMULATION.txt";
/// When the scenario begins.
const BEGIN: &str = "2025-05-12T08:00:00-07:00";

pub(crate) async fn run(demo: Demo) -> anyhow::Result<()> {
    if demo.fresh {
        remove_simulated_books(&demo.books)?;
    }
    let directory = new_directory(&demo.books)?;
    println!("A simulated book in {}; everything in it is invented.", directory.display());
    let book = Book { data: directory.clone(), database: None, secrets: None };
    let house = serve::open(&book, serve::clock(Some(BEGIN))?).await?;
    let listener = TcpListener::bind(demo.listen).await.with_context(|| {
        format!("{} is taken: choose another with --listen 127.0.0.1:PORT", demo.listen)
    })?;
    let url = format!("http://{}", listener.local_addr()?);
    let token = house.offer_founding().await?.context("the book exists already")?;
    let (stop, stopped) = oneshot::channel::<()>();
    let until = async {
        let _ = stopped.await;
    };
    let serving = tokio::spawn(serve::run(house, listener, Surroundings::default(), until));
    let (base, place) = (url.clone(), directory.clone());
    let played = tokio::task::spawn_blocking(move || stage::play(&base, &token, &place)).await?;
    let password = match played {
        Ok(password) => password,
        Err(error) => {
            let _ = stop.send(());
            serving.await??;
            return Err(error.context("the demo broke off"));
        }
    };
    println!("\nHolding the log against what it promises:");
    check::verify(&book).await?;
    check::rebuild(&crate::config::Rebuild { book: book.clone(), check: true }).await?;
    finish(&demo, &directory, &url, &password);
    if !demo.once {
        serve::signal().await;
    }
    let _ = stop.send(());
    serving.await??;
    Ok(())
}

fn finish(demo: &Demo, directory: &Path, url: &str, password: &str) {
    println!("\nThe records, marked as simulation on every page:");
    for code in [stage::BATCH_A, stage::BATCH_B] {
        println!("  {}", directory.join(format!("{code}.pdf")).display());
        println!("  {}", directory.join(format!("{code}.json")).display());
    }
    if demo.once {
        return;
    }
    println!("\nOpen {url}/v1/openapi.json for the interface. Sign in, for example:");
    println!("  curl -s {url}/v1/sessions -H 'Content-Type: application/json' \\");
    println!("    -d '{{\"site\":\"EXW\",\"login\":\"ana\",\"password\":\"{password}\"}}'");
    println!(
        "ana (cellar), ben (lead), caro (quality), dov (admin) share that password, made for this run only."
    );
    println!("Stop with Ctrl-C.");
}

/// A new directory named by the day and time, beside the earlier ones.
fn new_directory(books: &Path) -> anyhow::Result<PathBuf> {
    let now = Clock::System.now().to_string();
    let name: String =
        now.chars().take(19).map(|c| if c.is_ascii_alphanumeric() { c } else { '-' }).collect();
    for suffix in ["", "-b", "-c", "-d", "-e"] {
        let directory = books.join(format!("demo-{name}{suffix}"));
        if directory.exists() {
            continue;
        }
        std::fs::create_dir_all(&directory)
            .with_context(|| format!("{} cannot be made", directory.display()))?;
        let text = "A simulated book of the demo. Everything in it is invented.\n";
        std::fs::write(directory.join(MARK), text)?;
        return Ok(directory);
    }
    bail!("several demos were started in this very second: try again")
}

/// Removes the books of earlier demos, which carry the mark and whose names say so; nothing else.
fn remove_simulated_books(books: &Path) -> anyhow::Result<()> {
    let Ok(entries) = std::fs::read_dir(books) else { return Ok(()) };
    for entry in entries {
        let entry = entry?;
        let is_demo = entry.file_name().to_string_lossy().starts_with("demo-");
        if is_demo && entry.path().join(MARK).is_file() {
            std::fs::remove_dir_all(entry.path())?;
            println!("removed {}", entry.path().display());
        }
    }
    Ok(())
}
