//! What a second look at the book found, one true sentence each.

use domain::book::body::{Body, LotStatus};
use domain::book::command::{
    Act, Amend, AmendTo, CorrectClock, OpenBatch, Refusal, RefusalKind, SignOff,
};
use domain::book::role::Role;
use domain::book::state::State;
use domain::checks::Verdict;
use domain::ids::{BatchId, EntryId};

use crate::bench::{Who, at};
use crate::cellar::{Answer, Cellar, carrying_out, deviation_of, quantity};

fn must() -> (Cellar, BatchId) {
    let mut cellar = Cellar::founded(false);
    cellar.receive_first();
    let opening = cellar.must("EXW-25-B1", "T-12", "09-08 14:30");
    let batch = cellar.open(opening);
    cellar.nitrogen(batch, "09-08 16:00", "09-08 20:00", ["52", "NH4", "98"]);
    cellar.gravity(batch, "09-09 09:00", "1.0940", "15.0");
    (cellar, batch)
}

/// 2,600 g of diammonium phosphate: lawful and far beyond the need.
fn referred(cellar: &mut Cellar, batch: BatchId) -> Answer {
    let asked = ["09-09 10:00", "09-09 12:00"];
    let answer = cellar.asks(batch, asked, &[("DP-0412", "2600 g")], None);
    assert_eq!(answer.verdict(), Verdict::Refer, "{:?}", answer.found());
    answer
}

fn amend(cellar: &mut Cellar, who: &Who, target: EntryId, to: AmendTo) -> Result<(), Refusal> {
    let amended_at = cellar.clock("09-09 16:00");
    let amend = Amend { target, effect: to, reason: "a second look".to_owned(), amended_at };
    cellar.ledger.ask(who, Act::Amend(Box::new(amend))).map(|_| ())
}

#[test]
fn only_an_approval_of_the_exception_lets_it_pass() {
    for meaning in ["performed", "reviewed", "released", "approved the exception"] {
        let (mut cellar, batch) = must();
        let answer = referred(&mut cellar, batch);
        let ben = cellar.ben.clone();
        cellar.clock("09-09 10:05");
        let signing = SignOff { meaning: meaning.to_owned(), ..cellar.signing(&answer) };
        let _ = cellar.ledger.ask(&ben, Act::SignOff(signing)).unwrap();
        let found = cellar.adds(&answer, "09-09 12:00");
        assert_eq!(found.is_ok(), meaning == "approved the exception", "{meaning}: {found:?}");
    }
}

#[test]
fn powder_is_not_carried_out_where_slurry_was_proposed() {
    let (mut cellar, batch) = must();
    let asked = ["09-09 10:00", "09-09 12:00"];
    let answer = cellar.asks(batch, asked, &[("DP-0412", "600 g")], None);
    let mut add = carrying_out(&answer, "09-09 12:00");
    add.preparation = domain::book::body::Preparation::Powder;
    cellar.clock("09-09 12:00");
    let refusal = cellar.add(add).unwrap_err();
    assert!(refusal.detail.contains("another form"), "{refusal:?}");
}

#[test]
fn a_hold_given_after_the_clock_was_set_back_holds() {
    let (mut cellar, _) = must();
    cellar.lot_status("09-10 10:00", "DP-0412", LotStatus::Held, "torn bag");
    cellar.lot_status("09-10 11:00", "DP-0412", LotStatus::Released, "mended");
    let dov = cellar.dov.clone();
    let correct = CorrectClock { reason: "it was a day ahead".to_owned(), at: at("09-09 11:00") };
    let _ = cellar.ledger.ask(&dov, Act::CorrectClock(correct)).unwrap();
    cellar.ledger.clock = at("09-09 11:05").at;
    let caro = cellar.caro.clone();
    let hold =
        Act::ChangeLotStatus(cellar.lot("DP-0412"), LotStatus::Held, "torn again".to_owned());
    let _ = cellar.ledger.ask(&caro, hold).unwrap();
    let State::Lot(lot) = cellar.state(cellar.lot("DP-0412")) else { panic!("no lot") };
    assert_eq!(lot.status, LotStatus::Held);
}

#[test]
fn a_corrected_receipt_does_not_release_what_quality_holds() {
    let (mut cellar, _) = must();
    cellar.lot_status("09-09 10:00", "DP-0412", LotStatus::Held, "torn bag");
    let entry = cellar.ledger.log.iter().rev().find(|e| e.kind == "lot.received").unwrap().clone();
    let code = entry.body["code"].as_str().unwrap().to_owned();
    let mut receipt = cellar.receipt("DP-0412", "25001 g", "09-09 11:00");
    receipt.lot = cellar.lot("DP-0412");
    let target =
        cellar.ledger.log.iter().find(|e| e.kind == "lot.received" && e.body["code"] == "DP-0412");
    let target = target.unwrap().id;
    let ben = cellar.ben.clone();
    amend(&mut cellar, &ben, target, AmendTo::Receipt(Box::new(receipt))).unwrap();
    let State::Lot(lot) = cellar.state(cellar.lot("DP-0412")) else { panic!("no lot") };
    assert_eq!(lot.status, LotStatus::Held, "the last receipt was {code}");
}

