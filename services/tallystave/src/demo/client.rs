//! The demo's hands: plain HTTP requests to the program's own REST interface, as anybody would send them.

use anyhow::{Context as _, bail};
use serde_json::Value;
use uuid::Uuid;

/// One person at the interface.
#[derive(Clone)]
pub(super) struct Client {
    agent: ureq::Agent,
    base: String,
    token: Option<String>,
}

/// An answer.
pub(super) struct Answer {
    pub(super) status: u16,
    pub(super) body: Value,
    pub(super) etag: Option<String>,
}

impl Client {
    /// Nobody yet.
    pub(super) fn new(base: &str) -> Self {
        let config = ureq::Agent::config_builder().http_status_as_error(false).build();
        Self { agent: config.into(), base: base.to_owned(), token: None }
    }

    /// The same client, signed in.
    pub(super) fn signed_in(
        &self,
        site: &str,
        login: &str,
        password: &str,
    ) -> anyhow::Result<Self> {
        let body = serde_json::json!({"site": site, "login": login, "password": password});
        let answer = self.send("POST", "/v1/sessions", Some(&body), &[])?.expect(201)?;
        let token = answer.body["access_token"].as_str().context("no token was given")?;
        Ok(Self { token: Some(token.to_owned()), ..self.clone() })
    }

    /// Records something; anything but success is an error of the demo.
    pub(super) fn post(&self, path: &str, body: &Value) -> anyhow::Result<Value> {
        Ok(self.try_post(path, body)?.expect(201)?.body)
    }

    /// Records something, and lets the caller look at a refusal.
    pub(super) fn try_post(&self, path: &str, body: &Value) -> anyhow::Result<Answer> {
        let key = new_key()?;
        self.send("POST", path, Some(body), &[("Idempotency-Key", &key)])
    }

    /// Records something that needs the `ETag` last seen.
    pub(super) fn post_if(&self, path: &str, etag: &str, body: &Value) -> anyhow::Result<Value> {
        let key = new_key()?;
        let headers = [("Idempotency-Key", key.as_str()), ("If-Match", etag)];
        Ok(self.send("POST", path, Some(body), &headers)?.expect(201)?.body)
    }

    /// Drives the clock of the simulation.
    pub(super) fn set_clock(&self, now: &str) -> anyhow::Result<()> {
        let body = serde_json::json!({"now": now});
        self.send("POST", "/v1/clock", Some(&body), &[])?.expect(200)?;
        Ok(())
    }

    /// Reads something.
    pub(super) fn get(&self, path: &str) -> anyhow::Result<Answer> {
        self.send("GET", path, None, &[])?.expect(200)
    }

    /// Reads a document.
    pub(super) fn document(&self, path: &str, media_type: &str) -> anyhow::Result<Vec<u8>> {
        let mut request =
            self.agent.get(format!("{}{path}", self.base)).header("Accept", media_type);
        if let Some(token) = &self.token {
            request = request.header("Authorization", format!("Bearer {token}"));
        }
        let mut response = request.call()?;
        let bytes = response.body_mut().with_config().limit(64 << 20).read_to_vec()?;
        if response.status() != 200 {
            bail!("GET {path} answered {}: {}", response.status(), String::from_utf8_lossy(&bytes));
        }
        Ok(bytes)
    }

    fn send(
        &self,
        method: &str,
        path: &str,
        body: Option<&Value>,
        headers: &[(&str, &str)],
    ) -> anyhow::Result<Answer> {
        let mut request =
            ureq::http::Request::builder().method(method).uri(format!("{}{path}", self.base));
        for (name, value) in headers {
            request = request.header(*name, *value);
        }
        if let Some(token) = &self.token {
            request = request.header("Authorization", format!("Bearer {token}"));
        }
        let sent = match body {
            Some(body) => {
                let request = request.header("Content-Type", "application/json");
                self.agent.run(request.body(body.to_string())?)
            }
            None => self.agent.run(request.body(())?),
        };
        let mut response = sent.with_context(|| format!("{method} {path}"))?;
        let etag = response.headers().get("etag").and_then(|etag| etag.to_str().ok());
        let etag = etag.map(str::to_owned);
        let text = response.body_mut().read_to_string()?;
        let status = response.status().as_u16();
        let body = serde_json::from_str(&text).unwrap_or(Value::String(text));
        Ok(Answer { status, body, etag })
    }
}

impl Answer {
    /// The answer, if it has that status.
    pub(super) fn expect(self, status: u16) -> anyhow::Result<Self> {
        if self.status == status {
            return Ok(self);
        }
        bail!("{status} was expected, {} came: {}", self.status, self.body)
    }
}

/// A fresh idempotency key.
fn new_key() -> anyhow::Result<String> {
    let key: Uuid = house::ids::Ids.draw(house::clock::Clock::System.now())?;
    Ok(key.to_string())
}
