use std::time::{Duration, Instant};

use axum::body::Body;
use axum::http::StatusCode;
use axum::routing::post;
use axum::{Json, Router};
use serde::{Deserialize, Serialize};
use serde_json::json;
use tower::ServiceExt;

use super::*;

#[derive(Debug, Deserialize, Serialize)]
#[serde(deny_unknown_fields)]
struct Dose {
    material: String,
    lines: Vec<Line>,
    note: Option<String>,
}

#[derive(Debug, Deserialize, Serialize)]
#[serde(deny_unknown_fields)]
struct Line {
    amount: String,
    casks: u32,
}

const GOOD: &str = r#"{"material":"yeast food","lines":[{"amount":"2.5","casks":3}],"note":null}"#;

#[track_caller]
fn fault(body: impl AsRef<[u8]>) -> (String, String) {
    let problem = parse::<Dose>(body.as_ref()).unwrap_err();
    assert_eq!(problem.kind(), Kind::NotReadable);
    let [error] = problem.errors() else { panic!("{problem:?}") };
    (error.pointer.clone(), error.detail.clone())
}

#[test]
fn a_good_body_is_read_and_its_raw_form_has_no_null() {
    let body = parse::<Dose>(GOOD.as_bytes()).unwrap();
    assert_eq!(body.value.lines[0].casks, 3);
    let line = json!({"amount": "2.5", "casks": 3});
    assert_eq!(body.raw, json!({"material": "yeast food", "lines": [line]}));
}

