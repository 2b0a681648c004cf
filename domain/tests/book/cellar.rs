//! An invented works with its people, vessels, materials and lots: the setting of the tests. All of it is made up.

use std::collections::BTreeMap;
use std::sync::Arc;

use domain::book::body::{
    AdditionRecorded, Body, Component, DeviationOpened, InstrumentDescribed, LotStatus,
    MaterialDescribed, PartyDescribed, Premises, Preparation, ProposalAssessed, Reading, Standing,
    VesselDescribed,
};
use domain::book::command::{
    Act, Add, Adopt, DirectoryPerson, Draw, Enrol, Found, OpenBatch, Propose, Receive, Refusal,
    SignOff, TakeReading,
};
use domain::book::role::Role;
use domain::book::state::State;
use domain::book::subject::{Subject, SubjectKind};
use domain::checks::Verdict;
use domain::ids::{BatchId, EntryId, HoldingId, InstrumentId, LotId, MaterialId, PersonId, SiteId};
use domain::ledger::entry::Entry;
use domain::stamp::Stamp;
use domain::units::Quantity;
use uuid::Uuid;

use crate::bench::{Ledger, Who, at};

/// The works, with the clock set by each call.
#[derive(Clone, Debug)]
pub(crate) struct Cellar {
    pub(crate) ledger: Ledger,
    pub(crate) ana: Who,
    pub(crate) ben: Who,
    pub(crate) caro: Who,
    pub(crate) dov: Who,
}

/// A proposal as it was answered.
#[derive(Clone, Debug)]
pub(crate) struct Answer {
    pub(crate) entry: EntryId,
    pub(crate) said: ProposalAssessed,
}

impl Answer {
    pub(crate) fn verdict(&self) -> Verdict {
        self.said.assessment.verdict
    }

    /// Supply after the addition, mg N/L.
    pub(crate) fn supply(&self) -> &str {
        self.said.assessment.account_after.supply_mg_l.as_deref().unwrap_or("")
    }

    /// The rules that found something above information.
    pub(crate) fn found(&self) -> Vec<&str> {
        found(&self.said.assessment)
    }
}

/// The rules that found something above information, gravest first.
pub(crate) fn found(assessment: &domain::checks::Assessment) -> Vec<&str> {
    let above = assessment.findings.iter().filter(|finding| finding.verdict > Verdict::Clear);
    above.map(|finding| finding.rule.as_str()).collect()
}

/// `900 g`, as a quantity.
pub(crate) fn quantity(text: &str) -> Quantity {
    let (number, unit) = text.split_once(' ').unwrap();
    Quantity::parse_any(number, unit).unwrap()
}

fn who(number: u128, roles: &[Role]) -> Who {
    let person = uuid::Builder::from_u128(number).with_version(uuid::Version::Random).into_uuid();
    Who { person: PersonId(person), roles: roles.iter().copied().collect() }
}

fn directory(who: &Who, login: &str, name: &str) -> DirectoryPerson {
    DirectoryPerson {
        person: who.person,
        login: login.to_owned(),
        name: name.to_owned(),
        password_hash: "$argon2id$v=19$m=8,t=1,p=1$c2FsdHNhbHQ$aGFzaA".to_owned(),
        salt: who.person.0.as_bytes().to_vec(),
    }
}

/// Material code, name, category, names on positive lists, composition.
type MaterialRow = (
    &'static str,
    &'static str,
    &'static str,
    &'static [&'static str],
    &'static [(&'static str, &'static str)],
);