#[test]
fn what_something_was_done_with_is_corrected_and_not_undone() {
    let (mut cellar, batch) = must();
    let ben = cellar.ben.clone();
    let opened = cellar.ledger.log.iter().find(|e| e.kind == "batch.opened").unwrap().clone();
    let refusal = amend(&mut cellar, &ben, opened.id, AmendTo::Void).unwrap_err();
    assert_eq!(refusal.kind, RefusalKind::Conflict);
    assert!(refusal.detail.contains("lean on this batch"), "{refusal:?}");

    let opening = cellar.must("EXW-25-B1", "T-12", "09-08 14:30");
    let smaller =
        OpenBatch { batch, volume: quantity("2900 L"), liquid: quantity("2900 L"), ..opening };
    amend(&mut cellar, &ben, opened.id, AmendTo::Opening(Box::new(smaller))).unwrap();
    let State::Batch(state) = cellar.state(batch) else { panic!("no batch") };
    let (_, now) = state.opened.unwrap();
    assert_eq!(now.liquid.base(), 2_900_000_000);
    assert_eq!(now.holding.0.to_string(), opened.body["holding"].as_str().unwrap());
}

#[test]
fn a_fill_beyond_the_vessel_and_from_a_held_lot_is_recorded_with_a_deviation() {
    let mut cellar = Cellar::founded(false);
    cellar.receive_first();
    cellar.lot_status("09-08 13:00", "KM-0033", LotStatus::Held, "no certificate");
    let opening = cellar.must("EXW-25-B1", "T-12", "09-08 14:30");
    let full = OpenBatch {
        volume: quantity("9000 L"),
        liquid: quantity("9000 L"),
        ingredients: cellar.draws(&[("KM-0033", "10 g")]),
        ..opening
    };
    let ben = cellar.ben.clone();
    cellar.clock("09-08 14:30");
    let entries = cellar.ledger.ask(&ben, Act::OpenBatch(Box::new(full))).unwrap();
    assert_eq!(entries[0].kind, "batch.opened");
    let found = deviation_of(&entries[1]).findings;
    let rules: Vec<_> = found.iter().map(|finding| finding.rule.as_str()).collect();
    assert_eq!(rules, ["vessel.over-capacity", "lot.status"]);
}

#[test]
fn what_was_done_before_the_stated_opening_is_recorded_all_the_same() {
    let (mut cellar, batch) = must();
    let add = cellar.already(batch, "09-08 13:00", &[("DP-0412", "100 g")]);
    cellar.clock("09-09 10:00");
    let entries = cellar.add(add).unwrap();
    assert!(matches!(crate::cellar::body_of(&entries[0]), Body::AdditionRecorded(_)));
}

#[test]
fn what_is_too_much_for_one_entry_is_refused_and_told_how_to_split() {
    let (mut cellar, batch) = must();
    let mut reading =
        crate::cellar::reading(batch, "09-09 10:00", &[("temperature", "15.0", "Cel")]);
    reading.note = Some("x".repeat(70_000));
    cellar.clock("09-09 10:00");
    let ana = cellar.ana.clone();
    let refusal = cellar.ledger.ask(&ana, Act::TakeReading(Box::new(reading))).unwrap_err();
    assert_eq!(refusal.kind, RefusalKind::Meaningless);
    assert!(refusal.detail.contains("several parts"), "{refusal:?}");
}

#[test]
fn roles_count_as_they_are_under_the_lock() {
    let (mut cellar, batch) = must();
    let [ben, dov] = [&cellar.ben, &cellar.dov].map(Clone::clone);
    let answer = referred(&mut cellar, batch);
    let gone = Act::Withdraw(ben.person, Role::Lead, None);
    let _ = cellar.ledger.ask(&dov, gone.clone()).unwrap();
    // Ben's command still says that he is a lead: it was made before.
    let refusal = cellar.signs(&ben, "09-09 10:05", &answer).unwrap_err();
    assert_eq!(refusal.kind, RefusalKind::Forbidden);
    let refusal = cellar.ledger.ask(&dov, gone).unwrap_err();
    assert_eq!(refusal.kind, RefusalKind::Conflict, "nothing to withdraw is no success to repeat");
}

#[test]
fn ammonium_says_as_what_it_is_counted() {
    let (mut cellar, batch) = must();
    let values = [("ammonium", "52", "mg/L"), ("primary_amino_nitrogen", "98", "mg/L")];
    let reading = crate::cellar::reading(batch, "09-09 10:00", &values);
    cellar.clock("09-09 10:00");
    let ana = cellar.ana.clone();
    let refusal = cellar.ledger.ask(&ana, Act::TakeReading(Box::new(reading))).unwrap_err();
    assert_eq!(refusal.pointer.as_deref(), Some("/values/0/expressed_as"));
}

#[test]
fn a_gravity_told_as_a_bound_is_no_point_of_the_curve() {
    let (mut cellar, batch) = must();
    let mut reading =
        crate::cellar::reading(batch, "09-10 10:00", &[("gravity", "1.0000", "sg_20_20")]);
    cellar.clock("09-10 10:00");
    reading.values[0].qualifier = Some("<".to_owned());
    cellar.take(reading);
    let State::Batch(state) = cellar.state(batch) else { panic!("no batch") };
    assert_eq!(state.gravities.len(), 1);
}
