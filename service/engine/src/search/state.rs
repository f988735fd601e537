//! Choices under way: everything needed to tell in the time of a few look-ups whether switching one
//! group is possible and what it gains.

use super::index::Index;
use super::model::Choice;

/// One candidate chosen in every group, with row sums, clash counts and any-of counts kept up to
/// date switch by switch.
#[derive(Debug, Clone)]
pub struct State<'i> {
    pub(super) index: &'i Index,
    /// The chosen variable of every group.
    pub(super) chosen: Vec<u32>,
    pub(super) sum: Vec<i64>,
    /// Chosen variables that clash hard with this one.
    pub(super) hits: Vec<u32>,
    /// Soft costs between this variable and the chosen ones.
    pub(super) cost: Vec<i64>,
    /// Rows of this any-of that hold.
    pub(super) holding: Vec<u32>,
    objective: i64,
    broken: Broken,
}

/// How much is broken, in the units that [`State::is_feasible`] and repairs need.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
struct Broken {
    forbidden: i64,
    hits: i64,
    excess: i64,
    any_ofs: i64,
}

impl<'i> State<'i> {
    /// The state of these choices, or nothing if they are not one existing candidate a group.
    #[must_use]
    pub fn new(index: &'i Index, choices: &[u32]) -> Option<Self> {
        if !index.fits(choices) {
            return None;
        }
        let chosen: Vec<u32> = (0u32..)
            .zip(choices)
            .map(|(group, candidate)| index.vars(group).start + candidate)
            .collect();
        Some(Self::of_vars(index, chosen))
    }

    pub(super) fn of_vars(index: &'i Index, chosen: Vec<u32>) -> Self {
        let vars = index.value.len();
        let mut state = Self {
            index,
            chosen,
            sum: vec![0; index.slack.len()],
            hits: vec![0; vars],
            cost: vec![0; vars],
            holding: vec![0; index.any_of_rows.len()],
            objective: 0,
            broken: Broken::default(),
        };
        for row in 0..index.slack.len() as u32 {
            if index.slack[row as usize] >= 0 {
                for &any_of in &index.row_any_ofs[row] {
                    state.holding[any_of as usize] += 1;
                }
            } else if row < index.firm_rows {
                state.broken.excess -= index.slack[row as usize];
            }
        }
        state.broken.any_ofs = state.holding.iter().filter(|&&rows| rows == 0).count() as i64;
        for group in 0..index.groups() {
            state.enter(state.chosen[group as usize]);
        }
        state
    }

    /// The chosen candidate of every group.
    #[must_use]
    pub fn choices(&self) -> Vec<u32> {
        self.chosen.iter().map(|&var| self.index.choice(var).candidate).collect()
    }

    /// Values of what is chosen less the costs of soft clashes.
    #[must_use]
    pub fn objective(&self) -> i64 {
        self.objective
    }

    /// Whether nothing is broken.
    #[must_use]
    pub fn is_feasible(&self) -> bool {
        self.broken == Broken::default()
    }

    /// How much is broken in all: forbidden choices, clashing pairs, excess of rows, any-ofs.
    pub(super) fn breakage(&self) -> i64 {
        self.broken.forbidden + self.broken.hits + self.broken.excess + self.broken.any_ofs
    }

    /// Chooses this candidate in its group, feasible or not; one that does not exist changes nothing.
    pub fn switch(&mut self, choice: Choice) {
        if let Some(var) = self.index.var(choice) {
            self.switch_to(var);
        }
    }

    pub(super) fn switch_to(&mut self, var: u32) {
        let group = self.index.group_of[var as usize] as usize;
        let old = self.chosen[group];
        if old != var {
            self.leave(old);
            self.chosen[group] = var;
            self.enter(var);
        }
    }

    fn enter(&mut self, var: u32) {
        let index = self.index;
        self.objective += index.value[var as usize] - self.cost[var as usize];
        self.broken.forbidden += i64::from(!index.allowed[var as usize]);
        self.broken.hits += i64::from(self.hits[var as usize]);
        for &other in &index.hard[var] {
            self.hits[other as usize] += 1;
        }
        for &(other, cost) in &index.soft[var] {
            self.cost[other as usize] += cost;
        }
        for &(row, delta) in &index.var_terms[var] {
            self.add(row, delta);
        }
    }

    fn leave(&mut self, var: u32) {
        let index = self.index;
        self.objective -= index.value[var as usize] - self.cost[var as usize];
        self.broken.forbidden -= i64::from(!index.allowed[var as usize]);
        self.broken.hits -= i64::from(self.hits[var as usize]);
        for &other in &index.hard[var] {
            self.hits[other as usize] -= 1;
        }
        for &(other, cost) in &index.soft[var] {
            self.cost[other as usize] -= cost;
        }
        for &(row, delta) in &index.var_terms[var] {
            self.add(row, -delta);
        }
    }

    fn add(&mut self, row: u32, delta: i64) {
        let slack = self.index.slack[row as usize];
        let before = self.sum[row as usize] - slack;
        let after = before + delta;
        self.sum[row as usize] += delta;
        if row < self.index.firm_rows {
            self.broken.excess += after.max(0) - before.max(0);
        } else if (before <= 0) != (after <= 0) {
            for &any_of in &self.index.row_any_ofs[row] {
                let holding = &mut self.holding[any_of as usize];
                self.broken.any_ofs -= i64::from(*holding == 0);
                *holding = if after <= 0 { *holding + 1 } else { *holding - 1 };
                self.broken.any_ofs += i64::from(*holding == 0);
            }
        }
    }

