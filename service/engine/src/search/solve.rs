//! The search as a whole: what is asked for, what comes back, and the order of the steps.

use std::sync::atomic::AtomicU64;

use super::budget::{Budget, Watch};
use super::check::Violation;
use super::greedy;
use super::improve;
use super::index::Index;
use super::model::{Defect, Model};
use super::part::{Aim, Answer, solve_split};
use super::presolve::{Demand, Live};
use super::relaxation::Hints;
use super::split::{Split, split};
use super::state::State;

/// How to search.
#[derive(Debug, Clone, PartialEq)]
pub struct SolveOptions {
    /// Decides between otherwise equal ways; the same seed gives the same answer.
    pub seed: u64,
    /// Most work to do, in units of about one touched term. Preparing and polishing are always
    /// done, so a little more may be used.
    pub work: u64,
    /// Stop once (bound − objective) / max(|bound|, 1) is at most this; 0 asks for the optimum.
    pub gap: f64,
    /// Choices to start from, if they fit the model: the answer is at least as good as these are.
    pub start: Option<Vec<u32>>,
}

impl Default for SolveOptions {
    fn default() -> Self {
        Self { seed: 0, work: 200_000_000, gap: 0.0, start: None }
    }
}

/// Why the search ended.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Stopped {
    /// The objective is proven to be the greatest possible.
    Optimal,
    /// The gap asked for is reached.
    Gap,
    /// The work budget is used up.
    Work,
    /// The caller's stop flag was up.
    Asked,
    /// It is proven that no choices satisfy the model.
    Infeasible,
}

/// What was decided before the search proper, by reasoning alone.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct Presolved {
    /// Groups in the model.
    pub groups: usize,
    /// Groups settled beforehand.
    pub groups_settled: usize,
    /// Candidates in the model, those at rest included.
    pub candidates: usize,
    /// Candidates ruled out beforehand.
    pub candidates_ruled_out: usize,
    /// Rows of the model.
    pub rows: usize,
    /// Rows that can't be broken by what was left.
    pub rows_dropped: usize,
    /// Any-ofs of the model.
    pub any_ofs: usize,
    /// Any-ofs that can't be broken by what was left.
    pub any_ofs_dropped: usize,
    /// Parts that what was left falls into, with no constraint between them.
    pub components: usize,
    /// Groups of the largest part.
    pub largest_component: usize,
}

impl Presolved {
    fn of(index: &Index, live: &Live, cut: Option<&Split>) -> Self {
        let kept = |row: &&Demand| matches!(row, Demand::Firm | Demand::Alternative);
        let firm = index.firm_rows as usize;
        let open_any_ofs = live.any_ofs.iter().filter(|&&open| open).count();
        let parts = cut.map_or(&[][..], |cut| &cut.parts);
        Self {
            groups: live.count.len(),
            groups_settled: live.count.iter().filter(|&&count| count <= 1).count(),
            candidates: live.vars.len(),
            candidates_ruled_out: live.vars.iter().filter(|&&left| !left).count(),
            rows: firm,
            rows_dropped: firm - live.rows.iter().take(firm).filter(kept).count(),
            any_ofs: live.any_ofs.len(),
            any_ofs_dropped: live.any_ofs.len() - open_any_ofs,
            components: parts.len(),
            largest_component: parts
                .iter()
                .map(|part| part.index.groups() as usize)
                .max()
                .unwrap_or(0),
        }
    }
}

/// An answer.
#[derive(Debug, Clone, PartialEq)]
pub struct Solution {
    /// The chosen candidate of every group. Unless `violations` says otherwise, feasible and
    /// *maximal*: no single group's switch to another allowed candidate is feasible and raises the
    /// objective.
    pub choices: Vec<u32>,
    /// What the choices are worth.
    pub objective: i64,
    /// Proven: no feasible choices are worth more. Nothing if none is feasible, or none was found.
    pub bound: Option<i64>,
    /// Why the search ended.
    pub stopped: Stopped,
    /// What the choices break: empty unless no feasible choices were found, which can only happen
    /// when resting candidates are forbidden or rows begin with a negative slack. It is then the
    /// least broken set of choices met.
    pub violations: Vec<Violation>,
    /// What was settled by reasoning alone.
    pub presolved: Presolved,
    /// What one more unit of slack is worth in each of the model's rows, about: the prices behind
    /// the bound.
    pub row_prices: Vec<f64>,
    /// Work done.
    pub work: u64,
}

impl Solution {
    /// (bound − objective) / max(|bound|, 1), if there is a bound.
    #[must_use]
    pub fn gap(&self) -> Option<f64> {
        let bound = self.bound?;
        Some((bound - self.objective) as f64 / (bound.unsigned_abs() as f64).max(1.0))
    }
}

/// A model under search, with what is known of it: later questions about it start from there.
#[derive(Debug)]
pub struct Search<'m> {
    pub(super) model: &'m Model,
    pub(super) index: Index,
    pub(super) found: Option<Found>,
}

/// What a search found out.
#[derive(Debug)]
pub(super) struct Found {
    pub(super) live: Live,
    pub(super) cut: Split,
    pub(super) answers: Vec<Answer>,
    pub(super) presolved: Presolved,
    /// The best choices, as variables: feasible.
    pub(super) chosen: Vec<u32>,
    pub(super) bound: i64,
}

