//! Several plans, best first, each differing from all better ones in at least a given number of
//! groups. The demand is a row: of the choices of a better plan, at most all but so many may be
//! made again.

use super::budget::Watch;
use super::model::{Defect, Model, Row, choice};
use super::solve::{Search, Solution, SolveOptions, Stopped};

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

impl Search<'_> {
    /// The best plan, the best of those that differ enough from it, and so on; fewer than asked for
    /// if no more exist or none was found. A bound speaks of all plans that differ enough from the
    /// better ones listed. A plan after the first is maximal among those.
    pub fn rank(&mut self, options: &RankOptions, watch: Watch<'_>) -> Vec<Solution> {
        let mut plans = vec![self.solve(&options.solve, watch)];
        let mut rows = Vec::new();
        while plans.len() < options.plans
            && let Some(last) = plans.last()
            && last.bound.is_some()
            && last.stopped != Stopped::Asked
        {
            rows.push(differ(&last.choices, options.min_difference.max(1)));
            let ask = SolveOptions { start: Some(last.choices.clone()), ..options.solve.clone() };
            match self.solve_within(&rows, &ask, watch) {
                Ok(next) if next.bound.is_some() => plans.push(next),
                Ok(_) | Err(_) => break,
            }
        }
        plans
    }
}

/// Ranks plans: [`Search::rank`] for a single question.
///
/// # Errors
/// The first [`Defect`] of the model.
pub fn rank(
    model: &Model,
    options: &RankOptions,
    watch: Watch<'_>,
) -> Result<Vec<Solution>, Defect> {
    Ok(Search::new(model)?.rank(options, watch))
}

/// A row: of the choices of a better plan at most all but so many may be made again.
pub(super) fn differ(choices: &[u32], at_least: usize) -> Row {
    let terms =
        (0u32..).zip(choices).map(|(group, &candidate)| (choice(group, candidate), 1)).collect();
    Row { slack: choices.len() as i64 - at_least as i64, terms }
}
