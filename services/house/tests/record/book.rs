//! A simulated book in a directory that goes away with it, and the people who write in it.

use std::path::Path;
use std::process::Command as Program;

use domain::book::body::readings::Temperature;
use domain::book::body::{
    Component, InstrumentDescribed, LotStatus, MaterialDescribed, PartyDescribed, Premises,
    Preparation, Reading, Standing, VesselDescribed,
};
use domain::book::command::{
    Act, Add, Adopt, Amend, AmendTo, Draw, OpenBatch, Propose, Receive, Refusal, SignOff,
    TakeReading,
};
use domain::book::role::Role;
use domain::ids::{
    BatchId, EntryId, InstrumentId, LotId, MaterialId, PartyId, ProposalId, VesselId,
};
use domain::ledger::entry::Entry;
use domain::rules::shipped;
use domain::stamp::{Micros, Stamp};
use domain::units::{Dimension, Quantity};
use house::clock::Clock;
use house::founding::{Founding, NewPerson};
use house::secrets::Secrets;
use house::{Asked, Caller, House, HouseError};
use store::sites::Site;
use store::writer::Receipt;
use store::{Db, Place};

/// The password of everybody here.
const PASSWORD: &str = "made up for tests: seven herons";

pub(crate) struct Book {
    pub(crate) house: House,
    pub(crate) db: Db,
    pub(crate) site: Site,
    pub(crate) dov: Caller,
    pub(crate) ana: Caller,
    pub(crate) ben: Caller,
    pub(crate) caro: Caller,
    pub(crate) directory: tempfile::TempDir,
}

/// What stands in the cellar.
pub(crate) struct Cellar {
    pub(crate) batch: BatchId,
    pub(crate) supplier: PartyId,
    pub(crate) dap_material: MaterialId,
    pub(crate) dap: LotId,
    pub(crate) autolysate: LotId,
    pub(crate) held: LotId,
    pub(crate) hydrometer: InstrumentId,
}

pub(crate) fn at(text: &str) -> Stamp {
    Stamp::parse(&format!("2025-{text}:00-07:00")).unwrap()
}

pub(crate) fn grams(text: &str) -> Quantity {
    Quantity::parse(text, "g", Dimension::Mass).unwrap()
}

fn quantity(text: &str, unit: &str) -> Quantity {
    Quantity::parse_any(text, unit).unwrap()
}

impl Book {
    /// Founded on 2025-09-08 by Dov, with Ana in the cellar, Ben leading and Caro for quality.
    pub(crate) async fn found() -> Self {
        let directory = tempfile::tempdir().unwrap();
        let db = Db::open(&Place::Directory(directory.path().to_owned())).await.unwrap();
        store::migrate::migrate(&db).await.unwrap();
        let secrets = Secrets::open(&directory.path().join("secrets")).unwrap();
        let clock = Clock::simulated(at("09-08T09:00").at);
        let house = House::open(db.clone(), secrets, clock).await.unwrap();
        let founding = Founding {
            token: house.offer_founding().await.unwrap().unwrap(),
            code: "EXW".to_owned(),
            name: "Example Works".to_owned(),
            origin: "exw.example/book".to_owned(),
            time_zone: "America/Los_Angeles".to_owned(),
            licence: Some("DSP-EX-0001 (invented)".to_owned()),
            premises: vec![Premises {
                code: "DSP".to_owned(),
                kind: "distilled_spirits_plant".to_owned(),
                name: "Example plant".to_owned(),
            }],
            simulation: true,
            single_handed: false,
            admin: person("dov", "Dov Example"),
        };
        let (site, dov) = house.found(founding, house.draw().unwrap(), [1; 32]).await.unwrap();
        let dov = Caller { person: dov, site, roles: [Role::Admin].into() };
        let mut people = Vec::new();
        for (login, name, role) in [
            ("ana", "Ana Example", Role::Cellar),
            ("ben", "Ben Example", Role::Lead),
            ("caro", "Caro Example", Role::Quality),
        ] {
            let key = house.draw().unwrap();
            let new = person(login, name);
            let (person, _) =
                house.enrol(dov.clone(), key, [2; 32], new, vec![role]).await.unwrap();
            people.push(Caller { person, site, roles: [role].into() });
        }
        let [ana, ben, caro] = people.try_into().unwrap();
        let site = house.site(site).await.unwrap();
        Self { house, db, site, dov, ana, ben, caro, directory }
    }

    /// Drives the clock.
    pub(crate) fn now(&self, text: &str) {
        self.house.set_clock(at(text).at).unwrap();
    }

    fn local(&self) -> Stamp {
        Stamp::in_zone(self.house.now(), "America/Los_Angeles")
    }

