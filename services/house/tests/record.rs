//! Records as they leave the house: complete, the same for ever, and in the book once handed out.
#![expect(clippy::unwrap_used, reason = "a test fails where it stands")]

#[path = "record/book.rs"]
mod book;

use std::collections::BTreeMap;

use domain::book::command::{Act, AmendTo, RefusalKind, ResolveDeviation};
use domain::ids::{CommandId, DeviationId};
use domain::ledger::canonical;
use domain::ledger::note::Checkpoint;
use domain::ledger::tree::{Frontier, Hash};
use domain::stamp::{Micros, Stamp};
use store::writer::WriteError;

use crate::book::{Book, Cellar, at, grams, micros, refusal};

/// The story of the molasses wash, with a refused, an unsigned and a signed proposal, a dose thrown in at night, a
/// mistyped gravity, a wrong supplier lot and a reading that never was.
async fn story(book: &Book) -> Cellar {
    let cellar = book.cellar().await;
    book.now("09-22T10:00");
    let first = Book::gravity(&cellar, "1.0665", Some("27.0"));
    book.read(&cellar, at("09-22T10:00"), vec![first]).await;
    book.read_at(&cellar, "09-22T18:00", "1.0665").await;
    let (proposal, _) = book.propose(&cellar, "09-22T18:10", cellar.autolysate, "1600").await;
    book.now("09-22T18:10");
    book.add(&cellar, proposal, cellar.autolysate, "1600").await;
    book.now("09-22T21:00");
    book.nitrogen(&cellar, "09-22T16:30", ["13", "47"]).await;
    book.read_at(&cellar, "09-23T06:00", "1.0570").await;
    book.propose(&cellar, "09-23T06:20", cellar.held, "500").await;
    book.propose(&cellar, "09-23T06:30", cellar.dap, "2000").await;
    book.now("09-23T06:30");
    let (proposal, _) = book.propose(&cellar, "09-23T06:30", cellar.dap, "400").await;
    book.add(&cellar, proposal, cellar.dap, "400").await;
    book.read_at(&cellar, "09-23T16:00", "1.0465").await;
    night(book, &cellar).await;
    cellar
}

async fn night(book: &Book, cellar: &Cellar) {
    book.now("09-24T09:05");
    let typed = Book::gravity(cellar, "1.0730", Some("20.0"));
    let typed = book.read(cellar, at("09-24T02:30"), vec![typed]).await;
    let slip = Book::gravity(cellar, "1.0370", Some("20.0"));
    book.amend(&book.ana, typed, AmendTo::Value(0, Box::new(slip)), "slip shows 1.0370").await;
    let entries = book.thrown_in(cellar, "09-24T02:40", "300", "night shift, pump tripped").await;
    let deviation: DeviationId = entries[1].body["deviation"].as_str().unwrap().parse().unwrap();
    let never = book.read_at(cellar, "09-24T09:10", "1.0990").await;
    book.amend(&book.ben, never, AmendTo::Void, "read in another tank").await;
    let (proposal, proposed) = book.propose(cellar, "09-24T18:00", cellar.dap, "150").await;
    book.now("09-24T14:20");
    book.sign(&proposed, "strong hydrogen sulfide").await;
    book.now("09-24T18:05");
    book.add(cellar, proposal, cellar.dap, "151").await;
    let receipt = Book::receipt(
        cellar.dap,
        "DP-0412",
        cellar.dap_material,
        cellar.supplier,
        "P-1077",
        grams("25000"),
    );
    let lot = book
        .log()
        .await
        .iter()
        .map(|stored| stored.entry().unwrap())
        .find(|entry| entry.kind == "lot.received" && entry.body["code"] == "DP-0412");
    let receipt = AmendTo::Receipt(Box::new(receipt));
    book.amend(&book.caro, lot.unwrap().id, receipt, "label reads P-1077").await;
    book.now("10-06T10:00");
    let resolve = ResolveDeviation {
        deviation,
        cause: "the cooling pump tripped".to_owned(),
        action: "distil within three days".to_owned(),
        conclusion: "fit for spirit".to_owned(),
        resolved_at: at("10-06T10:00"),
    };
    book.act(&book.caro, Act::ResolveDeviation(resolve)).await.unwrap();
}