/// Compositions of the invented lots; fractions in UCUM units.
const MATERIALS: &[MaterialRow] = &[
    (
        "DP",
        "Diammonium phosphate",
        "nutrient",
        &["diammonium_phosphate"],
        &[("diammonium_phosphate", "100 %")],
    ),
    ("AU", "Yeast autolysate", "nutrient", &["autolysed_yeast"], &[("amino_nitrogen", "4.6 %")]),
    (
        "RH",
        "Rehydration product",
        "nutrient",
        &["autolysed_yeast", "thiamine_hydrochloride"],
        &[("amino_nitrogen", "4.0 %"), ("thiamine_hydrochloride", "1.0 g/kg")],
    ),
    (
        "KM",
        "Potassium metabisulfite",
        "sulfite",
        &["potassium_metabisulfite"],
        &[("sulfur_dioxide", "57.629 %")],
    ),
    ("YW", "Dry wine yeast", "yeast", &[], &[]),
    ("YD", "Dry distillers yeast", "yeast", &[], &[]),
    ("ML", "Cane molasses", "base", &[], &[]),
    ("CS", "Raw cane sugar", "sugar", &[], &[]),
    ("SB", "Stillage of an earlier run", "base", &[], &[]),
];

/// Lot code, amount, day and time received.
const LOTS: &[(&str, &str, &str)] = &[
    ("KM-0033", "2000 g", "05-12 10:00"),
    ("DP-0387", "500 g", "06-02 10:00"),
    ("DP-0412", "25000 g", "09-08 09:00"),
    ("AU-0208", "10000 g", "09-08 09:05"),
    ("RH-0091", "5000 g", "09-08 09:10"),
    ("YW-0001", "2 kg", "09-08 09:15"),
    ("YD-0001", "2 kg", "09-08 09:20"),
];

/// The same, for the wash.
const LOTS_FOR_THE_WASH: &[(&str, &str, &str)] = &[
    ("ML-0501", "1000 kg", "09-15 09:00"),
    ("CS-0502", "200 kg", "09-15 09:05"),
    ("SB-019", "400 L", "09-19 09:00"),
];

impl Cellar {
    /// A founded site: people, reference data, adopted sets; no lot yet.
    pub(crate) fn founded(single_handed: bool) -> Self {
        let opening = at("05-01 08:00");
        let site = SiteId(
            uuid::Builder::from_u128(0x0e_70).with_version(uuid::Version::Random).into_uuid(),
        );
        let mut cellar = Self {
            ledger: Ledger::new(site, opening.at),
            ana: who(0xa1, &[Role::Cellar]),
            ben: who(0xb2, &[Role::Lead]),
            caro: who(0xc3, &[Role::Quality]),
            dov: who(0xd4, &[Role::Admin]),
        };
        let found = founding(&cellar.dov, single_handed);
        let dov = cellar.dov.clone();
        cellar.done(&dov, Act::Found(Box::new(found)));
        cellar.enrol();
        cellar.adopt_shipped();
        cellar.describe();
        cellar
    }

    /// A founded site with the lots that came until 8 September, and the clock there.
    pub(crate) fn stocked() -> Self {
        let mut cellar = Self::founded(false);
        cellar.receive_first();
        cellar
    }

    /// The lots that came until 8 September.
    pub(crate) fn receive_first(&mut self) {
        self.receive_all(LOTS);
    }

    /// The lots that came for the wash.
    pub(crate) fn receive_for_the_wash(&mut self) {
        self.receive_all(LOTS_FOR_THE_WASH);
    }

    fn receive_all(&mut self, lots: &[(&str, &str, &str)]) {
        for (code, amount, when) in lots {
            self.receive(code, amount, when).unwrap();
        }
    }

    fn enrol(&mut self) {
        let dov = self.dov.clone();
        let people =
            [(&self.ana, "ana"), (&self.ben, "ben"), (&self.caro, "caro")].map(|(who, login)| {
                let name = format!("{}{} Example", login[..1].to_uppercase(), &login[1..]);
                let roles = who.roles.iter().copied().collect();
                Enrol { person: directory(who, login, &name), roles }
            });
        for person in people {
            self.done(&dov, Act::Enrol(person));
        }
    }

