//! The signed head: a C2SP tlog-checkpoint in a C2SP signed note, with Ed25519.
//!
//! A checkpoint says "the log of this origin has so many entries and this root". Its text is three lines, so that it
//! fits on paper and into a mail; its signature is checked strictly (RFC 8032, no second spelling of key or signature).
//! What a signature does not say is when it was made, nor that no other head was signed for other eyes: that takes
//! somebody outside who keeps heads.
//!
//! One key serves every log of an installation. So the name that a key goes by is the log's origin, and a checkpoint
//! counts only if the name beside its signature is the origin in its first line.

use std::fmt;
use std::str::FromStr;

use base64::Engine as _;
use base64::engine::general_purpose::STANDARD;
use ed25519_dalek::{Signature, Signer as _, SigningKey, VerifyingKey};
use sha2::{Digest as _, Sha256};

use super::tree::{Hash, TreeHead, empty_root};

/// Signature lines looked at. Our own bound; C2SP signed-note demands that at least 16 be accepted.
pub const MAX_SIGNATURES: usize = 64;

/// The longest note read, in bytes: 64 signatures of the longest kind in use, about 5 kB (C2SP signed-note), and text.
pub const MAX_NOTE_BYTES: usize = 500_000;

/// The byte that stands for Ed25519 in key ids and verifier keys (C2SP signed-note, "Signature types").
const ED25519: u8 = 1;

/// Why a note, a checkpoint or a key's text is not accepted.
#[derive(Clone, Debug, Eq, PartialEq, thiserror::Error)]
pub enum NoteError {
    /// A key's name is empty or holds a blank, a plus sign or a control character.
    #[error("{0:?} cannot name a key or a log: no blanks, plus signs or control characters")]
    BadName(String),
    /// The text of a verifier key is not `name+id+key`, or its id is not that of name and key.
    #[error("not a verifier key of the form name+hexadecimal id+base64 key")]
    BadKey,
    /// The note is not text, blank line, signature lines.
    #[error("not a signed note: {0}")]
    Malformed(&'static str),
    /// A known key's line does not fit the text: the text or the signature was altered.
    #[error("the signature by {0:?} does not fit the text")]
    BadSignature(String),
    /// No line is by a known key.
    #[error("the note is not signed by a known key")]
    UnknownSigner,
    /// The text is not a checkpoint's.
    #[error("not a checkpoint: {0}")]
    NotACheckpoint(&'static str),
    /// The checkpoint is that of another log, though signed with the same key.
    #[error("the checkpoint is of the log {found:?}, not of {wanted:?}")]
    OtherOrigin {
        /// The key's name.
        wanted: String,
        /// The origin in the checkpoint.
        found: String,
    },
}

/// The fingerprint of a public key, for people to compare: SHA-256 of its 32 bytes, in groups of four digits.
///
/// Reading forgives blanks, colons, hyphens and capitals.
#[derive(Clone, Copy, Debug, Eq, Hash, PartialEq)]
pub struct Fingerprint(pub Hash);

impl Fingerprint {
    /// Of this key.
    pub fn of(key: &VerifyingKey) -> Self {
        Self(Hash::of(key.as_bytes()))
    }
}

impl fmt::Display for Fingerprint {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        for (i, [a, b]) in self.0.0.as_chunks::<2>().0.iter().enumerate() {
            let gap = if i > 0 { " " } else { "" };
            write!(f, "{gap}{a:02x}{b:02x}")?;
        }
        Ok(())
    }
}

impl FromStr for Fingerprint {
    type Err = super::tree::NotAHash;

    fn from_str(text: &str) -> Result<Self, Self::Err> {
        let between = |c: &char| !c.is_whitespace() && !matches!(c, ':' | '-');
        let digits: String = text.chars().filter(between).map(|c| c.to_ascii_lowercase()).collect();
        digits.parse().map(Self)
    }
}

/// A public key with the name it signs under.
///
/// Written as C2SP signed-note has it, `name+hexadecimal id+base64(0x01 ‖ key)`; reading checks the id.
#[derive(Clone, Debug, Eq, PartialEq)]
pub struct VerifierKey {
    name: String,
    key: VerifyingKey,
}

impl VerifierKey {
    /// A key under a name.
    ///
    /// # Errors
    /// [`NoteError::BadName`]; [`NoteError::BadKey`] if the key is one of the few weak points that fit any message.
    pub fn new(name: &str, key: VerifyingKey) -> Result<Self, NoteError> {
        check_name(name)?;
        if key.is_weak() { Err(NoteError::BadKey) } else { Ok(Self { name: name.to_owned(), key }) }
    }

