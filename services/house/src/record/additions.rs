//! Additions, proposals that were not carried out, signatures, deviations.

use domain::book::body::{
    AdditionRecorded, Body, DeviationOpened, Line, Preparation, ProposalAssessed, SignoffGiven,
};
use domain::book::in_force::InForce;
use domain::checks;
use domain::ids::ProposalId;
use domain::units::Quantity;
use records::{Addition, Deviation, DoseLine, Finding, ProposalRef, Signature};

use super::evidence::{Evidence, Told};
use super::readings::entered_at;
use super::struck::struck;
use super::words;

impl Evidence {
    pub(super) fn printed_additions(&self) -> Vec<Addition> {
        let additions = self.told.iter().filter_map(|told| match told.read.body.as_ref() {
            Body::AdditionRecorded(body) => Some(self.addition(told, body)),
            _ => None,
        });
        additions.collect()
    }

    fn addition(&self, told: &Told, body: &AdditionRecorded) -> Addition {
        let behind = body.proposal.and_then(|id| self.proposal(id));
        let entered = entered_at(told);
        let done = told.read.occurred_at.at;
        Addition {
            n: told.n,
            at: self.clock(done),
            lines: dose_lines(&body.lines),
            preparation: preparation(body.preparation).to_owned(),
            carrier_water: water(body.carrier_water.as_ref()),
            purpose: behind.and_then(|(_, it)| it.purpose.clone()).unwrap_or_default(),
            by: self.name(told.read.actor),
            verdict: words::verdict(body.assessment.verdict),
            findings: findings(&body.assessment),
            signatures: body.proposal.map(|id| self.signatures(id)).unwrap_or_default(),
            already_done: body.already_done.clone(),
            late: if body.late.is_some() {
                self.late_text(entered, done, "the act")
            } else {
                String::new()
            },
            proposal: behind.map(|(proposal, it)| self.compared(proposal, it, body)),
            outcome: told.fate().unwrap_or_default().to_owned(),
            struck: struck(self, &told.read, said),
        }
    }

    fn compared(
        &self,
        proposal: &Told,
        proposed: &ProposalAssessed,
        done: &AdditionRecorded,
    ) -> ProposalRef {
        let many = done.lines.len() > 1;
        let each = |line: &Line| {
            let was = proposed.lines.iter().find(|other| other.lot == line.lot);
            let amount = was.map_or_else(
                || words::amount(&line.amount),
                |was| words::beside(&line.amount, &was.amount),
            );
            if many { format!("{amount} {}", line.lot_code) } else { amount }
        };
        let planned = self.clock(proposed.planned_at.at);
        let amounts = match proposed.lines.as_slice() {
            [one] => words::amount(&one.amount),
            lines => words::dose(lines),
        };
        ProposalRef {
            n: proposal.n,
            proposed: format!("{amounts} for {planned}"),
            done: done.lines.iter().map(each).collect::<Vec<_>>().join(" + "),
        }
    }

    fn proposal(&self, id: ProposalId) -> Option<(&Told, &ProposalAssessed)> {
        self.proposals().find(|(_, body)| body.proposal == id)
    }

    fn proposals(&self) -> impl Iterator<Item = (&Told, &ProposalAssessed)> {
        self.told.iter().filter_map(|told| match told.read.body.as_ref() {
            Body::ProposalAssessed(body) => Some((told, body)),
            _ => None,
        })
    }

    fn is_done(&self, id: ProposalId) -> bool {
        self.told.iter().filter(|told| told.is_in_force()).any(|told| {
            matches!(told.read.body.as_ref(), Body::AdditionRecorded(body) if body.proposal == Some(id))
        })
    }

    pub(super) fn printed_proposals(&self) -> Vec<Addition> {
        self.proposals()
            .filter(|(_, body)| !self.is_done(body.proposal))
            .map(|(told, body)| self.not_done(told, body))
            .collect()
    }

    fn not_done(&self, told: &Told, body: &ProposalAssessed) -> Addition {
        Addition {
            n: told.n,
            at: self.clock(body.planned_at.at),
            lines: dose_lines(&body.lines),
            preparation: preparation(body.preparation).to_owned(),
            carrier_water: water(body.carrier_water.as_ref()),
            purpose: body.purpose.clone().unwrap_or_default(),
            by: self.name(told.read.actor),
            verdict: words::verdict(body.assessment.verdict),
            findings: findings(&body.assessment),
            signatures: self.signatures(body.proposal),
            outcome: self.outcome(body),
            ..Addition::default()
        }
    }

    fn outcome(&self, body: &ProposalAssessed) -> String {
        let signed = !self.signatures(body.proposal).is_empty();
        let answer = match body.assessment.verdict {
            checks::Verdict::Refuse => return "refused; not done".to_owned(),
            checks::Verdict::Refer if signed => "signed, not done",
            checks::Verdict::Refer => "not signed, not done",
            _ => "not done",
        };
        let until = self.clock(body.lapses_at.at);
        if self.drawn_up > body.lapses_at.at {
            format!("{answer}; lapsed {until}")
        } else {
            format!("{answer} so far; lapses {until}")
        }
    }

