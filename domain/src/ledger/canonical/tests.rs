use proptest::prelude::*;
use serde_json::json;
use unicode_normalization::UnicodeNormalization;

use super::*;

/// The published documents of RFC 8785's author; see the file's own header for source and licence.
const DOCUMENTS: &str =
    include_str!(concat!(env!("CARGO_MANIFEST_DIR"), "/../tests/reference/vectors/jcs.json"));

/// The place and the reason of a refusal.
fn refused(value: &Value) -> (String, Why) {
    match canonical(value) {
        Err(NotCanonical::Refused { pointer, why }) => (pointer, why),
        other => panic!("{value} should have been refused, but: {other:?}"),
    }
}

fn check(value: &Value, text: &str) {
    assert_eq!(String::from_utf8(canonical(value).unwrap()).unwrap(), text);
    assert!(scan::is_canonical(text.as_bytes()));
    assert_eq!(is_canonical(text.as_bytes()).as_ref(), Ok(value));
}

#[test]
fn published_documents_within_the_profile_agree_and_the_others_are_refused() {
    let file: Value = serde_json::from_str(DOCUMENTS).unwrap();
    let cases = file["cases"].as_array().unwrap();
    assert_eq!(cases.len(), 6);
    for case in cases {
        let value: Value = serde_json::from_str(case["input_utf8"].as_str().unwrap()).unwrap();
        let output = bytes_of(case["output_hex"].as_str().unwrap());
        match case["name"].as_str().unwrap() {
            "french" => {
                assert_eq!(canonical(&value).unwrap(), output);
                assert_eq!(is_canonical(&output), Ok(value));
            }
            // The document says 56.0, which is refused; its canonical form says 56, which is ours too.
            "structures" => {
                assert_eq!(refused(&value), ("/1/\n".to_owned(), Why::NotAnInteger));
                assert_eq!(canonical(&is_canonical(&output).unwrap()).unwrap(), output);
            }
            name => {
                let expected = match name {
                    "arrays" => ("/1/10", Why::Null),
                    "unicode" => ("/Unnormalized Unicode", Why::NotNormal),
                    "values" => ("/literals/0", Why::Null),
                    "weird" => ("/\r", Why::ControlCharacter),
                    other => panic!("the file has a new document {other}"),
                };
                assert_eq!(refused(&value), (expected.0.to_owned(), expected.1));
                assert!(is_canonical(&output).is_err());
            }
        }
    }
}

fn bytes_of(hex: &str) -> Vec<u8> {
    (0..hex.len()).step_by(2).map(|i| u8::from_str_radix(&hex[i..i + 2], 16).unwrap()).collect()
}

/// The published "weird" and "structures" documents without what our profile leaves out.
#[test]
fn members_stand_in_the_order_of_utf_16_code_units() {
    check(
        &json!({
            "\u{20ac}": "Euro Sign", "\n": "Newline", "1": "One", "\u{1f602}": "Smiley", "\u{f6}": "o",
            "\u{ff21}": "beyond the surrogates", "</script>": "Browser Challenge", "": "empty",
            "10": {}, "111": [{ "e": "yes", "E": "no" }]
        }),
        "{\"\":\"empty\",\"\\n\":\"Newline\",\"1\":\"One\",\"10\":{},\"111\":[{\"E\":\"no\",\"e\":\"yes\"}],\
         \"</script>\":\"Browser Challenge\",\"\u{f6}\":\"o\",\"\u{20ac}\":\"Euro Sign\",\
         \"\u{1f602}\":\"Smiley\",\"\u{ff21}\":\"beyond the surrogates\"}",
    );
}

#[test]
fn only_quote_backslash_and_newline_are_escaped() {
    check(&json!("\"\\\n/'\u{2028}<é€😀"), "\"\\\"\\\\\\n/'\u{2028}<é€😀\"");
}

#[test]
fn integers_up_to_two_to_the_53_stand_and_others_are_refused() {
    check(&json!([0, -1, 9_007_199_254_740_991_i64]), "[0,-1,9007199254740991]");
    check(&json!(-9_007_199_254_740_991_i64), "-9007199254740991");
    for value in
        [json!(9_007_199_254_740_992_i64), json!(-9_007_199_254_740_992_i64), json!(u64::MAX)]
    {
        assert_eq!(refused(&value).1, Why::LargeInteger);
    }
    for value in [json!(0.5), json!(1.0), json!(-0.0), json!(1e30)] {
        assert_eq!(refused(&value).1, Why::NotAnInteger);
    }
}

