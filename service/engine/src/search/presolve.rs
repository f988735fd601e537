//! What can be settled by reasoning alone, before any search: rows that can't be broken, candidates
//! that no feasible choices contain, candidates that a mate of the same group is never worse than.
//!
//! The steps are the textbook ones for 0-1 programs (Savelsbergh 1994, ORSA Journal on Computing 6),
//! repeated until nothing changes. A ruled-out candidate is either in no feasible choices or can be
//! exchanged for its mate without loss, so the optimum stays.

use super::budget::Budget;
use super::index::Index;

/// What is left of an [`Index`] after reasoning.
#[derive(Debug, Clone)]
pub(super) struct Live {
    /// Candidates that may still be chosen.
    pub(super) vars: Vec<bool>,
    /// How many of them each group has.
    pub(super) count: Vec<u32>,
    /// What each row asks for.
    pub(super) rows: Vec<Demand>,
    /// Any-ofs that can still be broken and have several rows left.
    pub(super) any_ofs: Vec<bool>,
    /// For a candidate that was dropped in favour of a mate, the mate; else the candidate itself.
    pub(super) stand_in: Vec<u32>,
    /// At least how much better its stand-in is.
    spare: Vec<i64>,
    /// When each candidate was ruled out, counted; the greatest number there is while it is not.
    pub(super) ruled_at: Vec<u32>,
    /// How many candidates had been ruled out when a row was found not to be asked for any more.
    pub(super) dropped_at: Vec<u32>,
    ruled: u32,
    /// Nothing is feasible.
    pub(super) infeasible: bool,
}

/// What a row asks for.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Demand {
    /// It must hold.
    Firm,
    /// It is one of an any-of's rows.
    Alternative,
    /// It holds whatever is chosen, or nothing asks for it.
    Holds,
    /// It is one of an any-of's rows and can't hold.
    Fails,
}

/// Reasons until nothing changes.
pub(super) fn presolve(index: &Index, budget: &mut Budget<'_>) -> Live {
    let mut live = Live::new(index);
    live.reason(index, budget);
    live
}

impl Live {
    /// Everything that is allowed.
    pub(super) fn new(index: &Index) -> Self {
        let firm = |row| if row < index.firm_rows { Demand::Firm } else { Demand::Alternative };
        let mut live = Self {
            vars: vec![true; index.value.len()],
            count: (0..index.groups()).map(|group| index.vars(group).len() as u32).collect(),
            rows: (0..index.slack.len() as u32).map(firm).collect(),
            any_ofs: vec![true; index.any_of_rows.len()],
            stand_in: (0..index.value.len() as u32).collect(),
            spare: vec![0; index.value.len()],
            ruled_at: vec![u32::MAX; index.value.len()],
            dropped_at: vec![u32::MAX; index.slack.len()],
            ruled: 0,
            infeasible: false,
        };
        for (var, &allowed) in (0u32..).zip(&index.allowed) {
            if !allowed {
                live.rule_out(index, var);
            }
        }
        live
    }

    /// Repeats all steps until none changes anything.
    pub(super) fn reason(&mut self, index: &Index, budget: &mut Budget<'_>) {
        loop {
            let mut changed = self.bound_rows(index, budget);
            changed |= self.settle_any_ofs(index);
            changed |= self.exclude_clashing(index, budget);
            if !changed {
                changed = self.drop_dominated(index, budget);
            }
            if !changed || self.infeasible {
                return;
            }
        }
    }

    /// The only candidate left of a group, if it is settled.
    pub(super) fn settled(&self, index: &Index, group: u32) -> Option<u32> {
        if self.count[group as usize] != 1 {
            return None;
        }
        index.vars(group).find(|&var| self.vars[var as usize])
    }

    /// What stands in for a candidate of feasible choices: the choices stay feasible and lose nothing.
    pub(super) fn stand_in(&self, mut var: u32) -> u32 {
        while self.stand_in[var as usize] != var {
            var = self.stand_in[var as usize];
        }
        var
    }

    /// At least how much feasible choices lose by this candidate, compared with its stand-in.
    pub(super) fn spare(&self, mut var: u32) -> i64 {
        let mut sum = 0i64;
        while self.stand_in[var as usize] != var {
            sum = sum.saturating_add(self.spare[var as usize]);
            var = self.stand_in[var as usize];
        }
        sum
    }

