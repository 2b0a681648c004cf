use std::io::Write;
use std::sync::{Arc, Mutex};

use axum::body::Body;
use axum::extract::{Path, Query};
use axum::http::StatusCode;
use axum::routing::{get, post};
use serde::Deserialize;
use serde_json::Value;
use tower::ServiceExt;

use super::*;

#[derive(Deserialize)]
struct Page {
    limit: u8,
}

async fn broken() -> StatusCode {
    panic!("secret of the house")
}

async fn slow() -> &'static str {
    tokio::time::sleep(Duration::from_mins(1)).await;
    "too late"
}

fn router(surroundings: Surroundings) -> Router {
    let router = Router::new()
        .route("/fine/{id}", get(|Path(id): Path<Uuid>| async move { id.to_string() }).put(slow))
        .route("/list", get(|page: Query<Page>| async move { page.limit.to_string() }))
        .route("/panic", get(broken))
        .route("/slow", get(slow))
        .route("/refused", post(|| async { Problem::new(Kind::Refused, "too much nitrogen") }))
        .route(
            "/plain-fault",
            get(|| async { (StatusCode::INTERNAL_SERVER_ERROR, "at /var/lib/x.db") }),
        )
        .route("/own", get(|| async { [(header::CACHE_CONTROL, "max-age=60")] }));
    surround(router, surroundings)
}

async fn ask(method: &str, path: &str) -> Response {
    let surroundings = Surroundings { deadline: Duration::from_millis(50), behind_tls: false };
    let request = Request::builder().method(method).uri(path).body(Body::empty()).unwrap();
    router(surroundings).oneshot(request).await.unwrap()
}

/// The document, checked against its own status and request id.
async fn problem(response: Response, kind: Kind) -> Value {
    assert_eq!(response.status(), kind.status());
    assert_eq!(response.headers()["content-type"], "application/problem+json");
    let id = response.headers()[REQUEST_ID].to_str().unwrap().to_owned();
    let body = to_bytes(response.into_body(), 10_000).await.unwrap();
    let document: Value = serde_json::from_slice(&body).unwrap();
    assert_eq!(document["instance"], format!("urn:uuid:{id}"));
    assert_eq!(document["type"], kind.address());
    assert_eq!(document["status"], kind.status().as_u16());
    document
}

const FINE: &str = "/fine/0198f2a4-5b1c-7d3e-8f90-a1b2c3d4e5f6";

#[tokio::test]
async fn every_answer_has_the_safety_headers_and_an_id_of_its_own() {
    let mut seen = std::collections::HashSet::new();
    for (method, path) in [
        ("GET", FINE),
        ("GET", "/nowhere"),
        ("DELETE", "/list"),
        ("GET", "/panic"),
        ("GET", "/slow"),
        ("POST", "/refused"),
    ] {
        let response = ask(method, path).await;
        let headers = response.headers();
        assert_eq!(headers["cache-control"], "no-store", "{path}");
        let policy = "default-src 'none'; frame-ancestors 'none'";
        assert_eq!(headers["content-security-policy"], policy, "{path}");
        assert_eq!(headers["x-content-type-options"], "nosniff", "{path}");
        assert_eq!(headers["x-frame-options"], "DENY", "{path}");
        assert_eq!(headers["referrer-policy"], "no-referrer", "{path}");
        assert!(!headers.contains_key("strict-transport-security"), "{path}");
        assert!(!headers.contains_key("server"), "{path}");
        assert!(seen.insert(headers[REQUEST_ID].clone()), "{path}");
    }
    assert_eq!(ask("GET", "/own").await.headers()["cache-control"], "max-age=60");
}

#[tokio::test]
async fn behind_tls_browsers_are_told_to_stay_there() {
    let surroundings = Surroundings { behind_tls: true, ..Surroundings::default() };
    let request = Request::get(FINE).body(Body::empty()).unwrap();
    let response = router(surroundings).oneshot(request).await.unwrap();
    let wanted = "max-age=31536000; includeSubDomains";
    assert_eq!(response.headers()["strict-transport-security"], wanted);
}