#[test]
fn a_refusal_names_the_place() {
    let at = |value: Value| refused(&value).0;
    assert_eq!(at(json!(null)), "");
    assert_eq!(
        at(json!({ "body": { "doses": [{ "mass": 1 }, { "mass": null }] } })),
        "/body/doses/1/mass"
    );
    assert_eq!(at(json!({ "a/b": { "m~n": 0.5 } })), "/a~1b/m~0n");
    assert_eq!(at(json!({ "a": { "e\u{301}": 1 } })), "/a/e\u{301}");
    assert_eq!(at(json!(["fine", "tab\t"])), "/1");
}

#[test]
fn control_characters_and_text_not_in_normal_form_are_refused() {
    for text in ["\t", "a\r\nb", "\u{0}", "\u{7f}", "\u{85}", "\u{9f}"] {
        assert_eq!(refused(&json!(text)).1, Why::ControlCharacter);
        assert_eq!(refused(&json!({ text: 1 })).1, Why::ControlCharacter);
    }
    for text in ["e\u{301}", "\u{212b}", "\u{1100}\u{1161}"] {
        assert_eq!(refused(&json!(text)).1, Why::NotNormal);
    }
}

/// The JSON library reads such an object as the value that its text says, so that what a reader sees would not be what
/// a checker saw.
#[test]
fn a_name_with_a_meaning_of_its_own_is_refused() {
    for name in ["$serde_json::private::RawValue", "$serde_json::private::Number"] {
        let value = json!({ "body": { name: "{\"base\":1}" } });
        assert_eq!(refused(&value), (format!("/body/{name}"), Why::ReservedName));
        let bytes = format!("{{\"body\":{{\"{name}\":\"1\"}}}}");
        assert!(!scan::is_canonical(bytes.as_bytes()));
        assert!(verify(bytes.as_bytes()).is_err());
    }
}

#[test]
fn nesting_has_an_end() {
    let nested = |depth: usize| (0..depth).fold(json!(1), |inner, _| json!([inner]));
    let text = format!("{}1{}", "[".repeat(MAX_DEPTH), "]".repeat(MAX_DEPTH));
    check(&nested(MAX_DEPTH), &text);
    assert_eq!(refused(&nested(MAX_DEPTH + 1)).1, Why::TooDeep);
    assert!(is_canonical("[".repeat(60_000).as_bytes()).is_err());
}

#[test]
fn an_entry_has_a_largest_length_and_a_digest_has_not() {
    let of_length = |bytes: usize| json!("x".repeat(bytes - 2));
    assert_eq!(canonical(&of_length(MAX_ENTRY_BYTES)).unwrap().len(), MAX_ENTRY_BYTES);
    let longer = of_length(MAX_ENTRY_BYTES + 1);
    assert_eq!(canonical(&longer), Err(NotCanonical::TooLong(MAX_ENTRY_BYTES + 1)));
    assert_eq!(
        is_canonical(longer.to_string().as_bytes()),
        Err(NotCanonical::TooLong(MAX_ENTRY_BYTES + 1))
    );
    assert_eq!(digest(&longer), Ok(Hash::of(longer.to_string().as_bytes())));
}

#[test]
fn bytes_in_another_spelling_are_refused() {
    for text in [
        r#"{"a": 1}"#,
        r#"{"b":1,"a":2}"#,
        r#""\u0041""#,
        r#""\/""#,
        "\"\\u000a\"",
        " 1",
        "1\n",
        "[1,2 ]",
    ] {
        assert_eq!(is_canonical(text.as_bytes()), Err(NotCanonical::OtherSpelling), "{text}");
        assert!(!scan::is_canonical(text.as_bytes()), "{text}");
    }
}

#[test]
fn a_member_that_stands_twice_is_refused() {
    for text in [r#"{"a":1,"a":1}"#, r#"[{"b":{"a":1,"\u0061":2}}]"#] {
        let refusal = is_canonical(text.as_bytes()).unwrap_err();
        assert!(
            matches!(&refusal, NotCanonical::Unreadable(e) if e.contains("twice")),
            "{refusal}"
        );
    }
}

