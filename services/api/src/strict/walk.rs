//! One pass over a whole JSON text, whatever type it is meant for: what no body of ours may hold, and where it stands.

use std::fmt;

use serde::de::{DeserializeSeed, Deserializer, Error, MapAccess, SeqAccess, Visitor};
use serde_json::{Map, Value};
use unicode_normalization::UnicodeNormalization as _;

/// How deep arrays and objects may stand in each other (ours; the deepest body needs about six).
const DEEPEST: usize = 64;
/// How many values one body may hold (ours; an act over 400 casks needs some thousands).
const MOST_VALUES: usize = 20_000;
/// How long one text may be, in characters (ours; the longest remark of the book has as many).
pub(super) const LONGEST_TEXT: usize = 2_000;
/// The largest integer that every JSON reader keeps exact (RFC 8259 section 6).
const LARGEST_INTEGER: u64 = (1 << 53) - 1;

/// What is wrong, and where.
#[derive(Debug)]
pub(super) struct Fault {
    pub(super) pointer: String,
    pub(super) detail: String,
}

/// A whole body.
#[derive(Debug)]
pub(super) struct Read {
    /// As plain JSON, its text normalised.
    pub(super) value: Value,
    /// Pointers to texts longer than [`LONGEST_TEXT`].
    pub(super) too_long: Vec<String>,
}

/// Reads a whole text.
pub(super) fn read(text: &str) -> Result<Read, Fault> {
    let mut place = Vec::new();
    let mut too_long = Vec::new();
    let mut left = MOST_VALUES;
    let mut deserializer = serde_json::Deserializer::from_str(text);
    let walk = Walk { place: &mut place, left: &mut left, too_long: &mut too_long };
    let value = walk.deserialize(&mut deserializer).and_then(|value| {
        deserializer.end()?;
        Ok(value)
    });
    match value {
        Ok(value) => Ok(Read { value, too_long }),
        Err(error) => Err(Fault { pointer: pointer_of(&place), detail: described(&error) }),
    }
}

/// Leaves members out that are `null`.
pub(super) fn without_nulls(value: &mut Value) {
    match value {
        Value::Array(items) => items.iter_mut().for_each(without_nulls),
        Value::Object(members) => {
            members.retain(|_, value| !value.is_null());
            members.values_mut().for_each(without_nulls);
        }
        _ => {}
    }
}

/// Adds one step to a JSON pointer (RFC 6901 section 3).
pub(super) fn push_step(pointer: &mut String, step: &str) {
    pointer.push('/');
    pointer.push_str(&step.replace('~', "~0").replace('/', "~1"));
}

/// The message alone: for a fault of meaning, the pointer says the place better than line and column.
pub(super) fn without_position(error: &serde_json::Error) -> String {
    let message = error.to_string();
    let position = format!(" at line {} column {}", error.line(), error.column());
    message.strip_suffix(&position).map_or(message.clone(), str::to_owned)
}

fn described(error: &serde_json::Error) -> String {
    if error.is_data() { without_position(error) } else { error.to_string() }
}

fn pointer_of(place: &[String]) -> String {
    let mut pointer = String::new();
    for step in place {
        push_step(&mut pointer, step);
    }
    pointer
}

/// `place` is left standing where the first fault is met.
struct Walk<'a> {
    place: &'a mut Vec<String>,
    left: &'a mut usize,
    too_long: &'a mut Vec<String>,
}

impl Walk<'_> {
    fn child(&mut self) -> Walk<'_> {
        Walk { place: self.place, left: self.left, too_long: self.too_long }
    }

    fn count<E: Error>(&mut self) -> Result<(), E> {
        *self.left = self.left.checked_sub(1).ok_or_else(|| {
            E::custom(format_args!("the body holds more than {MOST_VALUES} values"))
        })?;
        Ok(())
    }

    fn go_deeper<E: Error>(&self) -> Result<(), E> {
        if self.place.len() < DEEPEST {
            Ok(())
        } else {
            Err(E::custom(format_args!("nested deeper than {DEEPEST} levels")))
        }
    }
}

impl<'de> DeserializeSeed<'de> for Walk<'_> {
    type Value = Value;

    fn deserialize<D: Deserializer<'de>>(mut self, deserializer: D) -> Result<Value, D::Error> {
        self.count()?;
        deserializer.deserialize_any(self)
    }
}

impl<'de> Visitor<'de> for Walk<'_> {
    type Value = Value;

    fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str("JSON")
    }

    fn visit_unit<E: Error>(self) -> Result<Value, E> {
        Ok(Value::Null)
    }

    fn visit_bool<E: Error>(self, value: bool) -> Result<Value, E> {
        Ok(value.into())
    }

    fn visit_i64<E: Error>(self, value: i64) -> Result<Value, E> {
        exact(value.unsigned_abs())?;
        Ok(value.into())
    }

    fn visit_u64<E: Error>(self, value: u64) -> Result<Value, E> {
        exact(value)?;
        Ok(value.into())
    }

    fn visit_f64<E: Error>(self, _: f64) -> Result<Value, E> {
        Err(E::custom("decimal numbers are written as text here, such as \"2.5\""))
    }

    fn visit_str<E: Error>(self, value: &str) -> Result<Value, E> {
        let text = normalised(value)?;
        if text.chars().nth(LONGEST_TEXT).is_some() {
            self.too_long.push(pointer_of(self.place));
        }
        Ok(text.into())
    }

    fn visit_seq<A: SeqAccess<'de>>(mut self, mut items: A) -> Result<Value, A::Error> {
        self.go_deeper()?;
        let mut array = Vec::new();
        self.place.push("0".to_owned());
        while let Some(item) = items.next_element_seed(self.child())? {
            array.push(item);
            self.place.pop();
            self.place.push(array.len().to_string());
        }
        self.place.pop();
        Ok(array.into())
    }

    fn visit_map<A: MapAccess<'de>>(mut self, mut members: A) -> Result<Value, A::Error> {
        self.go_deeper()?;
        let mut object = Map::new();
        while let Some(name) = members.next_key::<String>()? {
            self.place.push(name.clone());
            let name = normalised(&name)?;
            if object.contains_key(&name) {
                return Err(A::Error::custom("this member appears twice"));
            }
            let value = members.next_value_seed(self.child())?;
            object.insert(name, value);
            self.place.pop();
        }
        Ok(object.into())
    }
}

fn exact<E: Error>(magnitude: u64) -> Result<(), E> {
    if magnitude <= LARGEST_INTEGER {
        Ok(())
    } else {
        Err(E::custom(format_args!("integers go up to {LARGEST_INTEGER}")))
    }
}

/// Text in the ledger's form: Unicode normal form C, lines ended by a newline alone, no other control character.
fn normalised<E: Error>(text: &str) -> Result<String, E> {
    let text: String = text.replace("\r\n", "\n").replace('\r', "\n").nfc().collect();
    match text.chars().find(|c| c.is_control() && *c != '\n') {
        None => Ok(text),
        Some(c) => Err(E::custom(format_args!(
            "text must not hold the control character U+{:04X}",
            u32::from(c)
        ))),
    }
}
