//! What a choice costs: the best choices among those that contain it, from what is known without it.
//!
//! Reasoning ruled candidates out one after the other; only what was ruled out after the forced
//! candidate, next to it or to something else that was, may have to come back. The groups where it
//! does, and the parts that they touch, are searched again; all else stays as it was found.

use std::cmp::Reverse;
use std::collections::BinaryHeap;
use std::sync::atomic::AtomicU64;

use super::budget::{Budget, Watch};
use super::improve;
use super::index::Index;
use super::model::{Choice, Defect};
use super::part::{Aim, solve_split};
use super::presolve::{Demand, Live, presolve};
use super::solve::{Found, Search, Solution, SolveOptions, answer, solve};
use super::split::{Seam, cut_out, split, value_of_settled};
use super::state::State;

impl Search<'_> {
    /// Searches for the best choices among those that contain `forced`, after [`Search::solve`] (by a
    /// full search if that found nothing). The difference of the two objectives is what the forced
    /// choice costs; with both bounds closed it is the least it can cost. `start` is not heeded, and
    /// the prices returned are those of the search before.
    ///
    /// # Errors
    /// [`Defect::UnknownChoice`], or [`Defect::NothingAllowed`] if it may not be chosen.
    pub fn solve_forced(
        &self,
        forced: Choice,
        options: &SolveOptions,
        watch: Watch<'_>,
    ) -> Result<Solution, Defect> {
        let index = &self.index;
        let var = index.var(forced).ok_or(Defect::UnknownChoice { choice: forced })?;
        if !index.allowed[var as usize] {
            return Err(Defect::NothingAllowed { group: forced.group });
        }
        let Some(found) = &self.found else {
            let mut model = self.model.clone();
            model.groups[forced.group as usize].fix(forced.candidate);
            return solve(&model, options, watch);
        };
        let meter = AtomicU64::new(0);
        let mut budget = Budget::new(options.work, watch, &meter);
        let mut best = State::of_vars(index, found.chosen.clone());
        let mut bound = found.bound;
        if found.chosen[forced.group as usize] != var {
            bound = bound.min(search_region(index, found, &mut best, var, options, &mut budget));
        }
        Ok(self.answer_about(&best, bound, found, &budget, options))
    }

    /// An answer with the prices of the search before.
    pub(super) fn answer_about(
        &self,
        best: &State<'_>,
        bound: i64,
        found: &Found,
        budget: &Budget<'_>,
        options: &SolveOptions,
    ) -> Solution {
        let mut row_prices = vec![0.0; self.model.rows.len()];
        for (part, answer) in found.cut.parts.iter().zip(&found.answers) {
            for (&row, &price) in part.rows.iter().zip(&answer.hints.rows) {
                if let Some(known) = row_prices.get_mut(row as usize) {
                    *known = price;
                }
            }
        }
        answer(self.model, best, bound, found.presolved, row_prices, budget, options)
    }
}

/// Turns the best choices without `var` into the best with it; returns their bound.
fn search_region(
    index: &Index,
    found: &Found,
    best: &mut State<'_>,
    var: u32,
    options: &SolveOptions,
    budget: &mut Budget<'_>,
) -> i64 {
    let region = Region::around(index, found, var, budget);
    let group = index.group_of[var as usize];
    let mut forced = best.clone();
    if !improve::force(&mut forced, var, budget) {
        forced.switch_to(var);
    }
    if region.live.infeasible {
        best.switch_to(var);
        return i64::MIN;
    }
    let part = cut_out(index, &region.live, &region.groups, &region.seam);
    let live = presolve(&part.index, budget);
    if live.infeasible {
        best.switch_to(var);
        return i64::MIN;
    }
    let cut = split(&part.index, &live);
    let start: Vec<u32> = (0u32..)
        .zip(&region.groups)
        .map(|(here, &group)| {
            let known = part.vars.binary_search(&forced.chosen[group as usize]);
            live.stand_in(known.map_or(part.index.vars(here).start, |var| var as u32))
        })
        .collect();
    let hints = found.hints(index, |part| region.parts[part]).inside(&part);
    let aim = Aim { gap: options.gap };
    let nothing = (None, i64::MAX);
    let (chosen, bound, _) = solve_split(&part.index, &cut, &start, nothing, &hints, aim, budget);
    found.cut.settled.iter().for_each(|&var| best.switch_to(var));
    for (part, answer) in found.cut.parts.iter().zip(&found.answers) {
        answer.known.chosen.iter().for_each(|&var| best.switch_to(part.vars[var as usize]));
    }
    for var in chosen {
        best.switch_to(part.vars[var as usize]);
    }
    let rank = |state: &State<'_>| (state.is_feasible(), state.objective());
    if rank(&forced) > rank(best) {
        *best = forced;
    }
    if best.is_feasible() {
        improve::polish(best, Some(group), budget);
    }
    bound.saturating_add(region.bound_of_rest(index, found))
}

