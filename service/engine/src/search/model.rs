//! The model that the search is given: plain data, and the defects it may have.

use std::fmt;

/// One of a group's candidates, by position.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Choice {
    /// Position in [`Model::groups`].
    pub group: u32,
    /// Position in [`Group::candidates`].
    pub candidate: u32,
}

/// Shorthand for a [`Choice`].
#[must_use]
pub const fn choice(group: u32, candidate: u32) -> Choice {
    Choice { group, candidate }
}

/// One way of settling a group.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Candidate {
    /// What choosing it adds to the objective.
    pub value: i64,
    /// Whether it may be chosen at all. Decisions made by hand clear this.
    pub allowed: bool,
}

/// Candidates of which exactly one is chosen. Candidate 0 is the resting one, normally worth 0.
#[derive(Debug, Clone, PartialEq, Eq, Default)]
pub struct Group {
    /// At least one; the resting candidate first.
    pub candidates: Vec<Candidate>,
}

impl Group {
    /// A group whose candidates have these values and are all allowed.
    #[must_use]
    pub fn of(values: &[i64]) -> Self {
        let candidates = values.iter().map(|&value| Candidate { value, allowed: true }).collect();
        Self { candidates }
    }

    /// Forbids every candidate but this one. A position that does not exist forbids them all, which
    /// [`Model::defect`] reports.
    pub fn fix(&mut self, candidate: u32) {
        for (position, other) in self.candidates.iter_mut().enumerate() {
            other.allowed = other.allowed && position == candidate as usize;
        }
    }

    /// Forbids one candidate; a position that does not exist changes nothing.
    pub fn forbid(&mut self, candidate: u32) {
        if let Some(candidate) = self.candidates.get_mut(candidate as usize) {
            candidate.allowed = false;
        }
    }
}

/// What it takes to choose both ends of a [`Clash`].
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Cost {
    /// They may not be chosen together.
    Hard,
    /// Choosing both takes this much (at least 0) off the objective.
    Soft(i64),
}

/// Two candidates of different groups that do not go together. Candidate 0 may take part; soft
/// costs of clashes between the same two add up.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Clash {
    /// One end.
    pub a: Choice,
    /// The other end, in another group.
    pub b: Choice,
    /// Whether it forbids or costs.
    pub cost: Cost,
}

/// The sum of the deltas of the chosen candidates may not exceed the slack.
#[derive(Debug, Clone, PartialEq, Eq, Default)]
pub struct Row {
    /// Room left when nothing with a delta is chosen.
    pub slack: i64,
    /// What choosing a candidate adds to the sum; several entries of one candidate add up.
    pub terms: Vec<(Choice, i32)>,
}

/// At least one of these rows must hold.
#[derive(Debug, Clone, PartialEq, Eq, Default)]
pub struct AnyOf {
    /// The alternatives; a slack may be negative here. The same row may stand in many any-ofs.
    pub rows: Vec<Row>,
}

/// What is to be decided, and under which constraints.
///
/// # Validity
/// Every group has an allowed candidate; every choice named exists; the two ends of a clash lie in
/// different groups; soft costs are not negative; all values and soft costs together stay below
/// 2^53 in absolute size, and so do the deltas and slack of each row. [`Model::defect`] tells.
#[derive(Debug, Clone, PartialEq, Eq, Default)]
pub struct Model {
    /// One decision each.
    pub groups: Vec<Group>,
    /// Pairs that exclude each other or cost something together.
    pub clashes: Vec<Clash>,
    /// Sums that are limited.
    pub rows: Vec<Row>,
    /// Sets of rows of which one must hold.
    pub any_ofs: Vec<AnyOf>,
}

/// Why a model can't be searched.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Defect {
    /// No candidate of this group is allowed.
    NothingAllowed {
        /// Position of the group.
        group: u32,
    },
    /// A clash or row names a candidate that does not exist.
    UnknownChoice {
        /// The name that leads nowhere.
        choice: Choice,
    },
    /// A clash between candidates of one group, which exclude each other anyway.
    ClashInGroup {
        /// Position of the clash.
        clash: usize,
    },
    /// A soft clash with a negative cost.
    NegativeCost {
        /// Position of the clash.
        clash: usize,
    },
    /// Values, costs or deltas add up to 2^53 or more, beyond which sums are no longer exact.
    TooLarge,
    /// More candidates, rows or clashes than 2^31.
    TooMany,
}

impl fmt::Display for Defect {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::NothingAllowed { group } => write!(f, "group {group} has no allowed candidate"),
            Self::UnknownChoice { choice } => {
                write!(f, "there is no candidate {} in group {}", choice.candidate, choice.group)
            }
            Self::ClashInGroup { clash } => write!(f, "clash {clash} joins a group to itself"),
            Self::NegativeCost { clash } => write!(f, "clash {clash} has a negative cost"),
            Self::TooLarge => write!(f, "values, costs or deltas add up to 2^53 or more"),
            Self::TooMany => write!(f, "more than 2^31 candidates, rows or clashes"),
        }
    }
}

