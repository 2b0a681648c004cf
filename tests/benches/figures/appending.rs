//! Appending within this program: entries a second and a commit, without HTTP.

use std::time::{Duration, Instant};

use domain::ids::BatchId;
use tests::{Cellar, Engine};
use tokio::runtime::Runtime;

use crate::load::Times;
use crate::place::{self, Within};
use crate::{floors, table};

const MEASURED: Duration = Duration::from_secs(4);

/// Measures and prints.
pub(crate) fn print(engine: Engine) {
    println!("{engine:?}: readings through the writer");
    let home = place::home(engine);
    let mut cellar = Cellar::founded(&home, None);
    let runs: Vec<(usize, usize, Vec<BatchId>)> = [(1, 1), (1, 8), (32, 8), (32, 1), (128, 8)]
        .into_iter()
        .map(|(tasks, spread)| {
            let name = format!("EXW-A{tasks}-{spread}");
            (tasks, spread, place::ids(&place::batches(&cellar, &name, spread)))
        })
        .collect();
    let floor = floors::measure(&home);
    let runtime = place::runtime();
    let within = Within::open(&runtime, &mut cellar);
    for (tasks, spread, batches) in runs {
        let (times, a_commit) = measure(&runtime, &within, tasks, &batches);
        let of_floor = times.rate() / floor.rate();
        table::line(
            &format!("  {tasks} tasks, {spread} batches"),
            &format!("{times}   {a_commit:.1} a commit   {of_floor:.2} of the bare loop"),
        );
    }
    runtime.block_on(within.house.close());
}

fn measure(runtime: &Runtime, within: &Within, tasks: usize, batches: &[BatchId]) -> (Times, f64) {
    let counters = || {
        let counters = within.house.counters();
        (counters.commits(), counters.entries())
    };
    let (commits, entries) = counters();
    let running: Vec<_> = (0..tasks)
        .map(|task| {
            let (within, batch) = (within.clone(), batches[task % batches.len()]);
            let batches = batches.to_vec();
            runtime.spawn(async move {
                let (mut calls, begin) = (Vec::new(), Instant::now());
                while begin.elapsed() < MEASURED {
                    let start = Instant::now();
                    // One task goes round the batches; of several each has its own.
                    let place =
                        if tasks == 1 { batches[calls.len() % batches.len()] } else { batch };
                    within.record(place).await;
                    calls.push(start.elapsed());
                }
                calls
            })
        })
        .collect();
    let calls = runtime.block_on(async {
        let mut calls = Vec::new();
        for task in running {
            calls.extend(task.await.expect("a task"));
        }
        calls
    });
    let (commits, entries) = (counters().0 - commits, counters().1 - entries);
    (Times::new(calls, MEASURED), table::real(entries) / table::real(commits))
}
