//! Gravities on every scale, as the book takes them.

use domain::book::body::{Body, Reading};
use domain::book::command::{Act, Amend, AmendTo, Refusal, RefusalKind, TakeReading};
use domain::book::state::State;
use domain::book::state::batch::Gravity;
use domain::densimetry::Scale;
use domain::ids::{BatchId, EntryId};

use crate::cellar::{Cellar, reading};

/// A must that nothing was read of yet.
fn must() -> (Cellar, BatchId) {
    let mut cellar = Cellar::founded(false);
    cellar.receive_first();
    let opening = cellar.must("EXW-25-B1", "T-12", "09-08 14:30");
    let batch = cellar.open(opening);
    cellar.nitrogen(batch, "09-08 16:00", "09-08 20:00", ["52", "NH4", "98"]);
    (cellar, batch)
}

fn pitch(cellar: &mut Cellar, batch: BatchId, when: &str) {
    let asked = cellar.asks(batch, [when, when], &[("YW-0001", "750 g")], None);
    cellar.adds(&asked, when).unwrap();
}

/// Takes one gravity and gives back the entry and the value as it was kept.
fn gravity(
    cellar: &mut Cellar,
    batch: BatchId,
    when: &str,
    on: (&str, &str),
) -> (EntryId, Reading) {
    cellar.clock(when);
    let entry = cellar.take(reading(batch, when, &[("gravity", on.0, on.1)])).remove(0);
    let Body::ReadingTaken(body) = Body::read(&entry.kind, entry.kv, &entry.body).unwrap() else {
        panic!("no reading")
    };
    (entry.id, body.values[0].clone())
}

fn gravities(cellar: &Cellar, batch: BatchId) -> Vec<Gravity> {
    let State::Batch(state) = cellar.state(batch) else { panic!("no batch") };
    state.gravities.clone()
}

fn refused(cellar: &mut Cellar, take: TakeReading) -> Refusal {
    let ana = cellar.ana.clone();
    cellar.ledger.ask(&ana, Act::TakeReading(Box::new(take))).unwrap_err()
}

/// One must of SG 1.0900, as each scale shows it at its own temperature.
const MUST: [(&str, &str); 8] = [
    ("sg_20_20", "1.0900"),
    ("sg_60_60", "1.0904"),
    ("plato", "21.57"),
    ("brix", "21.57"),
    ("oechsle", "90.0"),
    ("kmw", "18.23"),
    ("baume_145", "11.97"),
    ("refractometer_brix", "21.57"),
];

#[test]
fn a_gravity_on_any_scale_is_kept_as_read_and_brought_to_20_20() {
    assert_eq!(
        MUST.map(|(scale, _)| scale).to_vec(),
        Scale::all().map(Scale::name).collect::<Vec<_>>()
    );
    for (scale, shown) in MUST {
        let (mut cellar, batch) = must();
        let (_, value) = gravity(&mut cellar, batch, "09-09 09:00", (shown, scale));
        assert_eq!((value.value.as_str(), value.unit.as_str()), (shown, scale));
        assert_eq!(value.left_as_read, None);
        let corrected = value.corrected.unwrap();
        let known: f64 = corrected.sg_20_20.parse().unwrap();
        assert!((known - 1.09).abs() < 0.0001, "{scale}: {known}");
        let extract: f64 = corrected.apparent_extract_percent.parse().unwrap();
        assert!((extract - 21.57).abs() < 0.02, "{scale}: {extract}");
        assert!(corrected.method.starts_with("taken as read"), "{}", corrected.method);
        assert_eq!(corrected.correction.trim_start_matches('-'), "0.00000", "{scale}");
        let point = gravities(&cellar, batch)[0];
        assert_eq!(format!("{:.5}", point.sg), corrected.sg_20_20);
    }
}

#[test]
fn a_refractometer_is_a_gravity_until_yeast_goes_in_and_then_it_is_kept_as_read() {
    let (mut cellar, batch) = must();
    let on = ("22.0", "refractometer_brix");
    assert!(gravity(&mut cellar, batch, "09-09 08:00", on).1.corrected.is_some());
    pitch(&mut cellar, batch, "09-09 09:00");
    let (_, value) = gravity(&mut cellar, batch, "09-10 09:00", ("15.0", "refractometer_brix"));
    assert_eq!((value.value.as_str(), &value.corrected), ("15.0", &None));
    let why = value.left_as_read.unwrap();
    for word in ["yeast went in before", "not as a gravity", "±0.5 % vol", "read a hydrometer"] {
        assert!(why.contains(word), "{why}");
    }
    assert_eq!(gravities(&cellar, batch).len(), 1);
    let (_, value) = gravity(&mut cellar, batch, "09-10 09:10", ("8.0", "brix"));
    assert!(value.corrected.is_some() && value.left_as_read.is_none());
    assert_eq!(gravities(&cellar, batch).len(), 2);
}

