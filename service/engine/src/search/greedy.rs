//! A first plan: from rest, the candidates that gain most for the room they take, one after another.

use super::budget::Budget;
use super::index::Index;
use super::state::State;

/// Repairs what is broken as far as single switches go, then makes every switch that gains and
/// breaks nothing, dearest first.
pub(super) fn fill(state: &mut State<'_>, budget: &mut Budget<'_>) {
    repair(state, budget);
    let index = state.index;
    let mut order: Vec<(f64, u32)> = (0..index.value.len() as u32)
        .filter(|&var| index.allowed[var as usize] && state.gain_of(var) > 0)
        .map(|var| (state.gain_of(var) as f64 / (1.0 + room_taken(index, var)), var))
        .collect();
    order.sort_unstable_by(|a, b| b.0.total_cmp(&a.0).then(a.1.cmp(&b.1)));
    for (_, var) in order {
        budget.spend(1 + index.var_terms[var].len());
        if state.gain_of(var) > 0 && state.allows_var(var) {
            state.switch_to(var);
        }
    }
}

/// Share of the scarce room a candidate takes: its deltas over the slack of their rows.
fn room_taken(index: &Index, var: u32) -> f64 {
    let terms = index.var_terms[var].iter().filter(|&&(row, _)| row < index.firm_rows);
    let rows: f64 = terms
        .map(|&(row, delta)| delta as f64 / (1.0 + index.slack[row as usize].max(0) as f64))
        .sum();
    (rows + 0.5 * index.hard[var].len() as f64).max(0.0)
}

/// Switches that lessen what is broken, the greatest relief first, until none does.
pub(super) fn repair(state: &mut State<'_>, budget: &mut Budget<'_>) {
    while !state.is_feasible() {
        let before = state.breakage();
        let mut best: Option<(i64, i64, u32)> = None;
        for group in 0..state.index.groups() {
            let old = state.chosen[group as usize];
            for var in state.index.allowed_vars(group) {
                state.switch_to(var);
                let key = (state.breakage(), -state.objective(), var);
                if key.0 < before && best.is_none_or(|best| key < best) {
                    best = Some(key);
                }
                state.switch_to(old);
                budget.spend(1 + state.index.var_terms[var].len());
            }
        }
        match best {
            Some((_, _, var)) if !budget.is_out() => state.switch_to(var),
            _ => return,
        }
    }
}
