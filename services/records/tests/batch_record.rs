//! The batch record as an outside reader sees it: through poppler and qpdf, which must be there.

use std::path::{Path, PathBuf};
use std::process::Command;

use records::{BatchRecord, Reading, RecordError, batch_record, batch_record_exact, legible};

mod sample;

/// Runs an outside program on a file and hands back what it says; fails if it is not installed.
fn read_with(program: &str, options: &[&str], pdf: &Path) -> String {
    let mut command = Command::new(program);
    command.args(options).arg(pdf);
    if program == "pdftotext" {
        command.arg("-");
    }
    let output = command.output().unwrap_or_else(|error| panic!("{program} is needed: {error}"));
    assert!(output.status.success(), "{program}: {}", String::from_utf8_lossy(&output.stderr));
    String::from_utf8(output.stdout).expect("text")
}

/// A drawn record in a directory that goes away with it.
struct Drawn {
    path: PathBuf,
    _directory: tempfile::TempDir,
}

impl Drawn {
    fn new(record: &BatchRecord) -> Self {
        let directory = tempfile::tempdir().expect("a directory");
        let path = directory.path().join("record.pdf");
        let pdf = batch_record(record).expect("a record");
        std::fs::write(&path, pdf).expect("room on the disk");
        Self { path, _directory: directory }
    }

    /// The text of each page, its lines joined.
    fn pages(&self) -> Vec<String> {
        let text = read_with("pdftotext", &["-layout", "-enc", "UTF-8"], &self.path);
        let mut pages: Vec<String> = text.split('\u{c}').map(flat).collect();
        assert_eq!(pages.pop().as_deref(), Some(""));
        pages
    }
}

fn flat(text: &str) -> String {
    text.split_whitespace().collect::<Vec<_>>().join(" ")
}

#[test]
fn every_page_says_what_it_belongs_to() {
    let pages = Drawn::new(&sample::record()).pages();
    for (index, page) in pages.iter().enumerate() {
        for said in [
            format!("page {} of {}", index + 1, pages.len()),
            "EXW-25-B1 · entries 1 to 58".to_owned(),
            "ledger head exw.example/ledger at 412 · 3f9a1c0b77d2e4865a10c9ef…".to_owned(),
            "SIMULATION".to_owned(),
            "Local requirements prevail".to_owned(),
            "A limit shown is not legal advice. A model is not a laboratory analysis.".to_owned(),
            "issued 2025-10-07 09:00 to Inspector Example".to_owned(),
        ] {
            assert!(page.contains(&said), "page {} lacks {said:?}: {page}", index + 1);
        }
        assert!(!page.contains("NOT ISSUED"));
    }
}

#[test]
fn a_preview_says_so_on_every_page_and_a_real_book_does_not_say_simulation() {
    let record = BatchRecord { simulation: false, ..sample::wash() };
    for page in Drawn::new(&record).pages() {
        assert!(page.contains("preview, not issued") && page.contains("NOT ISSUED"), "{page}");
        assert!(!page.contains("SIMULATION"));
    }
}

#[test]
fn what_was_recorded_can_be_read_back() {
    let text = Drawn::new(&sample::record()).pages().join(" ");
    for said in [
        "Labor Müller & Großmann,",
        "report č. 88/25",
        "< 5 µg/L",
        "total SO₂",
        "P ≥ 0.5",
        "warm to 17 °C first",
        "Ana's tablet had no network",
        "1.0620 SG struck through, now 1.0260 SG, 16.0 °C; Ana Example, 2025-09-19 08:48",
        "Ben Example, lead, 2025-09-18 14:20: approved the exception",
        "entry 31: proposed 150 g, done 151 g (+0.7 %)",
        "refused; not done",
        "27 CFR 24.246, 8 lb per 1,000 US gal = 958.611 mg/L",
        "us-wine-24.246",
        "Heavier than air",
        "Movements, gauges and lineage",
    ] {
        assert!(text.contains(said), "{said:?} is not in {text}");
    }
}

