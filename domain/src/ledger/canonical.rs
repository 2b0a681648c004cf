//! One value, one spelling: RFC 8785 canonical JSON, for fewer values than JSON has.
//!
//! A hash is only worth something if the same facts always give the same bytes. RFC 8785 settles blanks, escapes and
//! the order of members. What it leaves to floating point is left out here: numbers are integers that every JSON
//! reader holds exactly (RFC 7493, section 2.2), decimals are strings, and `null` never stands, so that a member is
//! either there or not. Text is in Unicode normal form C and has no control characters but the newline, so that what
//! looks equal is equal.

mod scan;

use std::fmt;

use serde::de::{self, Deserialize, Deserializer, MapAccess, SeqAccess, Visitor};
use serde_json::{Map, Number, Value};
use unicode_normalization::is_nfc;

use super::tree::Hash;

/// The longest entry in canonical bytes: entry bundles give its length in 16 bits (C2SP tlog-tiles, "Log Entries").
pub const MAX_ENTRY_BYTES: usize = 65_535;

/// How deep arrays and objects may be nested. Our own figure: no entry needs a tenth of it, and JSON readers that
/// guard their stack allow more.
pub const MAX_DEPTH: usize = 64;

/// The largest integer that every JSON reader holds exactly, 2^53 − 1 (RFC 7493, section 2.2).
pub const MAX_INTEGER: u64 = (1 << 53) - 1;

/// Names of members that begin like this are read by the JSON library as other values than they are.
const RESERVED: &str = "$serde_json::private::";

/// Why a value or its bytes cannot stand in the ledger.
#[derive(Clone, Debug, Eq, PartialEq, thiserror::Error)]
pub enum NotCanonical {
    /// Something in the value has no canonical form.
    #[error("at {pointer:?}: {why}")]
    Refused {
        /// Where: a JSON pointer (RFC 6901), empty for the whole value.
        pointer: String,
        /// What is wrong there.
        why: Why,
    },
    /// The canonical form is longer than [`MAX_ENTRY_BYTES`].
    #[error("{0} bytes, but an entry holds at most {MAX_ENTRY_BYTES}")]
    TooLong(usize),
    /// The bytes are no JSON, or name a member of one object twice.
    #[error("not readable as JSON: {0}")]
    Unreadable(String),
    /// The bytes say something that has a canonical form, but are not it.
    #[error("the value is written in another than its canonical form")]
    OtherSpelling,
}

/// What has no canonical form.
#[derive(Clone, Copy, Debug, Eq, PartialEq, thiserror::Error)]
pub enum Why {
    /// `null`.
    #[error("null never stands in the ledger: leave the member out")]
    Null,
    /// A number with a fraction or an exponent, or too large for an integer type.
    #[error("only integers stand in the ledger: write other numbers as a string")]
    NotAnInteger,
    /// An integer beyond ±[`MAX_INTEGER`].
    #[error("integers beyond ±(2^53 − 1) are not read alike everywhere: write it as a string")]
    LargeInteger,
    /// Text (or a member's name) not in normal form C.
    #[error("the text is not in Unicode normal form C")]
    NotNormal,
    /// Text (or a member's name) with a control character other than the newline.
    #[error("the text holds a control character other than a newline")]
    ControlCharacter,
    /// A member's name that the JSON library gives a meaning of its own: readers would not see what was hashed.
    #[error("a member's name may not begin with {RESERVED}")]
    ReservedName,
    /// Deeper than [`MAX_DEPTH`].
    #[error("nested deeper than {MAX_DEPTH}")]
    TooDeep,
}

