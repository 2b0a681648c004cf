//! A second person signs what the checks refer: what is accepted, and everything that is not.
#![expect(clippy::unwrap_used, reason = "a test that finds nothing to unwrap fails, as it should")]

use serde_json::{Value, json};
use tests::cellar::PEOPLE;
use tests::{Answer, Cellar, Client, Engine, on_both_engines};

const BEN: &str = PEOPLE[1].2;
const CARO: &str = PEOPLE[2].2;

/// A must that has enough nitrogen, so that 1 kg of the salt is far over its need and needs a second person.
struct Referred {
    cellar: Cellar,
    lot: String,
    batch: String,
    proposed: Answer,
}

impl Referred {
    fn new(engine: Engine) -> Self {
        let mut cellar = Cellar::simulated(engine);
        let lot = cellar.receive("DP-0412", "DAP", "25", "kg");
        let mut body = cellar.batch("B1", "3000", "L");
        body["fermentable_sugar"] = json!({"g_per_l": "240", "basis": "composition"});
        let batch = cellar.ben.post("/v1/batches", &body).id();
        cellar.nitrogen(&batch, "0", "300");
        let proposed = cellar.propose(&batch, &[(&lot, "1000", "g")]).expect(201);
        assert_eq!(proposed.text("/verdict"), "refer", "{proposed:?}");
        Self { cellar, lot, batch, proposed }
    }

    /// What a signer sends for the proposal as it was shown.
    fn signature(&self, secret: &str) -> Value {
        json!({"meaning": "approved the exception", "shown": self.proposed.text("/shown"),
            "reason": "strong hydrogen sulfide", "secret": secret})
    }

    fn sign(&self, signer: &Client, signature: &Value) -> Answer {
        signer.post(&format!("/v1/entries/{}/signoffs", self.proposed.text("/entry")), signature)
    }

    fn add(&self, grams: &str) -> Answer {
        let proposal = self.proposed.text("/proposal");
        self.cellar.carry_out(&self.batch, &proposal, &[(&self.lot, grams, "g")])
    }

    /// Nothing was signed: neither is there a new entry nor may the addition be made.
    fn is_still_unsigned(&self, entries: u64) {
        assert_eq!(self.cellar.size(), entries);
        let refused = self.add("1000").expect_problem(409, "conflict");
        assert!(refused.text("/detail").contains("signature"), "{refused:?}");
        assert_eq!(self.cellar.deep_check(), entries);
    }
}

