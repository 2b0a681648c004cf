//! Whether bytes are in canonical form, told from the bytes alone.
//!
//! Verifying a log asks this of every entry; building each value only to spell it again takes five times as long. A
//! "no" here says only that the slow way has to look, and say why.

use std::borrow::Cow;

use unicode_normalization::is_nfc;

use super::{MAX_DEPTH, MAX_INTEGER, RESERVED};

/// Whether these are the canonical bytes of a value.
pub(super) fn is_canonical(bytes: &[u8]) -> bool {
    let Ok(text) = std::str::from_utf8(bytes) else { return false };
    let mut scan = Scan { text, at: 0 };
    scan.value(0).is_some() && scan.at == text.len()
}

struct Scan<'a> {
    text: &'a str,
    at: usize,
}

impl<'a> Scan<'a> {
    fn next(&mut self) -> Option<u8> {
        let byte = *self.text.as_bytes().get(self.at)?;
        self.at += 1;
        Some(byte)
    }

    fn peek(&self) -> Option<u8> {
        self.text.as_bytes().get(self.at).copied()
    }

    fn expect(&mut self, byte: u8) -> Option<()> {
        (self.next()? == byte).then_some(())
    }

    fn word(&mut self, word: &str) -> Option<()> {
        self.at += word.len();
        (self.text.as_bytes().get(self.at - word.len()..self.at)? == word.as_bytes()).then_some(())
    }

    fn value(&mut self, depth: usize) -> Option<()> {
        if depth > MAX_DEPTH {
            return None;
        }
        match self.peek()? {
            b'{' => self.object(depth),
            b'[' => self.array(depth),
            b'"' => self.string().map(drop),
            b't' => self.word("true"),
            b'f' => self.word("false"),
            _ => self.integer(),
        }
    }

    fn array(&mut self, depth: usize) -> Option<()> {
        self.expect(b'[')?;
        if self.peek()? == b']' {
            return self.expect(b']');
        }
        loop {
            self.value(depth + 1)?;
            match self.next()? {
                b',' => {}
                b']' => return Some(()),
                _ => return None,
            }
        }
    }

    /// The names of members must rise.
    fn object(&mut self, depth: usize) -> Option<()> {
        self.expect(b'{')?;
        if self.peek()? == b'}' {
            return self.expect(b'}');
        }
        let mut last: Option<Text<'a>> = None;
        loop {
            let name = self.string()?;
            // A name that reads as a reserved one only after its escapes does not exist: they have none.
            if name.raw.starts_with(RESERVED) || last.is_some_and(|last| !last.is_before(&name)) {
                return None;
            }
            last = Some(name);
            self.expect(b':')?;
            self.value(depth + 1)?;
            match self.next()? {
                b',' => {}
                b'}' => return Some(()),
                _ => return None,
            }
        }
    }

    fn string(&mut self) -> Option<Text<'a>> {
        self.expect(b'"')?;
        let start = self.at;
        let (mut escaped, mut ascii) = (false, true);
        loop {
            match self.next()? {
                b'"' => break,
                b'\\' => {
                    escaped = true;
                    if !matches!(self.next()?, b'"' | b'\\' | b'n') {
                        return None;
                    }
                }
                0..=0x1f | 0x7f => return None,
                0x80.. => ascii = false,
                _ => {}
            }
        }
        let text = Text { raw: self.text.get(start..self.at - 1)?, escaped, ascii };
        (ascii || text.is_allowed()).then_some(text)
    }

    fn integer(&mut self) -> Option<()> {
        /// As many as the largest integer has.
        const DIGITS: usize = 16;
        let negative = self.peek()? == b'-';
        self.at += usize::from(negative);
        let start = self.at;
        let mut value = 0_u64;
        while let Some(digit @ b'0'..=b'9') = self.peek() {
            if self.at - start == DIGITS {
                return None;
            }
            value = value * 10 + u64::from(digit - b'0');
            self.at += 1;
        }
        let digits = self.at - start;
        let zero = value == 0 && digits == 1 && !negative;
        let other = digits > 0 && self.text.as_bytes()[start] != b'0' && value <= MAX_INTEGER;
        (zero || other).then_some(())
    }
}

/// A text between its quotes.
#[derive(Clone, Copy)]
struct Text<'a> {
    raw: &'a str,
    escaped: bool,
    ascii: bool,
}

impl<'a> Text<'a> {
    fn said(&self) -> Cow<'a, str> {
        if !self.escaped {
            return self.raw.into();
        }
        let mut said = String::with_capacity(self.raw.len());
        let mut chars = self.raw.chars();
        while let Some(c) = chars.next() {
            said.push(match c {
                '\\' => match chars.next() {
                    Some('n') => '\n',
                    Some(other) => other,
                    None => break,
                },
                other => other,
            });
        }
        said.into()
    }

    /// In normal form C and without control characters beyond ASCII's, which were met on the way.
    fn is_allowed(&self) -> bool {
        let said = self.said();
        is_nfc(&said) && !said.chars().any(|c| c.is_control() && c != '\n')
    }

    /// Bytes of plain ASCII are ordered as its code units are.
    fn is_before(&self, other: &Self) -> bool {
        if [self, other].iter().all(|text| text.ascii && !text.escaped) {
            return self.raw < other.raw;
        }
        self.said().encode_utf16().lt(other.said().encode_utf16())
    }
}
