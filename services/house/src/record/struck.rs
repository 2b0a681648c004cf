//! What an entry said before it was amended.

use domain::book::body::Body;
use domain::book::in_force::InForce;
use records::Struck;

use super::evidence::Evidence;

/// One line for each amendment that changed what `say` says, or when it happened; oldest first.
pub(crate) fn struck(
    evidence: &Evidence,
    entry: &InForce,
    say: impl Fn(&Body) -> String,
) -> Vec<Struck> {
    let last = (entry.occurred_at, &entry.body);
    let readings = entry.amendments.iter().map(|amendment| (amendment.was.0, &amendment.was.1));
    let readings: Vec<_> = readings.chain([last]).collect();
    let mut lines = Vec::new();
    for (amendment, step) in entry.amendments.iter().zip(readings.windows(2)) {
        let [(was_at, was), (now_at, now)] = step else { continue };
        let (mut before, mut after) = (say(was), say(now));
        if evidence.voids(amendment) {
            "voided: did not happen".clone_into(&mut after);
        } else if was_at != now_at {
            before = format!("{before} ({})", evidence.clock(was_at.at));
            after = format!("{after} ({})", evidence.clock(now_at.at));
        }
        if before != after {
            lines.push(Struck {
                was: before,
                now: after,
                by: evidence.name(amendment.actor),
                at: evidence.clock(amendment.at.at),
                why: amendment.reason.clone(),
            });
        }
    }
    lines
}
