//! An invented cellar to play in: a founded site, four people, vessels, materials, lots and rules.
//!
//! Everything about it is made up except the compositions, which follow from chemical formulas.

use std::sync::Arc;

use serde_json::{Value, json};

use crate::client::{Answer, Client};
use crate::program::{Engine, Home, Options, Program};

/// The site's code.
pub const SITE: &str = "EXW";
/// When the driven clock starts: the morning of the invented vintage.
pub const START: &str = "2025-09-08T08:00:00-07:00";
/// Times before every receipt and opening.
pub const EARLIER: &str = "2025-09-08T07:00:00-07:00";

/// Who works there: login, printed name, password, role.
pub const PEOPLE: [(&str, &str, &str, &str); 4] = [
    ("ana", "Ana Example", "copper kettles rarely whistle", "cellar"),
    ("ben", "Ben Example", "barrels roll downhill at dawn", "lead"),
    ("caro", "Caro Example", "seven quiet hydrometers float", "quality"),
    ("dov", "Dov Example", "a lantern hangs in every gate", "admin"),
];

/// A founded site whose program is running.
#[derive(Debug)]
pub struct Cellar {
    /// The program.
    pub program: Program,
    /// The site's id.
    pub site: String,
    /// Cellar hand.
    pub ana: Client,
    /// Production lead.
    pub ben: Client,
    /// Quality.
    pub caro: Client,
    /// Administrator.
    pub dov: Client,
    /// Ids of the people, in the order of [`PEOPLE`].
    pub people: [String; 4],
    /// Ids of vessels, materials, suppliers and lots, by code.
    ids: std::collections::BTreeMap<String, String>,
    /// The driven clock, if it is one.
    now: Option<String>,
}

impl Cellar {
    /// A simulated book on a driven clock, which stands at [`START`].
    ///
    /// # Panics
    /// If anything about it fails.
    pub fn simulated(engine: Engine) -> Self {
        Self::founded(&Home::new(engine), Some(START))
    }

    /// A real book on the machine's clock.
    ///
    /// # Panics
    /// If anything about it fails.
    pub fn real(engine: Engine) -> Self {
        Self::founded(&Home::new(engine), None)
    }

    /// The same at a given place.
    ///
    /// # Panics
    /// If anything about it fails.
    pub fn founded(home: &Arc<Home>, simulated_from: Option<&str>) -> Self {
        let simulated_from = simulated_from.map(str::to_owned);
        let options = Options { simulated_from: simulated_from.clone(), ..Options::default() };
        let program = Program::start(home, options);
        let token = program.founding_token().expect("a founding link").to_owned();
        let nobody = Client::new(program.url());
        let book = found(&nobody, &token, SITE, simulated_from.is_some()).expect(201);
        let dov = sign_in(&nobody, 3);
        let enrol = |index: usize| enrol(&dov, index).id();
        let people = [enrol(0), enrol(1), enrol(2), book.text("/admin")];
        let ids = std::collections::BTreeMap::new();
        let mut cellar = Self {
            site: book.text("/site"),
            ana: sign_in(&nobody, 0),
            ben: sign_in(&nobody, 1),
            caro: sign_in(&nobody, 2),
            dov,
            people,
            ids,
            now: simulated_from,
            program,
        };
        cellar.furnish();
        cellar
    }

    /// Vessels, suppliers, materials and the shipped rule sets.
    fn furnish(&mut self) {
        for (code, capacity, premises) in
            [("T-12", "5000", "BW"), ("T-13", "5000", "BW"), ("F-3", "2400", "DSP")]
        {
            let body = json!({"code": code, "name": "tank", "premises": premises,
                "capacity": {"value": capacity, "unit": "L"}});
            self.describe("vessels", code, &body);
        }
        self.describe(
            "parties",
            "ENS",
            &json!({"code": "ENS", "name": "Example Nutrient Supplier"}),
        );
        for (code, body) in materials() {
            self.describe("materials", code, &body);
        }
        self.adopt_shipped();
    }

