//! What the shipped rule sets say, and whether a site's own set can be read.

use std::io::{ErrorKind, Write};

use anyhow::Context as _;
use domain::rules::{RuleSet, check, digest, shipped};

use crate::config::{Rules, RulesCommand};

/// Lists the shipped sets, or checks a file.
pub(crate) fn run(rules: &Rules) -> anyhow::Result<()> {
    match &rules.command {
        None => match list(&mut std::io::stdout().lock(), rules.set.as_deref()) {
            // Whoever read the output has had enough.
            Err(error) if is_broken_pipe(&error) => Ok(()),
            outcome => outcome,
        },
        Some(RulesCommand::Check { file }) => {
            let text = std::fs::read_to_string(file)
                .with_context(|| format!("{} cannot be read", file.display()))?;
            match check(&text) {
                Ok(set) => {
                    let rules = set.rules().count();
                    println!(
                        "{}: set {} version {}, {rules} rules: in order; SHA-256 {}",
                        file.display(),
                        set.id,
                        set.version,
                        digest(&text)
                    );
                    Ok(())
                }
                Err(faults) => {
                    for fault in &faults {
                        println!("{}: {fault}", file.display());
                    }
                    anyhow::bail!("{} faults: nothing of this set can be adopted", faults.len())
                }
            }
        }
    }
}

fn is_broken_pipe(error: &anyhow::Error) -> bool {
    let cause = error.downcast_ref::<std::io::Error>();
    cause.is_some_and(|cause| cause.kind() == ErrorKind::BrokenPipe)
}

fn list(out: &mut impl Write, only: Option<&str>) -> anyhow::Result<()> {
    let mut found = false;
    for (id, text) in shipped().iter().filter(|(id, _)| only.is_none_or(|only| only == *id)) {
        found = true;
        let set = RuleSet::parse(text).with_context(|| format!("the shipped set {id}"))?;
        show(out, &set)?;
    }
    let known: Vec<_> = shipped().iter().map(|(id, _)| *id).collect();
    anyhow::ensure!(found, "there is no such set: the shipped ones are {}", known.join(", "));
    writeln!(
        out,
        "Local requirements prevail; a limit shown is not legal advice. Nothing binds that nobody adopted."
    )?;
    Ok(())
}

fn show(out: &mut impl Write, set: &RuleSet) -> anyhow::Result<()> {
    writeln!(out, "{} (version {}): {}", set.id, set.version, set.title)?;
    writeln!(out, "    {}; {}", set.jurisdiction, set.citation)?;
    writeln!(
        out,
        "    premises {}; products {}",
        set.premises_kinds.join(", "),
        set.product_classes.join(", ")
    )?;
    for rule in set.rules() {
        let (source, number) = (rule.source, set.number_of(&rule));
        let number = number.map(|number| format!(" {number}")).unwrap_or_default();
        let state = if source.on { "on" } else { "off" };
        writeln!(out, "  {state:<3} {}.{}{number} [{}]", rule.form, rule.id, source.basis.name())?;
        writeln!(out, "        {}", source.shown())?;
        if let Some(why) = &source.why {
            writeln!(out, "        off because {why}")?;
        }
    }
    writeln!(out)?;
    Ok(())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_shipped_rule_is_listed_with_its_source_and_whether_it_works() {
        let mut out = Vec::new();
        list(&mut out, None).unwrap();
        let text = String::from_utf8(out).unwrap();
        for (_, toml) in shipped() {
            let set = RuleSet::parse(toml).unwrap();
            for rule in set.rules() {
                assert!(text.contains(&format!("{}.{}", rule.form, rule.id)), "{}", rule.id);
                assert!(text.contains(&rule.source.shown()), "{}", rule.id);
            }
        }
        assert!(text.contains("8 lb per 1,000 US gal"), "a dose has its number");
        assert!(list(&mut Vec::new(), Some("atlantis")).is_err());
    }
}