    fn adopt_shipped(&mut self) {
        let dov = self.dov.clone();
        let here = ["us-wine", "common-practice"];
        for (_, text) in domain::rules::shipped().iter().filter(|(id, _)| here.contains(id)) {
            let adopt = Adopt {
                text: (*text).to_owned(),
                standing: Standing::Production,
                from: at("05-01 08:00"),
            };
            self.done(&dov, Act::Adopt(adopt));
        }
    }

    fn describe(&mut self) {
        let dov = self.dov.clone();
        for (code, name, category, listed_as, composition) in MATERIALS {
            let dimension = if *code == "SB" { "volume" } else { "mass" };
            let material = MaterialDescribed {
                material: self.ledger.id(),
                code: (*code).to_owned(),
                name: (*name).to_owned(),
                category: (*category).to_owned(),
                dimension: dimension.to_owned(),
                listed_as: listed_as.iter().map(|&name| name.to_owned()).collect(),
                composition: composition.iter().map(component).collect(),
            };
            self.done(&dov, Act::DescribeMaterial(material));
        }
        let supplier = PartyDescribed {
            party: self.ledger.id(),
            code: "NUT".to_owned(),
            name: "Example Nutrient Supplier".to_owned(),
            address: Some("1 Example Road\nExampleville".to_owned()),
            licence: None,
        };
        self.done(&dov, Act::DescribeParty(supplier));
        for (code, capacity, premises) in
            [("T-12", "3500 L", "W"), ("T-13", "3500 L", "W"), ("F-3", "2400 L", "D")]
        {
            let vessel = VesselDescribed {
                vessel: self.ledger.id(),
                code: code.to_owned(),
                name: "Fermenter".to_owned(),
                capacity: quantity(capacity),
                premises: premises.to_owned(),
            };
            self.done(&dov, Act::DescribeVessel(vessel));
        }
        let hydrometer = InstrumentDescribed {
            instrument: self.ledger.id(),
            code: "H-1".to_owned(),
            name: "Hydrometer".to_owned(),
            calibrated_on: Some("2025-03-01".to_owned()),
            calibration_due: Some("2026-03-01".to_owned()),
            certificate: Some("EX-17".to_owned()),
        };
        self.done(&dov, Act::DescribeInstrument(hydrometer));
    }

    /// Sets the clock.
    pub(crate) fn clock(&mut self, when: &str) -> Stamp {
        let stamp = at(when);
        self.ledger.clock = stamp.at;
        stamp
    }

    /// A command that must be done.
    pub(crate) fn done(&mut self, who: &Who, act: Act) -> Vec<Arc<Entry>> {
        self.ledger.ask(who, act).unwrap()
    }

    fn coded(&self, kind: SubjectKind, code: &str) -> Uuid {
        self.ledger.coded(kind, code).unwrap_or_else(|| panic!("no {} {code}", kind.name()))
    }

    pub(crate) fn lot(&self, code: &str) -> LotId {
        LotId(self.coded(SubjectKind::Lot, code))
    }

    pub(crate) fn material(&self, code: &str) -> MaterialId {
        MaterialId(self.coded(SubjectKind::Material, code))
    }

    pub(crate) fn instrument(&self, code: &str) -> InstrumentId {
        InstrumentId(self.coded(SubjectKind::Instrument, code))
    }

    /// A receipt, ready to be asked or put in the place of another.
    pub(crate) fn receipt(&mut self, code: &str, amount: &str, when: &str) -> Receive {
        let material = code.split('-').next().unwrap();
        Receive {
            lot: self.ledger.id(),
            code: code.to_owned(),
            material: self.material(material),
            supplier: Some(self.coded(SubjectKind::Party, "NUT").into()),
            supplier_lot: Some(format!("S-{code}")),
            amount: quantity(amount),
            received_at: at(when),
            expires_at: None,
            document: Some("Delivery note 4711".to_owned()),
            composition: Vec::new(),
            status: LotStatus::Released,
        }
    }