    fn describe(&mut self, what: &str, code: &str, body: &Value) {
        let id = self.ben.post(&format!("/v1/{what}"), body).id();
        self.ids.insert(code.to_owned(), id);
    }

    /// Adopts for production what binds an American wine cellar, and common practice.
    fn adopt_shipped(&self) {
        let from = self.now();
        for set in self.caro.get("/v1/rule-sets").expect(200).items() {
            let id = set["id"].as_str().expect("an id");
            if !["us-wine", "common-practice"].contains(&id) {
                continue;
            }
            let path = format!("/v1/rule-sets/{id}/adoptions");
            let body = json!({"standing": "production", "digest": set["digest"], "from": from});
            self.caro.post(&path, &body).expect(201);
        }
    }

    /// The id of a vessel, material, supplier or lot.
    ///
    /// # Panics
    /// If there is no such code.
    #[track_caller]
    pub fn id(&self, code: &str) -> &str {
        self.ids.get(code).unwrap_or_else(|| panic!("nothing here has the code {code}"))
    }

    /// The time by the book's clock, as RFC 3339.
    pub fn now(&self) -> String {
        self.now.clone().unwrap_or_else(machine_time)
    }

    /// Drives the clock of a simulation forward.
    ///
    /// # Panics
    /// If the clock is not driven.
    pub fn drive_to(&mut self, now: &str) {
        assert!(self.now.is_some(), "a real book runs on the machine's clock");
        self.dov.request("POST", "/v1/clock").json(&json!({"now": now})).send().expect(200);
        self.now = Some(now.to_owned());
    }

    /// Somebody of [`PEOPLE`] by login, signed in.
    ///
    /// # Panics
    /// If nobody has that login.
    pub fn person(&self, login: &str) -> &Client {
        match login {
            "ana" => &self.ana,
            "ben" => &self.ben,
            "caro" => &self.caro,
            "dov" => &self.dov,
            _ => panic!("nobody here is called {login}"),
        }
    }

    /// Somebody who has not signed in.
    pub fn nobody(&self) -> Client {
        Client::new(self.program.url())
    }

    /// Ends the program by `kill -9` and starts it again.
    ///
    /// # Panics
    /// If it does not come back.
    pub fn kill_and_restart(&mut self) {
        self.program.kill();
        self.restart();
    }

    /// Starts the ended program again; everybody goes on with the tokens they have.
    ///
    /// # Panics
    /// If it does not come back.
    pub fn restart(&mut self) {
        self.program.restart();
        let url = self.program.url().to_owned();
        for client in [&mut self.ana, &mut self.ben, &mut self.caro, &mut self.dov] {
            *client = client.at(&url);
        }
    }

    /// Receives a released lot and gives its id.
    ///
    /// # Panics
    /// If it is refused.
    #[track_caller]
    pub fn receive(&mut self, code: &str, material: &str, value: &str, unit: &str) -> String {
        let body = self.lot(code, material, value, unit);
        let id = self.ana.post("/v1/lots", &body).id();
        self.ids.insert(code.to_owned(), id.clone());
        id
    }

    /// The body of a receipt.
    pub fn lot(&self, code: &str, material: &str, value: &str, unit: &str) -> Value {
        json!({"code": code, "material": self.id(material), "supplier": self.id("ENS"),
            "amount": {"value": value, "unit": unit}, "received_at": self.now(),
            "status": "released"})
    }

    /// What is left of a lot, in base units.
    ///
    /// # Panics
    /// If there is no such lot.
    #[track_caller]
    pub fn remaining(&self, lot: &str) -> i64 {
        let answer = self.ana.get(&format!("/v1/lots/{lot}")).expect(200);
        answer.text("/remaining/value").parse().expect("a whole number of base units")
    }

