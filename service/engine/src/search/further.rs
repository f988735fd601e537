//! The best choices under further rows, from what is known without them: points of a trade-off
//! curve, and plans that differ from others.
//!
//! What can't be part of anything feasible without the rows can't be with them. A candidate that was
//! dropped in favour of a mate comes back where the mate takes more of a further row, unless so much
//! is lost by it that better choices are known already.

use std::sync::atomic::AtomicU64;

use super::budget::{Budget, Watch};
use super::forced::Marks;
use super::improve;
use super::index::Index;
use super::model::{Defect, Model, Row};
use super::presolve::{Demand, Live};
use super::solve::{Found, Search, Solution, SolveOptions, search, solve};
use super::state::State;

impl Search<'_> {
    /// Searches for the best choices that satisfy these rows, too, after [`Search::solve`] (by a full
    /// search if that found nothing). In the answer they count as rows after those of the model.
    ///
    /// # Errors
    /// The first [`Defect`] of the rows.
    pub fn solve_within(
        &self,
        rows: &[Row],
        options: &SolveOptions,
        watch: Watch<'_>,
    ) -> Result<Solution, Defect> {
        if let Some(defect) = rows.iter().find_map(|row| self.model.defect_in_row(row)) {
            return Err(defect);
        }
        let Some(found) = &self.found else {
            return solve(&self.with(rows), options, watch);
        };
        let index = self.index.with_rows(rows);
        let meter = AtomicU64::new(0);
        let mut budget = Budget::new(options.work, watch, &meter);
        let start = start(&self.index, &index, found, options, &mut budget);
        let worth = start.is_feasible().then(|| start.objective());
        let most = worth.map_or(i64::MAX, |worth| found.bound.saturating_sub(worth));
        if most <= 0 {
            return Ok(self.answer_about(&start, found.bound, found, &budget, options));
        }
        let mut live = reopened(&self.index, &index, found, most, &mut budget);
        live.reason(&index, &mut budget);
        let mut hints = found.hints(&self.index, |_| true);
        let firm = self.index.firm_rows as usize;
        hints.rows.splice(firm..firm, rows.iter().map(|_| 0.0));
        let mut outcome = search(&index, live, &hints, Some(start), options, &mut budget);
        outcome.bound = outcome.bound.min(found.bound);
        let mut solution = outcome.solution(self.model, &budget, options);
        if solution.bound.is_none() {
            solution.violations = self.with(rows).violations(&solution.choices);
        }
        Ok(solution)
    }

    fn with(&self, rows: &[Row]) -> Model {
        let mut model = self.model.clone();
        model.rows.extend_from_slice(rows);
        model
    }
}

/// The best choices known, changed as little as may be to satisfy the further rows.
fn start<'i>(
    before: &Index,
    index: &'i Index,
    found: &Found,
    options: &SolveOptions,
    budget: &mut Budget<'_>,
) -> State<'i> {
    let further: Vec<u32> = (before.firm_rows..index.firm_rows).collect();
    let mut best = State::of_vars(index, found.chosen.clone());
    if improve::hold(&mut best, &further, budget) && best.objective() < found.bound {
        improve::climb(&mut best, budget);
    }
    if best.is_feasible() && best.objective() >= found.bound {
        return best;
    }
    let given = options.start.as_ref().and_then(|start| State::new(index, start));
    if let Some(mut given) = given
        && improve::hold(&mut given, &further, budget)
    {
        improve::climb(&mut given, budget);
        if !best.is_feasible() || given.objective() > best.objective() {
            best = given;
        }
    }
    best
}

/// What is left when candidates come back that the further rows may ask for and that lose no more
/// than `most`.
fn reopened(
    before: &Index,
    index: &Index,
    found: &Found,
    most: i64,
    budget: &mut Budget<'_>,
) -> Live {
    let mut live = found.live.clone();
    let mut marks = Marks::new(before);
    let further = before.firm_rows..index.firm_rows;
    let delta = |var: u32, row: u32| {
        let terms = &index.var_terms[var];
        terms.binary_search_by_key(&row, |term| term.0).map_or(0, |position| terms[position].1)
    };
    let asked_for = |&var: &u32| {
        let mate = found.live.stand_in(var);
        mate != var
            && found.live.spare(var) <= most
            && further.clone().any(|row| delta(mate, row) > delta(var, row))
    };
    let asked_for: Vec<u32> = (0..index.value.len() as u32).filter(asked_for).collect();
    marks.restore(before, &mut live, &found.live, &asked_for, budget);
    let firm = before.firm_rows as usize;
    live.rows.splice(firm..firm, further.clone().map(|_| Demand::Firm));
    live.dropped_at.splice(firm..firm, further.map(|_| u32::MAX));
    live
}