/// The canonical bytes of a value, as they are stored and hashed.
///
/// ```
/// use domain::ledger::canonical::canonical;
/// let value = serde_json::json!({ "unit": "kg", "base": 2_500_000_000_u64, "entered": "2.5" });
/// assert_eq!(canonical(&value)?, br#"{"base":2500000000,"entered":"2.5","unit":"kg"}"#);
///
/// let refused = canonical(&serde_json::json!({ "doses": [{ "mass": 2.5 }] }));
/// assert!(refused.unwrap_err().to_string().starts_with(r#"at "/doses/0/mass""#));
/// # Ok::<(), domain::ledger::canonical::NotCanonical>(())
/// ```
///
/// # Errors
/// [`NotCanonical::Refused`] with the place, or [`NotCanonical::TooLong`].
pub fn canonical(value: &Value) -> Result<Vec<u8>, NotCanonical> {
    let text = spell(value)?;
    if text.len() > MAX_ENTRY_BYTES {
        return Err(NotCanonical::TooLong(text.len()));
    }
    Ok(text.into_bytes())
}

/// The canonical bytes of a document that is kept beside the log and may be of any length.
///
/// # Errors
/// [`NotCanonical::Refused`] with the place.
pub fn document(value: &Value) -> Result<Vec<u8>, NotCanonical> {
    spell(value).map(String::into_bytes)
}

/// SHA-256 of the canonical form, which may be of any length: the print of a command, or what a signature binds.
///
/// # Errors
/// [`NotCanonical::Refused`] with the place.
pub fn digest(value: &Value) -> Result<Hash, NotCanonical> {
    Ok(Hash::of(spell(value)?.as_bytes()))
}

/// Reads bytes that must be exactly the canonical form of what they say, and gives back what they say.
///
/// # Errors
/// [`NotCanonical`] if they are too long, no JSON, name a member twice, or could be written in another way.
pub fn is_canonical(bytes: &[u8]) -> Result<Value, NotCanonical> {
    if bytes.len() > MAX_ENTRY_BYTES {
        return Err(NotCanonical::TooLong(bytes.len()));
    }
    let Strict(value) =
        serde_json::from_slice(bytes).map_err(|e| NotCanonical::Unreadable(e.to_string()))?;
    if canonical(&value)? == bytes { Ok(value) } else { Err(NotCanonical::OtherSpelling) }
}

/// Proves that bytes are the canonical form of what they say, without building it.
///
/// # Errors
/// As [`is_canonical`].
pub fn verify(bytes: &[u8]) -> Result<(), NotCanonical> {
    if bytes.len() <= MAX_ENTRY_BYTES && scan::is_canonical(bytes) {
        return Ok(());
    }
    is_canonical(bytes).map(drop)
}

fn spell(value: &Value) -> Result<String, NotCanonical> {
    let mut out = String::new();
    put(value, 0, &mut out)
        .map_err(|Refusal { pointer, why }| NotCanonical::Refused { pointer, why })?;
    Ok(out)
}

/// The pointer grows from its end while the writer unwinds, so that a value without fault costs nothing.
struct Refusal {
    pointer: String,
    why: Why,
}

impl From<Why> for Refusal {
    fn from(why: Why) -> Self {
        Self { pointer: String::new(), why }
    }
}

impl Refusal {
    fn under(self, step: &str) -> Self {
        let step = step.replace('~', "~0").replace('/', "~1");
        Self { pointer: format!("/{step}{}", self.pointer), why: self.why }
    }
}

fn put(value: &Value, depth: usize, out: &mut String) -> Result<(), Refusal> {
    if depth > MAX_DEPTH {
        return Err(Why::TooDeep.into());
    }
    match value {
        Value::Null => return Err(Why::Null.into()),
        Value::Bool(truth) => out.push_str(if *truth { "true" } else { "false" }),
        Value::Number(number) => put_integer(number, out)?,
        Value::String(text) => put_text(text, out)?,
        Value::Array(items) => put_array(items, depth, out)?,
        Value::Object(members) => put_object(members, depth, out)?,
    }
    Ok(())
}

fn put_integer(number: &Number, out: &mut String) -> Result<(), Why> {
    match number.as_i64() {
        Some(integer) if integer.unsigned_abs() <= MAX_INTEGER => {
            out.push_str(&integer.to_string());
            Ok(())
        }
        None if !number.is_u64() => Err(Why::NotAnInteger),
        _ => Err(Why::LargeInteger),
    }
}