#[tokio::test]
async fn the_record_tells_the_whole_story_on_paper() {
    let book = Book::found().await;
    let cellar = story(&book).await;
    let drawn = book.house.batch_record(&book.ana, cellar.batch, None).await.unwrap();
    let pages = book.pages(&drawn.pdf);
    for (index, page) in pages.iter().enumerate() {
        for said in [
            format!("page {} of {}", index + 1, pages.len()),
            "SIMULATION".to_owned(),
            "NOT ISSUED".to_owned(),
            "Local requirements prevail".to_owned(),
            format!("entries 1 to {}", drawn.batch_n),
            format!("ledger head exw.example/book at {}", drawn.log_size),
        ] {
            assert!(page.contains(&said), "page {} lacks {said:?}: {page}", index + 1);
        }
    }
    let text = pages.join(" ");
    for said in [
        "America/Los_Angeles (UTC-07:00)",
        "distilled spirits plant",
        "ML-0501",
        "360 kg",
        "DP-0412",
        "851 g",
        "Example Nutrient Supplier, 1 Example Road, Example Town",
        "its lot P-1077; document DN-88",
        "its lot P-1007",
        "“label reads P-1077”",
        "1.0665 SG at 27.0 °C",
        "corrected as in entry 3 HY-1",
        "HY-1 hydrometer, calibrated 2025-03-01, due 2026-03-01",
        "1.0730 SG at 20.0 °C struck through, now 1.0370 SG at 20.0 °C",
        "“slip shows 1.0370”",
        "1.0990 SG at 20.0 °C struck through, now voided: did not happen",
        "“read in another tank”",
        "Example Laboratory, sample S-77, reported 2025-09-22 21:00",
        "assimilable nitrogen 60.0 mg N/L",
        "refused; not done",
        "not signed, not done; lapsed 2025-09-23 18:30",
        "certificate missing",
        "for 2025-09-24 18:00, done 151 g (+0.7 %)",
        "Ben Example, lead, 2025-09-24 14:20: approved the exception, valid until 2025-09-25 02:20",
        "“strong hydrogen sulfide”",
        "entered 2025-09-24 09:05, 6 h 25 min after the act",
        "“night shift, pump tripped”",
        "the cooling pump tripped",
        "fit for spirit",
        "Caro Example, quality, 2025-10-06 10:00: resolved the deviation",
        "the sample of 2025-09-22 16:30 was answered later",
        "+42.4",
        "common-practice",
        "confined space",
        "Ethyl carbamate outlook",
        "feed the yeast",
    ] {
        assert!(text.contains(said), "{said:?} is not in {text}");
    }
    for verdict in ["clear", "advise", "refer", "refuse"] {
        assert!(text.contains(verdict));
    }
}

/// Goal: a record of the first n entries is the same after more was written, whatever it was.
/// Method: draw all n and an n inside the story, write 100 more entries of every sort that touches the batch, its
/// lots, its people and the site, and draw both again.
#[tokio::test]
async fn a_record_as_of_n_has_the_same_bytes_after_a_hundred_more_entries() {
    let book = Book::found().await;
    let cellar = story(&book).await;
    let whole = book.house.batch_record(&book.ana, cellar.batch, None).await.unwrap();
    let half = book.house.batch_record(&book.ana, cellar.batch, Some(9)).await.unwrap();
    let before = book.log().await.len();
    let late = book.read_at(&cellar, "10-06T11:00", "1.0160").await;
    book.amend(&book.ben, late, AmendTo::Void, "not this batch").await;
    for hours in 0..46 {
        book.house.set_clock(micros(hours, "10-06T12:00")).unwrap();
        let value = Book::gravity(&cellar, "1.0155", None);
        book.read(&cellar, at("09-25T06:00"), vec![value]).await;
        let settings = BTreeMap::from([("late_entry_hours".to_owned(), (hours + 3).to_string())]);
        let act = Act::ChangeSettings(settings, "trying out".to_owned());
        book.act(&book.caro, act).await.unwrap();
    }
    let reason = "leaves".to_owned();
    let role = domain::book::role::Role::Lead;
    book.act(&book.dov, Act::Withdraw(book.ben.person, role, Some(reason))).await.unwrap();
    book.adopt().await;
    let receipt = Book::receipt(
        cellar.dap,
        "DP-0412",
        cellar.dap_material,
        cellar.supplier,
        "P-9999",
        grams("24000"),
    );
    let lot = book
        .log()
        .await
        .iter()
        .map(|stored| stored.entry().unwrap())
        .find(|entry| entry.kind == "lot.received" && entry.body["code"] == "DP-0412");
    let receipt = AmendTo::Receipt(Box::new(receipt));
    book.amend(&book.caro, lot.unwrap().id, receipt, "counted again").await;
    let status = domain::book::body::LotStatus::Rejected;
    let reason = "smells".to_owned();
    book.act(&book.caro, Act::ChangeLotStatus(cellar.dap, status, reason)).await.unwrap();
    let amended = book
        .log()
        .await
        .iter()
        .map(|stored| stored.entry().unwrap())
        .find(|entry| entry.kind == "addition.recorded");
    book.amend(&book.caro, amended.unwrap().id, AmendTo::Void, "was never done").await;
    assert!(book.log().await.len() >= before + 100, "{}", book.log().await.len() - before);

    for (drawn, n) in [(&whole, whole.batch_n), (&half, 9)] {
        let again = book.house.batch_record(&book.caro, cellar.batch, Some(n)).await.unwrap();
        assert_eq!(again.json_bytes().unwrap(), drawn.json_bytes().unwrap());
        assert!(again.pdf == drawn.pdf, "the PDF of n = {n} differs");
        assert_eq!(again, *drawn);
    }
    let newest = book.house.batch_record(&book.ana, cellar.batch, None).await.unwrap();
    assert_ne!(newest.pdf, whole.pdf);
    assert!(book.pages(&newest.pdf).join(" ").contains("voided: did not happen"));
}