    /// Receives a lot, the clock being five minutes later than the receipt.
    pub(crate) fn receive(
        &mut self,
        code: &str,
        amount: &str,
        when: &str,
    ) -> Result<LotId, Refusal> {
        self.ledger.clock = self.ledger.clock.max(at(when).at.plus_minutes(5));
        let receive = self.receipt(code, amount, when);
        let lot = receive.lot;
        let ana = self.ana.clone();
        self.ledger.ask(&ana, Act::Receive(Box::new(receive))).map(|_| lot)
    }

    pub(crate) fn draws(&self, lines: &[(&str, &str)]) -> Vec<Draw> {
        let draw =
            |(lot, amount): &(&str, &str)| Draw { lot: self.lot(lot), amount: quantity(amount) };
        lines.iter().map(draw).collect()
    }

    /// A batch of 3,000 L of white must in T-12, as the scenario's batch B is: SG 1.0940 to 0.9920.
    pub(crate) fn must(&mut self, code: &str, vessel: &str, when: &str) -> OpenBatch {
        OpenBatch {
            batch: self.ledger.id(),
            code: code.to_owned(),
            name: Some("White must".to_owned()),
            product_class: "grape_wine".to_owned(),
            premises: "W".to_owned(),
            destinations: ["US", "EU", "CA"].map(str::to_owned).to_vec(),
            claims: vec!["dry".to_owned()],
            vessel: self.coded(SubjectKind::Vessel, vessel).into(),
            opened_at: at(when),
            volume: quantity("3000 L"),
            volume_basis: "dip table".to_owned(),
            liquid: quantity("3000 L"),
            liquid_planned: None,
            expected_final: Some((
                "0.9920".to_owned(),
                "sg_20_20".to_owned(),
                "glucose and fructose to nothing".to_owned(),
            )),
            fermentable_sugar: None,
            demand: "medium".to_owned(),
            ingredients: Vec::new(),
        }
    }

    pub(crate) fn open(&mut self, batch: OpenBatch) -> BatchId {
        let (ben, id) = (self.ben.clone(), batch.batch);
        self.ledger.clock = self.ledger.clock.max(batch.opened_at.at.plus_minutes(5));
        self.done(&ben, Act::OpenBatch(Box::new(batch)));
        id
    }

    pub(crate) fn take(&mut self, reading: TakeReading) -> Vec<Arc<Entry>> {
        let ana = self.ana.clone();
        self.done(&ana, Act::TakeReading(Box::new(reading)))
    }

    /// A gravity on the 20 °C scale with the liquid's temperature beside it, recorded at once.
    pub(crate) fn gravity(
        &mut self,
        batch: BatchId,
        when: &str,
        sg: &str,
        celsius: &str,
    ) -> Vec<Arc<Entry>> {
        self.clock(when);
        let values = [("gravity", sg, "sg_20_20"), ("temperature", celsius, "Cel")];
        self.take(reading(batch, when, &values))
    }

    /// A laboratory's ammonium and primary amino nitrogen in mg/L, reported when the clock says.
    pub(crate) fn nitrogen(
        &mut self,
        batch: BatchId,
        sampled: &str,
        reported: &str,
        [ammonium, expressed_as, amino]: [&str; 3],
    ) -> Vec<Arc<Entry>> {
        let reported_at = self.clock(reported);
        let values = [("ammonium", ammonium, "mg/L"), ("primary_amino_nitrogen", amino, "mg/L")];
        let mut reading = reading(batch, sampled, &values);
        reading.values[0].expressed_as = Some(expressed_as.to_owned());
        reading.reported_at = Some(reported_at);
        reading.laboratory = Some("Example Laboratory".to_owned());
        reading.sample = Some(format!("EX {sampled}"));
        self.take(reading)
    }

