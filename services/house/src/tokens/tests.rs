//! Hostile tokens. Each is compared with a control that differs from it only in the one fault.

use base64::Engine;
use base64::engine::general_purpose::URL_SAFE_NO_PAD;
use ed25519_dalek::Signer;
use serde_json::{Value, json};

use super::*;

const PERSON: PersonId = PersonId(Uuid::from_u128(0x0198_1111_2222_7333_8444_5555_6666_7777));
const SITE: SiteId = SiteId(Uuid::from_u128(0x0198_aaaa_bbbb_7ccc_8ddd_eeee_ffff_0000));
const NOW: i64 = 1_757_610_000;

/// The key of RFC 8037 appendix A.1.
fn key() -> SigningKey {
    let seed = URL_SAFE_NO_PAD.decode("nWGxne_9WmC6hEr0kuwsxERJxWl7MmkZcDusAxyuf2A").unwrap();
    SigningKey::from_bytes(&seed.try_into().unwrap())
}

fn tokens() -> Tokens {
    Tokens::new(&key(), "https://cellar.example").unwrap()
}

fn at(seconds: i64) -> Micros {
    Micros(seconds * 1_000_000)
}

fn header() -> Value {
    json!({"typ": "at+jwt", "alg": "EdDSA", "kid": tokens().kid()})
}

fn claims() -> Value {
    json!({
        "iss": "https://cellar.example", "aud": "tallystave", "sub": PERSON, "site": SITE,
        "iat": NOW, "nbf": NOW, "exp": NOW + 900, "jti": Uuid::from_u128(9),
    })
}

fn with(mut object: Value, name: &str, value: Value) -> Value {
    object[name] = value;
    object
}

fn without(mut object: Value, name: &str) -> Value {
    assert!(object.as_object_mut().unwrap().remove(name).is_some());
    object
}

/// Signed with our own key, so that only what the texts say can be at fault.
fn signed(header: &str, claims: &str) -> String {
    let message = format!("{}.{}", URL_SAFE_NO_PAD.encode(header), URL_SAFE_NO_PAD.encode(claims));
    let signature = URL_SAFE_NO_PAD.encode(key().sign(message.as_bytes()).to_bytes());
    format!("{message}.{signature}")
}

fn signed_json(header: &Value, claims: &Value) -> String {
    signed(&header.to_string(), &claims.to_string())
}

fn good() -> String {
    signed_json(&header(), &claims())
}

fn check(token: &str) -> Result<Access, TokenError> {
    tokens().check(token, at(NOW))
}

#[track_caller]
fn refused(kinds: &[(&str, String)]) {
    assert!(check(&good()).is_ok(), "the control is refused");
    for (what, token) in kinds {
        assert!(check(token).is_err(), "{what} was accepted: {token}");
    }
}

#[test]
fn an_issued_token_is_accepted_until_its_quarter_of_an_hour_is_over() {
    let issued = tokens().issue(PERSON, SITE, at(NOW)).unwrap();
    assert_eq!(issued.expires_in, 900);
    let access = tokens().check(&issued.token, at(NOW + 1)).unwrap();
    assert_eq!((access.person, access.site, access.issued_at), (PERSON, SITE, at(NOW)));
    assert!(tokens().check(&issued.token, at(NOW + 899)).is_ok());
    assert!(tokens().check(&issued.token, at(NOW + 900 + LEEWAY - 1)).is_ok());
    let late = tokens().check(&issued.token, at(NOW + 900 + LEEWAY));
    assert_eq!(late, Err(TokenError::Expired));
    assert!(tokens().check(&issued.token, at(NOW - LEEWAY)).is_ok());
    let early = tokens().check(&issued.token, at(NOW - LEEWAY - 1));
    assert_eq!(early, Err(TokenError::Untimely));
}

#[test]
fn two_tokens_of_one_second_differ_and_neither_is_shown_by_debug() {
    let first = tokens().issue(PERSON, SITE, at(NOW)).unwrap();
    let second = tokens().issue(PERSON, SITE, at(NOW)).unwrap();
    assert_ne!(first.token, second.token);
    assert!(!format!("{first:?}").contains(&first.token[..20]));
}

/// RFC 8037 appendix A.4: the signature over a given input with the key of appendix A.1.
#[test]
fn the_published_signature_is_reproduced() {
    provider::install();
    let message = b"eyJhbGciOiJFZERTQSJ9.RXhhbXBsZSBvZiBFZDI1NTE5IHNpZ25pbmc";
    let wanted =
        "hgyY0il_MGCjP0JzlnLWG1PPOt7-09PGcvMg3AIbQR6dWbhijcNR4ki4iylGjg5BhVsPt9g7sVvpAr_MuM0KAg";
    let tokens = tokens();
    let made = jsonwebtoken::crypto::sign(message, &tokens.signing, Algorithm::EdDSA).unwrap();
    assert_eq!(made, wanted);
    let public = URL_SAFE_NO_PAD.encode(tokens.public_key());
    assert_eq!(public, "11qYAYKxCrfVS_7TyWQHOg7hcvPapiMlrwIaaPcHURo");
}