    /// Takes back that a candidate was ruled out; true if it was.
    pub(super) fn restore(&mut self, index: &Index, var: u32) -> bool {
        let ruled_out = !self.vars[var as usize];
        if ruled_out {
            self.vars[var as usize] = true;
            self.count[index.group_of[var as usize] as usize] += 1;
            self.stand_in[var as usize] = var;
            self.ruled_at[var as usize] = u32::MAX;
        }
        ruled_out
    }

    pub(super) fn rule_out(&mut self, index: &Index, var: u32) -> bool {
        if !self.vars[var as usize] {
            return false;
        }
        let group = index.group_of[var as usize] as usize;
        self.vars[var as usize] = false;
        self.ruled_at[var as usize] = self.ruled;
        self.ruled += 1;
        self.count[group] -= 1;
        self.infeasible |= self.count[group] == 0;
        true
    }

    /// Least and greatest delta that a group can have in a row, given its terms there.
    pub(super) fn range(&self, index: &Index, terms: &[(u32, i64)]) -> (i64, i64) {
        let Some(&(first, _)) = terms.first() else { return (0, 0) };
        let group = index.group_of[first as usize] as usize;
        let mut alive = 0;
        let (mut least, mut greatest) = (i64::MAX, i64::MIN);
        for &(var, delta) in terms {
            if self.vars[var as usize] {
                alive += 1;
                least = least.min(delta);
                greatest = greatest.max(delta);
            }
        }
        if alive < self.count[group] || alive == 0 {
            least = least.min(0);
            greatest = greatest.max(0);
        }
        (least, greatest)
    }

    fn drop_row(&mut self, row: u32, why: Demand) {
        self.rows[row as usize] = why;
        self.dropped_at[row as usize] = self.ruled;
    }

    /// Drops rows that can't be broken and rules out candidates that no row admits.
    fn bound_rows(&mut self, index: &Index, budget: &mut Budget<'_>) -> bool {
        let mut changed = false;
        for row in 0..index.slack.len() as u32 {
            let demand = self.rows[row as usize];
            if matches!(demand, Demand::Holds | Demand::Fails) {
                continue;
            }
            let terms = &index.row_terms[row];
            let slack = index.slack[row as usize];
            budget.spend(terms.len());
            let (mut least, mut greatest) = (0, 0);
            for run in by_group(index, terms) {
                let range = self.range(index, run);
                least += range.0;
                greatest += range.1;
            }
            if greatest <= slack {
                self.drop_row(row, Demand::Holds);
                changed = true;
            } else if least > slack {
                self.infeasible |= demand == Demand::Firm;
                self.drop_row(row, Demand::Fails);
                changed = true;
            } else if demand == Demand::Firm {
                changed |= self.exclude_by_row(index, terms, slack - least);
            }
        }
        changed
    }

    /// Rules out candidates whose delta exceeds their group's least by more than `room`.
    fn exclude_by_row(&mut self, index: &Index, terms: &[(u32, i64)], room: i64) -> bool {
        let mut changed = false;
        for run in by_group(index, terms) {
            let (least, greatest) = self.range(index, run);
            if greatest - least <= room {
                continue;
            }
            for var in index.vars(index.group_of[run[0].0 as usize]) {
                let delta = run.iter().find(|term| term.0 == var).map_or(0, |term| term.1);
                changed |= delta - least > room && self.rule_out(index, var);
            }
        }
        changed
    }

    /// Drops any-ofs of which a row holds anyway; where only one row is left it becomes firm.
    fn settle_any_ofs(&mut self, index: &Index) -> bool {
        let mut changed = false;
        for any_of in 0..index.any_of_rows.len() as u32 {
            if !self.any_ofs[any_of as usize] {
                continue;
            }
            let rows = &index.any_of_rows[any_of];
            let holds =
                |&&row: &&u32| matches!(self.rows[row as usize], Demand::Holds | Demand::Firm);
            let mut open =
                rows.iter().filter(|&&row| self.rows[row as usize] == Demand::Alternative);
            if rows.iter().any(|row| holds(&row)) {
                self.any_ofs[any_of as usize] = false;
                changed = true;
                continue;
            }
            match (open.next(), open.next()) {
                (None, _) => self.infeasible = true,
                (Some(&only), None) => {
                    self.rows[only as usize] = Demand::Firm;
                    self.any_ofs[any_of as usize] = false;
                    changed = true;
                }
                (Some(_), Some(_)) => {}
            }
        }
        self.release_unused(index);
        changed
    }

