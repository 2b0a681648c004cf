use serde_json::Value;

use super::*;
use crate::ledger::tree::{leaf_hash, verify_inclusion};

/// Sources and licences of the three files stand in their headers.
const NOTES: &str = include_str!(concat!(
    env!("CARGO_MANIFEST_DIR"),
    "/../tests/reference/vectors/signed_note.json"
));
const RFC_8032: &str = include_str!(concat!(
    env!("CARGO_MANIFEST_DIR"),
    "/../tests/reference/vectors/ed25519_rfc8032.json"
));
const WYCHEPROOF: &str = include_str!(concat!(
    env!("CARGO_MANIFEST_DIR"),
    "/../tests/reference/vectors/ed25519_wycheproof.json"
));

fn list(value: &Value) -> &[Value] {
    value.as_array().unwrap()
}

fn text(value: &Value) -> &str {
    value.as_str().unwrap()
}

fn bytes(hex: &Value) -> Vec<u8> {
    let digits = text(hex);
    (0..digits.len())
        .step_by(2)
        .map(|i| u8::from_str_radix(&digits[i..i + 2], 16).unwrap())
        .collect()
}

fn keys(case: &Value) -> Vec<VerifierKey> {
    list(&case["vkeys"]).iter().map(|key| text(key).parse().unwrap()).collect()
}

/// The first test key of RFC 8032, section 7.1.
fn signing_key() -> SigningKey {
    let file: Value = serde_json::from_str(RFC_8032).unwrap();
    SigningKey::try_from(bytes(&file["tests"][0]["sk"]).as_slice()).unwrap()
}

fn checkpoint(origin: &str) -> Checkpoint {
    Checkpoint { origin: origin.to_owned(), size: 1, root: leaf_hash(b"") }
}

#[test]
fn good_notes_open_and_name_their_signers() {
    let file: Value = serde_json::from_str(NOTES).unwrap();
    assert_eq!(list(&file["good"]).len(), 7);
    for case in list(&file["good"]) {
        let (note, keys) = (text(&case["note"]), keys(case));
        let opened = open(note, &keys).unwrap();
        let signers: Vec<&str> = list(&case["signed_by"]).iter().map(text).collect();
        assert_eq!(opened.signers, signers, "{}", case["why"]);
        let Some(expected) = case["checkpoint"].as_array() else {
            assert!(Checkpoint::read(opened.text).is_err());
            continue;
        };
        let found = Checkpoint::verify(note, &keys[0]).unwrap();
        assert_eq!(found.origin, text(&expected[0]));
        assert_eq!(Some(found.size), expected[1].as_u64());
        assert_eq!(found.root.to_string(), text(&expected[2]));
        assert_eq!(found.body(), opened.text);
        if signers.len() == 1 && !note.contains("witness") {
            assert_eq!(found.sign(&signing_key()).unwrap(), note);
        }
    }
}

#[test]
fn bad_notes_are_refused() {
    let file: Value = serde_json::from_str(NOTES).unwrap();
    assert_eq!(list(&file["bad"]).len(), 16);
    for case in list(&file["bad"]) {
        let read =
            open(text(&case["note"]), &keys(case)).and_then(|note| Checkpoint::read(note.text));
        assert!(read.is_err(), "{}", case["why"]);
    }
}

/// C2SP tlog-proof: a line of magic, perhaps one of extra data, `index n`, the hashes, an empty line, the checkpoint.
fn accepts_proof(case: &Value) -> Option<()> {
    let (proof, note) = text(&case["proof"]).split_once("\n\n")?;
    let mut lines = proof.strip_prefix("c2sp.org/tlog-proof@v1\n")?.split('\n').peekable();
    lines.next_if(|line| line.starts_with("extra "));
    let index = lines.next()?.strip_prefix("index ")?.parse().ok()?;
    let hash = |line| Hash::try_from(STANDARD.decode(line).ok()?.as_slice()).ok();
    let hashes: Vec<Hash> = lines.map(hash).collect::<Option<_>>()?;
    let head = Checkpoint::verify(note, &keys(case)[0]).ok()?.head();
    verify_inclusion(&leaf_hash(&bytes(&case["leaf_hex"])), index, &head, &hashes).ok()
}

