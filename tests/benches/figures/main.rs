//! Prints the figures of `DEVELOPERS.md`: what the built program does a second, how long one waits, how much it stores.
//!
//! `cargo bench -p tests` prints all of them, `cargo bench -p tests -- reading assess` only the named sections. Nothing
//! is asserted about times: whoever reads the table judges it, beside the floors measured in the same run and the load
//! of the machine, which is printed too.
#![forbid(unsafe_code)]

mod appending;
mod assessing;
mod floors;
mod load;
mod place;
mod serving;
mod sizes;
mod starting;
mod table;
mod whole_book;

use tests::Engine;

const ENGINES: [Engine; 2] = [Engine::Sqlite, Engine::Postgres];

/// Every section by its name.
const SECTIONS: [(&str, fn()); 6] = [
    ("floors", || ENGINES.into_iter().for_each(floors::print)),
    ("append", || ENGINES.into_iter().for_each(appending::print)),
    ("serve", || ENGINES.into_iter().for_each(serving::print)),
    ("book", || ENGINES.into_iter().for_each(whole_book::print)),
    ("assess", assessing::print),
    ("start", starting::print),
];

fn main() {
    let wanted: Vec<String> =
        std::env::args().skip(1).filter(|name| !name.starts_with('-')).collect();
    table::line("program", &tests::program::binary().display().to_string());
    for (name, print) in SECTIONS {
        if wanted.is_empty() || wanted.iter().any(|wanted| wanted == name) {
            println!("\n## {name}, load average {}", table::load_average());
            print();
        }
    }
    println!("\nload average at the end {}", table::load_average());
}