    /// What the objective would gain by this switch, feasible or not.
    #[must_use]
    pub fn gain(&self, choice: Choice) -> i64 {
        self.index.var(choice).map_or(0, |var| self.gain_of(var))
    }

    pub(super) fn gain_of(&self, var: u32) -> i64 {
        let old = self.chosen[self.index.group_of[var as usize] as usize];
        self.worth(var) - self.worth(old)
    }

    /// Value less the soft costs towards all other groups as they are now chosen.
    fn worth(&self, var: u32) -> i64 {
        self.index.value[var as usize] - self.cost[var as usize]
    }

    /// Whether this switch would break nothing that holds now, and leave no broken row worse.
    #[must_use]
    pub fn allows(&self, choice: Choice) -> bool {
        let made = |var: u32| self.chosen[choice.group as usize] == var;
        self.index.var(choice).is_some_and(|var| made(var) || self.allows_var(var))
    }

    /// [`State::allows`] for a variable other than the chosen one.
    pub(super) fn allows_var(&self, var: u32) -> bool {
        self.index.allowed[var as usize] && self.hits[var as usize] == 0 && self.rows_allow(var)
    }

    fn rows_allow(&self, var: u32) -> bool {
        let mut falling = Vec::new();
        let mut rising = Vec::new();
        for (row, delta) in self.deltas(var) {
            let before = self.sum[row as usize] - self.index.slack[row as usize];
            let after = before + delta;
            if row < self.index.firm_rows {
                if delta > 0 && after > 0 {
                    return false;
                }
            } else if before <= 0 && after > 0 {
                falling.extend_from_slice(&self.index.row_any_ofs[row]);
            } else if before > 0 && after <= 0 {
                rising.extend_from_slice(&self.index.row_any_ofs[row]);
            }
        }
        self.first_to_fail(falling, &rising).is_none()
    }

    /// The first any-of that would lose its last row.
    fn first_to_fail(&self, mut falling: Vec<u32>, rising: &[u32]) -> Option<u32> {
        falling.sort_unstable();
        let fails = |same: &&[u32]| {
            let any_of = same[0];
            let lost = same.len() as u32;
            lost == self.holding[any_of as usize] && !rising.contains(&any_of)
        };
        falling.chunk_by(|a, b| a == b).find(fails).map(|same| same[0])
    }

    /// What this switch would add to every row it touches, ascending by row.
    pub(super) fn deltas(&self, var: u32) -> impl Iterator<Item = (u32, i64)> + use<'i> {
        let old = self.chosen[self.index.group_of[var as usize] as usize];
        let (mut new_terms, mut old_terms) =
            (&self.index.var_terms[var], &self.index.var_terms[old]);
        std::iter::from_fn(move || {
            let row = match (new_terms.first(), old_terms.first()) {
                (Some(new), Some(old)) => new.0.min(old.0),
                (Some(only), None) | (None, Some(only)) => only.0,
                (None, None) => return None,
            };
            let mut delta = 0;
            if let Some((_, rest)) = new_terms.split_first().filter(|(term, _)| term.0 == row) {
                delta += new_terms[0].1;
                new_terms = rest;
            }
            if let Some((_, rest)) = old_terms.split_first().filter(|(term, _)| term.0 == row) {
                delta -= old_terms[0].1;
                old_terms = rest;
            }
            Some((row, delta))
        })
    }

    /// What this switch would break: the same answer as [`super::Model::blockers`], in the time of a
    /// few look-ups, except that clashes are told as the choices clashed with.
    #[must_use]
    pub fn blockers(&self, choice: Choice) -> Vec<Blocker> {
        let Some(var) = self.index.var(choice) else {
            return vec![Blocker::Forbidden];
        };
        let mut blockers = Vec::new();
        if self.chosen[choice.group as usize] == var {
            return blockers;
        }
        if !self.index.allowed[var as usize] {
            blockers.push(Blocker::Forbidden);
        }
        for &other in &self.index.hard[var] {
            if self.chosen[self.index.group_of[other as usize] as usize] == other {
                blockers.push(Blocker::Clash { with: self.index.choice(other) });
            }
        }
        let mut falling = Vec::new();
        let mut rising = Vec::new();
        for (row, delta) in self.deltas(var) {
            let before = self.sum[row as usize] - self.index.slack[row as usize];
            let after = before + delta;
            if row < self.index.firm_rows {
                if delta > 0 && after > 0 {
                    blockers.push(Blocker::Row { row: row as usize, excess: after });
                }
            } else if before <= 0 && after > 0 {
                falling.extend_from_slice(&self.index.row_any_ofs[row]);
            } else if before > 0 && after <= 0 {
                rising.extend_from_slice(&self.index.row_any_ofs[row]);
            }
        }
        while let Some(any_of) = self.first_to_fail(falling.clone(), &rising) {
            blockers.push(Blocker::AnyOf { any_of: any_of as usize });
            falling.retain(|&other| other != any_of);
        }
        blockers
    }
}

/// Something that keeps a single switch from being possible.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Blocker {
    /// The candidate may not be chosen, or does not exist.
    Forbidden,
    /// It clashes with what is chosen in another group.
    Clash {
        /// The choice that stands in the way.
        with: Choice,
    },
    /// A row's sum would exceed its slack.
    Row {
        /// Position in [`super::Model::rows`].
        row: usize,
        /// By how much.
        excess: i64,
    },
    /// None of an any-of's rows would hold.
    AnyOf {
        /// Position in [`super::Model::any_ofs`].
        any_of: usize,
    },
}