    /// The name: the origin of the log that it signs.
    pub fn name(&self) -> &str {
        &self.name
    }

    /// The key itself.
    pub const fn key(&self) -> &VerifyingKey {
        &self.key
    }

    /// For people to compare.
    pub fn fingerprint(&self) -> Fingerprint {
        Fingerprint::of(&self.key)
    }

    /// Checks an Ed25519 signature, strictly.
    pub fn accepts(&self, text: &[u8], signature: &[u8]) -> bool {
        Signature::from_slice(signature).is_ok_and(|s| self.key.verify_strict(text, &s).is_ok())
    }

    /// The first four bytes of SHA-256(name ‖ newline ‖ `0x01` ‖ key).
    fn id(&self) -> [u8; 4] {
        key_id(&self.name, &self.key)
    }
}

impl fmt::Display for VerifierKey {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let id = u32::from_be_bytes(self.id());
        let key = STANDARD.encode([&[ED25519], self.key.as_bytes().as_slice()].concat());
        write!(f, "{}+{id:08x}+{key}", self.name)
    }
}

impl FromStr for VerifierKey {
    type Err = NoteError;

    fn from_str(text: &str) -> Result<Self, NoteError> {
        // The base64 part may hold plus signs, the other two may not.
        let mut parts = text.splitn(3, '+');
        let (Some(name), Some(_), Some(key)) = (parts.next(), parts.next(), parts.next()) else {
            return Err(NoteError::BadKey);
        };
        let bytes = STANDARD.decode(key).map_err(|_| NoteError::BadKey)?;
        let Some((&ED25519, key)) = bytes.split_first() else { return Err(NoteError::BadKey) };
        let key = VerifyingKey::try_from(key).map_err(|_| NoteError::BadKey)?;
        let found = Self::new(name, key)?;
        if found.to_string() == text { Ok(found) } else { Err(NoteError::BadKey) }
    }
}

fn key_id(name: &str, key: &VerifyingKey) -> [u8; 4] {
    let digest: [u8; 32] = Sha256::new()
        .chain_update(name)
        .chain_update([b'\n', ED25519])
        .chain_update(key.as_bytes())
        .finalize()
        .into();
    [digest[0], digest[1], digest[2], digest[3]]
}

fn check_name(name: &str) -> Result<(), NoteError> {
    let unfit = |c: char| c.is_whitespace() || c.is_control() || c == '+';
    if name.is_empty() || name.contains(unfit) {
        return Err(NoteError::BadName(name.to_owned()));
    }
    Ok(())
}

/// A note whose text may be believed, because known keys signed it.
#[derive(Clone, Debug, Eq, PartialEq)]
pub struct OpenedNote<'a> {
    /// The text, with its last newline.
    pub text: &'a str,
    /// The known keys' names, in the order of their lines.
    pub signers: Vec<&'a str>,
}

/// Opens a signed note: lines by unknown keys are passed over, every line by a known key must fit.
///
/// # Errors
/// [`NoteError`] unless at least one known key signed the text.
pub fn open<'a>(note: &'a str, known: &[VerifierKey]) -> Result<OpenedNote<'a>, NoteError> {
    let (text, lines) = split(note)?;
    let mut signers = Vec::new();
    for line in lines {
        let (name, id, signature) = read_signature(line)?;
        let Some(key) = known.iter().find(|key| key.name == name && key.id() == id) else {
            continue;
        };
        if !key.accepts(text.as_bytes(), &signature) {
            return Err(NoteError::BadSignature(name.to_owned()));
        }
        signers.push(name);
    }
    if signers.is_empty() {
        Err(NoteError::UnknownSigner)
    } else {
        Ok(OpenedNote { text, signers })
    }
}

/// The text and the signature lines, which the last empty line parts.
fn split(note: &str) -> Result<(&str, Vec<&str>), NoteError> {
    if note.len() > MAX_NOTE_BYTES {
        return Err(NoteError::Malformed("it is too long"));
    }
    if note.contains(|c| c < ' ' && c != '\n') {
        return Err(NoteError::Malformed("it holds control characters"));
    }
    let end = note
        .rfind("\n\n")
        .ok_or(NoteError::Malformed("no empty line parts text and signatures"))?;
    let (text, rest) = note.split_at(end + 1);
    let lines = rest
        .strip_prefix('\n')
        .and_then(|lines| lines.strip_suffix('\n'))
        .ok_or(NoteError::Malformed("no line of signature, or the last one is cut"))?;
    let lines: Vec<&str> = lines.split('\n').collect();
    if lines.len() > MAX_SIGNATURES {
        return Err(NoteError::Malformed("it has too many signatures"));
    }
    Ok((text, lines))
}

