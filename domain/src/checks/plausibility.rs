//! Readings that can hardly be, with the likely cause. A true event is never refused: what was read is recorded, and
//! what is odd about it is told at once, while the cylinder is still at hand.
//!
//! A gravity only falls while yeast works, unless sugar goes in. How far it may rise before that is pointed out is a
//! setting of the site, above what a hydrometer and two readers differ by; no published number stands behind it.

use super::finding::{Basis, Finding, Verdict};
use super::number::fixed;
use crate::densimetry::{Scale, correct};

/// A gravity just read, and what is known of the batch before it.
#[derive(Clone, Copy, Debug)]
pub struct GravityRead<'a> {
    /// The number as it was entered.
    pub entered: &'a str,
    /// The scale it was entered in.
    pub scale: Scale,
    /// The sample's temperature in °C.
    pub celsius: f64,
    /// What it comes to, 20/20 °C.
    pub sg: f64,
    /// The gravity read last before it.
    pub before: Option<Before<'a>>,
    /// The gravity at which the ferment is expected to end.
    pub expected_end: Option<f64>,
    /// A rise of more than this is pointed out.
    pub rise: f64,
}

/// The gravity read last.
#[derive(Clone, Copy, Debug)]
pub struct Before<'a> {
    /// 20/20 °C.
    pub sg: f64,
    /// When, as shown.
    pub at: &'a str,
    /// Sugar or fruit went in since.
    pub sugar_since: bool,
}

/// What is odd about a gravity, with the likely cause.
pub fn gravity(read: &GravityRead<'_>) -> Vec<Finding> {
    let odd = [other_scale(read), rise(read), below_end(read)];
    odd.into_iter().flatten().take(1).collect()
}

/// A specific gravity entered as extract looks like a ferment that has lost all of its sugar.
fn other_scale(read: &GravityRead<'_>) -> Option<Finding> {
    let number: f64 = read.entered.parse().ok()?;
    let is_gravity = matches!(read.scale, Scale::Sg20_20 | Scale::Sg60_60);
    let is_extract = !is_gravity && (0.98..1.2).contains(&number);
    let other = correct(number, Scale::Sg20_20, read.celsius).ok()?.sg_20_20;
    if !is_extract || !could_be(read, other) || could_be(read, read.sg) {
        return None;
    }
    let sentence = format!(
        "{} looks like a specific gravity, but was entered in {}.",
        read.entered,
        read.scale.name()
    );
    Some(finding(
        read,
        "plausibility.other-scale",
        sentence,
        "Amend the entry with the scale that was read.",
    ))
}

fn rise(read: &GravityRead<'_>) -> Option<Finding> {
    let before = read.before.filter(|before| !before.sugar_since)?;
    if read.sg <= before.sg + read.rise {
        return None;
    }
    let sentence = format!(
        "Gravity {} is {} above the last one, {} at {}, and no sugar is recorded since: {}",
        fixed(read.sg, 4),
        fixed(read.sg - before.sg, 4),
        fixed(before.sg, 4),
        before.at,
        swapped(read).map_or_else(
            || "a later fill, an enzyme that frees sugar, solids, or a slip.".to_owned(),
            |number| format!("were two digits swapped ({number})?"),
        ),
    );
    Some(finding(read, "plausibility.gravity-rise", sentence, AGAIN))
}

fn below_end(read: &GravityRead<'_>) -> Option<Finding> {
    let end = read.expected_end?;
    if read.sg >= end - read.rise {
        return None;
    }
    let sentence = format!(
        "Gravity {} is below the end expected for this batch, {}: {}",
        fixed(read.sg, 4),
        fixed(end, 4),
        swapped(read).map_or_else(
            || "the end was expected too high, or it is a slip.".to_owned(),
            |number| format!("were two digits swapped ({number})?"),
        ),
    );
    Some(finding(read, "plausibility.below-end", sentence, AGAIN))
}

const AGAIN: &str = "Read again; if it was a slip, amend the entry.";

fn finding(read: &GravityRead<'_>, rule: &str, sentence: String, remedy: &str) -> Finding {
    let mut finding = Finding::new(rule, Verdict::Advise, Basis::SiteSetting, sentence)
        .param("gravity_sg", fixed(read.sg, 4))
        .param("rise_limit_sg", fixed(read.rise, 4));
    if let Some(before) = read.before {
        finding = finding.param("last_gravity_sg", fixed(before.sg, 4));
    }
    if let Some(end) = read.expected_end {
        finding = finding.param("expected_end_sg", fixed(end, 4));
    }
    finding.cured_by(remedy)
}