    /// A proposal for these lots, asked when the clock says.
    pub(crate) fn proposal(
        &mut self,
        batch: BatchId,
        planned: &str,
        lines: &[(&str, &str)],
    ) -> Propose {
        Propose {
            proposal: self.ledger.id(),
            batch,
            asked_at: Stamp::new(self.ledger.clock, -420),
            planned_at: at(planned),
            draws: self.draws(lines),
            carrier_water: None,
            preparation: Preparation::Slurry,
            purpose: None,
            prepared: None,
        }
    }

    pub(crate) fn propose(&mut self, who: &Who, propose: Propose) -> Answer {
        let entries = self.done(who, Act::Propose(Box::new(propose)));
        assert_eq!(entries.len(), 1);
        Answer { entry: entries[0].id, said: proposal_of(&entries[0]) }
    }

    /// Ana asks at `asked` whether these lots may go in at `planned`, in so much water.
    pub(crate) fn asks(
        &mut self,
        batch: BatchId,
        [asked, planned]: [&str; 2],
        lines: &[(&str, &str)],
        water: Option<&str>,
    ) -> Answer {
        self.clock(asked);
        let mut propose = self.proposal(batch, planned, lines);
        propose.carrier_water = water.map(quantity);
        let ana = self.ana.clone();
        self.propose(&ana, propose)
    }

    /// Ana carries a proposal out as proposed, and records it at once.
    pub(crate) fn adds(&mut self, answer: &Answer, when: &str) -> Result<Vec<Arc<Entry>>, Refusal> {
        self.clock(when);
        let add = carrying_out(answer, when);
        self.add(add)
    }

    pub(crate) fn add(&mut self, add: Add) -> Result<Vec<Arc<Entry>>, Refusal> {
        let ana = self.ana.clone();
        self.ledger.ask(&ana, Act::Add(Box::new(add)))
    }

    /// The command that records what nobody asked about.
    pub(crate) fn already(&self, batch: BatchId, when: &str, lines: &[(&str, &str)]) -> Add {
        Add {
            batch,
            proposal: None,
            done_at: at(when),
            captured_at: None,
            draws: self.draws(lines),
            carrier_water: None,
            preparation: Preparation::Powder,
            already_done: Some("nobody was there to ask".to_owned()),
        }
    }

    /// An approval of what the proposal showed.
    pub(crate) fn signing(&self, answer: &Answer) -> SignOff {
        SignOff {
            target: answer.entry,
            meaning: "approved the exception".to_owned(),
            binds: answer.said.shown.clone(),
            reason: "strong hydrogen sulfide; cooling repaired".to_owned(),
            signed_at: Stamp::new(self.ledger.clock, -420),
        }
    }

    pub(crate) fn signs(
        &mut self,
        who: &Who,
        when: &str,
        answer: &Answer,
    ) -> Result<Vec<Arc<Entry>>, Refusal> {
        self.clock(when);
        let sign_off = self.signing(answer);
        self.ledger.ask(who, Act::SignOff(sign_off))
    }

    pub(crate) fn lot_status(&mut self, when: &str, code: &str, status: LotStatus, reason: &str) {
        self.clock(when);
        let (lot, caro) = (self.lot(code), self.caro.clone());
        self.done(&caro, Act::ChangeLotStatus(lot, status, reason.to_owned()));
    }

    /// What the book has left of a lot, in base units, by the table that pages read.
    pub(crate) fn remaining(&self, code: &str) -> i64 {
        let lot = self.lot(code);
        match self.ledger.row("lot", vec![lot.0.into()]).last() {
            Some(domain::book::table::Cell::Int(base)) => *base,
            other => panic!("{code} has {other:?} left"),
        }
    }

    /// Booked mass of a holding, µg, by the table.
    pub(crate) fn booked_mass(&self, holding: HoldingId) -> i64 {
        match self.ledger.row("holding", vec![holding.0.into()])[4] {
            domain::book::table::Cell::Int(base) => base,
            ref other => panic!("a holding of {other:?}"),
        }
    }