    /// The body of an opening: must of white grapes in T-12.
    pub fn batch(&self, code: &str, volume: &str, unit: &str) -> Value {
        json!({"code": code, "product_class": "grape_wine", "premises": "BW",
            "vessel": self.id("T-12"), "opened_at": self.now(),
            "volume": {"value": volume, "unit": unit}, "volume_basis": "dip rod",
            "demand": "medium"})
    }

    /// Opens a batch of must and gives its id.
    ///
    /// # Panics
    /// If it is refused.
    #[track_caller]
    pub fn open(&self, code: &str, volume: &str, unit: &str) -> String {
        self.ben.post("/v1/batches", &self.batch(code, volume, unit)).id()
    }

    /// Takes a gravity of a batch now.
    ///
    /// # Panics
    /// If it is refused.
    #[track_caller]
    pub fn gravity(&self, batch: &str, sg: &str) -> Answer {
        self.ana.post(&format!("/v1/batches/{batch}/readings"), &self.gravity_body(sg)).expect(201)
    }

    /// The body of a gravity reading.
    pub fn gravity_body(&self, sg: &str) -> Value {
        json!({"taken_at": self.now(), "values": [
            {"quantity": "gravity", "value": sg, "unit": "sg_20_20", "sample_temperature": {"value": "20.0", "unit": "Cel"}}]})
    }

    /// Records the nitrogen of a sample taken now: ammonium nitrogen and primary amino nitrogen in mg/L.
    ///
    /// # Panics
    /// If it is refused.
    #[track_caller]
    pub fn nitrogen(&self, batch: &str, ammonium: &str, amino: &str) -> Answer {
        let body = json!({"taken_at": self.now(), "values": [
            {"quantity": "ammonium", "value": ammonium, "unit": "mg/L", "expressed_as": "N"},
            {"quantity": "primary_amino_nitrogen", "value": amino, "unit": "mg/L"}]});
        self.ana.post(&format!("/v1/batches/{batch}/readings"), &body).expect(201)
    }

    /// The body of a proposal for now.
    pub fn proposal(&self, lines: &[(&str, &str, &str)]) -> Value {
        json!({"planned_at": self.now(), "lines": draws(lines), "preparation": "slurry"})
    }

    /// Ana asks whether something may be added; lines are lot, value, unit.
    pub fn propose(&self, batch: &str, lines: &[(&str, &str, &str)]) -> Answer {
        self.ana.post(&format!("/v1/batches/{batch}/proposals"), &self.proposal(lines))
    }

    /// Ana carries a proposal out.
    pub fn carry_out(&self, batch: &str, proposal: &str, lines: &[(&str, &str, &str)]) -> Answer {
        let body = json!({"proposal": proposal, "done_at": self.now(), "lines": draws(lines),
            "preparation": "slurry"});
        self.ana.post(&format!("/v1/batches/{batch}/additions"), &body)
    }

    /// The body of an addition that nobody was asked about.
    pub fn already_done(&self, lines: &[(&str, &str, &str)]) -> Value {
        json!({"already_done": true, "reason": "the pump had tripped", "done_at": self.now(),
            "lines": draws(lines), "preparation": "slurry"})
    }

    /// Ana tells what she added before asking anybody.
    pub fn add_unasked(&self, batch: &str, lines: &[(&str, &str, &str)]) -> Answer {
        self.ana.post(&format!("/v1/batches/{batch}/additions"), &self.already_done(lines))
    }

    /// The newest signed head of the log.
    ///
    /// # Panics
    /// If it cannot be read.
    pub fn head(&self) -> Answer {
        self.caro.get(&format!("/v1/sites/{}/ledger/head", self.site)).expect(200)
    }

    /// How many entries the log has.
    ///
    /// # Panics
    /// If it cannot be read.
    pub fn size(&self) -> u64 {
        self.head().number("/size")
    }

