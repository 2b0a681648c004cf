//! Computations offered on their own: one JSON object in, one out, by name.
//!
//! Plain JSON numbers, since nothing of this is hashed. Every result has `method` (the formula and its source) and
//! `notes` (a range left, an estimate, a constant from memory, a hazard; last that local requirements prevail and that
//! a computed figure is no laboratory analysis).

mod chemistry;
mod gravity;
mod nutrition;
mod spirit;

use std::fmt::Display;

use serde_json::{Map, Number, Value, json};

use crate::checks::cautions::LAW;

/// One member of an input.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub struct Field {
    /// Its name.
    pub name: &'static str,
    /// Unit and range, or what it may say.
    pub takes: &'static str,
}

/// One computation.
#[derive(Clone, Copy, Debug)]
pub struct Calculation {
    /// Its name.
    pub name: &'static str,
    /// What it is for.
    pub meaning: &'static str,
    /// What it takes.
    pub fields: &'static [Field],
    /// What it gives, beside `method` and `notes`.
    pub gives: &'static [&'static str],
    /// Where the formula is from.
    pub source: &'static str,
    run: fn(&Given<'_>) -> Result<Found, Fault>,
}

/// Why something was not computed.
#[derive(Clone, Debug, Eq, PartialEq, thiserror::Error)]
#[error("{detail}")]
pub struct Fault {
    /// The member at fault, if it is one.
    pub field: Option<String>,
    /// What is wrong, and what would be accepted.
    pub detail: String,
}

impl Fault {
    fn at(field: &str, detail: impl Display) -> Self {
        Self { field: Some(field.to_owned()), detail: detail.to_string() }
    }

    fn whole(detail: impl Display) -> Self {
        Self { field: None, detail: detail.to_string() }
    }

    /// As the object that stands in a result's place.
    pub fn to_json(&self) -> Value {
        json!({"error": {"field": self.field, "detail": self.detail}})
    }
}

/// Every computation, by subject.
pub fn calculations() -> impl Iterator<Item = &'static Calculation> {
    [gravity::ALL, spirit::ALL, nutrition::ALL, chemistry::ALL].into_iter().flatten()
}

impl Calculation {
    /// The computation of that name.
    pub fn of(name: &str) -> Option<&'static Self> {
        calculations().find(|calculation| calculation.name == name)
    }

    /// Computes.
    ///
    /// ```
    /// use domain::compute::Calculation;
    /// let dilution = Calculation::of("dilution").unwrap();
    /// let asked = serde_json::json!({"volume_l": 200.0, "from_abv": 63.5, "to_abv": 40.0});
    /// let found = dilution.compute(&asked)?;
    /// assert!((found["water_l"].as_f64().unwrap() - 120.991).abs() < 0.002);
    /// # Ok::<(), domain::compute::Fault>(())
    /// ```
    ///
    /// # Errors
    /// [`Fault`].
    pub fn compute(&self, asked: &Value) -> Result<Value, Fault> {
        let Value::Object(members) = asked else {
            return Err(Fault::whole("give one JSON object"));
        };
        if let Some(unknown) = members.keys().find(|name| !self.has(name)) {
            let known: Vec<_> = self.fields.iter().map(|field| field.name).collect();
            let detail = format!("{} takes {}", self.name, known.join(", "));
            return Err(Fault::at(unknown, detail));
        }
        let found = (self.run)(&Given { calculation: self, members })?;
        Ok(found.to_json())
    }

    fn has(&self, name: &str) -> bool {
        self.fields.iter().any(|field| field.name == name)
    }
}

/// What was given.
struct Given<'a> {
    calculation: &'a Calculation,
    members: &'a Map<String, Value>,
}

impl<'a> Given<'a> {
    fn get(&self, name: &str) -> Option<&'a Value> {
        self.members.get(name).filter(|value| !value.is_null())
    }

    fn fault(&self, name: &str, what: &str) -> Fault {
        let takes = self.calculation.fields.iter().find(|field| field.name == name);
        let takes = takes.map_or("", |field| field.takes);
        Fault::at(name, format!("{what}: {takes}"))
    }

    fn number(&self, name: &str) -> Result<f64, Fault> {
        self.optional(name)?.ok_or_else(|| self.fault(name, "give a number"))
    }

    fn optional(&self, name: &str) -> Result<Option<f64>, Fault> {
        let read = |value: &Value| value.as_f64().ok_or_else(|| self.fault(name, "give a number"));
        self.get(name).map(read).transpose()
    }

    /// A number within a range that includes its ends.
    fn within(&self, name: &str, least: f64, most: f64) -> Result<f64, Fault> {
        self.optional_within(name, least, most)?.ok_or_else(|| self.fault(name, "give a number"))
    }

    fn optional_within(&self, name: &str, least: f64, most: f64) -> Result<Option<f64>, Fault> {
        let Some(number) = self.optional(name)? else { return Ok(None) };
        if (least..=most).contains(&number) {
            return Ok(Some(number));
        }
        Err(Fault::at(
            name,
            format!("{number} is outside {least} to {most}: check digits and unit"),
        ))
    }

    fn text(&self, name: &str) -> Result<&'a str, Fault> {
        let text = self.get(name).and_then(Value::as_str);
        text.ok_or_else(|| self.fault(name, "give a text"))
    }

    fn items(&self, name: &str) -> Result<&'a [Value], Fault> {
        let items = self.get(name).and_then(Value::as_array).filter(|items| !items.is_empty());
        items.map(Vec::as_slice).ok_or_else(|| self.fault(name, "give a list with something in it"))
    }

    /// The one of several members that was given.
    fn one_of(&self, names: &[&'static str]) -> Result<(&'static str, f64), Fault> {
        let given: Vec<_> = names.iter().filter(|name| self.get(name).is_some()).collect();
        match given.as_slice() {
            [name] => Ok((name, self.number(name)?)),
            _ => Err(Fault::whole(format!("give exactly one of {}", names.join(", ")))),
        }
    }
}

/// A number of an object within the input.
fn member(object: &Value, at: &str, name: &str) -> Result<f64, Fault> {
    let place = format!("{at}/{name}");
    object.get(name).and_then(Value::as_f64).ok_or_else(|| Fault::at(&place, "give a number"))
}

/// What was found.
#[derive(Default)]
struct Found {
    members: Vec<(&'static str, Value)>,
    method: &'static str,
    notes: Vec<String>,
}

impl Found {
    fn by(method: &'static str) -> Self {
        Self { method, ..Self::default() }
    }

    fn number(self, name: &'static str, value: f64) -> Self {
        self.member(name, Number::from_f64(value).map_or(Value::Null, Value::Number))
    }

    fn member(mut self, name: &'static str, value: Value) -> Self {
        self.members.push((name, value));
        self
    }

    fn note(mut self, note: impl Into<String>) -> Self {
        self.notes.push(note.into());
        self
    }

    fn note_if(self, condition: bool, note: &str) -> Self {
        if condition { self.note(note) } else { self }
    }

    fn to_json(&self) -> Value {
        let mut object = Map::new();
        for (name, value) in &self.members {
            object.insert((*name).to_owned(), value.clone());
        }
        object.insert("method".to_owned(), self.method.into());
        let law = std::iter::once(LAW.text.to_owned());
        object.insert("notes".to_owned(), self.notes.iter().cloned().chain(law).collect());
        Value::Object(object)
    }
}

#[cfg(test)]
mod tests;
