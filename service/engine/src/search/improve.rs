//! Small changes for the better: single switches, and switches that first move aside whatever
//! stands in their way (ejection chains of depth one, after Glover 1996, Discrete Applied
//! Mathematics 65).

use super::budget::Budget;
use super::state::{Blocker, State};

/// All small changes for the better, if the state is feasible; it is maximal then.
pub(super) fn climb(state: &mut State<'_>, budget: &mut Budget<'_>) {
    if state.is_feasible() {
        polish(state, None, budget);
        exchange_all(state, budget);
        polish(state, None, budget);
    }
}

/// Makes single switches that gain and break nothing until there is none, but leaves one group as
/// it is if told so: the state is then *maximal*. Not limited by the budget, as every answer promises
/// to be maximal; each switch gains at least 1 and passes are few.
pub(super) fn polish(state: &mut State<'_>, keep: Option<u32>, budget: &mut Budget<'_>) {
    loop {
        let mut changed = false;
        for group in 0..state.index.groups() {
            changed |= keep != Some(group) && switch_to_best(state, group, budget);
        }
        if !changed {
            return;
        }
    }
}

/// Switches a group to its best candidate that breaks nothing, if that gains.
fn switch_to_best(state: &mut State<'_>, group: u32, budget: &mut Budget<'_>) -> bool {
    let index = state.index;
    budget.spend(index.vars(group).len());
    let best = index
        .allowed_vars(group)
        .map(|var| (state.gain_of(var), var))
        .filter(|&(gain, var)| gain > 0 && state.allows_var(var))
        .max_by_key(|&(gain, var)| (gain, std::cmp::Reverse(var)));
    if let Some((_, var)) = best {
        state.switch_to(var);
    }
    best.is_some()
}

/// Tries an exchange for every candidate that would gain but is blocked, until none is left that
/// helps. The state must be feasible and stays so.
fn exchange_all(state: &mut State<'_>, budget: &mut Budget<'_>) {
    loop {
        let mut changed = false;
        for group in 0..state.index.groups() {
            for var in state.index.allowed_vars(group) {
                if budget.is_out() {
                    return;
                }
                budget.spend(1);
                if state.gain_of(var) > 0 {
                    changed |= exchange(state, var, budget);
                }
            }
        }
        if !changed {
            return;
        }
    }
}

/// A row with more terms is too long to look all over it for an exchange.
const LONG: usize = 200;

/// Switches to `var`, moves what blocks it to the least loss, and fills the room that this leaves.
/// Undone unless the objective rises.
fn exchange(state: &mut State<'_>, var: u32, budget: &mut Budget<'_>) -> bool {
    let before = state.objective();
    let index = state.index;
    let full = |&(row, delta): &(u32, i64)| {
        delta > 0
            && index.row_terms[row].len() > LONG
            && state.sum[row as usize] + delta > index.slack[row as usize]
    };
    let old = state.chosen[index.group_of[var as usize] as usize];
    let relieved =
        |row: u32| index.var_terms[old].iter().any(|&(other, by)| other == row && by > 0);
    if index.var_terms[var].iter().any(|term| full(term) && !relieved(term.0)) {
        return false;
    }
    let mut undo = Vec::new();
    let cleared = make_way(state, var, &mut undo, budget);
    let better = cleared && state.objective() > before;
    if !better {
        undo_all(state, &undo);
    }
    better
}

/// Switches to `var` at the least loss that is found, if a way is; the state stays feasible.
pub(super) fn force(state: &mut State<'_>, var: u32, budget: &mut Budget<'_>) -> bool {
    let mut undo = Vec::new();
    let forced = state.index.allowed[var as usize] && make_way(state, var, &mut undo, budget);
    if !forced {
        undo_all(state, &undo);
    }
    forced
}

/// Makes firm rows hold that are broken, at the least loss that is found, if a way is.
pub(super) fn hold(state: &mut State<'_>, rows: &[u32], budget: &mut Budget<'_>) -> bool {
    let mut undo = Vec::new();
    let held = rows.iter().all(|&row| relieve(state, row, None, &mut undo, budget));
    if held && state.is_feasible() {
        fill_around(state, None, &mut undo, budget);
    }
    state.is_feasible()
}

fn undo_all(state: &mut State<'_>, undo: &[u32]) {
    for &old in undo.iter().rev() {
        state.switch_to(old);
    }
}

