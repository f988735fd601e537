//! Decisions by hand: what they are about must be there, and they must not contradict each other.

use super::super::hand::{HandDecision, HandSubject};
use super::super::parts::{DecisionAbout, DecisionParts, Must};
use super::super::{Day, Defect, Flight, Proposal};
use super::Build;
use crate::ids::{FlightId, ProposalId};

impl Day {
    /// Decisions by hand beside the day's own, in order and each once.
    ///
    /// # Errors
    /// Names that the day does not have, and decisions that contradict each other or the day's own;
    /// paths are `decisions[i]`, counted over `parts`.
    pub fn further_decisions(
        &self,
        parts: &[DecisionParts],
    ) -> Result<Vec<HandDecision>, Vec<Defect>> {
        let mut build = Build::default();
        let proposals = self.proposals.as_slice();
        let found = build.resolved_decisions(parts, self.flights.as_slice(), proposals);
        build.contradictions(&found, proposals);
        for (i, decision) in &found {
            if let Some(own) = self.decisions.iter().find(|own| self.contradict(**own, *decision)) {
                build.defects.push(
                    || format!("decisions[{i}].must"),
                    format!("contradicts the day's own decision to {}", self.told(*own)),
                    "decide each proposal and flight one way",
                );
            }
        }
        if build.defects.is_empty() {
            Ok(found.into_iter().map(|(_, decision)| decision).collect())
        } else {
            Err(build.defects.into_vec())
        }
    }

    fn contradict(&self, a: HandDecision, b: HandDecision) -> bool {
        let grants_on = |grant: HandDecision, keep: HandDecision| match (grant.about, grant.must) {
            (HandSubject::Proposal(id), Must::Grant { .. }) => {
                keep.about == HandSubject::Flight(self.proposals[id].flight)
            }
            _ => false,
        };
        (a.about == b.about && a.must != b.must && !agree(a.must, b.must))
            || grants_on(a, b)
            || grants_on(b, a)
    }

    /// A decision in words.
    fn told(&self, decision: HandDecision) -> String {
        let about = match decision.about {
            HandSubject::Proposal(id) => format!("proposal `{}`", self.proposals[id].name),
            HandSubject::Flight(id) => format!("flight `{}`", self.flights[id].name),
        };
        match decision.must {
            Must::Grant { option: Some(option) } => format!("grant {about} with option {option}"),
            Must::Grant { option: None } => format!("grant {about}"),
            Must::Refuse => format!("refuse {about}"),
            Must::Keep => format!("keep {about} as filed"),
        }
    }
}

/// Whether two different decisions about one proposal agree: a grant with any option and one with
/// a certain option do.
fn agree(a: Must, b: Must) -> bool {
    matches!(
        (a, b),
        (Must::Grant { option: None }, Must::Grant { .. })
            | (Must::Grant { .. }, Must::Grant { option: None })
    )
}

impl Build {
    pub(super) fn decisions(
        &mut self,
        parts: &[DecisionParts],
        flights: &[Flight],
        proposals: &[Proposal],
    ) -> Vec<HandDecision> {
        let found = self.resolved_decisions(parts, flights, proposals);
        self.contradictions(&found, proposals);
        found.into_iter().map(|(_, decision)| decision).collect()
    }

    /// Decisions in order, each once, with their place in the input.
    fn resolved_decisions(
        &mut self,
        parts: &[DecisionParts],
        flights: &[Flight],
        proposals: &[Proposal],
    ) -> Vec<(usize, HandDecision)> {
        let mut found: Vec<(usize, HandDecision)> = Vec::with_capacity(parts.len());
        for (i, row) in parts.iter().enumerate() {
            let about = match &row.about {
                DecisionAbout::Proposal(name) => {
                    let at = proposals.binary_search_by(|p| p.name.as_str().cmp(name));
                    if at.is_err() {
                        self.unknown_name("decisions", i, "proposal", "proposal", name);
                    }
                    at.ok().map(|at| HandSubject::Proposal(ProposalId(at as u32)))
                }
                DecisionAbout::Flight(name) => {
                    let at = flights.binary_search_by(|f| f.name.as_str().cmp(name));
                    if at.is_err() {
                        self.unknown_name("decisions", i, "flight", "flight", name);
                    }
                    at.ok().map(|at| HandSubject::Flight(FlightId(at as u32)))
                }
            };
            let Some(about) = about else { continue };
            if self.decision_fits(i, about, row.must, proposals) {
                found.push((i, HandDecision { about, must: row.must }));
            }
        }
        found.sort_by(|a, b| a.1.cmp(&b.1).then(a.0.cmp(&b.0)));
        found.dedup_by(|a, b| a.1 == b.1);
        found
    }

    fn decision_fits(
        &mut self,
        i: usize,
        about: HandSubject,
        must: Must,
        proposals: &[Proposal],
    ) -> bool {
        let path = || format!("decisions[{i}].must");
        match (about, must) {
            (HandSubject::Proposal(_), Must::Keep) => {
                self.defects.push(
                    path,
                    "`keep` is about flights",
                    "name the flight, or `refuse` the proposal",
                );
                false
            }
            (HandSubject::Flight(_), Must::Grant { .. } | Must::Refuse) => {
                self.defects.push(
                    path,
                    "is about proposals",
                    "name the proposal, or `keep` the flight as filed",
                );
                false
            }
            (HandSubject::Proposal(ProposalId(at)), Must::Grant { option: Some(option) }) => {
                let proposal = &proposals[at as usize];
                let has = proposal.alternatives.iter().any(|a| a.option == option);
                if !has {
                    self.defects.push(
                        || format!("decisions[{i}].option"),
                        format!("proposal `{}` has no option {option}", proposal.name),
                        "name one of its options, or none for any",
                    );
                }
                has
            }
            _ => true,
        }
    }

    /// Two different decisions about one proposal, or a grant on a flight that is to be kept.
    fn contradictions(&mut self, found: &[(usize, HandDecision)], proposals: &[Proposal]) {
        for w in found.windows(2) {
            let ((first, a), (second, b)) = (w[0], w[1]);
            if a.about == b.about && !agree(a.must, b.must) {
                self.contradiction(second, first);
            }
        }
        let kept = |flight: FlightId| {
            found.iter().find(|(_, d)| d.about == HandSubject::Flight(flight)).map(|&(i, _)| i)
        };
        for &(i, decision) in found {
            if let (HandSubject::Proposal(ProposalId(at)), Must::Grant { .. }) =
                (decision.about, decision.must)
                && let Some(keep) = kept(proposals[at as usize].flight)
            {
                self.contradiction(i, keep);
            }
        }
    }

    fn contradiction(&mut self, row: usize, other: usize) {
        self.defects.push(
            || format!("decisions[{row}].must"),
            format!("contradicts decisions[{other}]"),
            "decide each proposal and flight one way",
        );
    }
}