#[tokio::test]
async fn the_head_on_a_record_is_that_of_the_log_at_its_size_and_signed() {
    let book = Book::found().await;
    let cellar = story(&book).await;
    let log = book.log().await;
    for n in [1, 4, 9] {
        let drawn = book.house.batch_record(&book.ana, cellar.batch, Some(n)).await.unwrap();
        let mut tree = Frontier::default();
        for stored in log.iter().take(usize::try_from(drawn.log_size).unwrap()) {
            tree.push(stored.leaf_hash);
        }
        let head = &drawn.json["head"];
        assert_eq!(head["root"], tree.root().to_string());
        let key = book.house.verifier("exw.example/book").unwrap();
        let note = Checkpoint::verify(head["note"].as_str().unwrap(), &key).unwrap();
        assert_eq!(note.head(), tree.head());
        let last = &log[usize::try_from(drawn.log_size).unwrap() - 1].entry().unwrap();
        assert_eq!(
            drawn.json["drawn_up"],
            Stamp::in_zone(last.recorded_at, "America/Los_Angeles").to_string()
        );
        assert_eq!(drawn.json["entries"].as_array().unwrap().len() as u64, n);
    }
}

#[tokio::test]
async fn issuing_is_written_once_with_the_digests_of_what_was_handed_out() {
    let book = Book::found().await;
    let cellar = story(&book).await;
    book.now("10-07T09:00");
    let key: CommandId = book.house.draw().unwrap();
    let issue = |print| {
        let to = " Inspector Example, case 25-118 ".to_owned();
        book.house.issue_record(book.caro.clone(), key, print, cellar.batch, to)
    };
    let before = book.log().await.len();
    let issued = issue([7; 32]).await.unwrap();
    let entry = &issued.receipt.entries[0];
    assert_eq!(book.log().await.len(), before + 1);
    assert_eq!(entry.kind, "record.issued");
    assert_eq!(entry.body["to"], "Inspector Example, case 25-118");
    assert_eq!(entry.body["batch_n"].as_u64().unwrap() + 1, entry.subjects[0].n);

    let pdf = book.house.issued_document(&book.ana, entry.id).await.unwrap();
    let json = book.house.issued_json(&book.ana, entry.id).await.unwrap();
    assert_eq!(entry.body["pdf"], Hash::of(&pdf).to_string());
    assert_eq!(entry.body["json"], Hash::of(&json).to_string());
    assert_eq!(
        (&issued.pdf, &issued.json),
        (&Hash::of(&pdf).to_string(), &Hash::of(&json).to_string())
    );
    let text = book.pages(&pdf).join(" ");
    assert!(text.contains("issued 2025-10-07 09:00 to Inspector Example, case 25-118"));
    assert!(!text.contains("NOT ISSUED"));

    book.read_at(&cellar, "10-07T10:00", "1.0155").await;
    let after = book.log().await.len();
    let again = issue([7; 32]).await.unwrap();
    assert_eq!(book.log().await.len(), after, "a repeat writes nothing");
    assert_eq!((again.receipt.entries[0].id, &again.pdf), (entry.id, &issued.pdf));
    let other = issue([8; 32]).await.unwrap_err();
    assert!(matches!(other, house::HouseError::Write(WriteError::KeyReused)), "{other:?}");

    let mut held = book.db.reader().await.unwrap();
    let kept = store::log::kept_heads(&mut held.conn(), book.site.number).await.unwrap();
    let size = entry.body["log_size"].as_u64().unwrap();
    assert!(kept.iter().any(|head| head.size == size), "the head left the house and is kept");
    drop(held);
    store::verify::verify(&book.db, &book.site).await.unwrap();
}

