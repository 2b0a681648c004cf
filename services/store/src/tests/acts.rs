//! Commands that tests send.

use std::collections::BTreeMap;
use std::sync::atomic::Ordering;

use domain::book::body::{
    LotStatus, MaterialDescribed, Premises, Preparation, Reading, Standing, VesselDescribed,
};
use domain::book::command::{
    Act, Add, Adopt, DirectoryPerson, Draw, Found, Issue, OpenBatch, Propose, Receive, SignOff,
    TakeReading,
};
use domain::book::command::{Blob, OpenDeviation};
use domain::book::role::Role;
use domain::ids::{BatchId, DeviationId, LotId, MaterialId, ProposalId, VesselId};
use domain::ledger::tree::Hash;
use domain::stamp::{Micros, Stamp};
use domain::units::Quantity;
use uuid::Uuid;

use super::book::{Book, ORIGIN, START, person, public_key};

pub(super) fn batch() -> BatchId {
    BatchId(Uuid::from_u128(0xba << 120))
}

pub(super) fn lot() -> LotId {
    LotId(Uuid::from_u128(0x10 << 120))
}

fn material() -> MaterialId {
    MaterialId(Uuid::from_u128(0xaa << 120))
}

fn vessel() -> VesselId {
    VesselId(Uuid::from_u128(0xee << 120))
}

pub(super) fn proposal() -> ProposalId {
    ProposalId(Uuid::from_u128(0x99 << 120))
}

pub(super) const fn at(minutes: i64) -> Stamp {
    Stamp::new(Micros(START).plus_minutes(minutes), 0)
}

pub(super) fn amount(entered: &str, unit: &str) -> Quantity {
    Quantity::parse_any(entered, unit).unwrap()
}

fn found() -> Act {
    Act::Found(Box::new(Found {
        code: "cellar".to_owned(),
        name: "The cellar".to_owned(),
        origin: ORIGIN.to_owned(),
        public_key: public_key(),
        time_zone: "UTC".to_owned(),
        offset_minutes: 0,
        licence: None,
        premises: vec![Premises {
            code: "main".to_owned(),
            kind: "bonded_wine_premises".to_owned(),
            name: "Main".to_owned(),
        }],
        simulation: true,
        single_handed: true,
        admin: DirectoryPerson {
            person: person(),
            login: "ada".to_owned(),
            name: "Ada".to_owned(),
            password_hash: "none".to_owned(),
            salt: vec![1; 16],
        },
    }))
}

fn describe_vessel() -> Act {
    Act::DescribeVessel(VesselDescribed {
        vessel: vessel(),
        code: "T1".to_owned(),
        name: "Tank 1".to_owned(),
        capacity: amount("2000", "L"),
        premises: "main".to_owned(),
    })
}

fn describe_material() -> Act {
    Act::DescribeMaterial(MaterialDescribed {
        material: material(),
        code: "M1".to_owned(),
        name: "Nutrient".to_owned(),
        category: "nutrient".to_owned(),
        dimension: "mass".to_owned(),
        listed_as: Vec::new(),
        composition: Vec::new(),
    })
}

fn receive() -> Act {
    Act::Receive(Box::new(Receive {
        lot: lot(),
        code: "L1".to_owned(),
        material: material(),
        supplier: None,
        supplier_lot: Some("S-1".to_owned()),
        amount: amount("25", "kg"),
        received_at: at(-60),
        expires_at: None,
        document: None,
        composition: Vec::new(),
        status: LotStatus::Released,
    }))
}

pub(super) fn open_batch(id: BatchId, code: &str) -> Act {
    Act::OpenBatch(Box::new(OpenBatch {
        batch: id,
        code: code.to_owned(),
        name: None,
        product_class: "grape_wine".to_owned(),
        premises: "main".to_owned(),
        destinations: Vec::new(),
        claims: Vec::new(),
        vessel: vessel(),
        opened_at: at(-30),
        volume: amount("1000", "L"),
        volume_basis: "dipstick".to_owned(),
        liquid: amount("1000", "L"),
        liquid_planned: None,
        expected_final: None,
        fermentable_sugar: None,
        demand: "medium".to_owned(),
        ingredients: Vec::new(),
    }))
}