#[test]
fn other_algorithms_in_any_spelling_are_refused() {
    let (_, rest) = good().split_once('.').map(|(h, r)| (h.to_owned(), r.to_owned())).unwrap();
    let (payload, signature) = rest.split_once('.').unwrap();
    let mut kinds = Vec::new();
    for alg in [
        "none", "None", "NONE", "nOnE", "", "HS256", "HS384", "HS512", "RS256", "ES256", "eddsa",
        "Ed25519",
    ] {
        let header = URL_SAFE_NO_PAD.encode(with(header(), "alg", json!(alg)).to_string());
        kinds.push((alg, format!("{header}.{payload}.{signature}")));
        kinds.push((alg, format!("{header}.{payload}.")));
        kinds.push((alg, signed_json(&with(self::header(), "alg", json!(alg)), &claims())));
    }
    kinds.push(("alg missing", signed_json(&without(header(), "alg"), &claims())));
    kinds.push(("alg null", signed_json(&with(header(), "alg", json!(null)), &claims())));
    kinds.push(("alg list", signed_json(&with(header(), "alg", json!(["EdDSA"])), &claims())));
    refused(&kinds);
}

/// The attack of RFC 8725 section 2.1: our public key used as the secret of an HMAC (RFC 2104 over SHA-256).
#[test]
fn an_hmac_with_our_public_key_is_refused() {
    let header = with(header(), "alg", json!("HS256"));
    let message = format!(
        "{}.{}",
        URL_SAFE_NO_PAD.encode(header.to_string()),
        URL_SAFE_NO_PAD.encode(claims().to_string())
    );
    let pad = |with: u8| -> Vec<u8> {
        let mut block = [0_u8; 64];
        block[..32].copy_from_slice(tokens().public_key());
        block.iter().map(|byte| byte ^ with).collect()
    };
    let inner = Sha256::digest([pad(0x36), message.clone().into_bytes()].concat());
    let mac = Sha256::digest([pad(0x5c), inner.to_vec()].concat());
    refused(&[("HS256 with the public key", format!("{message}.{}", URL_SAFE_NO_PAD.encode(mac)))]);
}