/// The groups that have to be searched again, and what is left of the index for them.
struct Region {
    live: Live,
    groups: Vec<u32>,
    seam: Seam,
    inside: Vec<bool>,
    /// Which of the parts lie inside.
    parts: Vec<bool>,
}

impl Region {
    fn around(index: &Index, found: &Found, var: u32, budget: &mut Budget<'_>) -> Self {
        let mut live = found.live.clone();
        let mut marks = Marks::new(index);
        let seeds = marks.restore(index, &mut live, &found.live, &[var], budget);
        for mate in index.vars(index.group_of[var as usize]) {
            if mate != var {
                live.rule_out(index, mate);
            }
        }
        rule_out_against_settled(index, &mut live, &seeds, &found.live);
        let mut inside = vec![false; index.groups() as usize];
        let mut parts = vec![false; found.cut.parts.len()];
        for &seed in &seeds {
            inside[seed as usize] = true;
        }
        for &group in &marks.near {
            let part = found.cut.part_of[group as usize];
            if part != u32::MAX {
                parts[part as usize] = true;
            }
        }
        for (group, &part) in found.cut.part_of.iter().enumerate() {
            inside[group] |= part != u32::MAX && parts[part as usize];
        }
        let groups: Vec<u32> =
            (0..index.groups()).filter(|&group| inside[group as usize]).collect();
        let seam = seam(index, &live, &groups);
        Self { live, groups, seam, inside, parts }
    }

    /// What the bound of all that lies outside is.
    fn bound_of_rest(&self, index: &Index, found: &Found) -> i64 {
        let outside = |var: &u32| !self.inside[index.group_of[*var as usize] as usize];
        let settled: Vec<u32> = found.cut.settled.iter().copied().filter(outside).collect();
        let parts = self.parts.iter().zip(&found.answers).filter(|(inside, _)| !**inside);
        let bounds = parts.map(|(_, answer)| answer.known.bound);
        bounds.fold(value_of_settled(index, &settled), i64::saturating_add)
    }
}

/// What has been looked at.
pub(super) struct Marks {
    rows: Vec<bool>,
    any_ofs: Vec<bool>,
    groups: Vec<bool>,
    is_near: Vec<bool>,
    /// Groups next to those where something came back.
    near: Vec<u32>,
}

impl Marks {
    pub(super) fn new(index: &Index) -> Self {
        Self {
            rows: vec![false; index.slack.len()],
            any_ofs: vec![false; index.any_of_rows.len()],
            groups: vec![false; index.groups() as usize],
            is_near: vec![false; index.groups() as usize],
            near: Vec::new(),
        }
    }

    /// Takes back what was ruled out and may depend on these having been: they, and then whatever was
    /// ruled out later next to a group where something came back. Constraints of such groups ask for
    /// what they asked for at first. Returns those groups.
    pub(super) fn restore(
        &mut self,
        index: &Index,
        live: &mut Live,
        before: &Live,
        vars: &[u32],
        budget: &mut Budget<'_>,
    ) -> Vec<u32> {
        let mut seeds: Vec<u32> = vars.iter().map(|&var| index.group_of[var as usize]).collect();
        let start = vars.iter().map(|&var| Reverse((before.ruled_at[var as usize], var)));
        let mut queue: BinaryHeap<_> = start.collect();
        for &var in vars {
            live.restore(index, var);
        }
        // Earliest first: a group needs to be looked at but once.
        while let Some(Reverse((since, var))) = queue.pop() {
            let group = index.group_of[var as usize];
            if std::mem::replace(&mut self.groups[group as usize], true) {
                continue;
            }
            let near = self.neighbours(index, live, before, group, since);
            budget.spend(near.len());
            for near in near {
                if !std::mem::replace(&mut self.is_near[near as usize], true) {
                    self.near.push(near);
                }
                for mate in index.vars(near) {
                    let ruled_at = before.ruled_at[mate as usize];
                    if ruled_at > since && ruled_at != u32::MAX && live.restore(index, mate) {
                        queue.push(Reverse((ruled_at, mate)));
                        seeds.push(near);
                    }
                }
            }
        }
        seeds.sort_unstable();
        seeds.dedup();
        seeds
    }

