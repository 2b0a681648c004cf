//! The stage: who is there, what they have in hand, and the events of the scenario in the order of their times.

use std::collections::HashMap;
use std::path::Path;

use anyhow::Context as _;
use domain::stamp::Micros;
use serde_json::{Value, json};

use super::client::Client;
use super::{batch_a, batch_b, setting};

/// The molasses and cane-sugar wash.
pub(super) const BATCH_A: &str = "EXW-25-A1";
/// The white grape must.
pub(super) const BATCH_B: &str = "EXW-25-B1";

/// Ids by human name, and the people's hands.
pub(super) struct Stage {
    nobody: Client,
    password: String,
    ids: HashMap<String, String>,
    done: usize,
    total: usize,
}

/// What happens at one time.
type Happening = Box<dyn FnOnce(&mut Stage) -> anyhow::Result<()>>;

/// The events of the scenario.
#[derive(Default)]
pub(super) struct Events(Vec<(&'static str, Happening)>);

impl Events {
    /// Something that happens at a time.
    pub(super) fn at(
        &mut self,
        time: &'static str,
        happening: impl FnOnce(&mut Stage) -> anyhow::Result<()> + 'static,
    ) {
        self.0.push((time, Box::new(happening)));
    }
}

/// Plays the whole scenario, and gives back the password of its people.
pub(super) fn play(base: &str, token: &str, directory: &Path) -> anyhow::Result<String> {
    let password = passphrase()?;
    let mut stage = Stage {
        nobody: Client::new(base),
        password: password.clone(),
        ids: HashMap::new(),
        done: 0,
        total: 0,
    };
    setting::found(&mut stage, token)?;
    let mut events = Events::default();
    setting::receipts(&mut events);
    batch_b::events(&mut events);
    batch_a::events(&mut events);
    let mut events = events.0;
    events.sort_by_key(|(time, _)| Micros::parse(time).unwrap_or_default());
    stage.total = events.len();
    for (time, happening) in events {
        stage.done += 1;
        stage.as_("dov")?.set_clock(time)?;
        happening(&mut stage).with_context(|| format!("at {time}"))?;
    }
    stage.hand_out(directory)?;
    Ok(password)
}

/// A password of this run only.
fn passphrase() -> anyhow::Result<String> {
    let id: uuid::Uuid = house::ids::Ids.draw(house::clock::Clock::System.now())?;
    Ok(format!("demo-{}", &id.simple().to_string()[12..]))
}

impl Stage {
    /// A person at the interface, freshly signed in: tokens are short.
    pub(super) fn as_(&self, login: &str) -> anyhow::Result<Client> {
        self.nobody.signed_in("EXW", login, &self.password)
    }

    /// Nobody in particular.
    pub(super) const fn nobody(&self) -> &Client {
        &self.nobody
    }

    /// The password of everybody in the demo.
    pub(super) fn password(&self) -> &str {
        &self.password
    }

    /// Remembers an id under a name.
    pub(super) fn note(&mut self, name: &str, answer: &Value, member: &str) -> anyhow::Result<()> {
        let id = answer[member].as_str().with_context(|| format!("no {member} in {answer}"))?;
        self.ids.insert(name.to_owned(), id.to_owned());
        Ok(())
    }

    /// The id of a name.
    pub(super) fn id(&self, name: &str) -> anyhow::Result<&str> {
        self.ids.get(name).map(String::as_str).with_context(|| format!("{name} is not known"))
    }

    /// Prints a line of the story with how far it is.
    pub(super) fn say(&self, line: &str) {
        if self.total == 0 {
            println!("[ setting] {line}");
        } else {
            println!("[{:>3}/{:<4}] {line}", self.done, self.total);
        }
    }

    /// Lots and amounts as the interface takes them.
    pub(super) fn lines(&self, lots: &[(&str, &str, &str)]) -> anyhow::Result<Value> {
        lots.iter()
            .map(|(lot, value, unit)| {
                Ok(json!({"lot": self.id(lot)?, "amount": {"value": value, "unit": unit}}))
            })
            .collect()
    }

    /// A gravity at 20 °C with the vessel's temperature, and perhaps more.
    pub(super) fn gravity(
        &self,
        batch: &str,
        at: &str,
        sg: &str,
        celsius: &str,
    ) -> anyhow::Result<()> {
        let body = json!({"taken_at": at, "values": [
            {"quantity": "gravity", "value": sg, "unit": "sg_20_20", "sample_temperature": {"value": "20.0", "unit": "Cel"},
             "instrument": self.id("HY-1")?},
            {"quantity": "temperature", "value": celsius, "unit": "Cel", "method": "vessel thermometer"},
        ]});
        let path = format!("/v1/batches/{}/readings", self.id(batch)?);
        self.as_("ana")?.post(&path, &body)?;
        self.say(&format!("{}  {batch}  gravity {sg} at {celsius} °C", when(at)));
        Ok(())
    }

    /// Asks whether something may be added, and tells the answer.
    pub(super) fn propose(
        &mut self,
        name: &str,
        batch: &str,
        body: &Value,
    ) -> anyhow::Result<String> {
        let path = format!("/v1/batches/{}/proposals", self.id(batch)?);
        let answer = self.as_("ana")?.post(&path, body)?;
        self.note(name, &answer, "proposal")?;
        self.note(&format!("{name} entry"), &answer, "entry")?;
        self.note(&format!("{name} shown"), &answer, "shown")?;
        let verdict = answer["verdict"].as_str().unwrap_or_default().to_owned();
        let supply = answer["assessment"]["account_after"]["supply_mg_l"].as_str().unwrap_or("?");
        let planned = when(body["planned_at"].as_str().unwrap_or_default());
        self.say(&format!("{planned}  {name}: {verdict}; supply would be {supply} mg N/L"));
        tell(&answer["assessment"]);
        Ok(verdict)
    }

    /// Records what was done.
    pub(super) fn add(&mut self, batch: &str, body: &Value) -> anyhow::Result<Value> {
        let path = format!("/v1/batches/{}/additions", self.id(batch)?);
        let answer = self.as_("ana")?.post(&path, body)?;
        let verdict = answer["verdict"].as_str().unwrap_or_default();
        let done = when(body["done_at"].as_str().unwrap_or_default());
        self.say(&format!("{done}  recorded as done ({verdict})"));
        if let Some(deviation) = answer["deviation"].as_str() {
            self.ids.insert(format!("{batch} deviation"), deviation.to_owned());
            println!("          a deviation was opened");
            tell(&answer["entries"][0]["body"]["assessment"]);
        }
        Ok(answer)
    }

    /// Hands out the records of both batches, and writes them down.
    fn hand_out(&self, directory: &Path) -> anyhow::Result<()> {
        for code in [BATCH_A, BATCH_B] {
            let quality = self.as_("caro")?;
            let path = format!("/v1/batches/{}/record", self.id(code)?);
            let issued = quality.post(&path, &json!({"to": "Office of the Example Inspector"}))?;
            let record = format!("/v1/records/{}", issued["id"].as_str().unwrap_or_default());
            let pdf = quality.document(&record, "application/pdf")?;
            let structured = quality.document(&record, "application/json")?;
            self.say(&format!(
                "{code}: record handed out, {} kB PDF, sha256 {}",
                pdf.len() / 1024,
                issued["pdf"].as_str().unwrap_or_default()
            ));
            std::fs::write(directory.join(format!("{code}.pdf")), pdf)?;
            std::fs::write(directory.join(format!("{code}.json")), structured)?;
        }
        for lot in ["DP-0387", "DP-0412", "AU-0208"] {
            let answer = self.as_("caro")?.get(&format!("/v1/lots/{}", self.id(lot)?))?;
            let micrograms = answer.body["remaining"]["value"].as_str().unwrap_or("0");
            let grams = micrograms.parse::<i64>().unwrap_or(0) / 1_000_000;
            self.say(&format!("{lot}: {grams} g left"));
        }
        Ok(())
    }
}

/// Prints what was found above information, with its remedy.
pub(super) fn tell(told: &Value) {
    let findings = told["findings"].as_array().map(Vec::as_slice).unwrap_or_default();
    for finding in findings.iter().filter(|finding| finding["verdict"] != "clear") {
        let text = |value: &Value| value.as_str().unwrap_or_default().to_owned();
        println!("          {}: {}", text(&finding["verdict"]), text(&finding["sentence"]));
        if let Some(remedy) = finding["remedy"]["sentence"].as_str() {
            println!("          → {remedy}");
        }
    }
}

/// `2025-09-11T10:00:00-07:00` as people write it.
pub(super) fn when(time: &str) -> String {
    time.get(..16).unwrap_or(time).replace('T', " ")
}
