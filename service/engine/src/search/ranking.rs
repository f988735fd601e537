//! Several plans, best first, each differing from all better ones in at least a given number of
//! groups. The demand is a row: of the choices of a better plan, at most all but so many may be
//! made again.

use super::budget::Watch;
use super::model::{Defect, Model, Row, choice};
use super::solve::{Solution, SolveOptions, Stopped, solve};

/// How many plans, and how different.
#[derive(Debug, Clone, PartialEq)]
pub struct RankOptions {
    /// Most plans to return.
    pub plans: usize,
    /// Fewest groups whose choice must differ between any two; 0 is taken as 1.
    pub min_difference: usize,
    /// How to search for each.
    pub solve: SolveOptions,
}

/// The best plan, the best of those that differ enough from it, and so on; fewer than asked for if
/// no more exist or none was found. A bound speaks of all plans that differ enough from the better
/// ones listed. A plan after the first is maximal among those.
///
/// # Errors
/// The first [`Defect`] of the model.
pub fn rank(
    model: &Model,
    options: &RankOptions,
    watch: Watch<'_>,
) -> Result<Vec<Solution>, Defect> {
    let mut model = model.clone();
    let mut plans: Vec<Solution> = Vec::new();
    let own_rows = model.rows.len();
    for _ in 0..options.plans {
        let mut ask = options.solve.clone();
        if let Some(better) = plans.last() {
            ask.start = Some(better.choices.clone());
        }
        let mut solution = solve(&model, &ask, watch)?;
        if !solution.violations.is_empty() {
            if plans.is_empty() {
                plans.push(solution);
            }
            break;
        }
        solution.row_prices.truncate(own_rows);
        model.rows.push(differ(&solution.choices, options.min_difference.max(1)));
        let stopped = solution.stopped;
        plans.push(solution);
        if stopped == Stopped::Asked {
            break;
        }
    }
    Ok(plans)
}

fn differ(choices: &[u32], at_least: usize) -> Row {
    let terms =
        (0u32..).zip(choices).map(|(group, &candidate)| (choice(group, candidate), 1)).collect();
    Row { slack: choices.len() as i64 - at_least as i64, terms }
}