#[tokio::test]
async fn the_json_record_is_canonical_and_its_digests_are_those_of_the_log() {
    let book = Book::found().await;
    let cellar = story(&book).await;
    let drawn = book.house.batch_record(&book.ana, cellar.batch, None).await.unwrap();
    let bytes = drawn.json_bytes().unwrap();
    let read: serde_json::Value = serde_json::from_slice(&bytes).unwrap();
    assert_eq!(canonical::document(&read).unwrap(), bytes);
    assert_eq!(read, drawn.json);
    assert_eq!(read["simulation"], true);
    assert_eq!(read["issued"], false);
    assert!(read["deferral"].as_str().unwrap().contains("not legal advice"));

    let log = book.log().await;
    let mut hashes = Vec::new();
    for (n, listed) in (1_u64..).zip(read["entries"].as_array().unwrap()) {
        let stored = &log[usize::try_from(listed["seq"].as_u64().unwrap()).unwrap()];
        assert_eq!(listed["n"], n);
        assert_eq!(listed["leaf_hash"], stored.leaf_hash.to_string());
        assert_eq!(listed["id"], stored.entry().unwrap().id.to_string());
        hashes.extend(stored.leaf_hash.0);
    }
    assert_eq!(read["entries_digest"], Hash::of(&hashes).to_string());
    assert_eq!(drawn.entries_digest, Hash::of(&hashes).to_string());

    let readings = read["readings"].as_array().unwrap();
    let slip = readings.iter().find(|one| one["body"]["values"][0]["value"] == "1.0370").unwrap();
    assert_eq!(slip["amendments"][0]["was"]["body"]["values"][0]["value"], "1.0730");
    assert_eq!(slip["amendments"][0]["reason"], "slip shows 1.0370");
    let never = readings.iter().find(|one| one["void"] == true).unwrap();
    assert_eq!(never["amendments"][0]["voids"], true);
    let dap = read["materials"]
        .as_array()
        .unwrap()
        .iter()
        .find(|one| one["receipt"]["body"]["code"] == "DP-0412");
    assert_eq!(dap.unwrap()["uses"].as_array().unwrap().len(), 3);
    assert_eq!(read["signatures"][0]["body"]["reason"], "strong hydrogen sulfide");
}

#[tokio::test]
async fn what_cannot_be_drawn_or_handed_out_is_refused_with_a_reason() {
    let book = Book::found().await;
    let cellar = book.cellar().await;
    let unknown = book.house.draw().unwrap();
    let error = book.house.batch_record(&book.ana, unknown, None).await.unwrap_err();
    assert_eq!(refusal(error).kind, RefusalKind::Unknown);
    for n in [0, 2, u64::MAX] {
        let error = book.house.batch_record(&book.ana, cellar.batch, Some(n)).await.unwrap_err();
        assert_eq!(refusal(error).kind, RefusalKind::Meaningless, "n = {n}");
    }
    let before = book.log().await.len();
    for (caller, to, kind) in [
        (&book.ana, "somebody", RefusalKind::Forbidden),
        (&book.caro, "   ", RefusalKind::Meaningless),
    ] {
        let key = book.house.draw().unwrap();
        let issued =
            book.house.issue_record(caller.clone(), key, [9; 32], cellar.batch, to.to_owned());
        assert_eq!(refusal(issued.await.unwrap_err()).kind, kind);
    }
    assert_eq!(book.log().await.len(), before);
    let opening = book.log().await.last().unwrap().entry().unwrap().id;
    let error = book.house.issued_document(&book.ana, opening).await.unwrap_err();
    assert_eq!(refusal(error).kind, RefusalKind::Unknown);
}

/// Told to the minute, an addition may lie before the proposal that it carries out.
#[tokio::test]
async fn a_dose_told_to_the_minute_still_carries_its_proposal_out_once() {
    let book = Book::found().await;
    let cellar = book.cellar().await;
    book.read_at(&cellar, "09-22T10:00", "1.0685").await;
    book.house.set_clock(Micros(at("09-22T10:10").at.0 + 30_000_000)).unwrap();
    let (proposal, _) = book.propose(&cellar, "09-22T10:10", cellar.autolysate, "400").await;
    let dose = |minute| book.dose(&cellar, at(minute), proposal, cellar.autolysate, "400");
    dose("09-22T10:10").await.unwrap();
    let again = dose("09-22T10:11").await.unwrap_err();
    assert!(refusal(again).detail.contains("carried out already"));
    let drawn = book.house.batch_record(&book.ana, cellar.batch, None).await.unwrap();
    let text = book.pages(&drawn.pdf).join(" ");
    assert!(text.contains("Proposals not carried out none recorded for this batch"), "{text}");
}

#[tokio::test]
async fn an_erased_person_stands_by_pseudonym() {
    let book = Book::found().await;
    let cellar = story(&book).await;
    let mut tx = book.db.begin().await.unwrap();
    assert!(
        store::directory::erase(&mut tx.conn(), book.site.number, book.ben.person).await.unwrap()
    );
    tx.commit().await.unwrap();
    let drawn = book.house.batch_record(&book.ana, cellar.batch, None).await.unwrap();
    let text = book.pages(&drawn.pdf).join(" ");
    assert!(!text.contains("Ben Example"));
    assert!(drawn.json.to_string().contains(&book.ben.person.to_string()));
}
