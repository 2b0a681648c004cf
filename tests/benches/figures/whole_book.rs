//! A book of 100,000 readings: verifying it, replaying it, and what it takes on disk.

use std::time::{Duration, Instant};

use tests::{Cellar, Engine, Home};

use crate::place::{self, Within};
use crate::sizes::{self, Sizes};
use crate::table;

const BATCHES: usize = 100;
/// Readings of one batch.
const EACH: usize = 1_000;

/// Measures and prints.
pub(crate) fn print(engine: Engine) {
    println!("{engine:?}: {} readings of {BATCHES} batches", BATCHES * EACH);
    let home = place::home(engine);
    let mut cellar = Cellar::founded(&home, None);
    let batches = place::ids(&place::batches(&cellar, "EXW-B", BATCHES));
    let runtime = place::runtime();
    let within = Within::open(&runtime, &mut cellar);
    let before = runtime.block_on(sizes::measure(&home));
    let start = Instant::now();
    runtime.block_on(async {
        let fill = |batch| {
            let within = within.clone();
            tokio::spawn(async move {
                for _ in 0..EACH {
                    within.record(batch).await;
                }
            })
        };
        for task in batches.into_iter().map(fill).collect::<Vec<_>>() {
            task.await.expect("a task");
        }
        within.house.close().await;
    });
    let filled = start.elapsed();
    let rate = table::rate(table::count(BATCHES * EACH), filled);
    table::line("  filled", &format!("{filled:.1?}, {rate:.0}/s"));
    let after = runtime.block_on(sizes::measure(&home));
    print_sizes(before, after);
    commands(&home, after.entries);
}

fn print_sizes(before: Sizes, after: Sizes) {
    let entries = table::real(after.entries - before.entries);
    let canonical = table::real(after.canonical - before.canonical) / entries;
    let stored = table::real(after.stored - before.stored) / entries;
    let allowed = 1.5f64.mul_add(canonical, 300.0);
    table::line(
        "  bytes an entry",
        &format!(
            "canonical {canonical:.0}, stored {stored:.0} (1.5 x canonical + 300: {allowed:.0})"
        ),
    );
}

fn commands(home: &Home, entries: u64) {
    for arguments in [&["verify"][..], &["rebuild", "--check"]] {
        let start = Instant::now();
        home.run(arguments).expect_success();
        let spent: Duration = start.elapsed();
        let rate = table::rate(entries, spent);
        let what = format!("  tallystave {}", arguments.join(" "));
        let million = 1e6 / rate;
        table::line(
            &what,
            &format!("{spent:.2?}, {rate:.0} entries/s, a million in {million:.1} s"),
        );
    }
}