impl std::error::Error for Defect {}

const LIMIT: u64 = 1 << 53;
const MOST: usize = 1 << 31;

impl Model {
    /// The candidate a choice names.
    #[must_use]
    pub fn candidate(&self, choice: Choice) -> Option<&Candidate> {
        self.groups.get(choice.group as usize)?.candidates.get(choice.candidate as usize)
    }

    /// The choice of candidate 0 in every group.
    #[must_use]
    pub fn resting(&self) -> Vec<u32> {
        vec![0; self.groups.len()]
    }

    /// Every row, those of the any-ofs included.
    pub(crate) fn all_rows(&self) -> impl Iterator<Item = &Row> {
        self.rows.iter().chain(self.any_ofs.iter().flat_map(|any_of| &any_of.rows))
    }

    /// The first thing that makes the model unfit to be searched, if any does.
    #[must_use]
    pub fn defect(&self) -> Option<Defect> {
        self.defect_in_groups()
            .or_else(|| self.defect_in_clashes())
            .or_else(|| self.defect_in_rows())
            .or_else(|| self.defect_in_size())
    }

    fn defect_in_groups(&self) -> Option<Defect> {
        let empty = |group: &Group| group.candidates.iter().all(|candidate| !candidate.allowed);
        let group = self.groups.iter().position(empty)?;
        Some(u32::try_from(group).map_or(Defect::TooMany, |group| Defect::NothingAllowed { group }))
    }

    fn defect_in_clashes(&self) -> Option<Defect> {
        for (clash, Clash { a, b, cost }) in self.clashes.iter().enumerate() {
            for choice in [*a, *b] {
                if self.candidate(choice).is_none() {
                    return Some(Defect::UnknownChoice { choice });
                }
            }
            if a.group == b.group {
                return Some(Defect::ClashInGroup { clash });
            }
            if matches!(cost, Cost::Soft(cost) if *cost < 0) {
                return Some(Defect::NegativeCost { clash });
            }
        }
        None
    }

    fn defect_in_rows(&self) -> Option<Defect> {
        self.all_rows().find_map(|row| self.defect_in_row(row))
    }

    /// What makes a row unfit to stand in this model, if anything does.
    pub(super) fn defect_in_row(&self, row: &Row) -> Option<Defect> {
        let mut size = row.slack.unsigned_abs();
        for &(choice, delta) in &row.terms {
            if self.candidate(choice).is_none() {
                return Some(Defect::UnknownChoice { choice });
            }
            size = size.saturating_add(u64::from(delta.unsigned_abs()));
        }
        (size >= LIMIT).then_some(Defect::TooLarge)
    }

    fn defect_in_size(&self) -> Option<Defect> {
        let values = self.groups.iter().flat_map(|group| &group.candidates);
        let values = values.map(|candidate| candidate.value.unsigned_abs());
        let costs = self.clashes.iter().map(|clash| match clash.cost {
            Cost::Soft(cost) => cost.unsigned_abs(),
            Cost::Hard => 0,
        });
        if values.chain(costs).fold(0, u64::saturating_add) >= LIMIT {
            return Some(Defect::TooLarge);
        }
        let candidates: usize = self.groups.iter().map(|group| group.candidates.len()).sum();
        let rows = self.all_rows().count();
        let most = candidates.max(rows).max(self.any_ofs.len()).max(self.clashes.len());
        (most >= MOST).then_some(Defect::TooMany)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn defects_are_named() {
        let sound = Model {
            groups: vec![Group::of(&[0, 5]), Group::of(&[0, 7])],
            clashes: vec![Clash { a: choice(0, 1), b: choice(1, 1), cost: Cost::Hard }],
            rows: vec![Row { slack: 1, terms: vec![(choice(0, 1), 1)] }],
            any_ofs: vec![],
        };
        assert_eq!(sound.defect(), None);

        let mut model = sound.clone();
        model.groups[1].fix(1);
        model.groups[1].forbid(1);
        assert_eq!(model.defect(), Some(Defect::NothingAllowed { group: 1 }));

        let mut model = sound.clone();
        model.clashes[0].b = choice(0, 0);
        assert_eq!(model.defect(), Some(Defect::ClashInGroup { clash: 0 }));

        let mut model = sound.clone();
        model.clashes[0].cost = Cost::Soft(-1);
        assert_eq!(model.defect(), Some(Defect::NegativeCost { clash: 0 }));

        let mut model = sound.clone();
        model.any_ofs.push(AnyOf { rows: vec![Row { slack: -1, terms: vec![(choice(2, 0), 1)] }] });
        assert_eq!(model.defect(), Some(Defect::UnknownChoice { choice: choice(2, 0) }));

        let mut model = sound;
        model.groups[0].candidates[1].value = i64::MIN;
        assert_eq!(model.defect(), Some(Defect::TooLarge));
    }
}
