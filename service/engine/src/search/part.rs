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
use super::progress::Place;
use super::relaxation::{Hints, Relaxation};
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
    /// The prices behind the bound.
    pub(super) hints: Hints,
}

/// Groups from which prices are sought before the linear relaxation is solved.
const LARGE: u32 = 40;
/// A core holds this share of the candidates that could be added to one a group.
const CORE: usize = 8;

/// Solves a part of which something is known.
pub(super) fn solve_part(
    index: &Index,
    mut known: Known,
    hints: &Hints,
    aim: Aim,
    budget: &mut Budget<'_>,
) -> Answer {
    if known.is_good_enough(aim.gap) || (budget.is_out() && known.objective.is_some()) {
        return Answer { known, hints: hints.clone() };
    }
    let relaxation = Relaxation::new(index, hints);
    budget.spend(4 * relaxation.columns.items_len());
    let answer = |known, prices: &[f64]| Answer {
        known,
        hints: relaxation.hints(prices, index.slack.len()),
    };
    let mut left = vec![true; index.value.len()];
    if index.groups() >= LARGE {
        let prices = descend(index, &relaxation, known.objective, budget);
        let proof = Proof::new(index, &relaxation, &prices, &left);
        known.bound = known.bound.min(proof.bound);
        budget.tell(known.objective, known.bound);
        let so_far = answer(known, &prices);
        known = solve_core(index, &proof, so_far.known, &so_far.hints, aim, budget);
        if known.is_good_enough(aim.gap) {
            return answer(known, &prices);
        }
        rule_out(index, &proof, &known, &mut left);
        if is_much_smaller(index, &left) {
            known = again(index, &left, known, &so_far.hints, aim, budget);
            return answer(known, &prices);
        }
    }
    let mut tree = Tree::new(index, &relaxation, known);
    let solved = tree.root(&mut left, budget);
    let prices = tree.root_prices.clone();
    let known = tree.known().clone();
    budget.tell(known.objective, known.bound);
    if known.is_good_enough(aim.gap) || budget.is_out() {
        return answer(known, &prices);
    }
    if solved && is_much_smaller(index, &left) {
        let hints = relaxation.hints(&prices, index.slack.len());
        let known = again(index, &left, known, &hints, aim, budget);
        return answer(known, &prices);
    }
    tree.search(left, aim.gap, budget);
    answer(tree.known().clone(), &prices)
}

/// Solves what is left when, beside the choices known, only the candidates may be chosen that cost
/// the bound least: a small part of the whole that holds very good choices (the core of Balas and
/// Zemel 1980, Operations Research 28). At most a quarter of the budget goes there.
fn solve_core(
    index: &Index,
    proof: &Proof,
    mut known: Known,
    hints: &Hints,
    aim: Aim,
    budget: &mut Budget<'_>,
) -> Known {
    let spare = index.value.len() - index.groups() as usize;
    let core = proof.core(index, &known.chosen, spare / CORE);
    if !is_much_smaller(index, &core) || known.objective.is_none() {
        return known;
    }
    let mut share = budget.portion(budget.left() / 4);
    let inner = again(index, &core, known.clone(), hints, aim, &mut share);
    let (used, told_to_stop) = (share.used(), share.told_to_stop());
    budget.absorb(used, told_to_stop);
    known.objective = inner.objective;
    known.chosen = inner.chosen;
    known
}