    /// The signatures on a proposal, oldest first.
    fn signatures(&self, id: ProposalId) -> Vec<Signature> {
        let given = self.told.iter().filter_map(|told| match told.read.body.as_ref() {
            Body::SignoffGiven(body) if body.proposal == Some(id) => Some((&*told.read, body)),
            _ => None,
        });
        given.map(|(entry, body)| self.signature(entry, body)).collect()
    }

    fn signature(&self, entry: &InForce, body: &SignoffGiven) -> Signature {
        let mut meaning = body.meaning.clone();
        if let Some(until) = body.valid_until {
            meaning = format!("{meaning}, valid until {}", self.clock(until.at));
        }
        if body.single_person {
            meaning.push_str("; single person: the site is declared single-handed");
        }
        Signature {
            name: self.name(entry.actor),
            role: self.roles(entry.actor, entry.seq),
            at: self.clock(entry.occurred_at.at),
            meaning,
            reason: body.reason.clone(),
            binds: format!("sha256 {}", body.binds),
        }
    }

    pub(super) fn printed_deviations(&self) -> Vec<Deviation> {
        let opened = self.told.iter().filter_map(|told| match told.read.body.as_ref() {
            Body::DeviationOpened(body) => Some(self.deviation(told, body)),
            _ => None,
        });
        opened.collect()
    }

    fn deviation(&self, told: &Told, body: &DeviationOpened) -> Deviation {
        let findings = body.findings.iter().map(|finding| {
            format!("{}: {} ({})", finding.verdict.name(), finding.sentence, finding.rule)
        });
        let mut row = Deviation {
            code: body.code.clone(),
            opened: self.clock(told.read.occurred_at.at),
            by: self.name(told.read.actor),
            findings: std::iter::once(body.title.clone()).chain(findings).collect(),
            ..Deviation::default()
        };
        if let Some(fate) = told.fate() {
            let by = told.read.amendments.last();
            fate.clone_into(&mut row.resolved_at);
            row.resolved_by = by.map(|a| self.name(a.actor)).unwrap_or_default();
            row.conclusion = by.map(|a| a.reason.clone()).unwrap_or_default();
        }
        let resolved = self.told.iter().find_map(|other| match other.read.body.as_ref() {
            Body::DeviationResolved(end) if end.deviation == body.deviation => Some((other, end)),
            _ => None,
        });
        if let Some((end, resolved)) = resolved.filter(|(end, _)| end.is_in_force()) {
            row.cause.clone_from(&resolved.cause);
            row.action.clone_from(&resolved.action);
            row.conclusion.clone_from(&resolved.conclusion);
            row.resolved_at = self.clock(end.read.occurred_at.at);
            row.resolved_by = self.name(end.read.actor);
            row.signature = Some(Signature {
                name: row.resolved_by.clone(),
                role: self.roles(end.read.actor, end.read.seq),
                at: row.resolved_at.clone(),
                meaning: "resolved the deviation".to_owned(),
                reason: String::new(),
                binds: format!("sha256 {}", resolved.binds),
            });
        }
        row
    }
}

fn dose_lines(lines: &[Line]) -> Vec<DoseLine> {
    let each = |line: &Line| DoseLine {
        lot: line.lot_code.clone(),
        material: line.material_name.clone(),
        amount: words::amount(&line.amount),
    };
    lines.iter().map(each).collect()
}

const fn preparation(preparation: Preparation) -> &'static str {
    match preparation {
        Preparation::AsDelivered => "as delivered",
        Preparation::Powder => "powder",
        Preparation::Slurry => "slurry",
        Preparation::Solution => "solution",
    }
}

fn water(carrier: Option<&Quantity>) -> String {
    carrier.map(|water| format!("water {}", words::amount(water))).unwrap_or_default()
}

fn findings(assessment: &checks::Assessment) -> Vec<Finding> {
    let each = |finding: &checks::Finding| Finding {
        verdict: words::verdict(finding.verdict),
        sentence: finding.sentence.clone(),
        basis: words::basis(finding.basis).to_owned(),
        citation: finding.citation.clone().unwrap_or_default(),
        remedy: finding.remedy.as_ref().map(|it| it.sentence.clone()).unwrap_or_default(),
    };
    assessment.findings.iter().map(each).collect()
}

/// An addition in a line, to be struck through.
fn said(body: &Body) -> String {
    let Body::AdditionRecorded(body) = body else { return String::new() };
    let parts = [
        words::dose(&body.lines),
        preparation(body.preparation).to_owned(),
        water(body.carrier_water.as_ref()),
    ];
    parts.into_iter().filter(|part| !part.is_empty()).collect::<Vec<_>>().join(", ")
}