pub(super) fn reading(of: BatchId, value: &str) -> Act {
    Act::TakeReading(Box::new(TakeReading {
        batch: of,
        taken_at: at(0),
        captured_at: None,
        reported_at: None,
        sample: None,
        laboratory: None,
        values: vec![value_of(value)],
        note: None,
    }))
}

pub(super) fn value_of(value: &str) -> Reading {
    Reading {
        quantity: "ph".to_owned(),
        value: value.to_owned(),
        qualifier: None,
        unit: "[pH]".to_owned(),
        expressed_as: None,
        sample_temperature: None,
        method: None,
        instrument: None,
        corrected: None,
        left_as_read: None,
    }
}

fn draws() -> Vec<Draw> {
    vec![Draw { lot: lot(), amount: amount("100", "g") }]
}

fn propose() -> Act {
    Act::Propose(Box::new(Propose {
        proposal: proposal(),
        batch: batch(),
        asked_at: at(0),
        planned_at: at(10),
        draws: draws(),
        carrier_water: None,
        preparation: Preparation::Slurry,
        purpose: None,
        prepared: None,
    }))
}

pub(super) fn add() -> Act {
    Act::Add(Box::new(Add {
        batch: batch(),
        proposal: None,
        done_at: at(1),
        captured_at: None,
        draws: draws(),
        carrier_water: None,
        preparation: Preparation::Slurry,
        already_done: Some("before anybody asked".to_owned()),
    }))
}

fn adopt() -> Act {
    let (_, text) = domain::rules::shipped().first().copied().unwrap();
    Act::Adopt(Adopt { text: text.to_owned(), standing: Standing::Production, from: at(-90) })
}

pub(super) fn open_deviation(number: u128, code: &str) -> Act {
    Act::OpenDeviation(OpenDeviation {
        deviation: DeviationId(Uuid::from_u128(0xde << 120 | number)),
        code: code.to_owned(),
        title: "The cooling failed".to_owned(),
        batch: Some(batch()),
        opened_at: at(0),
    })
}

/// Founds the book; whoever founds it may do everything else too.
pub(super) async fn begin(book: &Book) {
    book.act(found()).await.unwrap();
    for role in Role::ALL.into_iter().filter(|role| *role != Role::Admin) {
        book.act(Act::Grant(person(), role)).await.unwrap();
    }
}

/// A batch with its vessel.
pub(super) async fn furnish(book: &Book) {
    book.act(describe_vessel()).await.unwrap();
    book.act(open_batch(batch(), "B1")).await.unwrap();
}

/// A little of everything, so that no projection table stays empty.
pub(super) async fn live(book: &Book) {
    furnish(book).await;
    let settings = BTreeMap::from([("shift_hours".to_owned(), "10".to_owned())]);
    let acts = [
        Act::ChangeSettings(settings, "long shifts in harvest".to_owned()),
        describe_material(),
        receive(),
        reading(batch(), "3.4"),
        open_deviation(1, "D1"),
    ];
    for act in acts {
        book.act(act).await.unwrap();
    }
    let proposed = book.act(propose()).await.unwrap();
    let entry = &proposed.entries[0];
    let sign_off = SignOff {
        target: entry.id,
        meaning: "approved the exception".to_owned(),
        binds: entry.body["shown"].as_str().unwrap().to_owned(),
        reason: "as discussed".to_owned(),
        signed_at: at(2),
    };
    book.act(Act::SignOff(sign_off)).await.unwrap();
    book.act(adopt()).await.unwrap();
    book.clock.fetch_add(120_000_000, Ordering::Relaxed);
    book.act(add()).await.unwrap();
    book.act(issue(book).await).await.unwrap();
}

async fn issue(book: &Book) -> Act {
    let mut held = book.db.reader().await.unwrap();
    let n = crate::log::count_of(&mut held.conn(), book.site.number, &batch().into()).await;
    let document = |text: &str| Blob {
        digest: Hash::of(text.as_bytes()).0,
        media_type: "text/plain".to_owned(),
        bytes: text.as_bytes().to_vec(),
    };
    let (pdf, json) = (document("pdf"), document("json"));
    Act::Issue(Issue {
        batch: batch(),
        batch_n: n.unwrap(),
        log_size: book.size().await,
        pdf: Hash(pdf.digest).to_string(),
        json: Hash(json.digest).to_string(),
        entries: Hash::of(b"entries").to_string(),
        to: "the inspector".to_owned(),
        issued_at: at(3),
        documents: vec![pdf, json],
    })
}