    pub(crate) async fn act(&self, who: &Caller, act: Act) -> Result<Receipt, HouseError> {
        let (caller, key) = (who.clone(), self.house.draw().unwrap());
        self.house.submit(Asked { caller, key, print: [3; 32], expects: None, act }).await
    }

    async fn done(&self, who: &Caller, act: Act) -> EntryId {
        self.act(who, act).await.unwrap().entries[0].id
    }

    pub(crate) async fn adopt(&self) {
        let here = ["us-wine", "common-practice"];
        for (_, text) in shipped().iter().filter(|(id, _)| here.contains(id)) {
            let adopt = Adopt {
                text: (*text).to_owned(),
                standing: Standing::Production,
                from: self.local(),
            };
            self.done(&self.caro, Act::Adopt(adopt)).await;
        }
    }

    async fn material(
        &self,
        code: &str,
        name: &str,
        category: &str,
        holds: &[(&str, &str)],
    ) -> MaterialId {
        let material = self.house.draw().unwrap();
        let part = |(substance, percent): &(&str, &str)| Component {
            substance: (*substance).to_owned(),
            fraction: quantity(percent, "%"),
        };
        let body = MaterialDescribed {
            material,
            code: code.to_owned(),
            name: name.to_owned(),
            category: category.to_owned(),
            dimension: "mass".to_owned(),
            listed_as: Vec::new(),
            composition: holds.iter().map(part).collect(),
        };
        self.done(&self.ben, Act::DescribeMaterial(body)).await;
        material
    }

    pub(crate) fn receipt(
        lot: LotId,
        code: &str,
        material: MaterialId,
        supplier: PartyId,
        supplier_lot: &str,
        amount: Quantity,
    ) -> Receive {
        Receive {
            lot,
            code: code.to_owned(),
            material,
            supplier: Some(supplier),
            supplier_lot: Some(supplier_lot.to_owned()),
            amount,
            received_at: at("09-08T10:00"),
            expires_at: Some(at("12-31T00:00")),
            document: Some("DN-88".to_owned()),
            composition: Vec::new(),
            status: LotStatus::Released,
        }
    }

    async fn receive(
        &self,
        code: &str,
        material: MaterialId,
        supplier: PartyId,
        supplier_lot: &str,
        amount: Quantity,
    ) -> LotId {
        let lot = self.house.draw().unwrap();
        let receipt = Self::receipt(lot, code, material, supplier, supplier_lot, amount);
        self.done(&self.ana, Act::Receive(Box::new(receipt))).await;
        lot
    }

    /// The wash of the story: molasses and cane sugar, 2,000 L in F-3, opened on 09-22 at 09:50.
    pub(crate) async fn cellar(&self) -> Cellar {
        self.now("09-08T10:00");
        self.adopt().await;
        let supplier: PartyId = self.house.draw().unwrap();
        let party = PartyDescribed {
            party: supplier,
            code: "ENS".to_owned(),
            name: "Example Nutrient Supplier".to_owned(),
            address: Some("1 Example Road\nExample Town".to_owned()),
            licence: None,
        };
        self.done(&self.ben, Act::DescribeParty(party)).await;
        let dap_material = self
            .material("DAP", "diammonium phosphate", "nutrient", &[("diammonium_phosphate", "100")])
            .await;
        let autolysed = self
            .material("AUT", "yeast autolysate", "nutrient", &[("amino_nitrogen", "4.6")])
            .await;
        let molasses = self.material("MOL", "cane molasses", "base", &[]).await;
        let sugar = self.material("SUG", "raw cane sugar", "sugar", &[]).await;
        let dap = self.receive("DP-0412", dap_material, supplier, "P-1007", grams("25000")).await;
        let autolysate = self.receive("AU-0208", autolysed, supplier, "AU-5", grams("10000")).await;
        let held = self.receive("AU-0209", autolysed, supplier, "AU-6", grams("10000")).await;
        let ml = self.receive("ML-0501", molasses, supplier, "M-1", quantity("1000", "kg")).await;
        let cs = self.receive("CS-0502", sugar, supplier, "C-1", quantity("200", "kg")).await;
        let reason = "certificate missing".to_owned();
        self.done(&self.caro, Act::ChangeLotStatus(held, LotStatus::Held, reason)).await;
        let hydrometer = self.hydrometer().await;
        let vessel = self.vessel().await;
        self.now("09-22T09:50");
        let batch = self.house.draw().unwrap();
        let open = OpenBatch {
            batch,
            code: "EXW-25-A1".to_owned(),
            name: None,
            product_class: "wash".to_owned(),
            premises: "DSP".to_owned(),
            destinations: vec!["US".to_owned()],
            claims: Vec::new(),
            vessel,
            opened_at: self.local(),
            volume: quantity("2000", "L"),
            volume_basis: "dip at 20 °C".to_owned(),
            liquid: quantity("2000", "L"),
            liquid_planned: None,
            expected_final: Some(("1.0155".into(), "sg_20_20".into(), "composition".into())),
            fermentable_sugar: Some(("119.3".into(), "composition".into())),
            demand: "medium".to_owned(),
            ingredients: vec![
                Draw { lot: ml, amount: quantity("360", "kg") },
                Draw { lot: cs, amount: quantity("60", "kg") },
            ],
        };
        self.done(&self.ben, Act::OpenBatch(Box::new(open))).await;
        Cellar { batch, supplier, dap_material, dap, autolysate, held, hydrometer }
    }