on_both_engines! {
    fn a_wrong_secret_signs_nothing(engine) {
        let it = Referred::new(engine);
        let before = it.cellar.size();
        for wrong in [BEN, "", "seven quiet hydrometers floa", "Seven quiet hydrometers float"] {
            it.sign(&it.cellar.caro, &it.signature(wrong)).expect_problem(401, "credentials-refused");
        }
        it.is_still_unsigned(before);
    }

    fn nobody_signs_their_own_proposal(engine) {
        let mut it = Referred::new(engine);
        let asked = it.cellar.proposal(&[(&it.lot, "1000", "g")]);
        let path = format!("/v1/batches/{}/proposals", it.batch);
        it.proposed = it.cellar.ben.post(&path, &asked).expect(201);
        let before = it.cellar.size();
        it.sign(&it.cellar.ben, &it.signature(BEN)).expect_problem(403, "forbidden");
        it.is_still_unsigned(before);
        it.sign(&it.cellar.caro, &it.signature(CARO)).expect(201);
    }

    fn a_signature_binds_what_was_shown_and_nothing_else(engine) {
        let mut it = Referred::new(engine);
        let older = it.signature(BEN);
        let mut altered = it.signature(BEN);
        altered["shown"] = json!("0".repeat(64));
        it.proposed = it.cellar.propose(&it.batch, &[(&it.lot, "1001", "g")]).expect(201);
        let before = it.cellar.size();
        it.sign(&it.cellar.ben, &older).expect_problem(409, "conflict");
        it.sign(&it.cellar.ben, &altered).expect_problem(409, "conflict");
        it.is_still_unsigned(before);
    }

    fn what_was_signed_for_one_proposal_is_not_signed_for_the_next(engine) {
        let mut it = Referred::new(engine);
        it.sign(&it.cellar.ben, &it.signature(BEN)).expect(201);
        it.proposed = it.cellar.propose(&it.batch, &[(&it.lot, "1000", "g")]).expect(201);
        it.is_still_unsigned(it.cellar.size());
    }

    fn a_lapsed_proposal_can_neither_be_signed_nor_carried_out(engine) {
        let mut it = Referred::new(engine);
        assert_eq!(it.proposed.text("/lapses_at"), "2025-09-08T20:00:00.000000-07:00");
        it.cellar.drive_to("2025-09-08T20:00:01-07:00");
        let before = it.cellar.size();
        let late = it.sign(&it.cellar.ben, &it.signature(BEN)).expect_problem(409, "conflict");
        assert!(late.text("/detail").contains("lapsed"), "{late:?}");
        let late = it.add("1000").expect_problem(409, "conflict");
        assert!(late.text("/detail").contains("lapsed"), "{late:?}");
        assert_eq!(it.cellar.deep_check(), before);
    }

    fn a_signature_runs_out(engine) {
        let mut it = Referred::new(engine);
        let settings = json!({"settings": {"signoff_valid_hours": "1"}, "reason": "a short shift"});
        let change = it.cellar.caro.request("PATCH", "/v1/settings").key(&tests::random_id());
        change.json(&settings).send().expect(200);
        it.sign(&it.cellar.ben, &it.signature(BEN)).expect(201);
        it.cellar.drive_to("2025-09-08T09:00:01-07:00");
        it.is_still_unsigned(it.cellar.size());
    }

    fn who_has_no_role_any_more_is_out_at_once_whatever_token_they_hold(engine) {
        let it = Referred::new(engine);
        let path = format!("/v1/people/{}/roles/lead", it.cellar.people[1]);
        let withdraw = it.cellar.dov.request("DELETE", &path).key(&tests::random_id());
        withdraw.send().expect(200);
        let before = it.cellar.size();
        it.sign(&it.cellar.ben, &it.signature(BEN)).expect_problem(401, "token-refused");
        it.cellar.ben.get("/v1/me").expect_problem(401, "token-refused");
        let again = it.cellar.nobody().try_sign_in("EXW", "ben", BEN);
        again.expect_problem(401, "credentials-refused");
        it.is_still_unsigned(before);
    }

    fn who_changed_from_lead_to_cellar_does_not_sign_with_the_old_token(engine) {
        let it = Referred::new(engine);
        let person = &it.cellar.people[1];
        for (method, role) in [("PUT", "cellar"), ("DELETE", "lead")] {
            let path = format!("/v1/people/{person}/roles/{role}");
            it.cellar.dov.request(method, &path).key(&tests::random_id()).send().expect(200);
        }
        let before = it.cellar.size();
        it.sign(&it.cellar.ben, &it.signature(BEN)).expect_problem(403, "forbidden");
        it.is_still_unsigned(before);
    }

    fn a_cellar_hand_does_not_sign(engine) {
        let it = Referred::new(engine);
        let before = it.cellar.size();
        it.sign(&it.cellar.ana, &it.signature(PEOPLE[0].2)).expect_problem(403, "forbidden");
        it.is_still_unsigned(before);
    }

    fn a_refused_proposal_cannot_be_signed(engine) {
        let mut it = Referred::new(engine);
        it.proposed = it.cellar.propose(&it.batch, &[(&it.lot, "3", "kg")]).expect(201);
        assert_eq!(it.proposed.text("/verdict"), "refuse");
        let before = it.cellar.size();
        it.sign(&it.cellar.ben, &it.signature(BEN)).expect_problem(409, "conflict");
        assert_eq!(it.cellar.deep_check(), before);
    }

    fn signed_once_it_is_carried_out_within_3_percent_and_not_outside(engine) {
        let it = Referred::new(engine);
        let signed = it.sign(&it.cellar.ben, &it.signature(BEN)).expect(201);
        assert_eq!(signed.text("/entries/0/kind"), "signoff.given");
        assert_eq!(signed.text("/entries/0/actor"), it.cellar.people[1]);
        assert_eq!(signed.text("/entries/0/body/binds"), it.proposed.text("/shown"));
        let said = String::from_utf8(signed.bytes).unwrap();
        assert!(!said.contains(BEN), "the secret never stands in the log");

        let before = it.cellar.size();
        for outside in ["1030.1", "969.9", "1"] {
            it.add(outside).expect_problem(409, "conflict");
        }
        assert_eq!(it.cellar.size(), before);
        let done = it.add("1030").expect(201);
        assert_eq!(done.json()["deviation"], Value::Null);
        assert_eq!(done.text("/entries/0/body/proposal"), it.proposed.text("/proposal"));
        assert_eq!(it.cellar.remaining(&it.lot), 23_970_000_000);
        it.add("1030").expect_problem(409, "conflict");
        it.sign(&it.cellar.ben, &it.signature(BEN)).expect_problem(409, "conflict");
        assert_eq!(it.cellar.deep_check(), before + 1);
    }
}