    /// The groups that share a constraint with a group, and itself; a constraint that was dropped, or
    /// a candidate that was ruled out, before `since` does not count. The rows and any-ofs, and those
    /// tied to them by any-ofs, ask again for what they asked for at first.
    fn neighbours(
        &mut self,
        index: &Index,
        live: &mut Live,
        before: &Live,
        group: u32,
        since: u32,
    ) -> Vec<u32> {
        let still = |at: u32| at > since || at == u32::MAX;
        let mut found = vec![group];
        let mut rows = Vec::new();
        let mut add = |other: u32| {
            if still(before.ruled_at[other as usize]) {
                let near = index.group_of[other as usize];
                if found.last() != Some(&near) {
                    found.push(near);
                }
            }
        };
        for var in index.vars(group) {
            index.hard[var].iter().for_each(|&other| add(other));
            index.soft[var].iter().for_each(|&(other, _)| add(other));
            rows.extend(index.var_terms[var].iter().map(|&(row, _)| row));
        }
        let asked = |row: &u32| still(before.dropped_at[*row as usize]);
        rows.sort_unstable();
        rows.dedup();
        rows.retain(asked);
        let mut next = 0;
        while let Some(&row) = rows.get(next) {
            next += 1;
            index.row_terms[row].iter().for_each(|&(other, _)| add(other));
            self.rows[row as usize] = true;
            let firm = row < index.firm_rows;
            live.rows[row as usize] = if firm { Demand::Firm } else { Demand::Alternative };
            for &any_of in &index.row_any_ofs[row] {
                live.any_ofs[any_of as usize] = true;
                if !std::mem::replace(&mut self.any_ofs[any_of as usize], true) {
                    let others = index.any_of_rows[any_of].iter().copied();
                    rows.extend(others.filter(|&other| !self.rows[other as usize]));
                }
            }
        }
        found.sort_unstable();
        found.dedup();
        found
    }
}

/// Rules out what came back but clashes with what stays settled.
fn rule_out_against_settled(index: &Index, live: &mut Live, seeds: &[u32], before: &Live) {
    for &seed in seeds {
        for var in index.vars(seed) {
            let blocked = index.hard[var].iter().any(|&other| {
                let group = index.group_of[other as usize];
                live.vars[other as usize]
                    && before.count[group as usize] == 1
                    && live.count[group as usize] == 1
                    && seeds.binary_search(&group).is_err()
            });
            if blocked {
                live.rule_out(index, var);
            }
        }
    }
}

/// The constraints that something open or restored of these groups takes part in.
fn seam(index: &Index, live: &Live, groups: &[u32]) -> Seam {
    let asked = |row: &u32| matches!(live.rows[*row as usize], Demand::Firm | Demand::Alternative);
    let mut rows: Vec<u32> = groups
        .iter()
        .flat_map(|&group| index.vars(group))
        .flat_map(|var| index.var_terms[var].iter().map(|&(row, _)| row))
        .filter(asked)
        .collect();
    rows.sort_unstable();
    rows.dedup();
    let mut any_ofs: Vec<u32> = rows
        .iter()
        .flat_map(|&row| index.row_any_ofs[row].iter().copied())
        .filter(|&any_of| live.any_ofs[any_of as usize])
        .collect();
    any_ofs.sort_unstable();
    any_ofs.dedup();
    rows.extend(
        any_ofs.iter().flat_map(|&any_of| index.any_of_rows[any_of].iter().copied()).filter(asked),
    );
    rows.sort_unstable();
    rows.dedup();
    Seam { rows, any_ofs }
}