    async fn hydrometer(&self) -> InstrumentId {
        let instrument = self.house.draw().unwrap();
        let body = InstrumentDescribed {
            instrument,
            code: "HY-1".to_owned(),
            name: "hydrometer".to_owned(),
            calibrated_on: Some("2025-03-01".to_owned()),
            calibration_due: Some("2026-03-01".to_owned()),
            certificate: None,
        };
        self.done(&self.ben, Act::DescribeInstrument(body)).await;
        instrument
    }

    async fn vessel(&self) -> VesselId {
        let vessel = self.house.draw().unwrap();
        let body = VesselDescribed {
            vessel,
            code: "F-3".to_owned(),
            name: "fermenter".to_owned(),
            capacity: quantity("2400", "L"),
            premises: "DSP".to_owned(),
        };
        self.done(&self.ben, Act::DescribeVessel(body)).await;
        vessel
    }

    /// A gravity read now; without a temperature it is taken as read.
    pub(crate) fn gravity(cellar: &Cellar, value: &str, celsius: Option<&str>) -> Reading {
        Reading {
            quantity: "gravity".to_owned(),
            value: value.to_owned(),
            qualifier: None,
            unit: "sg_20_20".to_owned(),
            expressed_as: None,
            sample_temperature: celsius
                .map(|value| Temperature { value: value.to_owned(), unit: "Cel".to_owned() }),
            method: Some("hydrometer, 20 °C scale".to_owned()),
            instrument: Some(cellar.hydrometer),
            corrected: None,
            left_as_read: None,
        }
    }

    pub(crate) async fn read(
        &self,
        cellar: &Cellar,
        taken_at: Stamp,
        values: Vec<Reading>,
    ) -> EntryId {
        let act = TakeReading {
            batch: cellar.batch,
            taken_at,
            captured_at: None,
            reported_at: None,
            sample: None,
            laboratory: None,
            values,
            note: None,
        };
        self.done(&self.ana, Act::TakeReading(Box::new(act))).await
    }

    /// A gravity at 20 °C, read at that time and entered at once.
    pub(crate) async fn read_at(&self, cellar: &Cellar, time: &str, value: &str) -> EntryId {
        self.now(time);
        let reading = Self::gravity(cellar, value, Some("20.0"));
        self.read(cellar, at(time), vec![reading]).await
    }

    /// A laboratory's nitrogen: ammonium counted as N, and amino nitrogen.
    pub(crate) async fn nitrogen(
        &self,
        cellar: &Cellar,
        sampled: &str,
        parts: [&str; 2],
    ) -> EntryId {
        let part = |quantity: &str, value: &str, expressed_as: Option<&str>| Reading {
            quantity: quantity.to_owned(),
            value: value.to_owned(),
            qualifier: None,
            unit: "mg/L".to_owned(),
            expressed_as: expressed_as.map(str::to_owned),
            sample_temperature: None,
            method: Some("enzymatic".to_owned()),
            instrument: None,
            corrected: None,
            left_as_read: None,
        };
        let act = TakeReading {
            batch: cellar.batch,
            taken_at: at(sampled),
            captured_at: None,
            reported_at: Some(self.local()),
            sample: Some("S-77".to_owned()),
            laboratory: Some("Example Laboratory".to_owned()),
            values: vec![
                part("ammonium", parts[0], Some("N")),
                part("primary_amino_nitrogen", parts[1], None),
            ],
            note: Some("of the full wash".to_owned()),
        };
        self.done(&self.ana, Act::TakeReading(Box::new(act))).await
    }

