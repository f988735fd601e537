//! One part from start to proof: a first plan, prices, then the tree; after each step that rules out
//! much, what is left is reasoned about and split again.

use rayon::prelude::*;

use super::budget::Budget;
use super::exact::{Known, Tree};
use super::greedy;
use super::improve;
use super::index::Index;
use super::presolve::Live;
use super::prices::{Proof, descend};
use super::relaxation::Relaxation;
use super::split::{Part, Split, split};
use super::state::State;

/// What is asked of every part.
#[derive(Debug, Clone, Copy)]
pub(super) struct Aim {
    /// Gap at which a part is good enough, relative to its bound.
    pub(super) gap: f64,
}

/// What came out of a part.
#[derive(Debug, Clone)]
pub(super) struct Answer {
    pub(super) known: Known,
    /// Prices of the part's rows.
    pub(super) row_prices: Vec<f64>,
}

/// Groups from which prices are sought before the linear relaxation is solved.
const LARGE: u32 = 40;
/// Subgradient steps on a large part.
const DESCENT: usize = 120;

/// Solves a part, starting from the given choices (variables) if there are any.
pub(super) fn solve_part(
    index: &Index,
    start: Option<&[u32]>,
    aim: Aim,
    budget: &mut Budget<'_>,
) -> Answer {
    let mut known = first_plan(index, start, budget);
    let gap = |known: &Known| (aim.gap * (known.bound.unsigned_abs() as f64)) as i64;
    let mut row_prices = vec![0.0; index.slack.len()];
    if known.is_closed(gap(&known)) || (budget.is_out() && known.objective.is_some()) {
        return Answer { known, row_prices };
    }
    let relaxation = Relaxation::new(index);
    budget.spend(4 * relaxation.columns.items_len());
    let mut left = vec![true; index.value.len()];
    if index.groups() >= LARGE {
        let target = known.objective.unwrap_or(0) as f64;
        let prices =
            descend(index, &relaxation, vec![0.0; relaxation.right.len()], target, DESCENT, budget);
        let proof = Proof::new(index, &relaxation, &prices, &left);
        known.bound = known.bound.min(proof.bound);
        spread_prices(&relaxation, &prices, &mut row_prices);
        if known.is_closed(gap(&known)) {
            return Answer { known, row_prices };
        }
        rule_out(index, &proof, &known, &mut left);
        if is_much_smaller(index, &left) {
            known = again(index, &left, known, aim, budget);
            return Answer { known, row_prices };
        }
    }
    let mut tree = Tree::new(index, &relaxation, known);
    if tree.root(&mut left, budget) {
        spread_prices(&relaxation, &tree.root_prices, &mut row_prices);
    }
    let known = tree.known().clone();
    if known.is_closed(gap(&known)) || budget.is_out() {
        return Answer { known, row_prices };
    }
    if is_much_smaller(index, &left) {
        let known = again(index, &left, known, aim, budget);
        return Answer { known, row_prices };
    }
    tree.search(left, gap(&known), budget);
    Answer { known: tree.known().clone(), row_prices }
}

fn first_plan(index: &Index, start: Option<&[u32]>, budget: &mut Budget<'_>) -> Known {
    let rest: Vec<u32> = (0..index.groups()).map(|group| index.vars(group).start).collect();
    let greatest = |group| index.vars(group).map(|var| index.value[var as usize]).max();
    let mut known = Known {
        chosen: rest.clone(),
        objective: None,
        bound: (0..index.groups()).filter_map(greatest).sum(),
    };
    for chosen in start.map(<[u32]>::to_vec).into_iter().chain([rest]) {
        let mut state = State::of_vars(index, chosen);
        greedy::fill(&mut state, budget);
        improve::climb(&mut state, budget);
        if known.objective.is_none() {
            known.chosen.copy_from_slice(&state.chosen);
        }
        known.offer(&state);
    }
    known
}

/// Rules out what is worse than what is known; that itself stays in, as a start for what is left.
fn rule_out(index: &Index, proof: &Proof, known: &Known, left: &mut [bool]) {
    let target = known.objective.unwrap_or(i64::MIN + 1);
    for (var, left) in (0u32..).zip(left) {
        *left = *left && !proof.excludes(index, var, target);
    }
}

fn is_much_smaller(index: &Index, left: &[bool]) -> bool {
    let open = left.iter().filter(|&&left| left).count();
    let spare = |open: usize| open.saturating_sub(index.groups() as usize);
    4 * spare(open) < 3 * spare(left.len())
}

fn spread_prices(relaxation: &Relaxation, prices: &[f64], row_prices: &mut [f64]) {
    for (source, &price) in relaxation.source.iter().zip(prices) {
        if let Some(row) = source {
            row_prices[*row as usize] = price;
        }
    }
}