#[test]
fn the_wash_shows_its_correction_and_its_deviation() {
    let text = Drawn::new(&sample::wash()).pages().join(" ");
    for said in [
        "1.0665 SG at 27.0 °C",
        "1.0685",
        "No legal dose check was made here",
        "Already done",
        "powder into an active ferment",
        "none recorded for this batch",
    ] {
        assert!(text.contains(said), "{said:?} is not in {text}");
    }
}

#[test]
fn unusual_signs_come_back_as_they_went_in() {
    let mut record = sample::record();
    let signs = "é ß µ ° ² ≤ ½ č Å ř — “x” it's Ωμέγα Слив №7 5′ → ✓ NH₄⁺ L⁻¹";
    record.batch.claims = signs.into();
    let text = Drawn::new(&record).pages().join(" ");
    assert!(text.contains(signs), "{text}");
}

#[test]
fn fonts_are_embedded_and_reduced() {
    let drawn = Drawn::new(&sample::record());
    let fonts = read_with("pdffonts", &[], &drawn.path);
    let fonts: Vec<&str> = fonts.lines().skip(2).collect();
    assert_eq!(fonts.len(), 2, "{fonts:?}");
    for font in fonts {
        let marks: Vec<&str> = font.split_whitespace().rev().skip(2).take(3).collect();
        assert_eq!(marks, ["yes", "yes", "yes"], "embedded, subset, to Unicode: {font}");
        assert_eq!(font.find('+'), Some(6), "{font}");
    }
    let size = std::fs::metadata(&drawn.path).unwrap().len();
    assert!(size < 120_000, "{size} bytes for a short record: whole fonts?");
}

#[test]
fn the_file_is_sound_and_structured() {
    let drawn = Drawn::new(&sample::record());
    let said = read_with("qpdf", &["--check"], &drawn.path);
    assert!(said.contains("No syntax or stream encoding errors"), "{said}");
    let info = read_with("pdfinfo", &[], &drawn.path);
    assert!(info.contains("Batch record EXW-25-B1"), "{info}");
    assert!(info.lines().any(|line| flat(line) == "Tagged: yes"), "{info}");
    assert!(info.lines().any(|line| line.contains("(A4)")), "{info}");
    let structure = read_with("pdfinfo", &["-struct-text"], &drawn.path);
    for tag in ["H1", "H2", "Table", "TR", "TH", "TD", "Figure"] {
        assert!(structure.contains(tag), "{tag} is not in the structure");
    }
}

/// Goal: zone, language and process leave no trace in the bytes.
/// Method: this test starts itself twice with other surroundings and compares what it writes.
#[test]
fn the_bytes_depend_on_nothing_but_the_record() {
    const WRITE_TO: &str = "RECORDS_TEST_WRITE_TO";
    if let Some(path) = std::env::var_os(WRITE_TO) {
        // Another record first: a counter of the process would show in the second.
        drop(batch_record(&sample::wash()).unwrap());
        std::fs::write(path, batch_record(&sample::record()).unwrap()).unwrap();
        return;
    }
    let directory = tempfile::tempdir().unwrap();
    let here = batch_record(&sample::record()).unwrap();
    for (zone, language) in [("Pacific/Kiritimati", "C"), ("America/St_Johns", "de_DE.UTF-8")] {
        let path = directory.path().join("child.pdf");
        let status = Command::new(std::env::current_exe().unwrap())
            .args(["--exact", "the_bytes_depend_on_nothing_but_the_record"])
            .envs([("TZ", zone), ("LC_ALL", language), ("LANG", language)])
            .env(WRITE_TO, &path)
            .current_dir(directory.path())
            .status()
            .unwrap();
        assert!(status.success());
        assert!(std::fs::read(&path).unwrap() == here, "differs under {zone}, {language}");
        std::fs::remove_file(&path).unwrap();
    }
}