/// With control characters out, RFC 8785 section 3.2.2.2 leaves three characters to escape.
fn put_text(text: &str, out: &mut String) -> Result<(), Why> {
    if text.chars().any(|c| c.is_control() && c != '\n') {
        return Err(Why::ControlCharacter);
    }
    if !is_nfc(text) {
        return Err(Why::NotNormal);
    }
    out.push('"');
    for c in text.chars() {
        match c {
            '"' => out.push_str("\\\""),
            '\\' => out.push_str("\\\\"),
            '\n' => out.push_str("\\n"),
            other => out.push(other),
        }
    }
    out.push('"');
    Ok(())
}

fn put_array(items: &[Value], depth: usize, out: &mut String) -> Result<(), Refusal> {
    out.push('[');
    for (i, item) in items.iter().enumerate() {
        if i > 0 {
            out.push(',');
        }
        put(item, depth + 1, out).map_err(|refusal| refusal.under(&i.to_string()))?;
    }
    out.push(']');
    Ok(())
}

/// RFC 8785 section 3.2.3: members stand in the order of their names as arrays of UTF-16 code units.
fn put_object(members: &Map<String, Value>, depth: usize, out: &mut String) -> Result<(), Refusal> {
    let mut members: Vec<_> = members.iter().collect();
    members.sort_by(|(a, _), (b, _)| a.encode_utf16().cmp(b.encode_utf16()));
    out.push('{');
    for (i, (name, value)) in members.into_iter().enumerate() {
        if i > 0 {
            out.push(',');
        }
        if name.starts_with(RESERVED) {
            return Err(Refusal::from(Why::ReservedName).under(name));
        }
        put_text(name, out).map_err(|why| Refusal::from(why).under(name))?;
        out.push(':');
        put(value, depth + 1, out).map_err(|refusal| refusal.under(name))?;
    }
    out.push('}');
    Ok(())
}

/// A JSON value read without forgiving a member that stands twice, of which serde's own would keep the last.
struct Strict(Value);

impl<'de> Deserialize<'de> for Strict {
    fn deserialize<D: Deserializer<'de>>(deserializer: D) -> Result<Self, D::Error> {
        deserializer.deserialize_any(StrictVisitor).map(Self)
    }
}

struct StrictVisitor;

impl<'de> Visitor<'de> for StrictVisitor {
    type Value = Value;

    fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str("a JSON value")
    }

    fn visit_unit<E: de::Error>(self) -> Result<Value, E> {
        Ok(Value::Null)
    }

    fn visit_bool<E: de::Error>(self, truth: bool) -> Result<Value, E> {
        Ok(Value::Bool(truth))
    }

    fn visit_i64<E: de::Error>(self, integer: i64) -> Result<Value, E> {
        Ok(Value::from(integer))
    }

    fn visit_u64<E: de::Error>(self, integer: u64) -> Result<Value, E> {
        Ok(Value::from(integer))
    }

    fn visit_f64<E: de::Error>(self, number: f64) -> Result<Value, E> {
        Number::from_f64(number)
            .map(Value::Number)
            .ok_or_else(|| E::custom("a number beyond the range of JSON readers"))
    }

    fn visit_str<E: de::Error>(self, text: &str) -> Result<Value, E> {
        Ok(Value::from(text))
    }

    fn visit_seq<A: SeqAccess<'de>>(self, mut seq: A) -> Result<Value, A::Error> {
        let mut items = Vec::new();
        while let Some(Strict(item)) = seq.next_element()? {
            items.push(item);
        }
        Ok(Value::Array(items))
    }

    fn visit_map<A: MapAccess<'de>>(self, mut map: A) -> Result<Value, A::Error> {
        let mut members = Map::new();
        while let Some(name) = map.next_key::<String>()? {
            if members.contains_key(&name) {
                return Err(de::Error::custom(format_args!("member {name:?} stands twice")));
            }
            let Strict(value) = map.next_value()?;
            members.insert(name, value);
        }
        Ok(Value::Object(members))
    }
}

#[cfg(test)]
mod tests;