    /// Alternatives that no open any-of needs any more ask for nothing.
    fn release_unused(&mut self, index: &Index) {
        for row in index.firm_rows..index.slack.len() as u32 {
            let needed = index.row_any_ofs[row].iter().any(|&any_of| self.any_ofs[any_of as usize]);
            if self.rows[row as usize] == Demand::Alternative && !needed {
                self.drop_row(row, Demand::Holds);
            }
        }
    }

    /// Rules out candidates that clash with everything another group has left.
    fn exclude_clashing(&mut self, index: &Index, budget: &mut Budget<'_>) -> bool {
        let mut changed = false;
        for var in 0..index.value.len() as u32 {
            if !self.vars[var as usize] || index.hard[var].is_empty() {
                continue;
            }
            budget.spend(index.hard[var].len());
            let same_group =
                |a: &u32, b: &u32| index.group_of[*a as usize] == index.group_of[*b as usize];
            let walled = index.hard[var].chunk_by(same_group).any(|run| {
                let alive = run.iter().filter(|&&other| self.vars[other as usize]).count();
                alive == self.count[index.group_of[run[0] as usize] as usize] as usize
            });
            changed |= walled && self.rule_out(index, var);
        }
        changed
    }

    /// Rules out candidates that a mate is never worse than.
    fn drop_dominated(&mut self, index: &Index, budget: &mut Budget<'_>) -> bool {
        let mut changed = false;
        for group in 0..index.groups() {
            if self.count[group as usize] < 2 {
                continue;
            }
            for var in index.vars(group) {
                if !self.vars[var as usize] {
                    continue;
                }
                let better = index.vars(group).find_map(|mate| {
                    budget.spend(1);
                    let other = mate != var && self.vars[mate as usize];
                    let spare = other.then(|| self.dominates(index, mate, var)).flatten();
                    spare.map(|spare| (mate, spare))
                });
                if let Some((mate, spare)) = better {
                    self.stand_in[var as usize] = mate;
                    self.spare[var as usize] = spare;
                    changed |= self.rule_out(index, var);
                }
            }
        }
        changed
    }

    /// At least how much is gained by exchanging `worse` for `better`, if that never breaks anything
    /// and never loses.
    fn dominates(&self, index: &Index, better: u32, worse: u32) -> Option<i64> {
        let spare = index.value[better as usize] - index.value[worse as usize];
        if spare < 0
            || !self.clashes_within(index, better, worse)
            || !self.deltas_within(index, better, worse)
        {
            return None;
        }
        Some(spare - self.extra_costs(index, better, worse)).filter(|&spare| spare >= 0)
    }

    fn clashes_within(&self, index: &Index, better: u32, worse: u32) -> bool {
        let theirs = &index.hard[worse];
        let covered =
            |other: &u32| !self.vars[*other as usize] || theirs.binary_search(other).is_ok();
        index.hard[better].iter().all(covered)
    }

    fn extra_costs(&self, index: &Index, better: u32, worse: u32) -> i64 {
        let theirs = &index.soft[worse];
        let extra = |&(other, cost): &(u32, i64)| {
            if !self.vars[other as usize] || index.hard[worse].binary_search(&other).is_ok() {
                return 0;
            }
            let same = theirs.binary_search_by_key(&other, |&(other, _)| other);
            (cost - same.map_or(0, |position| theirs[position].1)).max(0)
        };
        index.soft[better].iter().map(extra).sum()
    }

    fn deltas_within(&self, index: &Index, better: u32, worse: u32) -> bool {
        let asked =
            |row: u32| matches!(self.rows[row as usize], Demand::Firm | Demand::Alternative);
        let (ours, theirs) = (&index.var_terms[better], &index.var_terms[worse]);
        let delta = |terms: &[(u32, i64)], row: u32| {
            let found = terms.binary_search_by_key(&row, |&(row, _)| row);
            found.map_or(0, |position| terms[position].1)
        };
        ours.iter().all(|&(row, ours)| !asked(row) || ours <= delta(theirs, row))
            && theirs
                .iter()
                .all(|&(row, theirs)| !asked(row) || theirs >= 0 || delta(ours, row) <= theirs)
    }
}

/// The terms of a row, group by group.
pub(super) fn by_group<'t>(
    index: &Index,
    terms: &'t [(u32, i64)],
) -> impl Iterator<Item = &'t [(u32, i64)]> {
    terms.chunk_by(|a, b| index.group_of[a.0 as usize] == index.group_of[b.0 as usize])
}
