//! Prints how long a record takes to draw, and writes one to the path given, if any.
//!
//! `cargo run --release -p records --example pages_per_second -- record.pdf`

use std::time::Instant;

#[path = "../tests/sample/mod.rs"]
mod sample;

fn main() -> Result<(), Box<dyn std::error::Error>> {
    let mut long = sample::record();
    long.readings = std::iter::repeat_with(|| long.readings.clone()).take(80).flatten().collect();
    for (name, record) in [
        ("first", sample::record()),
        ("again", sample::record()),
        ("preview", sample::wash()),
        ("long", long),
    ] {
        let start = Instant::now();
        let pdf = records::batch_record(&record)?;
        let spent = start.elapsed();
        let pages = lopdf::Document::load_mem(&pdf)?.get_pages().len();
        println!(
            "{name}: {pages} pages, {} bytes, {spent:?}, {:?} a page",
            pdf.len(),
            spent / u32::try_from(pages)?
        );
        if let (Some(path), "first") = (std::env::args().nth(1), name) {
            std::fs::write(path, pdf)?;
        }
    }
    Ok(())
}
