//! Starting on the demo's book, memory while nobody asks anything, and the size of the program.

use std::io::{BufRead as _, BufReader};
use std::path::{Path, PathBuf};
use std::process::{Child, Command, Stdio};
use std::time::{Duration, Instant};

use tests::Client;
use tests::program::{binary, outcome};

use crate::table::{self, millis};

/// How often the program is started.
const STARTS: usize = 9;
/// When the demo begins; the clock goes on from the book's last entry.
pub(crate) const DEMO_BEGINS: &str = "2025-05-12T08:00:00-07:00";

/// The demo's book, made anew in a directory.
pub(crate) fn demo_book(directory: &Path) -> PathBuf {
    let mut demo = Command::new(binary());
    demo.args(["demo", "--once", "--listen", "127.0.0.1:0", "--books"]).arg(directory);
    outcome(demo).expect_success();
    let mut books = std::fs::read_dir(directory).expect("the directory of books");
    books.next().expect("a book").expect("a book").path()
}

/// Measures and prints.
pub(crate) fn print() {
    let directory = tempfile::tempdir().expect("a temporary directory");
    let book = demo_book(directory.path());
    let mut starts = Vec::new();
    let mut resident = String::new();
    for _ in 0..STARTS {
        let (mut child, spent) = start(&book);
        starts.push(spent);
        std::thread::sleep(Duration::from_millis(500));
        resident = memory(child.id());
        child.kill().expect("a running program");
        child.wait().expect("its end");
    }
    starts.sort_unstable();
    let (first, middle, last) = (starts[0], starts[STARTS / 2], starts[STARTS - 1]);
    table::line(
        "start to the first answer of /healthz, demo book",
        &format!("median {} ({} to {})", millis(middle), millis(first), millis(last)),
    );
    table::line("idle resident memory, demo book", &resident);
    let size = std::fs::metadata(binary()).expect("the program").len();
    table::line("program", &format!("{:.1} MB", table::real(size) / 1e6));
}

fn start(book: &Path) -> (Child, Duration) {
    let begin = Instant::now();
    let mut child = Command::new(binary())
        .args(["serve", "--listen", "127.0.0.1:0", "--simulated-from", DEMO_BEGINS, "--data"])
        .arg(book)
        .stdin(Stdio::null())
        .stdout(Stdio::piped())
        .spawn()
        .expect("the program");
    let printed = BufReader::new(child.stdout.take().expect("its output"));
    let url = printed
        .lines()
        .map_while(Result::ok)
        .find_map(|line| line.strip_prefix("listening on ").map(str::to_owned))
        .expect("an address");
    let _ = Client::new(&url).get("/healthz").expect(200);
    (child, begin.elapsed())
}

/// What the system says a process holds in memory.
fn memory(process: u32) -> String {
    let status = std::fs::read_to_string(format!("/proc/{process}/status")).expect("its status");
    let resident = status.lines().find_map(|line| line.strip_prefix("VmRSS:")).expect("its memory");
    let kib: u64 = resident.trim().trim_end_matches(" kB").parse().expect("a number");
    format!("{:.1} MiB", table::real(kib) / 1024.0)
}