#[test]
fn published_proofs_with_a_checkpoint_are_judged_right() {
    let file: Value = serde_json::from_str(NOTES).unwrap();
    assert_eq!(list(&file["tlog_proof"]).len(), 22);
    for case in list(&file["tlog_proof"]) {
        assert_eq!(
            accepts_proof(case).is_some(),
            case["valid"].as_bool().unwrap(),
            "{}",
            case["why"]
        );
    }
}

#[test]
fn signatures_are_those_of_rfc_8032() {
    let file: Value = serde_json::from_str(RFC_8032).unwrap();
    assert_eq!(list(&file["tests"]).len(), 3);
    for case in list(&file["tests"]) {
        let key = SigningKey::try_from(bytes(&case["sk"]).as_slice()).unwrap();
        let (message, signature) = (bytes(&case["msg"]), bytes(&case["sig"]));
        assert_eq!(key.verifying_key().as_bytes().as_slice(), bytes(&case["pk"]));
        assert_eq!(key.sign(&message).to_bytes().as_slice(), signature);
        let known = VerifierKey::new("example.org", key.verifying_key()).unwrap();
        assert!(known.accepts(&message, &signature));
        assert!(!known.accepts(b"another", &signature));
    }
}

#[test]
fn published_signatures_are_all_judged_right() {
    let file: Value = serde_json::from_str(WYCHEPROOF).unwrap();
    let cases = list(&file["tests"]);
    assert_eq!(cases.len(), 151);
    for case in cases {
        let accepted = VerifyingKey::try_from(bytes(&case["pk"]).as_slice())
            .ok()
            .and_then(|key| VerifierKey::new("example.org", key).ok())
            .is_some_and(|key| key.accepts(&bytes(&case["msg"]), &bytes(&case["sig"])));
        assert_eq!(accepted, text(&case["result"]) == "valid", "{case}");
    }
}

/// One installation signs all its logs with one key, so the same signature fits under both names.
#[test]
fn the_checkpoint_of_a_sister_log_is_refused_under_this_logs_name() {
    let key = signing_key();
    let note = checkpoint("example.org/north").sign(&key).unwrap();
    let (body, signed) = note.split_once("\n\n").unwrap();
    let encoded = signed.trim_end().rsplit_once(' ').unwrap().1;
    let signature = STANDARD.decode(encoded).unwrap();
    let south = VerifierKey::new("example.org/south", key.verifying_key()).unwrap();
    let relabelled = STANDARD.encode([&south.id()[..], &signature[4..]].concat());
    let forged = format!("{body}\n\n— example.org/south {relabelled}\n");
    assert!(open(&forged, std::slice::from_ref(&south)).is_ok());
    assert!(matches!(Checkpoint::verify(&forged, &south), Err(NoteError::OtherOrigin { .. })));
    assert_eq!(Checkpoint::verify(&note, &south), Err(NoteError::UnknownSigner));
}

#[test]
fn sixteen_signatures_and_more_are_accepted_up_to_the_bound() {
    let key = signing_key();
    let known = VerifierKey::new("example.org", key.verifying_key()).unwrap();
    let note = checkpoint("example.org").sign(&key).unwrap();
    let (body, line) = note.split_once("\n\n").unwrap();
    let with = |others: usize| {
        let witness = format!("— witness.example {}\n", STANDARD.encode([9; 2_500]));
        format!("{body}\n\n{}{line}", witness.repeat(others))
    };
    for others in [0, 15, MAX_SIGNATURES - 1] {
        assert!(Checkpoint::verify(&with(others), &known).is_ok(), "{others}");
    }
    assert!(matches!(
        Checkpoint::verify(&with(MAX_SIGNATURES), &known),
        Err(NoteError::Malformed(_))
    ));
    let long = format!("{}{note}", "x".repeat(MAX_NOTE_BYTES));
    assert!(matches!(open(&long, &[known]), Err(NoteError::Malformed(_))));
}

