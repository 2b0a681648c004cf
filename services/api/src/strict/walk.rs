//! One pass over a whole JSON text, whatever type it is meant for: what no body of ours may hold, and where it stands.

use std::fmt;

use serde::de::{DeserializeSeed, Deserializer, Error, MapAccess, SeqAccess, Visitor};
use serde_json::{Map, Value};

/// How deep arrays and objects may stand in each other (ours; the deepest body needs about six).
const DEEPEST: usize = 64;
/// How many values one body may hold (ours; an act over 400 casks needs some thousands).
const MOST_VALUES: usize = 20_000;
/// The largest integer that every JSON reader keeps exact (RFC 8259 section 6).
const LARGEST_INTEGER: u64 = (1 << 53) - 1;

/// What is wrong, and where.
#[derive(Debug)]
pub(super) struct Fault {
    pub(super) pointer: String,
    pub(super) detail: String,
}

/// Reads a whole text into plain JSON without `null` members.
pub(super) fn read(text: &str) -> Result<Value, Fault> {
    let mut place = Vec::new();
    let mut left = MOST_VALUES;
    let mut deserializer = serde_json::Deserializer::from_str(text);
    let walk = Walk { place: &mut place, left: &mut left };
    let value = walk.deserialize(&mut deserializer).and_then(|value| {
        deserializer.end()?;
        Ok(value)
    });
    value.map_err(|error| Fault { pointer: pointer_of(&place), detail: described(&error) })
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
}

impl Walk<'_> {
    fn child(&mut self) -> Walk<'_> {
        Walk { place: self.place, left: self.left }
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
        without_nul(value)?;
        Ok(value.into())
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
            without_nul(&name)?;
            self.place.push(name.clone());
            if object.contains_key(&name) {
                return Err(A::Error::custom("this member appears twice"));
            }
            let value = members.next_value_seed(self.child())?;
            object.insert(name, value);
            self.place.pop();
        }
        object.retain(|_, value| !value.is_null());
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

fn without_nul<E: Error>(text: &str) -> Result<(), E> {
    if text.contains('\0') {
        Err(E::custom("text must not hold the character U+0000"))
    } else {
        Ok(())
    }
}