#[tokio::test]
async fn a_request_id_from_outside_is_not_believed() {
    let theirs = "11111111-1111-4111-8111-111111111111";
    let request = Request::get("/echo").header(REQUEST_ID, theirs).body(Body::empty()).unwrap();
    let echo = |id: axum::Extension<RequestId>, headers: HeaderMap| async move {
        assert!(!headers.contains_key(REQUEST_ID));
        id.0.0.to_string()
    };
    let router = surround(Router::new().route("/echo", get(echo)), Surroundings::default());
    let response = router.oneshot(request).await.unwrap();
    let given = response.headers()[REQUEST_ID].clone();
    assert_ne!(given, theirs);
    assert_eq!(to_bytes(response.into_body(), 100).await.unwrap(), given.as_bytes());
}

#[tokio::test]
async fn unknown_addresses_and_methods_are_problems_and_405_keeps_allow() {
    problem(ask("GET", "/nowhere").await, Kind::NotFound).await;
    let wrong_method = ask("DELETE", FINE).await;
    let allow = wrong_method.headers()["allow"].to_str().unwrap().to_owned();
    assert_eq!(allow, "GET,HEAD,PUT");
    problem(wrong_method, Kind::MethodNotAllowed).await;
    problem(ask("TRACE", FINE).await, Kind::MethodNotAllowed).await;
}

#[tokio::test]
async fn a_problem_of_a_handler_gets_the_request_id() {
    let document = problem(ask("POST", "/refused").await, Kind::Refused).await;
    assert_eq!(document["detail"], "too much nitrogen");
}

#[tokio::test]
async fn refusals_in_plain_text_become_problems_and_faults_of_ours_lose_their_text() {
    let document = problem(ask("GET", "/fine/17").await, Kind::NotReadable).await;
    assert!(document["detail"].as_str().unwrap().contains("UUID"), "{document}");
    problem(ask("GET", "/list?limit=many").await, Kind::NotReadable).await;
    let document = problem(ask("GET", "/plain-fault").await, Kind::Internal).await;
    assert!(!document.to_string().contains("/var"), "{document}");
}

#[tokio::test]
async fn a_panic_is_a_500_without_its_text_and_the_next_request_is_served() {
    let document = problem(ask("GET", "/panic").await, Kind::Internal).await;
    assert!(!document.to_string().contains("secret"), "{document}");
    assert_eq!(ask("GET", FINE).await.status(), 200);
}

#[tokio::test]
async fn a_request_that_takes_too_long_is_a_503_that_says_to_repeat_with_the_same_key() {
    let response = ask("GET", "/slow").await;
    assert_eq!(response.headers()["retry-after"], "1");
    let document = problem(response, Kind::OutcomeUnknown).await;
    assert!(document["detail"].as_str().unwrap().contains("same `Idempotency-Key`"));
}

/// Collects what the log would have written.
#[derive(Clone, Default)]
struct Log(Arc<Mutex<Vec<u8>>>);

impl Write for Log {
    fn write(&mut self, bytes: &[u8]) -> std::io::Result<usize> {
        self.0.lock().unwrap().write(bytes)
    }
    fn flush(&mut self) -> std::io::Result<()> {
        Ok(())
    }
}

#[tokio::test]
async fn the_log_names_method_matched_path_status_and_id_but_no_token_query_or_body() {
    let log = Log::default();
    let writer = log.clone();
    let subscriber = tracing_subscriber::fmt().json().with_writer(move || writer.clone()).finish();
    // For the whole program, since a thread without a subscriber that comes first by a place in the code would have it
    // held to be silent for all.
    tracing::subscriber::set_global_default(subscriber).unwrap();
    tracing::callsite::rebuild_interest_cache();
    let request = Request::put(format!("{FINE}?key=hush-query"))
        .header("authorization", "Bearer hush-token")
        .body(Body::from("hush-body"))
        .unwrap();
    let surroundings = Surroundings { deadline: Duration::from_millis(1), behind_tls: false };
    let response = router(surroundings).oneshot(request).await.unwrap();
    let id = response.headers()[REQUEST_ID].to_str().unwrap().to_owned();
    let all = String::from_utf8(log.0.lock().unwrap().clone()).unwrap();
    let text: Vec<&str> = all.lines().filter(|line| line.contains(&id)).collect();
    let text = text.join("\n");
    for wanted in ["\"PUT\"", "/fine/{id}", "503", "micros"] {
        assert!(text.contains(wanted), "{wanted} is missing in {text}, of {all}");
    }
    assert!(!all.contains("hush") && !text.contains("0198f2a4"), "{all}");
}