#[test]
fn another_word_makes_another_file_identity() {
    let id = |record: &BatchRecord| {
        let pdf = lopdf::Document::load_mem(&batch_record(record).unwrap()).unwrap();
        format!("{:?}", pdf.trailer.get(b"ID").unwrap())
    };
    let mut other = sample::record();
    other.readings[3].by = "Bna Example".into();
    assert_ne!(id(&sample::record()), id(&other));
    assert_eq!(id(&sample::record()), id(&sample::record()));
}

#[test]
fn three_hundred_readings_keep_their_head_and_each_stands_once() {
    let mut record = sample::record();
    record.readings = (1001..=1300)
        .map(|n| Reading {
            n,
            at: "2025-09-09 08:00".into(),
            kind: "gravity".into(),
            entered: "1.0940".into(),
            late: if n % 50 == 0 {
                "a long note, written at night. ".repeat(64)
            } else {
                String::new()
            },
            ..Reading::default()
        })
        .collect();
    let pages = Drawn::new(&record).pages();
    let text = pages.join(" ");
    for n in 1001..=1300 {
        let found = text.matches(&format!(" {n} 2025-09-09 08:00")).count();
        assert_eq!(found, 1, "reading {n}");
    }
    let with_rows: Vec<&String> =
        pages.iter().filter(|page| page.contains("2025-09-09 08:00 gravity")).collect();
    assert!(with_rows.len() > 5);
    assert!(with_rows.iter().all(|page| page.contains("n Taken Kind As entered Corrected")));
}

/// Goal: an outside reader finds every word inside the margins.
#[test]
fn no_word_stands_outside_the_margins() {
    /// A4 is 595 by 842 points; 14 mm at the sides and 11 mm above stay white, 7 mm below.
    const WHITE: (f32, f32, f32, f32) = (39.0, 31.0, 556.0, 822.0);
    let mut record = sample::record();
    record.additions[2].findings[0].sentence = "überlang ".repeat(220);
    record.readings[0].instrument = "H".repeat(1_500);
    let drawn = Drawn::new(&record);
    let boxes = read_with("pdftotext", &["-bbox"], &drawn.path);
    let words: Vec<[f32; 4]> =
        boxes.lines().filter(|line| line.contains("<word ")).map(word_box).collect();
    assert!(words.len() > 1_000, "{} words", words.len());
    let (left, top, right, bottom) = WHITE;
    for word in words {
        let [x0, y0, x1, y1] = word;
        assert!(x0 >= left && y0 >= top && x1 <= right && y1 <= bottom, "{word:?}");
    }
}

fn word_box(line: &str) -> [f32; 4] {
    let numbers: Vec<f32> = line
        .split('"')
        .skip(1)
        .step_by(2)
        .take(4)
        .map(|text| text.parse().expect("a number"))
        .collect();
    numbers.try_into().expect("four numbers")
}

#[test]
fn what_the_typeface_lacks_is_boxed_or_refused_by_name() {
    let mut record = sample::record();
    assert!(batch_record_exact(&record).is_ok());
    record.readings[0].by = "Ana 漢 Example".into();
    let refused = batch_record_exact(&record).unwrap_err();
    assert!(matches!(refused, RecordError::MissingGlyph { character: '漢' }), "{refused}");
    assert_eq!(refused.to_string(), "the typeface has no sign for '漢' (U+6F22)");

    let text = Drawn::new(&record).pages().join(" ");
    assert!(text.contains("Ana □ Example"), "{text}");
    assert!(text.contains("the first one is U+6F22"), "{text}");
    assert_eq!(legible("Ana 漢 Example"), "Ana □ Example");
}

#[test]
fn a_time_without_its_offset_is_refused() {
    let record = BatchRecord { drawn_up: "2025-10-07 09:00".into(), ..sample::record() };
    assert!(matches!(batch_record(&record), Err(RecordError::Stamp(_))));
}