#[test]
fn a_refractometer_is_no_gravity_once_the_extract_has_fallen_without_yeast() {
    let (mut cellar, batch) = must();
    gravity(&mut cellar, batch, "09-09 08:00", ("22.0", "refractometer_brix"));
    let (_, same) = gravity(&mut cellar, batch, "09-09 09:00", ("21.8", "refractometer_brix"));
    assert!(same.corrected.is_some(), "{same:?}");
    let (_, fallen) = gravity(&mut cellar, batch, "09-10 09:00", ("21.5", "refractometer_brix"));
    assert!(fallen.left_as_read.unwrap().contains("has fallen"));
    gravity(&mut cellar, batch, "09-11 09:00", ("18.0", "brix"));
    let (_, later) = gravity(&mut cellar, batch, "09-12 09:00", ("22.0", "refractometer_brix"));
    assert!(later.left_as_read.unwrap().contains("has fallen"));
    assert_eq!(gravities(&cellar, batch).len(), 3);
}

#[test]
fn a_refractometer_beside_measured_alcohol_is_no_gravity() {
    for (strength, is_gravity) in [("0", true), ("0.8", false)] {
        let (mut cellar, batch) = must();
        cellar.clock("09-09 09:00");
        let values = [("gravity", "22.0", "refractometer_brix"), ("ethanol", strength, "%{vol}")];
        cellar.take(reading(batch, "09-09 09:00", &values));
        assert_eq!(gravities(&cellar, batch).len(), usize::from(is_gravity), "{strength}");
    }
}

#[test]
fn the_first_refractometer_reading_may_be_amended_downwards() {
    let (mut cellar, batch) = must();
    let ana = cellar.ana.clone();
    let first = gravity(&mut cellar, batch, "09-09 08:00", ("25.0", "refractometer_brix"));
    for shown in ["22.0", "21.0"] {
        let right = reading(batch, "09-09 08:00", &[("gravity", shown, "refractometer_brix")]);
        let value = AmendTo::Value(0, Box::new(right.values[0].clone()));
        for effect in [AmendTo::Reading(Box::new(right)), value] {
            let amended_at = cellar.clock("09-09 08:30");
            let reason = "slip".to_owned();
            let amend = Amend { target: first.0, effect, reason, amended_at };
            cellar.ledger.ask(&ana, Act::Amend(Box::new(amend))).unwrap();
            let now = gravities(&cellar, batch);
            assert_eq!(format!("{:.1}", now[0].extract), shown);
        }
    }
}

#[test]
fn what_is_too_hot_to_correct_is_kept_as_read_with_the_reason() {
    let (mut cellar, batch) = must();
    cellar.clock("09-09 09:00");
    let mut take = reading(batch, "09-09 09:00", &[("gravity", "1.0500", "sg_20_20")]);
    take.values[0].sample_temperature =
        Some(domain::book::body::readings::Temperature { value: "95".into(), unit: "Cel".into() });
    let entry = cellar.take(take).remove(0);
    let Body::ReadingTaken(body) = Body::read(&entry.kind, entry.kv, &entry.body).unwrap() else {
        panic!("no reading")
    };
    assert_eq!(body.values[0].corrected, None);
    assert!(body.values[0].left_as_read.as_ref().unwrap().contains("cool or warm the sample"));
    assert!(gravities(&cellar, batch).is_empty());
}

#[test]
fn an_unknown_scale_and_a_number_off_its_scale_name_every_scale() {
    let (mut cellar, batch) = must();
    cellar.clock("09-09 09:00");
    for (shown, scale, pointer) in [
        ("1.0500", "sg", "/values/0/unit"),
        ("1050", "sg_20_20", "/values/0/value"),
        ("1050", "oechsle", "/values/0/value"),
        ("-3", "kmw", "/values/0/value"),
    ] {
        let refusal =
            refused(&mut cellar, reading(batch, "09-09 09:00", &[("gravity", shown, scale)]));
        assert_eq!(refusal.kind, RefusalKind::Meaningless);
        assert_eq!(refusal.pointer.as_deref(), Some(pointer));
        for known in Scale::all() {
            assert!(refusal.detail.contains(known.name()), "{}", refusal.detail);
        }
    }
}

#[test]
fn an_expected_final_is_on_a_scale_of_density() {
    for (value, scale, extract) in [("-8", "oechsle", "-2.0899"), ("0.9920", "sg_20_20", "-2.0899")]
    {
        let (mut cellar, _) = must();
        let mut opening = cellar.must("EXW-25-B2", "T-13", "09-09 09:30");
        opening.expected_final = Some((value.into(), scale.into(), "earlier batches".into()));
        let batch = cellar.open(opening);
        let State::Batch(state) = cellar.state(batch) else { panic!("no batch") };
        let (_, opened) = state.opened.as_ref().unwrap();
        let expected = opened.expected_final.as_ref().unwrap();
        assert_eq!(
            (expected.scale.as_str(), expected.apparent_extract_percent.as_str()),
            (scale, extract)
        );
    }
    let (mut cellar, _) = must();
    let ben = cellar.ben.clone();
    let mut opening = cellar.must("EXW-25-B2", "T-13", "09-09 09:30");
    opening.expected_final = Some(("5".into(), "refractometer_brix".into(), "habit".into()));
    cellar.clock("09-09 09:35");
    let refusal = cellar.ledger.ask(&ben, Act::OpenBatch(Box::new(opening))).unwrap_err();
    assert!(refusal.detail.contains("scale of density, such as sg_20_20"), "{}", refusal.detail);
}