fn make_way(state: &mut State<'_>, var: u32, undo: &mut Vec<u32>, budget: &mut Budget<'_>) -> bool {
    let kept = Some(state.index.group_of[var as usize]);
    let blockers = state.blockers(state.index.choice(var));
    record_switch(state, var, undo);
    let cleared = blockers.iter().all(|blocker| match *blocker {
        Blocker::Forbidden => false,
        Blocker::Clash { with } => {
            let other = state.chosen[with.group as usize];
            state.hits[other as usize] == 0 || move_aside(state, with.group, undo, budget)
        }
        Blocker::Row { row, .. } => relieve(state, row as u32, kept, undo, budget),
        Blocker::AnyOf { any_of } => relieve_any(state, any_of as u32, kept, undo, budget),
    });
    if cleared && state.is_feasible() {
        fill_around(state, kept, undo, budget);
    }
    cleared && state.is_feasible()
}

fn record_switch(state: &mut State<'_>, var: u32, undo: &mut Vec<u32>) {
    undo.push(state.chosen[state.index.group_of[var as usize] as usize]);
    state.switch_to(var);
}

/// Moves a group to the best of its other candidates that breaks nothing.
fn move_aside(
    state: &mut State<'_>,
    group: u32,
    undo: &mut Vec<u32>,
    budget: &mut Budget<'_>,
) -> bool {
    let current = state.chosen[group as usize];
    budget.spend(state.index.vars(group).len());
    let best = (state.index.allowed_vars(group))
        .filter(|&var| var != current && state.allows_var(var))
        .max_by_key(|&var| (state.gain_of(var), std::cmp::Reverse(var)));
    best.is_some_and(|var| {
        record_switch(state, var, undo);
        true
    })
}

/// Moves groups other than `kept` until the row holds, least loss for the relief first.
fn relieve(
    state: &mut State<'_>,
    row: u32,
    kept: Option<u32>,
    undo: &mut Vec<u32>,
    budget: &mut Budget<'_>,
) -> bool {
    let index = state.index;
    while state.sum[row as usize] > index.slack[row as usize] {
        let mut best: Option<(f64, u32)> = None;
        let mut last_group = u32::MAX;
        for &(term, _) in &index.row_terms[row] {
            let group = index.group_of[term as usize];
            if Some(group) == kept || group == last_group {
                continue;
            }
            last_group = group;
            budget.spend(4 * index.vars(group).len());
            for var in index.allowed_vars(group) {
                let relief =
                    -state.deltas(var).find(|&(r, _)| r == row).map_or(0, |(_, delta)| delta);
                if relief > 0 && state.allows_var(var) {
                    let loss = -state.gain_of(var) as f64 / relief as f64;
                    if best.is_none_or(|best| (loss, var) < best) {
                        best = Some((loss, var));
                    }
                }
            }
        }
        match best {
            Some((_, var)) => record_switch(state, var, undo),
            None => return false,
        }
    }
    true
}

/// Makes the row of an any-of hold that is nearest to it.
fn relieve_any(
    state: &mut State<'_>,
    any_of: u32,
    kept: Option<u32>,
    undo: &mut Vec<u32>,
    budget: &mut Budget<'_>,
) -> bool {
    let excess = |row: u32| state.sum[row as usize] - state.index.slack[row as usize];
    let nearest =
        state.index.any_of_rows[any_of].iter().copied().min_by_key(|&row| (excess(row), row));
    nearest.is_some_and(|row| relieve(state, row, kept, undo, budget))
}

/// Makes the switches that gain among the groups, other than `kept`, that share a clash or row with
/// what was left.
fn fill_around(
    state: &mut State<'_>,
    kept: Option<u32>,
    undo: &mut Vec<u32>,
    budget: &mut Budget<'_>,
) {
    let index = state.index;
    let mut near = Vec::new();
    for &left in undo.iter() {
        near.extend(index.hard[left].iter().copied());
        near.extend(index.soft[left].iter().map(|&(var, _)| var));
        for &(row, _) in &index.var_terms[left] {
            let terms = &index.row_terms[row];
            if terms.len() <= LONG {
                near.extend(terms.iter().map(|&(var, _)| var));
            }
        }
    }
    near.sort_unstable();
    near.dedup();
    budget.spend(near.len());
    let may = |var: u32| index.allowed[var as usize] && kept != Some(index.group_of[var as usize]);
    near.retain(|&var| may(var) && state.gain_of(var) > 0);
    near.sort_unstable_by_key(|&var| (std::cmp::Reverse(state.gain_of(var)), var));
    for var in near {
        if state.gain_of(var) > 0 && state.allows_var(var) {
            record_switch(state, var, undo);
        }
    }
}