    /// Reads the whole book: `tallystave verify` finds the log whole and `rebuild --check` finds every table equal to
    /// a fresh replay. Gives the number of entries.
    ///
    /// # Panics
    /// If either does not.
    #[track_caller]
    pub fn deep_check(&self) -> u64 {
        deep_check(self.program.home());
        self.size()
    }
}

/// The deep check of a place, whoever serves it.
///
/// # Panics
/// If the log is not whole or a table differs from a fresh replay.
#[track_caller]
pub fn deep_check(home: &Home) {
    let verified = home.run(&["verify"]).expect_success();
    assert!(verified.printed.contains(": whole; root "), "{}", verified.printed);
    let replayed = home.run(&["rebuild", "--check"]).expect_success();
    assert!(replayed.printed.contains("every table equals"), "{}", replayed.printed);
}

/// Founds a site with Dov as its administrator.
pub fn found(nobody: &Client, token: &str, code: &str, simulation: bool) -> Answer {
    nobody.post("/v1/founding", &founding(token, code, simulation))
}

/// The body of a founding.
pub fn founding(token: &str, code: &str, simulation: bool) -> Value {
    let (login, name, password, _) = PEOPLE[3];
    let origin = format!("{}.example/book", code.to_lowercase());
    json!({"token": token, "code": code, "name": "Example Works", "origin": origin,
        "time_zone": "America/Los_Angeles", "simulation": simulation,
        "premises": [
            {"code": "BW", "kind": "bonded_wine_premises", "name": "Wine premises"},
            {"code": "DSP", "kind": "distilled_spirits_plant", "name": "Spirits plant"}],
        "admin": {"login": login, "name": name, "password": password}})
}

fn enrol(admin: &Client, index: usize) -> Answer {
    let (login, name, password, role) = PEOPLE[index];
    let body = json!({"login": login, "name": name, "password": password, "roles": [role]});
    admin.post("/v1/people", &body)
}

fn sign_in(nobody: &Client, index: usize) -> Client {
    let (login, _, password, _) = PEOPLE[index];
    nobody.signed_in(SITE, login, password)
}

/// The lines of a proposal or an addition: lot, value, unit.
pub fn draws(lines: &[(&str, &str, &str)]) -> Value {
    let draw = |(lot, value, unit): &(&str, &str, &str)| json!({"lot": lot, "amount": {"value": value, "unit": unit}});
    lines.iter().map(draw).collect()
}

/// Materials with what they hold. The salt is all salt; the others' analyses are invented.
fn materials() -> [(&'static str, Value); 5] {
    let material = |code: &str, name: &str, category: &str, listed: &[&str], holds: Value| {
        json!({"code": code, "name": name, "category": category, "dimension": "mass",
            "listed_as": listed, "composition": holds})
    };
    let part = |substance: &str, value: &str, unit: &str| json!([{"substance": substance, "fraction": {"value": value, "unit": unit}}]);
    [
        (
            "DAP",
            material(
                "DAP",
                "diammonium phosphate",
                "nutrient",
                &["diammonium_phosphate"],
                part("diammonium_phosphate", "100", "%"),
            ),
        ),
        (
            "AUT",
            material(
                "AUT",
                "yeast autolysate",
                "nutrient",
                &["autolysed_yeast"],
                part("amino_nitrogen", "4.6", "%"),
            ),
        ),
        (
            "KMS",
            material(
                "KMS",
                "potassium metabisulfite",
                "sulfite",
                &["potassium_metabisulfite"],
                part("sulfur_dioxide", "57.629", "%"),
            ),
        ),
        ("YW", material("YW", "dry yeast", "yeast", &[], json!([]))),
        ("SUG", material("SUG", "raw cane sugar", "sugar", &[], json!([]))),
    ]
}

/// The machine's time as RFC 3339, for books on its clock.
#[expect(clippy::disallowed_methods, reason = "a test stands outside the program, as a user does")]
fn machine_time() -> String {
    jiff::Timestamp::now().to_string()
}