    /// The state of a subject, folded from the log alone.
    pub(crate) fn state(&self, subject: impl Into<Subject>) -> State {
        let subject = subject.into();
        let entries = self.ledger.entries_of(subject, usize::MAX);
        let in_force = domain::book::in_force::in_force(subject, &entries).unwrap();
        State::fold(subject, &in_force)
    }
}

fn founding(admin: &Who, single_handed: bool) -> Found {
    let premises = [
        ("W", "bonded_wine_premises", "Wine cellar"),
        ("D", "distilled_spirits_plant", "Still house"),
    ];
    Found {
        code: "EXW".to_owned(),
        name: "Example Works".to_owned(),
        origin: "log.example.org/exw".to_owned(),
        public_key: "log.example.org/exw+00000000+AQAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAAA"
            .to_owned(),
        time_zone: "America/Los_Angeles".to_owned(),
        offset_minutes: -420,
        licence: Some("EX-W-0001".to_owned()),
        premises: premises
            .map(|(code, kind, name)| Premises {
                code: code.to_owned(),
                kind: kind.to_owned(),
                name: name.to_owned(),
            })
            .to_vec(),
        simulation: true,
        single_handed,
        admin: directory(admin, "dov", "Dov Example"),
    }
}

fn component((substance, fraction): &(&str, &str)) -> Component {
    Component { substance: (*substance).to_owned(), fraction: quantity(fraction) }
}

fn value((quantity, value, unit): &(&str, &str, &str)) -> Reading {
    Reading {
        quantity: (*quantity).to_owned(),
        value: (*value).to_owned(),
        qualifier: None,
        unit: (*unit).to_owned(),
        expressed_as: None,
        sample_temperature: None,
        method: None,
        instrument: None,
        corrected: None,
        left_as_read: None,
    }
}

/// What an entry says.
pub(crate) fn body_of(entry: &Entry) -> Body {
    Body::read(&entry.kind, entry.kv, &entry.body).unwrap()
}

fn proposal_of(entry: &Entry) -> ProposalAssessed {
    match body_of(entry) {
        Body::ProposalAssessed(body) => body,
        other => panic!("not a proposal: {other:?}"),
    }
}

pub(crate) fn addition_of(entry: &Entry) -> AdditionRecorded {
    match body_of(entry) {
        Body::AdditionRecorded(body) => body,
        other => panic!("not an addition: {other:?}"),
    }
}

pub(crate) fn deviation_of(entry: &Entry) -> DeviationOpened {
    match body_of(entry) {
        Body::DeviationOpened(body) => body,
        other => panic!("not a deviation: {other:?}"),
    }
}

/// Settings by name, for changing them.
pub(crate) fn settings(pairs: &[(&str, &str)]) -> BTreeMap<String, String> {
    pairs.iter().map(|(name, value)| ((*name).to_owned(), (*value).to_owned())).collect()
}

/// A reading of these values: quantity, number, unit.
pub(crate) fn reading(batch: BatchId, when: &str, values: &[(&str, &str, &str)]) -> TakeReading {
    TakeReading {
        batch,
        taken_at: at(when),
        captured_at: None,
        reported_at: None,
        sample: None,
        laboratory: None,
        values: values.iter().map(value).collect(),
        note: None,
    }
}

/// The command that carries a proposal out exactly as proposed.
pub(crate) fn carrying_out(answer: &Answer, when: &str) -> Add {
    let said = &answer.said;
    let draw =
        |line: &domain::book::body::Line| Draw { lot: line.lot, amount: line.amount.clone() };
    Add {
        batch: said.batch,
        proposal: Some(said.proposal),
        done_at: at(when),
        captured_at: None,
        draws: said.lines.iter().map(draw).collect(),
        carrier_water: said.carrier_water.clone(),
        preparation: said.preparation,
        already_done: None,
    }
}