    /// A proposal for that time, asked now.
    pub(crate) async fn propose(
        &self,
        cellar: &Cellar,
        planned: &str,
        lot: LotId,
        amount: &str,
    ) -> (ProposalId, Entry) {
        let proposal = self.house.draw().unwrap();
        let propose = Propose {
            proposal,
            batch: cellar.batch,
            asked_at: self.local(),
            planned_at: at(planned),
            draws: vec![Draw { lot, amount: grams(amount) }],
            carrier_water: Some(quantity("4", "L")),
            preparation: Preparation::Slurry,
            purpose: Some("feed the yeast".to_owned()),
            prepared: None,
        };
        let (caller, key) = (self.ana.clone(), self.house.draw().unwrap());
        let asked = |propose| Asked {
            caller,
            key,
            print: [4; 32],
            expects: None,
            act: Act::Propose(Box::new(propose)),
        };
        let receipt = self.house.propose(self.ana.clone(), asked, propose).await.unwrap();
        (proposal, (*receipt.entries[0]).clone())
    }

    /// Done now, as proposed.
    pub(crate) async fn add(
        &self,
        cellar: &Cellar,
        proposal: ProposalId,
        lot: LotId,
        amount: &str,
    ) -> EntryId {
        let receipt = self.dose(cellar, self.local(), proposal, lot, amount).await.unwrap();
        receipt.entries[0].id
    }

    pub(crate) async fn dose(
        &self,
        cellar: &Cellar,
        done_at: Stamp,
        proposal: ProposalId,
        lot: LotId,
        amount: &str,
    ) -> Result<Receipt, HouseError> {
        let act = Add {
            batch: cellar.batch,
            proposal: Some(proposal),
            done_at,
            captured_at: None,
            draws: vec![Draw { lot, amount: grams(amount) }],
            carrier_water: Some(quantity("4", "L")),
            preparation: Preparation::Slurry,
            already_done: None,
        };
        self.act(&self.ana, Act::Add(Box::new(act))).await
    }

    /// Thrown in before anybody asked.
    pub(crate) async fn thrown_in(
        &self,
        cellar: &Cellar,
        when: &str,
        amount: &str,
        reason: &str,
    ) -> Vec<Entry> {
        let act = Add {
            batch: cellar.batch,
            proposal: None,
            done_at: at(when),
            captured_at: None,
            draws: vec![Draw { lot: cellar.dap, amount: grams(amount) }],
            carrier_water: None,
            preparation: Preparation::Powder,
            already_done: Some(reason.to_owned()),
        };
        let receipt = self.act(&self.ana, Act::Add(Box::new(act))).await.unwrap();
        receipt.entries.iter().map(|entry| (**entry).clone()).collect()
    }

    pub(crate) async fn sign(&self, proposed: &Entry, reason: &str) {
        let binds = proposed.body["shown"].as_str().unwrap().to_owned();
        let act = SignOff {
            target: proposed.id,
            meaning: "approved the exception".to_owned(),
            binds,
            reason: reason.to_owned(),
            signed_at: self.local(),
        };
        self.done(&self.ben, Act::SignOff(act)).await;
    }

    pub(crate) async fn amend(&self, who: &Caller, target: EntryId, effect: AmendTo, reason: &str) {
        let reason = reason.to_owned();
        let act = Amend { target, effect, reason, amended_at: self.local() };
        self.done(who, Act::Amend(Box::new(act))).await;
    }

    /// How many entries the log has, and the entries.
    pub(crate) async fn log(&self) -> Vec<store::log::Stored> {
        let mut held = self.db.reader().await.unwrap();
        store::log::entries(&mut held.conn(), self.site.number, 0, 10_000).await.unwrap()
    }

    /// What a PDF says, its lines joined, page by page.
    pub(crate) fn pages(&self, pdf: &[u8]) -> Vec<String> {
        let path = self.directory.path().join("record.pdf");
        std::fs::write(&path, pdf).unwrap();
        let text = said_by("pdftotext", &path);
        let mut pages: Vec<String> = text
            .split('\u{c}')
            .map(|page| page.split_whitespace().collect::<Vec<_>>().join(" "))
            .collect();
        assert_eq!(pages.pop().as_deref(), Some(""));
        pages
    }
}

/// Fails if the program is not installed: a test that skips itself proves nothing.
fn said_by(program: &str, pdf: &Path) -> String {
    let output = Program::new(program).args(["-enc", "UTF-8"]).arg(pdf).arg("-").output();
    let output = output.unwrap_or_else(|error| panic!("{program} is needed: {error}"));
    assert!(output.status.success(), "{program}: {}", String::from_utf8_lossy(&output.stderr));
    String::from_utf8(output.stdout).unwrap()
}

fn person(login: &str, name: &str) -> NewPerson {
    NewPerson { login: login.to_owned(), name: name.to_owned(), password: PASSWORD.to_owned() }
}

pub(crate) fn refusal(error: HouseError) -> Refusal {
    match error {
        HouseError::Refused(refusal) => refusal,
        other => panic!("not refused: {other:?}"),
    }
}

pub(crate) fn micros(hours_after: i64, from: &str) -> Micros {
    at(from).at.plus_hours(hours_after)
}
