//! A plain HTTP client that shows everything: statuses are never errors, bodies are given as they came.

use std::fmt;
use std::time::Duration;

use serde_json::{Value, json};
use ureq::http::{HeaderMap, Request};

/// The longest a test waits for one answer.
const PATIENCE: Duration = Duration::from_mins(2);

/// Somebody who asks: an address, and a token once signed in. Clones share connections.
#[derive(Clone, Debug)]
pub struct Client {
    agent: ureq::Agent,
    url: String,
    token: Option<String>,
}

impl Client {
    /// Somebody who has not signed in.
    pub fn new(url: &str) -> Self {
        let config = ureq::Agent::config_builder()
            .http_status_as_error(false)
            .max_redirects(0)
            .timeout_global(Some(PATIENCE))
            .max_idle_connections_per_host(64)
            .max_idle_connections(64)
            .build();
        Self { agent: config.into(), url: url.to_owned(), token: None }
    }

    /// The same person at another address, with the same token.
    #[must_use]
    pub fn at(&self, url: &str) -> Self {
        Self { url: url.to_owned(), ..Self::new(url).with_token(self.token.clone()) }
    }

    /// The same client with another token, or none.
    #[must_use]
    pub fn with_token(mut self, token: Option<String>) -> Self {
        self.token = token;
        self
    }

    /// The access token.
    pub fn token(&self) -> Option<&str> {
        self.token.as_deref()
    }

    /// Signs in at a site.
    ///
    /// # Panics
    /// If the sign-in is refused.
    #[must_use]
    #[track_caller]
    pub fn signed_in(&self, site: &str, login: &str, password: &str) -> Self {
        let token = self.try_sign_in(site, login, password).expect(201).text("/access_token");
        self.clone().with_token(Some(token))
    }

    /// The answer to a sign-in.
    pub fn try_sign_in(&self, site: &str, login: &str, password: &str) -> Answer {
        let body = json!({"site": site, "login": login, "password": password});
        self.clone().with_token(None).request("POST", "/v1/sessions").json(&body).send()
    }

    /// A request to be filled in.
    pub fn request(&self, method: &str, path: &str) -> Asking<'_> {
        Asking {
            client: self,
            method: method.to_owned(),
            path: path.to_owned(),
            headers: Vec::new(),
            body: None,
        }
    }

    /// Reads.
    pub fn get(&self, path: &str) -> Answer {
        self.request("GET", path).send()
    }

    /// Records, with an idempotency key of its own.
    pub fn post(&self, path: &str, body: &Value) -> Answer {
        self.post_as(&crate::random_id(), path, body)
    }

    /// Records under this idempotency key.
    pub fn post_as(&self, key: &str, path: &str, body: &Value) -> Answer {
        self.request("POST", path).key(key).json(body).send()
    }
}

/// A request that is being filled in.
#[derive(Clone, Debug)]
pub struct Asking<'a> {
    client: &'a Client,
    method: String,
    path: String,
    headers: Vec<(String, String)>,
    body: Option<Vec<u8>>,
}

impl Asking<'_> {
    /// One more header.
    #[must_use]
    pub fn header(mut self, name: &str, value: &str) -> Self {
        self.headers.push((name.to_owned(), value.to_owned()));
        self
    }

    /// Its idempotency key.
    #[must_use]
    pub fn key(self, key: &str) -> Self {
        self.header("idempotency-key", key)
    }

    /// A JSON body.
    #[must_use]
    pub fn json(self, body: &Value) -> Self {
        self.raw("application/json", body.to_string().into_bytes())
    }

    /// Any body.
    #[must_use]
    pub fn raw(mut self, media_type: &str, body: Vec<u8>) -> Self {
        self.body = Some(body);
        self.header("content-type", media_type)
    }

    /// Asks.
    ///
    /// # Panics
    /// If no answer comes.
    #[track_caller]
    pub fn send(self) -> Answer {
        let asked = format!("{} {}", self.method, self.path);
        self.try_send().unwrap_or_else(|error| panic!("{asked}: no answer: {error}"))
    }

    /// Asks, where it may be that nobody answers.
    ///
    /// # Errors
    /// What went wrong with the connection.
    ///
    /// # Panics
    /// If the request itself is malformed.
    pub fn try_send(self) -> Result<Answer, ureq::Error> {
        let asked = format!("{} {}", self.method, self.path);
        let mut request = Request::builder()
            .method(self.method.as_str())
            .uri(format!("{}{}", self.client.url, self.path));
        for (name, value) in &self.headers {
            request = request.header(name, value);
        }
        if let Some(token) = &self.client.token {
            request = request.header("authorization", format!("Bearer {token}"));
        }
        let response = match self.body {
            Some(body) => self.client.agent.run(request.body(body).expect("a request")),
            None if ["POST", "PUT", "PATCH"].contains(&self.method.as_str()) => {
                self.client.agent.run(request.body(Vec::new()).expect("a request"))
            }
            None => self.client.agent.run(request.body(()).expect("a request")),
        };
        let (parts, mut body) = response?.into_parts();
        let bytes = body.with_config().limit(1 << 30).read_to_vec()?;
        Ok(Answer { asked, status: parts.status.as_u16(), headers: parts.headers, bytes })
    }
}

