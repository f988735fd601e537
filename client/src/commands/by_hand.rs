//! Decisions by hand on the command line, beside those of the day folder.

use rimeshift_proto::v1::hand_decision::About;
use rimeshift_proto::v1::{HandDecision, Must};

/// What is decided by hand.
#[derive(Debug, Default, clap::Args)]
pub(crate) struct ByHandArgs {
    /// Grant this proposal, with that option or, without a number, with any; may be given several
    /// times.
    #[arg(long, value_name = "P[=OPTION]")]
    grant: Vec<String>,
    /// Refuse this proposal; may be given several times.
    #[arg(long, value_name = "P")]
    refuse: Vec<String>,
    /// Keep this flight as filed; may be given several times.
    #[arg(long, value_name = "F")]
    keep: Vec<String>,
    /// Plan around decisions that can't be met, and say which.
    #[arg(long)]
    pub(crate) around_decisions: bool,
}

impl ByHandArgs {
    /// The decisions, each with the option of the command line that made it.
    pub(crate) fn decisions(&self) -> (Vec<HandDecision>, Vec<String>) {
        let grants = self.grant.iter().map(|text| {
            let (proposal, option) = proposal_and_option(text);
            (decided(About::Proposal(proposal), Must::Grant, option), format!("--grant {text}"))
        });
        let refusals = self.refuse.iter().map(|proposal| {
            let about = About::Proposal(proposal.clone());
            (decided(about, Must::Refuse, None), format!("--refuse {proposal}"))
        });
        let kept = self.keep.iter().map(|flight| {
            let about = About::Flight(flight.clone());
            (decided(about, Must::Keep, None), format!("--keep {flight}"))
        });
        grants.chain(refusals).chain(kept).unzip()
    }
}

fn decided(about: About, must: Must, option: Option<u32>) -> HandDecision {
    HandDecision { about: Some(about), must: must.into(), option }
}

/// Splits `P=2`; what follows the last `=` belongs to the name where it is no number from 1.
fn proposal_and_option(text: &str) -> (String, Option<u32>) {
    let numbered = text.rsplit_once('=').and_then(|(proposal, option)| {
        let option = option.parse().ok().filter(|option| *option >= 1)?;
        Some((proposal.to_owned(), Some(option)))
    });
    numbered.unwrap_or_else(|| (text.to_owned(), None))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn an_option_is_told_from_a_name() {
        for (text, proposal, option) in [
            ("P1", "P1", None),
            ("P1=2", "P1", Some(2)),
            ("P=1=3", "P=1", Some(3)),
            ("P1=0", "P1=0", None),
            ("P1=a", "P1=a", None),
            ("P1=", "P1=", None),
        ] {
            assert_eq!(proposal_and_option(text), (proposal.to_owned(), option), "{text}");
        }
    }

    #[test]
    fn decisions_keep_the_option_that_made_them() {
        let args = ByHandArgs {
            grant: vec!["P1=2".to_owned()],
            refuse: vec!["P2".to_owned()],
            keep: vec!["F3".to_owned()],
            around_decisions: false,
        };
        let (decisions, flags) = args.decisions();
        assert_eq!(flags, ["--grant P1=2", "--refuse P2", "--keep F3"]);
        let proposal = |name: &str| About::Proposal(name.to_owned());
        assert_eq!(
            decisions,
            [
                decided(proposal("P1"), Must::Grant, Some(2)),
                decided(proposal("P2"), Must::Refuse, None),
                decided(About::Flight("F3".to_owned()), Must::Keep, None),
            ]
        );
    }
}
