//! Start-up and shutdown of the service.

use anyhow::Context as _;
use api::Surroundings;
use domain::stamp::Micros;
use house::House;
use house::clock::Clock;
use house::secrets::Secrets;
use store::Db;
use tokio::net::TcpListener;
use tokio::sync::oneshot;

use crate::config::{Book, Serve};

/// Opens a house on its book. A file is brought up to date by itself; a server by `migrate`, as the owner.
pub(crate) async fn open(book: &Book, clock: Clock) -> anyhow::Result<House> {
    std::fs::create_dir_all(&book.data)
        .with_context(|| format!("the data directory {} cannot be made", book.data.display()))?;
    let secrets = Secrets::open(&book.secrets()).context("the secrets cannot serve")?;
    let db = Db::open(&book.place()).await.context("the database cannot be opened")?;
    if matches!(db, Db::Sqlite { .. }) {
        store::migrate::migrate(&db).await.context("the book cannot be brought up to date")?;
    } else {
        store::migrate::check(&db).await.context("run `tallystave migrate` as the owner")?;
    }
    House::open(db, secrets, clock).await.context("the house cannot be opened")
}

/// Serves until a signal comes, then answers what waits and closes.
pub(crate) async fn serve(serve: Serve) -> anyhow::Result<()> {
    let clock = clock(serve.simulated_from.as_deref())?;
    let house = open(&serve.book, clock).await?;
    let listener = TcpListener::bind(serve.listen)
        .await
        .with_context(|| format!("{} cannot be listened on", serve.listen))?;
    let address = listener.local_addr()?;
    let url = serve.public_url.clone().unwrap_or_else(|| format!("http://{address}"));
    if let Some(token) = house.offer_founding().await? {
        println!("No book yet. Found one with this one-time link: {url}/v1/founding#{token}");
    }
    println!("listening on {url}");
    let surroundings = Surroundings { behind_tls: serve.behind_tls, ..Surroundings::default() };
    run(house, listener, surroundings, signal()).await
}

/// The clock that a flag asks for.
pub(crate) fn clock(simulated_from: Option<&str>) -> anyhow::Result<Clock> {
    Ok(match simulated_from {
        Some(text) => Clock::simulated(Micros::parse(text)?),
        None => Clock::System,
    })
}

/// How long requests under way are waited for at the end.
const LAST_ANSWERS: std::time::Duration = std::time::Duration::from_secs(10);

/// Serves a house until `stop` comes: refuses new connections, answers what waits, closes within a deadline.
pub(crate) async fn run(
    house: House,
    listener: TcpListener,
    surroundings: Surroundings,
    stop: impl Future<Output = ()> + Send + 'static,
) -> anyhow::Result<()> {
    let (stopping, stopped) = oneshot::channel::<()>();
    let router = api::router(house.clone(), surroundings);
    let graceful = async move {
        stop.await;
        tracing::info!("stopping: answering what waits");
        let _ = stopping.send(());
    };
    let serving = axum::serve(listener, router).with_graceful_shutdown(graceful);
    let deadline = async {
        if stopped.await.is_ok() {
            tokio::time::sleep(LAST_ANSWERS).await;
        } else {
            std::future::pending::<()>().await;
        }
    };
    tokio::select! {
        served = async { serving.await } => served?,
        () = deadline => tracing::warn!("some requests were not answered in time"),
    }
    house.close().await;
    tracing::info!("closed");
    Ok(())
}

/// Waits for the signal to end.
pub(crate) async fn signal() {
    let interrupt = tokio::signal::ctrl_c();
    match tokio::signal::unix::signal(tokio::signal::unix::SignalKind::terminate()) {
        Ok(mut terminate) => {
            tokio::select! { _ = interrupt => {}, _ = terminate.recv() => {} }
        }
        Err(error) => {
            tracing::warn!(%error, "only an interrupt from the keyboard is heard");
            let _ = interrupt.await;
        }
    }
}