/// What is known of a part before it is solved, from the given choices (variables) if there are any.
fn first_plan(index: &Index, start: Option<&[u32]>, budget: &mut Budget<'_>) -> Known {
    let rest: Vec<u32> = (0..index.groups()).map(|group| index.vars(group).start).collect();
    let mut known = Known { chosen: rest.clone(), objective: None, bound: greatest_sum(index) };
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

/// The sum of every group's greatest value: the plainest bound.
fn greatest_sum(index: &Index) -> i64 {
    let greatest = |group| index.vars(group).map(|var| index.value[var as usize]).max();
    (0..index.groups()).filter_map(greatest).sum()
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

/// Reasons about what is left of a part, splits it again, and solves its pieces. What was ruled out
/// holds nothing better than what is known, so the bound is the greater of the two.
fn again(
    index: &Index,
    left: &[bool],
    mut known: Known,
    hints: &Hints,
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
    let best = (known.objective, known.bound);
    let (chosen, bound, _) = solve_split(index, &cut, &start, best, hints, aim, budget);
    let mut state = State::of_vars(index, chosen);
    if state.is_feasible() {
        improve::polish(&mut state, None, budget);
    }
    known.offer(&state);
    known.bound = known.bound.min(bound).max(known.objective.unwrap_or(i64::MIN));
    known
}

/// Solves all parts, in parallel, each with its share of the budget; what some leave over goes to
/// those that ran out. `best` is what is known of the whole. Returns the choices of the whole, its
/// bound (the least there is if a part is infeasible), and what came out of each part.
pub(super) fn solve_split(
    index: &Index,
    cut: &Split,
    start: &[u32],
    best: (Option<i64>, i64),
    hints: &Hints,
    aim: Aim,
    budget: &mut Budget<'_>,
) -> (Vec<u32>, i64, Vec<Answer>) {
    let count = cut.parts.len();
    let size = |part: usize| (cut.parts[part].vars.len() as f64).powi(2);
    let unknown = cut.parts.iter().map(|part| (None, greatest_sum(&part.index))).collect();
    let ledger = budget.ledger(cut.settled_value, unknown, best);
    let place = |part| Place { whole: &ledger, part };
    let mut purse = Purse::default();

    let all: Vec<usize> = (0..count).collect();
    let first = purse.share_out(budget, &all, size, place, |part, budget| {
        let piece = &cut.parts[part];
        let known = first_plan(&piece.index, inside(piece, index, start).as_deref(), budget);
        Answer { known, hints: hints.inside(piece) }
    });
    let mut answers = first;
    for _ in 0..2 {
        let open = |part: &usize| !answers[*part].known.is_good_enough(aim.gap);
        let todo: Vec<usize> = all.iter().copied().filter(open).collect();
        if todo.is_empty() || purse.is_out(budget) {
            break;
        }
        let solved = purse.share_out(budget, &todo, size, place, |part, budget| {
            let Answer { known, hints } = &answers[part];
            solve_part(&cut.parts[part].index, known.clone(), hints, aim, budget)
        });
        for (part, answer) in todo.into_iter().zip(solved) {
            answers[part] = answer;
        }
    }
    drop(ledger);
    budget.absorb(purse.used, purse.told_to_stop);
    let (chosen, bound) = assemble(index, cut, &answers);
    (chosen, bound, answers)
}

/// What the shares of a budget have spent.
#[derive(Default)]
struct Purse {
    used: u64,
    told_to_stop: bool,
}

impl Purse {
    fn is_out(&self, budget: &Budget<'_>) -> bool {
        self.told_to_stop || self.used >= budget.left()
    }

    /// Does something for each of these parts, in parallel, each with a share of what is left that
    /// is in proportion to its size. The shares don't depend on the number of threads.
    fn share_out<'l>(
        &mut self,
        budget: &Budget<'_>,
        parts: &[usize],
        size: impl Fn(usize) -> f64,
        place: impl Fn(usize) -> Place<'l> + Sync,
        solve: impl Fn(usize, &mut Budget<'_>) -> Answer + Sync,
    ) -> Vec<Answer> {
        let left = budget.left().saturating_sub(self.used) as f64;
        let total: f64 = parts.iter().map(|&part| size(part)).sum();
        let share = |part: usize| (part, (left * size(part) / total) as u64);
        let shares: Vec<(usize, u64)> = parts.iter().map(|&part| share(part)).collect();
        let solved: Vec<(Answer, u64, bool)> = shares
            .into_par_iter()
            .map(|(part, share)| {
                let mut budget = budget.share(share, place(part));
                let answer = solve(part, &mut budget);
                budget.tell(answer.known.objective, answer.known.bound);
                (answer, budget.used(), budget.told_to_stop())
            })
            .collect();
        let mut answers = Vec::with_capacity(solved.len());
        for (answer, used, told_to_stop) in solved {
            self.used = self.used.saturating_add(used);
            self.told_to_stop |= told_to_stop;
            answers.push(answer);
        }
        answers
    }
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

fn assemble(index: &Index, cut: &Split, answers: &[Answer]) -> (Vec<u32>, i64) {
    let mut chosen: Vec<u32> = (0..index.groups()).map(|group| index.vars(group).start).collect();
    let mut choose = |var: u32| chosen[index.group_of[var as usize] as usize] = var;
    cut.settled.iter().for_each(|&var| choose(var));
    let mut bound = Some(cut.settled_value);
    for (part, Answer { known, .. }) in cut.parts.iter().zip(answers) {
        known.chosen.iter().for_each(|&var| choose(part.vars[var as usize]));
        let feasible = known.bound > i64::MIN;
        bound = bound.filter(|_| feasible).map(|bound| bound.saturating_add(known.bound));
    }
    (chosen, bound.unwrap_or(i64::MIN))
}