/// Name, key id and signature of a line `— name base64(id ‖ signature)`.
fn read_signature(line: &str) -> Result<(&str, [u8; 4], Vec<u8>), NoteError> {
    const UNREADABLE: NoteError = NoteError::Malformed("a line of signature cannot be read");
    let (name, encoded) =
        line.strip_prefix("— ").and_then(|rest| rest.split_once(' ')).ok_or(UNREADABLE)?;
    check_name(name)?;
    let bytes = STANDARD.decode(encoded).map_err(|_| UNREADABLE)?;
    let (id, signature) = bytes.split_first_chunk::<4>().ok_or(UNREADABLE)?;
    Ok((name, *id, signature.to_vec()))
}

/// What a log's head says: whose log, how many entries, which root.
///
/// ```
/// use domain::ledger::note::{Checkpoint, VerifierKey};
/// use domain::ledger::tree::empty_root;
/// use ed25519_dalek::SigningKey;
///
/// let key = SigningKey::from_bytes(&[7; 32]); // made up
/// let head = Checkpoint { origin: "example.org/cellar".to_owned(), size: 0, root: empty_root() };
/// let note = head.sign(&key)?;
/// let known = VerifierKey::new("example.org/cellar", key.verifying_key())?;
/// assert_eq!(Checkpoint::verify(&note, &known)?, head);
/// # Ok::<(), domain::ledger::note::NoteError>(())
/// ```
#[derive(Clone, Debug, Eq, PartialEq)]
pub struct Checkpoint {
    /// The log's unique name.
    pub origin: String,
    /// Number of entries.
    pub size: u64,
    /// Root over them.
    pub root: Hash,
}

impl Checkpoint {
    /// Size and root.
    pub const fn head(&self) -> TreeHead {
        TreeHead { size: self.size, root: self.root }
    }

    /// The three lines that are signed.
    pub fn body(&self) -> String {
        format!("{}\n{}\n{}\n", self.origin, self.size, STANDARD.encode(self.root.0))
    }

    /// The signed note. Whether this head may be signed, having regard to those signed before, is the caller's to know.
    ///
    /// # Errors
    /// [`NoteError::BadName`] if the origin cannot be a key's name.
    pub fn sign(&self, key: &SigningKey) -> Result<String, NoteError> {
        check_name(&self.origin)?;
        let body = self.body();
        let id = key_id(&self.origin, &key.verifying_key());
        let signature = key.sign(body.as_bytes()).to_bytes();
        let encoded = STANDARD.encode([&id[..], &signature[..]].concat());
        Ok(format!("{body}\n— {} {encoded}\n", self.origin))
    }

    /// Opens a signed checkpoint by the log that `key` is named after.
    ///
    /// # Errors
    /// [`NoteError`].
    pub fn verify(note: &str, key: &VerifierKey) -> Result<Self, NoteError> {
        let opened = open(note, std::slice::from_ref(key))?;
        let checkpoint = Self::read(opened.text)?;
        if checkpoint.origin == key.name {
            Ok(checkpoint)
        } else {
            Err(NoteError::OtherOrigin { wanted: key.name.clone(), found: checkpoint.origin })
        }
    }

    /// Reads a note's text without asking who signed it. Extension lines, which we never write, are passed over.
    ///
    /// # Errors
    /// [`NoteError::NotACheckpoint`].
    pub fn read(text: &str) -> Result<Self, NoteError> {
        let fault = NoteError::NotACheckpoint;
        let text = text.strip_suffix('\n').ok_or(fault("its last line is cut"))?;
        let mut lines = text.split('\n');
        let (Some(origin), Some(size), Some(root)) = (lines.next(), lines.next(), lines.next())
        else {
            return Err(fault("it has fewer than three lines"));
        };
        if origin.is_empty() || lines.any(str::is_empty) {
            return Err(fault("a line is empty"));
        }
        let size = read_size(size).ok_or(fault("its size is no plain number"))?;
        let root =
            STANDARD.decode(root).ok().and_then(|bytes| Hash::try_from(bytes.as_slice()).ok());
        let root = root.ok_or(fault("its root is no hash"))?;
        if size == 0 && root != empty_root() {
            return Err(fault("an empty log has another root"));
        }
        Ok(Self { origin: origin.to_owned(), size, root })
    }
}

/// Decimal without sign or leading zero.
fn read_size(text: &str) -> Option<u64> {
    text.parse().ok().filter(|size: &u64| size.to_string() == text)
}

#[cfg(test)]
mod tests;
