//! What limits cost: how much a plan would gain from one more in a window or at a minute.
//!
//! The prices behind the search's bound say it about: they are what one more unit of each row is
//! worth in the relaxed problem. Exactly it is known by searching again with the limit raised.

use super::find::{FindOptions, PlanError, Watch};
use super::problem::{Limit, Problem};
use crate::answer::LimitPrice;
use crate::search::{self, Search, Solution, SolveOptions};
use crate::traffic::Traffic;

/// Prices below this share of the largest are not told of.
const LEAST_SHARE: f64 = 1e-6;

/// The limits that cost something, dearest first; the gains of the first `exact` of them are found
/// by searching again.
pub(super) fn limit_prices(
    traffic: &Traffic,
    problem: &Problem,
    best: &Solution,
    options: &FindOptions,
    watch: Watch<'_>,
) -> Result<Vec<LimitPrice>, PlanError> {
    let priced = problem.limits.iter().zip(&best.row_prices).enumerate();
    let mut rows: Vec<(usize, &Limit, f64)> = priced
        .filter(|(_, (_, price))| **price > 0.0)
        .map(|(row, (limit, price))| (row, limit, *price))
        .collect();
    rows.sort_by(|a, b| b.2.total_cmp(&a.2).then(a.0.cmp(&b.0)));
    let least = rows.first().map_or(0.0, |row| row.2 * LEAST_SHARE);
    rows.retain(|row| row.2 >= least);
    let stop = || (watch.stop)().is_some();
    let search_watch = search::Watch { stop: &stop, progress: &|_| () };
    let unit = problem.quantum.amount(1);
    let mut prices = Vec::with_capacity(rows.len());
    for (position, (row, limit, price)) in rows.into_iter().enumerate() {
        let exact = if position < options.exact_limits && (watch.stop)().is_none() {
            let mut model = problem.model.clone();
            model.rows[row].slack += 1;
            let ask = SolveOptions {
                seed: options.seed,
                work: options.work,
                start: Some(best.choices.clone()),
                ..SolveOptions::default()
            };
            let mut search = Search::new(&model).map_err(PlanError::Model)?;
            let raised = search.solve(&ask, search_watch);
            let proven = [best, &raised].iter().all(|s| s.bound == Some(s.objective));
            proven.then(|| problem.quantum.amount(raised.objective - best.objective))
        } else {
            None
        };
        prices.push(match *limit {
            Limit::Policy(key) => LimitPrice {
                place: None,
                policy_key: Some(key),
                measure: None,
                from_s: 0.0,
                until_s: 0.0,
                estimate: price * unit,
                exact,
            },
            Limit::Cell(cell) => LimitPrice {
                place: Some(traffic.loads.place(cell)),
                policy_key: None,
                measure: Some(traffic.loads.measure(cell)),
                from_s: traffic.loads.start_s(cell),
                until_s: traffic.loads.end_s(cell),
                estimate: price * unit,
                exact,
            },
        });
    }
    Ok(prices)
}
