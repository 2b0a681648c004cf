//! Computations on the command line: one JSON object a line in, one result a line out, in order.

use std::io::{BufRead, ErrorKind, Write};

use anyhow::Context as _;
use domain::compute::{Calculation, Fault, calculations};
use serde_json::Value;

use crate::config::Compute;

/// Lists the computations, or computes line by line; gives whether every line could be computed.
pub(crate) fn run(compute: &Compute) -> anyhow::Result<bool> {
    let mut out = std::io::stdout().lock();
    let done = match (&compute.name, compute.list) {
        (None, true) => list(&mut out).map(|()| true),
        (Some(name), false) => {
            let calculation = Calculation::of(name).with_context(|| {
                format!("there is no computation {name:?}: `tallystave compute --list` names them")
            })?;
            each_line(calculation, std::io::stdin().lock(), &mut out)
        }
        _ => anyhow::bail!("name a computation, or ask for the --list"),
    };
    match done {
        // Whoever read the output has had enough.
        Err(error) if error.kind() == ErrorKind::BrokenPipe => Ok(true),
        outcome => outcome.context("the lines cannot be read or printed"),
    }
}

fn list(out: &mut impl Write) -> std::io::Result<()> {
    for calculation in calculations() {
        writeln!(out, "{}: {}", calculation.name, calculation.meaning)?;
        for field in calculation.fields {
            writeln!(out, "    takes {}: {}", field.name, field.takes)?;
        }
        writeln!(out, "    gives {}", calculation.gives.join(", "))?;
        writeln!(out, "    source: {}\n", calculation.source)?;
    }
    writeln!(
        out,
        "None of it is a laboratory analysis, and statutory tables prevail over a formula."
    )
}

/// Empty lines are passed over; a line that cannot be computed gives an error in its place.
fn each_line(
    calculation: &Calculation,
    lines: impl BufRead,
    out: &mut impl Write,
) -> std::io::Result<bool> {
    let mut all = true;
    for line in lines.lines() {
        let line = line?;
        if line.trim().is_empty() {
            continue;
        }
        let asked = serde_json::from_str::<Value>(&line).map_err(|error| Fault {
            field: None,
            detail: format!("not readable as JSON: {error}"),
        });
        let result = asked.and_then(|asked| calculation.compute(&asked));
        all &= result.is_ok();
        writeln!(out, "{}", result.unwrap_or_else(|fault| fault.to_json()))?;
    }
    Ok(all)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_line_that_cannot_be_computed_leaves_the_others_whole() {
        let water = Calculation::of("water_density").unwrap();
        let mut out = Vec::new();
        let lines = "{\"temperature_c\": 20}\n\nnot json\n{\"temperature_c\": 4}\n";
        assert!(!each_line(water, lines.as_bytes(), &mut out).unwrap());
        let results: Vec<Value> = String::from_utf8(out)
            .unwrap()
            .lines()
            .map(|line| serde_json::from_str(line).unwrap())
            .collect();
        assert_eq!(results.len(), 3);
        assert!(
            results[0]["density_kg_m3"].as_f64().unwrap()
                < results[2]["density_kg_m3"].as_f64().unwrap()
        );
        assert_eq!(results[1]["error"]["field"], Value::Null);
        assert!(each_line(water, "{\"temperature_c\": 20}".as_bytes(), &mut Vec::new()).unwrap());
    }

    #[test]
    fn the_list_names_every_computation_with_its_fields() {
        let mut out = Vec::new();
        list(&mut out).unwrap();
        let text = String::from_utf8(out).unwrap();
        for calculation in calculations() {
            assert!(text.contains(&format!("{}: ", calculation.name)));
            assert!(calculation.fields.iter().all(|field| text.contains(field.name)));
        }
    }
}