/// The number with two neighbouring digits exchanged, if exactly one such exchange gives what could be.
fn swapped(read: &GravityRead<'_>) -> Option<String> {
    let mut digits: Vec<char> = read.entered.chars().collect();
    let places: Vec<usize> = (0..digits.len()).filter(|&i| digits[i].is_ascii_digit()).collect();
    let mut found = Vec::new();
    for pair in places.windows(2) {
        if digits[pair[0]] == digits[pair[1]] {
            continue;
        }
        digits.swap(pair[0], pair[1]);
        let number: String = digits.iter().collect();
        digits.swap(pair[0], pair[1]);
        let sg = number.parse().ok().and_then(|n| correct(n, read.scale, read.celsius).ok());
        if sg.is_some_and(|sg| could_be(read, sg.sg_20_20)) {
            found.push(number);
        }
    }
    (found.len() == 1).then(|| found.remove(0))
}

/// Not above the last gravity and not below the expected end.
fn could_be(read: &GravityRead<'_>, sg: f64) -> bool {
    let highest = read.before.map_or(sg, |before| before.sg + read.rise);
    let lowest = read.expected_end.map_or(sg, |end| end - read.rise);
    (lowest..=highest).contains(&sg)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The plum mash of the demo on 2025-09-16: 1.0310 the day before, 1.0135 expected.
    fn plums(entered: &str) -> GravityRead<'_> {
        let sg = entered.parse().unwrap();
        let before = Before { sg: 1.0310, at: "2025-09-15 08:00", sugar_since: false };
        let (scale, celsius) = (Scale::Sg20_20, 20.0);
        GravityRead {
            entered,
            scale,
            celsius,
            sg,
            before: Some(before),
            expected_end: Some(1.0135),
            rise: 0.002,
        }
    }

    fn told(read: &GravityRead<'_>) -> Option<(String, String)> {
        let mut found = gravity(read);
        assert!(found.len() <= 1);
        let one = found.pop()?;
        assert_eq!((one.verdict, one.basis), (Verdict::Advise, Basis::SiteSetting));
        assert!(one.remedy.is_some());
        Some((one.rule, one.sentence))
    }

    #[test]
    fn swapped_digits_are_found_and_the_right_number_is_named() {
        let (rule, sentence) = told(&plums("1.0620")).unwrap();
        assert_eq!(rule, "plausibility.gravity-rise");
        assert_eq!(
            sentence,
            "Gravity 1.0620 is 0.0310 above the last one, 1.0310 at 2025-09-15 08:00, and no sugar is recorded since: \
             were two digits swapped (1.0260)?"
        );
        assert_eq!(told(&plums("1.0260")), None);
    }

    #[test]
    fn a_rise_that_no_exchange_explains_names_the_other_causes() {
        let (_, sentence) = told(&plums("1.0450")).unwrap();
        assert!(
            sentence.ends_with("a later fill, an enzyme that frees sugar, solids, or a slip."),
            "{sentence}"
        );
    }

    #[test]
    fn a_rise_within_the_setting_or_after_sugar_is_not_odd() {
        assert_eq!(told(&plums("1.0330")), None);
        assert!(told(&plums("1.0331")).is_some());
        let mut sweetened = plums("1.0620");
        sweetened.before = sweetened.before.map(|before| Before { sugar_since: true, ..before });
        assert_eq!(told(&sweetened), None);
        assert_eq!(told(&GravityRead { before: None, ..plums("1.0620") }), None);
    }

    #[test]
    fn two_exchanges_that_could_be_name_neither() {
        let before = Before { sg: 1.0900, ..plums("1.0260").before.unwrap() };
        let read = GravityRead { before: Some(before), ..plums("1.0950") };
        let (_, sentence) = told(&read).unwrap();
        assert!(!sentence.contains("swapped"), "1.0590 and 1.0905 could both be: {sentence}");
    }

    #[test]
    fn below_the_expected_end_is_pointed_out() {
        let (rule, sentence) = told(&plums("1.0085")).unwrap();
        assert_eq!(rule, "plausibility.below-end");
        assert!(
            sentence.contains("1.0135") && sentence.contains("expected too high"),
            "{sentence}"
        );
        let (_, swapped) = told(&plums("1.0028")).unwrap();
        assert!(swapped.ends_with("were two digits swapped (1.0208)?"), "{swapped}");
        assert_eq!(told(&plums("1.0115")), None);
    }

    #[test]
    fn a_specific_gravity_entered_as_extract_is_recognised() {
        let sg = correct(1.026, Scale::Plato, 20.0).unwrap().sg_20_20;
        let read = GravityRead { scale: Scale::Plato, sg, ..plums("1.0260") };
        let (rule, sentence) = told(&read).unwrap();
        assert_eq!(rule, "plausibility.other-scale");
        assert_eq!(sentence, "1.0260 looks like a specific gravity, but was entered in plato.");
        // A scale of gravity is no other scale, however odd the number.
        let (rule, _) = told(&GravityRead { scale: Scale::Sg60_60, ..plums("1.0085") }).unwrap();
        assert_eq!(rule, "plausibility.below-end");
        // A cider that really ends at 1 % extract.
        let dry = GravityRead { expected_end: Some(1.000), ..read };
        assert_eq!(told(&dry), None);
    }
}