#[test]
fn bytes_that_are_no_json_are_refused() {
    for bytes in [
        &b""[..],
        b"{",
        b"01",
        b"-",
        b"1 2",
        b"NaN",
        b"'a'",
        b"\"\xff\"",
        b"\"\\ud800\"",
        b"\xef\xbb\xbf1",
    ] {
        assert!(matches!(is_canonical(bytes), Err(NotCanonical::Unreadable(_))), "{bytes:?}");
        assert!(!scan::is_canonical(bytes), "{bytes:?}");
    }
}

fn text() -> impl Strategy<Value = String> {
    proptest::collection::vec(
        prop_oneof![any::<char>(), "[ -~\n]".prop_map(|s| s.chars().next().unwrap())],
        0..12,
    )
    .prop_map(|chars| {
        let plain = chars.into_iter().filter(|&c| !c.is_control() || c == '\n');
        plain.nfc().collect()
    })
}

fn value() -> impl Strategy<Value = Value> {
    let largest = i64::try_from(MAX_INTEGER).unwrap();
    let leaf = prop_oneof![
        any::<bool>().prop_map(Value::from),
        (-largest..=largest).prop_map(Value::from),
        text().prop_map(Value::from),
    ];
    leaf.prop_recursive(4, 40, 6, |inner| {
        prop_oneof![
            proptest::collection::vec(inner.clone(), 0..6).prop_map(Value::from),
            proptest::collection::vec((text(), inner), 0..6)
                .prop_map(|members| Value::Object(members.into_iter().collect())),
        ]
    })
}

proptest! {
    #[test]
    fn another_writer_gives_the_same_bytes_and_reading_them_gives_the_value(value in value()) {
        let bytes = canonical(&value).unwrap();
        prop_assert_eq!(&bytes, &serde_json_canonicalizer::to_vec(&value).unwrap());
        prop_assert_eq!(is_canonical(&bytes), Ok(value));
    }

    #[test]
    fn whatever_the_bytes_the_reader_answers(bytes in proptest::collection::vec(any::<u8>(), 0..60)) {
        if let Ok(value) = is_canonical(&bytes) {
            prop_assert_eq!(canonical(&value).unwrap(), bytes);
        }
    }

    #[test]
    fn the_scan_of_the_bytes_says_what_reading_them_says(
        value in value(),
        edits in proptest::collection::vec(edit(), 0..3),
    ) {
        let mut text: Vec<char> = String::from_utf8(canonical(&value).unwrap()).unwrap().chars().collect();
        for (place, removed, piece) in edits {
            let start = place.index(text.len() + 1);
            let end = (start + removed).min(text.len());
            text.splice(start..end, piece.chars());
        }
        let text: String = text.into_iter().collect();
        let read = is_canonical(text.as_bytes());
        prop_assert_eq!(scan::is_canonical(text.as_bytes()), read.is_ok(), "{} {:?}", text, read);
        prop_assert_eq!(verify(text.as_bytes()), read.map(drop));
    }
}

/// Somewhere a few characters go and a piece comes that means something in JSON or in Unicode.
fn edit() -> impl Strategy<Value = (proptest::sample::Index, usize, &'static str)> {
    const PIECES: [&str; 25] = [
        "",
        "",
        "\"",
        "\\",
        "\\n",
        "\\t",
        "\\u0041",
        "n",
        "\u{301}",
        "e\u{301}",
        "\u{7f}",
        "\u{85}",
        "\n",
        " ",
        ",",
        ":",
        "{",
        "}",
        "[",
        "]",
        "0",
        "-",
        "null",
        "\"a\":1,",
        "$serde_json::private::",
    ];
    (any::<proptest::sample::Index>(), 0..3_usize, proptest::sample::select(&PIECES[..]))
}

#[test]
fn a_document_may_be_longer_than_an_entry() {
    let value = json!({ "b": "x".repeat(MAX_ENTRY_BYTES), "a": 1 });
    assert!(matches!(canonical(&value), Err(NotCanonical::TooLong(_))));
    assert!(document(&value).unwrap().starts_with(br#"{"a":1,"b":"x"#));
    assert!(document(&json!({ "a": null })).is_err());
}