/// What came back.
#[derive(Clone)]
pub struct Answer {
    asked: String,
    /// The status.
    pub status: u16,
    /// The headers.
    pub headers: HeaderMap,
    /// The body.
    pub bytes: Vec<u8>,
}

impl fmt::Debug for Answer {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let body = String::from_utf8_lossy(&self.bytes);
        write!(f, "{}: {} {body}", self.asked, self.status)
    }
}

impl Answer {
    /// The answer, if its status is this one.
    ///
    /// # Panics
    /// If it is another.
    #[expect(
        clippy::return_self_not_must_use,
        reason = "it asserts, and most tests ask for no more"
    )]
    #[track_caller]
    pub fn expect(self, status: u16) -> Self {
        assert_eq!(self.status, status, "{self:?}");
        self
    }

    /// The answer, if it is a problem document of this status and kind that says what happened.
    ///
    /// # Panics
    /// If it is none.
    #[expect(
        clippy::return_self_not_must_use,
        reason = "it asserts, and most tests ask for no more"
    )]
    #[track_caller]
    pub fn expect_problem(self, status: u16, kind: &str) -> Self {
        assert_eq!(self.status, status, "{self:?}");
        assert_eq!(self.header("content-type"), Some("application/problem+json"), "{self:?}");
        let document = self.json();
        assert_eq!(document["type"], format!("/problems/{kind}"), "{self:?}");
        assert_eq!(document["status"], status, "{self:?}");
        for member in ["title", "detail", "instance"] {
            assert!(document[member].as_str().is_some_and(|text| text.len() > 3), "{self:?}");
        }
        self
    }

    /// The body as JSON; `null` if it is empty.
    ///
    /// # Panics
    /// If it is something else.
    #[track_caller]
    pub fn json(&self) -> Value {
        if self.bytes.is_empty() {
            return Value::Null;
        }
        serde_json::from_slice(&self.bytes).unwrap_or_else(|error| panic!("{error}: {self:?}"))
    }

    /// The text at a JSON pointer.
    ///
    /// # Panics
    /// If there is none.
    #[track_caller]
    pub fn text(&self, pointer: &str) -> String {
        let found = self.json().pointer(pointer).and_then(Value::as_str).map(str::to_owned);
        found.unwrap_or_else(|| panic!("no text at {pointer}: {self:?}"))
    }

    /// The number at a JSON pointer.
    ///
    /// # Panics
    /// If there is none.
    #[track_caller]
    pub fn number(&self, pointer: &str) -> u64 {
        let found = self.json().pointer(pointer).and_then(Value::as_u64);
        found.unwrap_or_else(|| panic!("no number at {pointer}: {self:?}"))
    }

    /// The items of a list.
    ///
    /// # Panics
    /// If it is no list.
    #[track_caller]
    pub fn items(&self) -> Vec<Value> {
        let found = self.json()["items"].as_array().cloned();
        found.unwrap_or_else(|| panic!("no list: {self:?}"))
    }

    /// A header's value.
    pub fn header(&self, name: &str) -> Option<&str> {
        self.headers.get(name).and_then(|value| value.to_str().ok())
    }

    /// The id of what was recorded.
    ///
    /// # Panics
    /// If it was not recorded.
    #[track_caller]
    pub fn id(self) -> String {
        let id = self.expect(201).text("/id");
        assert_ne!(id, "00000000-0000-0000-0000-000000000000");
        id
    }
}
