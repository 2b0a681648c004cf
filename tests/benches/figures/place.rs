//! Where figures are taken: a cellar on its own database, which writes through to disk.

use std::sync::Arc;

use domain::book::body::Reading;
use domain::book::body::readings::Temperature;
use domain::book::command::{Act, TakeReading};
use domain::ids::{BatchId, CommandId};
use domain::stamp::Stamp;
use house::clock::Clock;
use house::secrets::Secrets;
use house::{Asked, Caller, House};
use store::{Db, Place};
use tests::postgres::Cluster;
use tests::{Cellar, Engine, Home};
use tokio::runtime::Runtime;

/// An empty place on this engine; PostgreSQL writes through to disk, as it does in production.
pub(crate) fn home(engine: Engine) -> Arc<Home> {
    match engine {
        Engine::Sqlite => Home::new(Engine::Sqlite),
        Engine::Postgres => Home::on(Arc::new(Cluster::start())),
    }
}

/// Opens batches, named after what is measured with them.
pub(crate) fn batches(cellar: &Cellar, name: &str, how_many: usize) -> Vec<String> {
    (0..how_many).map(|index| cellar.open(&format!("{name}-{index}"), "3000", "L")).collect()
}

/// A house opened within this very program, on a book whose program has ended.
#[derive(Clone, Debug)]
pub(crate) struct Within {
    pub(crate) house: House,
    pub(crate) caller: Caller,
}

impl Within {
    /// Opens the book of a cellar that was served until now.
    pub(crate) fn open(runtime: &Runtime, cellar: &mut Cellar) -> Self {
        let home = Arc::clone(cellar.program.home());
        let token = cellar.ana.token().expect("a token of Ana's").to_owned();
        assert!(cellar.program.terminate().success());
        runtime.block_on(async {
            let place =
                home.serving_url().map_or_else(|| Place::Directory(home.data()), Place::Url);
            let db = Db::open(&place).await.expect("the database");
            let secrets = Secrets::open(&home.data().join("secrets")).expect("the secrets");
            let house = House::open(db, secrets, Clock::System).await.expect("the house");
            let caller = house.caller(&token).await.expect("Ana");
            Self { house, caller }
        })
    }

    /// Records one gravity of a batch now.
    pub(crate) async fn record(&self, batch: BatchId) {
        let values = vec![Reading {
            quantity: "gravity".to_owned(),
            value: "1.0900".to_owned(),
            unit: "sg_20_20".to_owned(),
            qualifier: None,
            expressed_as: None,
            sample_temperature: Some(Temperature {
                value: "20.0".to_owned(),
                unit: "Cel".to_owned(),
            }),
            method: None,
            instrument: None,
            corrected: None,
            left_as_read: None,
        }];
        let key: CommandId = self.house.draw().expect("randomness");
        let mut print = [0; 32];
        print[..16].copy_from_slice(key.0.as_bytes());
        let taking = TakeReading {
            batch,
            taken_at: Stamp::new(self.house.now(), 0),
            captured_at: None,
            reported_at: None,
            sample: None,
            laboratory: None,
            values,
            note: None,
        };
        let act = Act::TakeReading(Box::new(taking));
        let asked = Asked { caller: self.caller.clone(), key, print, expects: None, act };
        self.house.submit(asked).await.expect("a reading recorded");
    }
}

/// As many workers as the machine has processors.
pub(crate) fn runtime() -> Runtime {
    tokio::runtime::Builder::new_multi_thread().enable_all().build().expect("a runtime")
}

/// Ids of batches, for the house.
pub(crate) fn ids(batches: &[String]) -> Vec<BatchId> {
    batches.iter().map(|id| id.parse().expect("an id")).collect()
}