/// Reasons about what is left of a part, splits it again, and solves its pieces. What was ruled out
/// holds nothing better than what is known, so the bound is the greater of the two.
fn again(
    index: &Index,
    left: &[bool],
    mut known: Known,
    aim: Aim,
    budget: &mut Budget<'_>,
) -> Known {
    let mut live = Live::new(index);
    for (var, &left) in (0u32..).zip(left) {
        if !left {
            live.rule_out(index, var);
        }
    }
    live.reason(index, budget);
    if live.infeasible {
        known.bound = known.objective.unwrap_or(i64::MIN);
        return known;
    }
    let cut = split(index, &live);
    let start: Vec<u32> = known.chosen.iter().map(|&var| live.stand_in(var)).collect();
    let (chosen, bound, _) = solve_split(index, &cut, &start, aim, budget);
    let mut state = State::of_vars(index, chosen);
    if state.is_feasible() {
        improve::polish(&mut state, budget);
    }
    known.offer(&state);
    known.bound = known.bound.min(bound).max(known.objective.unwrap_or(i64::MIN));
    known
}

/// Solves all parts, in parallel, each with its share of the budget; what some leave over goes to
/// those that ran out. Returns the choices of the whole, its bound (the least there is if a part is
/// infeasible), and the prices of its rows.
pub(super) fn solve_split(
    index: &Index,
    cut: &Split,
    start: &[u32],
    aim: Aim,
    budget: &mut Budget<'_>,
) -> (Vec<u32>, i64, Vec<f64>) {
    let mut answers: Vec<Option<Answer>> = vec![None; cut.parts.len()];
    let unfinished = |answer: &Option<Answer>| {
        answer.as_ref().is_none_or(|it| {
            !it.known.is_closed((aim.gap * it.known.bound.unsigned_abs() as f64) as i64)
        })
    };
    for _ in 0..2 {
        let todo: Vec<usize> =
            (0..answers.len()).filter(|&part| unfinished(&answers[part])).collect();
        if todo.is_empty() || (budget.is_out() && answers.iter().all(Option::is_some)) {
            break;
        }
        let size = |part: usize| (cut.parts[part].vars.len() as f64).powi(2);
        let total: f64 = todo.iter().map(|&part| size(part)).sum();
        let limit = budget.left() as f64;
        let shares: Vec<u64> =
            todo.iter().map(|&part| (limit * size(part) / total) as u64).collect();
        let parent = &*budget;
        let solved: Vec<(Answer, Budget<'_>)> = todo
            .par_iter()
            .zip(&shares)
            .map(|(&part, &share)| {
                let mut budget = parent.share(share);
                let piece = &cut.parts[part];
                let start = match &answers[part] {
                    Some(answer) => Some(answer.known.chosen.clone()),
                    None => inside(piece, index, start),
                };
                let mut answer = solve_part(&piece.index, start.as_deref(), aim, &mut budget);
                if let Some(before) = &answers[part] {
                    answer.known.bound = answer.known.bound.min(before.known.bound);
                }
                (answer, budget)
            })
            .collect();
        for (part, (answer, share)) in todo.into_iter().zip(solved) {
            budget.absorb(&share);
            answers[part] = Some(answer);
        }
    }
    assemble(index, cut, &answers)
}

/// The given choices as variables of a part, if all of them are left there.
fn inside(part: &Part, index: &Index, chosen: &[u32]) -> Option<Vec<u32>> {
    let groups = (0..part.index.groups()).map(|group| {
        let whole = index.group_of[part.vars[part.index.vars(group).start as usize] as usize];
        let position = part.vars.binary_search(&chosen[whole as usize]).ok();
        position.map(|var| var as u32)
    });
    groups.collect()
}

fn assemble(index: &Index, cut: &Split, answers: &[Option<Answer>]) -> (Vec<u32>, i64, Vec<f64>) {
    let mut chosen: Vec<u32> = (0..index.groups()).map(|group| index.vars(group).start).collect();
    let mut choose = |var: u32| chosen[index.group_of[var as usize] as usize] = var;
    cut.settled.iter().for_each(|&var| choose(var));
    let mut bound = Some(cut.settled_value);
    let mut prices = vec![0.0; index.slack.len()];
    for (part, answer) in cut.parts.iter().zip(answers) {
        let Some(Answer { known, row_prices }) = answer else { continue };
        known.chosen.iter().for_each(|&var| choose(part.vars[var as usize]));
        let feasible = known.bound > i64::MIN;
        bound = bound.filter(|_| feasible).map(|bound| bound.saturating_add(known.bound));
        for (&row, &price) in part.rows.iter().zip(row_prices) {
            prices[row as usize] = price;
        }
    }
    (chosen, bound.unwrap_or(i64::MIN), prices)
}