#[test]
fn headers_that_bring_or_name_another_key_or_kind_are_refused() {
    let jwk =
        json!({"kty": "OKP", "crv": "Ed25519", "x": URL_SAFE_NO_PAD.encode(tokens().public_key())});
    let more = |name, value| signed_json(&with(header(), name, value), &claims());
    let twice = header().to_string().replacen('{', r#"{"alg":"EdDSA","#, 1);
    refused(&[
        ("another kid", more("kid", json!("0000000000000000"))),
        ("kid in capitals", more("kid", json!(tokens().kid().to_uppercase()))),
        ("kid cut", more("kid", json!(tokens().kid()[..15]))),
        ("kid as a path", more("kid", json!("../../dev/null"))),
        ("kid missing", signed_json(&without(header(), "kid"), &claims())),
        ("typ JWT", more("typ", json!("JWT"))),
        ("typ with application/", more("typ", json!("application/at+jwt"))),
        ("typ missing", signed_json(&without(header(), "typ"), &claims())),
        ("crit", more("crit", json!(["exp"]))),
        ("crit b64", with_b64()),
        ("b64 true", more("b64", json!(true))),
        ("embedded jwk", more("jwk", jwk)),
        ("jku", more("jku", json!("https://attacker.example/keys"))),
        ("x5u", more("x5u", json!("https://attacker.example/cert"))),
        ("x5c", more("x5c", json!(["AAAA"]))),
        ("zip", more("zip", json!("DEF"))),
        ("unknown member", more("hello", json!(1))),
        ("alg twice", signed(&twice, &claims().to_string())),
        ("header no object", signed("[]", &claims().to_string())),
        ("header no JSON", signed("alg", &claims().to_string())),
        ("something after the header", signed(&format!("{}x", header()), &claims().to_string())),
    ]);
}

fn with_b64() -> String {
    let header = with(with(header(), "crit", json!(["b64"])), "b64", json!(true));
    signed_json(&header, &claims())
}

#[test]
fn broken_shapes_and_signatures_are_refused() {
    let good = good();
    let (message, signature) = good.rsplit_once('.').unwrap();
    let (head, payload) = message.split_once('.').unwrap();
    let other = SigningKey::from_bytes(&[7; 32]).sign(message.as_bytes()).to_bytes();
    let mut kinds = vec![
        ("empty", String::new()),
        ("dots alone", "..".to_owned()),
        ("two parts", message.to_owned()),
        ("four parts", format!("{good}.{signature}")),
        ("five parts, as when encrypted", format!("{good}.a.b")),
        ("empty signature", format!("{message}.")),
        ("empty payload", format!("{head}..{signature}")),
        ("empty header", format!(".{payload}.{signature}")),
        ("signature cut by a letter", good[..good.len() - 1].to_owned()),
        ("signature cut by four", good[..good.len() - 4].to_owned()),
        ("signature longer", format!("{good}AAAA")),
        ("signature padded", format!("{good}==")),
        ("signature of another key", format!("{message}.{}", URL_SAFE_NO_PAD.encode(other))),
        ("signature of zeros", format!("{message}.{}", URL_SAFE_NO_PAD.encode([0_u8; 64]))),
        ("leading blank", format!(" {good}")),
        ("trailing line feed", format!("{good}\n")),
        ("scheme left on", format!("Bearer {good}")),
        ("too long", format!("{good}{}", "A".repeat(LONGEST))),
        ("not ASCII", good.replacen('.', "\u{ff0e}", 1)),
        ("NUL inside", good.replacen('.', ".\0", 1)),
    ];
    let standard = good.replace('-', "+").replace('_', "/");
    if standard != good {
        kinds.push(("the other base64 alphabet", standard));
    }
    refused(&kinds);
}

#[test]
fn every_flipped_bit_of_the_signature_and_every_changed_letter_is_refused() {
    let good = good();
    let (message, signature) = good.rsplit_once('.').unwrap();
    let bytes = URL_SAFE_NO_PAD.decode(signature).unwrap();
    for bit in 0..bytes.len() * 8 {
        let mut flipped = bytes.clone();
        flipped[bit / 8] ^= 1 << (bit % 8);
        let token = format!("{message}.{}", URL_SAFE_NO_PAD.encode(flipped));
        assert!(check(&token).is_err(), "bit {bit}");
    }
    for place in 0..good.len() {
        let mut letters = good.clone().into_bytes();
        letters[place] = if letters[place] == b'A' { b'B' } else { b'A' };
        assert!(check(&String::from_utf8(letters).unwrap()).is_err(), "letter {place}");
    }
}

#[test]
fn claims_that_are_missing_foreign_doubled_or_of_another_type_are_refused() {
    let changed = |name, value| signed_json(&header(), &with(claims(), name, value));
    let mut kinds = vec![
        ("exp as text", changed("exp", json!((NOW + 900).to_string()))),
        ("exp negative", changed("exp", json!(-1))),
        ("exp with a fraction", changed("exp", json!(1_757_610_900.5))),
        ("exp null", changed("exp", json!(null))),
        ("exp huge", changed("exp", json!(u64::MAX))),
        ("exp for ever", changed("exp", json!(i64::MAX))),
        ("exp zero", changed("exp", json!(0))),
        ("lifetime a second too long", changed("exp", json!(NOW + 901))),
        ("expired", changed("exp", json!(NOW - LEEWAY))),
        ("nbf in the future", changed("nbf", json!(NOW + LEEWAY + 1))),
        ("nbf as text", changed("nbf", json!("0"))),
        ("iat in the future", changed("iat", json!(NOW + LEEWAY + 1))),
        ("iat as text", changed("iat", json!("1757610000"))),
        ("another audience", changed("aud", json!("billing"))),
        ("audience in capitals", changed("aud", json!("Tallystave"))),
        ("audience as a list", changed("aud", json!(["tallystave", "billing"]))),
        ("audience empty", changed("aud", json!(""))),
        ("another issuer", changed("iss", json!("https://cellar.example.org"))),
        ("issuer with a slash", changed("iss", json!("https://cellar.example/"))),
        ("issuer as a list", changed("iss", json!(["https://cellar.example"]))),
        ("subject no id", changed("sub", json!("admin"))),
        ("subject a number", changed("sub", json!(1))),
        ("site no id", changed("site", json!("*"))),
        ("site as a list", changed("site", json!([SITE]))),
        ("claim of a role", changed("role", json!("admin"))),
        ("claims no object", signed(&header().to_string(), "[]")),
        ("claims no JSON", signed(&header().to_string(), "hello")),
        (
            "something after the claims",
            signed(&header().to_string(), &format!("{}{}", claims(), claims())),
        ),
    ];
    for name in ["iss", "aud", "sub", "site", "iat", "nbf", "exp", "jti"] {
        kinds.push((name, signed_json(&header(), &without(claims(), name))));
        let again = format!("{{{:?}:{},", name, claims()[name]);
        let doubled = claims().to_string().replacen('{', &again, 1);
        kinds.push((name, signed(&header().to_string(), &doubled)));
    }
    refused(&kinds);
}

#[test]
fn a_token_of_another_installation_is_refused_even_under_the_same_issuer() {
    let elsewhere =
        Tokens::new(&SigningKey::from_bytes(&[3; 32]), "https://cellar.example").unwrap();
    let foreign = elsewhere.issue(PERSON, SITE, at(NOW)).unwrap().token;
    assert!(elsewhere.check(&foreign, at(NOW)).is_ok());
    assert_eq!(check(&foreign), Err(TokenError::Header));
}