impl Found {
    /// The prices of some of the parts, in the numbering of the whole.
    pub(super) fn hints(&self, index: &Index, of: impl Fn(usize) -> bool) -> Hints {
        let mut hints = Hints { rows: vec![0.0; index.slack.len()], cliques: Vec::new() };
        for (position, (part, answer)) in self.cut.parts.iter().zip(&self.answers).enumerate() {
            if !of(position) {
                continue;
            }
            for (&row, &price) in part.rows.iter().zip(&answer.hints.rows) {
                hints.rows[row as usize] = price;
            }
            let whole =
                |clique: &[u32]| clique.iter().map(|&var| part.vars[var as usize]).collect();
            let cliques = answer.hints.cliques.iter();
            hints.cliques.extend(cliques.map(|(clique, price)| (whole(clique), *price)));
        }
        hints
    }
}

impl<'m> Search<'m> {
    /// Makes a model ready.
    ///
    /// # Errors
    /// The first [`Defect`] of the model.
    pub fn new(model: &'m Model) -> Result<Self, Defect> {
        Ok(Self { model, index: Index::new(model)?, found: None })
    }

    /// Everything about the model that is looked up in both directions.
    #[must_use]
    pub fn index(&self) -> &Index {
        &self.index
    }

    /// Searches for the best choices.
    pub fn solve(&mut self, options: &SolveOptions, watch: Watch<'_>) -> Solution {
        let index = &self.index;
        let meter = AtomicU64::new(0);
        let mut budget = Budget::new(options.work, watch, &meter);
        let mut live = Live::new(index);
        live.reason(index, &mut budget);
        let start = options.start.as_ref().and_then(|start| State::new(index, start));
        let outcome = search(index, live, &Hints::default(), start, options, &mut budget);
        let solution = outcome.solution(self.model, &budget, options);
        self.found = outcome.found();
        solution
    }
}

/// How a search of a whole index ended.
pub(super) struct Outcome<'i> {
    pub(super) best: State<'i>,
    pub(super) bound: i64,
    presolved: Presolved,
    live: Live,
    parts: Option<(Split, Vec<Answer>)>,
}

/// Searches what is left of an index.
pub(super) fn search<'i>(
    index: &'i Index,
    live: Live,
    hints: &Hints,
    start: Option<State<'i>>,
    options: &SolveOptions,
    budget: &mut Budget<'_>,
) -> Outcome<'i> {
    let first = start.as_ref().map_or_else(|| rest(index), |state| state.chosen.clone());
    if live.infeasible {
        let mut best = State::of_vars(index, first);
        greedy::repair(&mut best, budget);
        let presolved = Presolved::of(index, &live, None);
        return Outcome { best, bound: i64::MIN, presolved, live, parts: None };
    }
    let cut = split(index, &live);
    let presolved = Presolved::of(index, &live, Some(&cut));
    let first: Vec<u32> = first.into_iter().map(|var| live.stand_in(var)).collect();
    let aim = Aim { gap: options.gap };
    let (chosen, bound, answers) =
        solve_split(index, &cut, &first, (None, i64::MAX), hints, aim, budget);
    let mut best = State::of_vars(index, chosen);
    let rank = |state: &State<'_>| (state.is_feasible(), state.objective());
    best = start.filter(|start| rank(start) > rank(&best)).unwrap_or(best);
    if best.is_feasible() {
        improve::polish(&mut best, None, budget);
    }
    Outcome { best, bound, presolved, live, parts: Some((cut, answers)) }
}

impl Outcome<'_> {
    pub(super) fn solution(
        &self,
        model: &Model,
        budget: &Budget<'_>,
        options: &SolveOptions,
    ) -> Solution {
        let mut row_prices = vec![0.0; self.best.index.slack.len()];
        for (part, answer) in
            self.parts.iter().flat_map(|(cut, answers)| cut.parts.iter().zip(answers))
        {
            for (&row, &price) in part.rows.iter().zip(&answer.hints.rows) {
                row_prices[row as usize] = price;
            }
        }
        row_prices.truncate(model.rows.len());
        answer(model, &self.best, self.bound, self.presolved, row_prices, budget, options)
    }

    fn found(self) -> Option<Found> {
        let (cut, answers) = self.parts?;
        let feasible = self.best.is_feasible();
        feasible.then_some(Found {
            live: self.live,
            cut,
            answers,
            presolved: self.presolved,
            chosen: self.best.chosen,
            bound: self.bound,
        })
    }
}

/// Searches for the best choices: [`Search::solve`] for a single question.
///
/// # Errors
/// The first [`Defect`] of the model.
pub fn solve(model: &Model, options: &SolveOptions, watch: Watch<'_>) -> Result<Solution, Defect> {
    Ok(Search::new(model)?.solve(options, watch))
}

/// Candidate 0 of every group, or the first allowed one.
fn rest(index: &Index) -> Vec<u32> {
    let first = |group| index.allowed_vars(group).next().unwrap_or(index.vars(group).start);
    (0..index.groups()).map(first).collect()
}

pub(super) fn answer(
    model: &Model,
    best: &State<'_>,
    bound: i64,
    presolved: Presolved,
    row_prices: Vec<f64>,
    budget: &Budget<'_>,
    options: &SolveOptions,
) -> Solution {
    let out_of_budget = if budget.told_to_stop() { Stopped::Asked } else { Stopped::Work };
    let mut solution = Solution {
        choices: best.choices(),
        objective: best.objective(),
        bound: best.is_feasible().then_some(bound),
        stopped: out_of_budget,
        violations: Vec::new(),
        presolved,
        row_prices,
        work: budget.used(),
    };
    match solution.gap() {
        Some(gap) if gap <= 0.0 => solution.stopped = Stopped::Optimal,
        Some(gap) if gap <= options.gap => solution.stopped = Stopped::Gap,
        Some(_) => {}
        None => {
            solution.violations = model.violations(&solution.choices);
            if bound == i64::MIN {
                solution.stopped = Stopped::Infeasible;
            }
        }
    }
    solution
}