#[test]
fn a_member_that_appears_twice_is_refused_wherever_it_stands() {
    let top = GOOD.replacen('{', r#"{"material":"x","#, 1);
    assert_eq!(fault(top), ("/material".into(), "this member appears twice".into()));
    let deep = GOOD.replace(r#""casks":3"#, r#""casks":3,"casks":3"#);
    assert_eq!(fault(deep).0, "/lines/0/casks");
    let escaped = GOOD.replace(r#""casks":3"#, r#""casks":3,"c\u0061sks":3"#);
    assert_eq!(fault(escaped).0, "/lines/0/casks");
    let after_null = GOOD.replace(r#""note":null"#, r#""note":null,"note":"x""#);
    assert_eq!(fault(after_null).0, "/note");
}

#[test]
fn unknown_missing_and_mistyped_members_are_named_by_their_pointer() {
    let (pointer, detail) = fault(GOOD.replace(r#""casks":3"#, r#""casks":3,"verdict":"clear""#));
    assert_eq!(pointer, "/lines/0/verdict");
    assert!(detail.contains("unknown field `verdict`"), "{detail}");
    let (pointer, detail) = fault(GOOD.replace(r#","casks":3"#, ""));
    assert_eq!((pointer.as_str(), detail.as_str()), ("/lines/0", "missing field `casks`"));
    let (pointer, detail) = fault(GOOD.replace(r#""2.5""#, "25"));
    assert_eq!(pointer, "/lines/0/amount");
    assert_eq!(detail, "invalid type: integer `25`, expected a string");
    assert_eq!(fault(GOOD.replace(r#""casks":3"#, r#""casks":"3""#)).0, "/lines/0/casks");
    assert_eq!(fault(GOOD.replace(r#""casks":3"#, r#""casks":-3"#)).0, "/lines/0/casks");
    assert_eq!(fault(GOOD.replace("lines", "li/n~es")).0, "/li~1n~0es");
}

#[test]
fn numbers_that_not_everybody_reads_alike_are_refused() {
    for number in [
        "3.0",
        "0.1",
        "3e0",
        "1e400",
        "-1e400",
        "9007199254740992",
        "-9007199254740992",
        "1e-3",
        "-0",
        "99999999999999999999999",
        "NaN",
        "Infinity",
        "-Infinity",
        "0x3",
        "03",
        "+3",
        "3.",
        ".3",
    ] {
        let body = GOOD.replace(r#""casks":3"#, &format!(r#""casks":{number}"#));
        // Where a number ends early, the parser stands behind the member already.
        let (pointer, _) = fault(body);
        assert!(["/lines/0/casks", "/lines/0"].contains(&pointer.as_str()), "{number}: {pointer}");
    }
    for number in ["9007199254740992", "-9007199254740992", "18446744073709551615", "0.5"] {
        let problem = parse::<Value>(format!("[0,{number}]").as_bytes()).unwrap_err();
        assert_eq!(problem.errors()[0].pointer, "/1", "{number}");
    }
    let largest = json!({"n": 9_007_199_254_740_991_i64, "m": -9_007_199_254_740_991_i64});
    assert_eq!(parse::<Value>(largest.to_string().as_bytes()).unwrap().raw, largest);
}

#[test]
fn text_that_is_not_clean_unicode_is_refused() {
    for escape in [
        r"\ud800",
        r"\udc00",
        r"\ud800\ud800",
        r"\ud83c",
        r"\u0000",
        r"\x41",
        r"\t",
        r"\u007f",
        r"\u0085",
        "\t",
        "\u{0}",
    ] {
        let body = GOOD.replace("yeast food", escape);
        assert_eq!(fault(body).0, "/material", "{escape}");
    }
    let mut latin = GOOD.replace("yeast", "m\u{e9}lange").into_bytes();
    latin.retain(|byte| *byte != 0xc3);
    assert_eq!(fault(latin).1, "the body is not UTF-8");
    assert!(parse::<Dose>(GOOD.replace("yeast", r"\ud83c\udf47").as_bytes()).is_ok());
}

#[test]
fn text_is_brought_into_the_ledgers_form_before_anybody_sees_it() {
    let body = GOOD.replace("yeast food", r"Jose\u0301\r\nMu\u0308ller\rGmbH\n");
    let read = parse::<Dose>(body.as_bytes()).unwrap();
    assert_eq!(read.value.material, "Jos\u{e9}\nM\u{fc}ller\nGmbH\n");
    assert_eq!(read.raw["material"], read.value.material);
    let composed = GOOD.replace("yeast food", r"Jos\u00e9\nM\u00fcller\nGmbH\n");
    assert_eq!(parse::<Dose>(composed.as_bytes()).unwrap().raw, read.raw);
    let twice = r#"{"caf\u00e9":1,"cafe\u0301":2}"#;
    let twice = parse::<Value>(twice.as_bytes()).unwrap_err();
    assert!(twice.detail().contains("twice"), "{}", twice.detail());
}

#[test]
fn every_text_over_two_thousand_characters_is_pointed_at() {
    let longest = "\u{fc}".repeat(2_000);
    assert!(parse::<Dose>(GOOD.replace("yeast food", &longest).as_bytes()).is_ok());
    let longer = format!("{longest}!");
    let body = GOOD.replace("yeast food", &longer).replace("2.5", &longer);
    let problem = parse::<Dose>(body.as_bytes()).unwrap_err();
    assert_eq!(problem.kind(), Kind::Meaningless);
    let pointers: Vec<_> = problem.errors().iter().map(|error| error.pointer.as_str()).collect();
    assert_eq!(pointers, ["/material", "/lines/0/amount"]);
    assert!(problem.errors()[0].detail.contains("2000 characters"), "{problem:?}");
}

#[test]
fn broken_trailing_and_foreign_text_is_refused() {
    for (body, what) in [
        (format!("\u{feff}{GOOD}"), "byte order mark"),
        (String::new(), "empty"),
        (" \n".to_owned(), "empty"),
        (format!("{GOOD}{GOOD}"), "trailing characters"),
        (format!("{GOOD},"), "trailing characters"),
        (format!("{GOOD}\0"), "trailing characters"),
        (GOOD[..GOOD.len() - 1].to_owned(), "EOF"),
        (GOOD.replace('"', "'"), "key must be a string"),
        (GOOD.replace('}', ",}"), "trailing comma"),
        (format!("/* note */ {GOOD}"), "expected value"),
        ("null".to_owned(), "invalid type: null"),
        ("3".to_owned(), "invalid type: integer"),
    ] {
        let (_, detail) = fault(&body);
        assert!(detail.contains(what), "{body:?}: {detail}");
    }
    assert!(parse::<Dose>(format!(" \r\n\t{GOOD}\n").as_bytes()).is_ok());
}

#[test]
fn deep_and_crowded_bodies_are_refused_fast() {
    let start = Instant::now();
    let (_, detail) = fault("[".repeat(500_000));
    assert!(detail.contains("deeper than 64"), "{detail}");
    let (_, detail) = fault(format!("{}1{}", r#"{"a":"#.repeat(100), "}".repeat(100)));
    assert!(detail.contains("deeper than 64"), "{detail}");
    let crowd: Vec<String> = (0..100_000).map(|i| format!("\"{i:x}\":1")).collect();
    let (_, detail) = fault(format!("{{{}}}", crowd.join(",")));
    assert!(detail.contains("more than 20000"), "{detail}");
    assert!(start.elapsed() < Duration::from_secs(2), "{:?}", start.elapsed());
    let deepest = format!("{}1{}", "[".repeat(64), "]".repeat(64));
    assert!(parse::<Value>(deepest.as_bytes()).is_ok());
    assert!(parse::<Value>(format!("[{deepest}]").as_bytes()).is_err());
}

#[test]
fn what_is_sent_back_is_short() {
    let long = "n".repeat(500_000);
    let (pointer, detail) = fault(GOOD.replace("note", &long));
    assert!(pointer.len() < 1000 && detail.len() < 1000);
}

async fn send(content_type: Option<&str>, encoding: Option<&str>, body: Body) -> StatusCode {
    async fn echo(body: Strict<Dose>) -> Json<Dose> {
        Json(body.value)
    }
    let mut request = Request::post("/");
    for (name, value) in [("content-type", content_type), ("content-encoding", encoding)] {
        if let Some(value) = value {
            request = request.header(name, value);
        }
    }
    let router: Router = Router::new().route("/", post(echo));
    router.oneshot(request.body(body).unwrap()).await.unwrap().status()
}

#[tokio::test]
async fn only_a_body_declared_as_plain_json_is_read() {
    for good in [
        "application/json",
        "Application/JSON",
        "application/json; charset=utf-8",
        "application/json;charset=UTF-8",
        "application/json; charset=\"utf-8\"",
    ] {
        assert_eq!(send(Some(good), None, GOOD.into()).await, 200, "{good}");
    }
    for bad in [
        "text/plain",
        "application/x-www-form-urlencoded",
        "application/jsonp",
        "application/merge-patch+json",
        "application/json; charset=latin1",
        "text/plain; application/json",
        "",
    ] {
        assert_eq!(send(Some(bad), None, GOOD.into()).await, 415, "{bad}");
    }
    assert_eq!(send(None, None, GOOD.into()).await, 415);
    assert_eq!(send(Some("application/json"), Some("gzip"), GOOD.into()).await, 415);
    assert_eq!(send(Some("application/json"), Some("identity"), GOOD.into()).await, 200);
    assert_eq!(send(Some("application/json"), None, "{}".into()).await, 400);
}

/// A body that does not say how long it is, as it arrives in chunks.
fn unannounced(text: String) -> Body {
    Body::from_stream(Body::from(text).into_data_stream())
}

#[tokio::test]
async fn a_body_over_one_mebibyte_is_413_announced_or_not() {
    let padded = |length: usize| format!("{GOOD}{}", " ".repeat(length - GOOD.len()));
    let json = Some("application/json");
    assert_eq!(send(json, None, padded(LARGEST_BODY).into()).await, 200);
    assert_eq!(send(json, None, padded(LARGEST_BODY + 1).into()).await, 413);
    assert_eq!(send(json, None, unannounced(padded(LARGEST_BODY))).await, 200);
    assert_eq!(send(json, None, unannounced(padded(LARGEST_BODY + 1))).await, 413);
    let announced =
        Request::post("/").header("content-length", "1048577").body(Body::empty()).unwrap();
    assert_eq!(
        refuse_if_announced_too_large(announced.headers()).unwrap_err().kind(),
        Kind::TooLarge
    );
}
