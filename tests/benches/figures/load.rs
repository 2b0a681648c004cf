//! A load of clients, each a thread with one connection that is kept open. They speak as little HTTP/1.1 as will do, so
//! that they cost less than what they measure: `GET /healthz` shows what they cost together with the server's frame.

use std::io::{Read as _, Write as _};
use std::net::TcpStream;
use std::sync::Barrier;
use std::time::{Duration, Instant};

use crate::table::{count, millis, rate};

/// Time before anything is measured.
const WARM_UP: Duration = Duration::from_millis(700);
/// Time measured.
const MEASURED: Duration = Duration::from_secs(4);

/// How long each of the measured calls took, in rising order.
#[derive(Debug)]
pub(crate) struct Times {
    sorted: Vec<Duration>,
    within: Duration,
}

impl Times {
    /// From calls made within a time.
    pub(crate) fn new(mut calls: Vec<Duration>, within: Duration) -> Self {
        calls.sort_unstable();
        Self { sorted: calls, within }
    }

    /// Calls a second.
    pub(crate) fn rate(&self) -> f64 {
        rate(count(self.sorted.len()), self.within)
    }

    fn percent(&self, percent: usize) -> Duration {
        let place = self.sorted.len() * percent / 100;
        self.sorted.get(place).or(self.sorted.last()).copied().unwrap_or_default()
    }
}

impl std::fmt::Display for Times {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        let (half, most) = (millis(self.percent(50)), millis(self.percent(99)));
        write!(f, "{:>8.0}/s   p50 {half:>9}   p99 {most:>9}", self.rate())
    }
}

/// Has so many clients send requests one after another. `request` makes the next one of a client by its number and how
/// many it sent before; each must be answered with `status`.
pub(crate) fn clients(
    url: &str,
    clients: usize,
    status: u16,
    request: impl Fn(usize, usize) -> Vec<u8> + Sync,
) -> Times {
    let ready = Barrier::new(clients);
    let one = |client: usize| {
        let mut wire = Wire::to(url);
        let mut calls = Vec::new();
        let mut sent = 0;
        ready.wait();
        let begin = Instant::now() + WARM_UP;
        while begin.elapsed() < MEASURED {
            let text = request(client, sent);
            let start = Instant::now();
            let answered = wire.ask(&text);
            assert_eq!(answered, status, "{}", String::from_utf8_lossy(&wire.held));
            if begin <= start {
                calls.push(start.elapsed());
            }
            sent += 1;
        }
        calls
    };
    let calls = std::thread::scope(|scope| {
        let running: Vec<_> = (0..clients).map(|client| scope.spawn(move || one(client))).collect();
        running.into_iter().flat_map(|client| client.join().expect("a client")).collect()
    });
    Times::new(calls, MEASURED)
}

/// The text of a request.
pub(crate) fn request(method: &str, path: &str, token: &str, body: &str) -> Vec<u8> {
    let key = tests::random_id();
    format!(
        "{method} {path} HTTP/1.1\r\nhost: figures\r\nauthorization: Bearer {token}\r\n\
         idempotency-key: {key}\r\ncontent-type: application/json\r\ncontent-length: {}\r\n\r\n{body}",
        body.len()
    )
    .into_bytes()
}

/// A connection that is kept open.
struct Wire {
    stream: TcpStream,
    held: Vec<u8>,
}

impl Wire {
    fn to(url: &str) -> Self {
        let address = url.trim_start_matches("http://");
        let stream = TcpStream::connect(address).expect("a connection");
        stream.set_nodelay(true).expect("packets that do not wait");
        Self { stream, held: Vec::new() }
    }

    /// Sends, reads the whole answer and gives its status.
    fn ask(&mut self, request: &[u8]) -> u16 {
        self.stream.write_all(request).expect("a request sent");
        self.held.clear();
        let mut piece = [0_u8; 16 * 1024];
        loop {
            let read = self.stream.read(&mut piece).expect("an answer");
            assert!(read > 0, "the connection was closed");
            self.held.extend_from_slice(&piece[..read]);
            if let Some(status) = whole(&self.held) {
                return status;
            }
        }
    }
}

/// The status of an answer, once all of it is there.
fn whole(held: &[u8]) -> Option<u16> {
    let head = held.windows(4).position(|four| four == b"\r\n\r\n")?;
    let text = std::str::from_utf8(&held[..head]).expect("a head in ASCII");
    let length: usize = text
        .lines()
        .filter_map(|line| line.split_once(':'))
        .find(|(name, _)| name.eq_ignore_ascii_case("content-length"))
        .map(|(_, value)| value.trim().parse().expect("a length"))
        .expect("an answer that says its length");
    (held.len() == head + 4 + length)
        .then(|| text.get(9..12).and_then(|status| status.parse().ok()).expect("a status"))
}