#[test]
fn broken_lines_of_signature_are_refused_even_if_unknown() {
    let key = signing_key();
    let known = VerifierKey::new("example.org", key.verifying_key()).unwrap();
    let note = checkpoint("example.org").sign(&key).unwrap();
    for line in [
        "—",
        "— name",
        "— name ****",
        "— name AAA=",
        "—  AAAAAAAA",
        "— na+me AAAAAAAA",
        "name AAAAAAAA",
        "",
    ] {
        assert!(
            open(&format!("{note}{line}\n"), std::slice::from_ref(&known)).is_err(),
            "{line:?}"
        );
    }
    assert!(open(&format!("{note}— name AAAAAAAA\n"), &[known]).is_ok());
}

#[test]
fn a_checkpoint_has_three_good_lines_and_may_have_more() {
    let body = checkpoint("example.org").body();
    assert_eq!(Checkpoint::read(&body).unwrap(), checkpoint("example.org"));
    assert!(Checkpoint::read(&format!("{body}an extension\n")).is_ok());
    for wrong in [
        body.trim_end().to_owned(),
        format!("{body}\n"),
        format!("\n{body}"),
        body.replacen("\n1\n", "\n+1\n", 1),
        body.replacen("\n1\n", "\n 1\n", 1),
        body.replacen("\n1\n", "\n01\n", 1),
        body.replacen("\n1\n", "\n18446744073709551616\n", 1),
        body.replace('=', ""),
        String::new(),
    ] {
        assert!(Checkpoint::read(&wrong).is_err(), "{wrong:?}");
    }
}

#[test]
fn an_origin_that_cannot_name_a_key_is_not_signed() {
    for origin in ["", "two words", "a+b", "line\nbreak", "no\u{a0}break", "tab\t"] {
        let refusal = NoteError::BadName(origin.to_owned());
        assert_eq!(checkpoint(origin).sign(&signing_key()), Err(refusal.clone()));
        assert_eq!(VerifierKey::new(origin, signing_key().verifying_key()), Err(refusal));
    }
}

#[test]
fn a_verifier_key_survives_its_text_and_refuses_another() {
    let file: Value = serde_json::from_str(NOTES).unwrap();
    let published = text(&file["good"][0]["vkeys"][0]);
    let key: VerifierKey = published.parse().unwrap();
    assert_eq!((key.name(), key.to_string().as_str()), ("example.com/foo", published));
    for wrong in [
        published.replace("foo", "fob"),
        published.replace("530d903a", "530D903A"),
        published.replace("530d903a", "530d903b"),
        published.replace("+AekyeRrm", "+AukyeRrm"),
        published.replace('+', " "),
        published[..published.len() - 4].to_owned(),
        format!("{published}\n"),
        String::new(),
    ] {
        assert!(wrong.parse::<VerifierKey>().is_err(), "{wrong}");
    }
}

#[test]
fn a_weak_key_is_refused() {
    // The neutral point, y = 1: with it a signature can be made that fits any text (RFC 8032, section 5.1).
    let mut neutral = [0; 32];
    neutral[0] = 1;
    let key = VerifyingKey::from_bytes(&neutral).unwrap();
    assert_eq!(VerifierKey::new("example.org", key), Err(NoteError::BadKey));
}

/// The digest was computed by another program: `printf d75a98…511a | xxd -r -p | sha256sum`.
#[test]
fn a_fingerprint_is_compared_whatever_its_blanks_and_capitals() {
    let fingerprint = Fingerprint::of(&signing_key().verifying_key());
    let shown = fingerprint.to_string();
    assert_eq!(
        shown,
        "21fe 31df a154 a261 626b f854 046f d227 1b7b ed4b 6abe 45aa 5887 7ef4 7f97 21b9"
    );
    for typed in [
        shown.to_uppercase(),
        shown.replace(' ', ":"),
        shown.replace(' ', "\n"),
        shown.replace(' ', ""),
    ] {
        assert_eq!(typed.parse(), Ok(fingerprint));
    }
    assert!(shown[1..].parse::<Fingerprint>().is_err());
}
