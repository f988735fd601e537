//! The judge: what a set of choices is worth and what it breaks, read straight off the model.
//! Slow and obvious on purpose; the fast paths are tested against it.

use super::model::{AnyOf, Choice, Clash, Cost, Model, Row};

/// Something that a set of choices breaks.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Violation {
    /// A candidate that may not be chosen, or does not exist, is chosen.
    Forbidden {
        /// The choice made.
        choice: Choice,
    },
    /// Both ends of a hard clash are chosen.
    Clash {
        /// Position in [`Model::clashes`].
        clash: usize,
    },
    /// A row's sum exceeds its slack.
    Row {
        /// Position in [`Model::rows`].
        row: usize,
        /// By how much.
        excess: i64,
    },
    /// None of an any-of's rows holds.
    AnyOf {
        /// Position in [`Model::any_ofs`].
        any_of: usize,
    },
}

impl Row {
    /// The sum of the deltas of what is chosen.
    #[must_use]
    pub fn sum(&self, choices: &[u32]) -> i64 {
        let chosen =
            |choice: &Choice| choices.get(choice.group as usize) == Some(&choice.candidate);
        self.terms
            .iter()
            .filter(|(choice, _)| chosen(choice))
            .map(|&(_, delta)| i64::from(delta))
            .sum()
    }

    /// Whether the sum stays within the slack.
    #[must_use]
    pub fn holds(&self, choices: &[u32]) -> bool {
        self.sum(choices) <= self.slack
    }
}

impl AnyOf {
    /// Whether at least one row holds.
    #[must_use]
    pub fn holds(&self, choices: &[u32]) -> bool {
        self.rows.iter().any(|row| row.holds(choices))
    }
}

impl Model {
    /// What these choices (one candidate a group) are worth: values less the costs of soft clashes.
    #[must_use]
    pub fn objective(&self, choices: &[u32]) -> i64 {
        let values = self.groups.iter().zip(choices);
        let values = values.filter_map(|(group, &chosen)| group.candidates.get(chosen as usize));
        let costs = self.clashes.iter().filter_map(|clash| match clash.cost {
            Cost::Soft(cost) if both(choices, clash.a, clash.b) => Some(cost),
            Cost::Soft(_) | Cost::Hard => None,
        });
        values.map(|candidate| candidate.value).sum::<i64>() - costs.sum::<i64>()
    }

    /// Everything these choices break, in the order of [`Violation`]'s variants and then by position.
    ///
    /// A missing or surplus choice counts as forbidden.
    #[must_use]
    pub fn violations(&self, choices: &[u32]) -> Vec<Violation> {
        let mut broken = Vec::new();
        for group in 0..self.groups.len().max(choices.len()) {
            let candidate = choices.get(group).copied().unwrap_or(u32::MAX);
            let choice = Choice { group: u32::try_from(group).unwrap_or(u32::MAX), candidate };
            if !self.candidate(choice).is_some_and(|candidate| candidate.allowed) {
                broken.push(Violation::Forbidden { choice });
            }
        }
        for (clash, Clash { a, b, cost }) in self.clashes.iter().enumerate() {
            if *cost == Cost::Hard && both(choices, *a, *b) {
                broken.push(Violation::Clash { clash });
            }
        }
        for (position, row) in self.rows.iter().enumerate() {
            let excess = row.sum(choices) - row.slack;
            if excess > 0 {
                broken.push(Violation::Row { row: position, excess });
            }
        }
        for (position, any_of) in self.any_ofs.iter().enumerate() {
            if !any_of.holds(choices) {
                broken.push(Violation::AnyOf { any_of: position });
            }
        }
        broken
    }

    /// What switching one group to `choice` would break, all other choices staying: everything that
    /// is broken afterwards and was not before, and rows that were broken and become more so.
    #[must_use]
    pub fn blockers(&self, choices: &[u32], choice: Choice) -> Vec<Violation> {
        let before = self.violations(choices);
        let mut after = choices.to_vec();
        if let Some(chosen) = after.get_mut(choice.group as usize) {
            *chosen = choice.candidate;
        }
        let worse = |now: &Violation| {
            match *now {
            Violation::Row { row, excess } => !before.iter().any(
                |old| matches!(*old, Violation::Row { row: r, excess: e } if r == row && e >= excess),
            ),
            _ => !before.contains(now),
        }
        };
        self.violations(&after).into_iter().filter(worse).collect()
    }
}

fn both(choices: &[u32], a: Choice, b: Choice) -> bool {
    [a, b].iter().all(|end| choices.get(end.group as usize) == Some(&end.candidate))
}

#[cfg(test)]
mod tests {
    use super::super::model::{Group, choice};
    use super::*;

    #[test]
    fn every_kind_of_violation_is_found() {
        let mut model = Model {
            groups: vec![Group::of(&[0, 5, 6]), Group::of(&[0, 7])],
            clashes: vec![
                Clash { a: choice(0, 1), b: choice(1, 1), cost: Cost::Hard },
                Clash { a: choice(0, 2), b: choice(1, 1), cost: Cost::Soft(4) },
            ],
            rows: vec![Row { slack: 1, terms: vec![(choice(0, 1), 1), (choice(1, 1), 3)] }],
            any_ofs: vec![AnyOf {
                rows: vec![
                    Row { slack: -1, terms: vec![(choice(0, 2), -1)] },
                    Row { slack: 0, terms: vec![(choice(1, 1), 1)] },
                ],
            }],
        };
        assert_eq!(model.violations(&[0, 0]), []);
        assert_eq!(model.objective(&[2, 1]), 6 + 7 - 4);
        let row = |excess| Violation::Row { row: 0, excess };
        let any_of = Violation::AnyOf { any_of: 0 };
        assert_eq!(model.violations(&[1, 1]), [Violation::Clash { clash: 0 }, row(3), any_of]);
        assert_eq!(model.violations(&[2, 1]), [row(2)]);
        assert_eq!(model.blockers(&[0, 1], choice(0, 1)), [Violation::Clash { clash: 0 }, row(3)]);
        model.groups[0].forbid(0);
        let forbidden = Violation::Forbidden { choice: choice(0, 0) };
        assert_eq!(model.violations(&[0, 0]), [forbidden]);
        assert_eq!(model.violations(&[1])[0], Violation::Forbidden { choice: choice(1, u32::MAX) });
    }
}
