//! What a plan buys for how many moved flights and how much fuel: the best plans under a rising
//! limit on one of them (the epsilon-constraint method: Haimes, Lasdon & Wismer 1971, IEEE Trans.
//! Syst. Man Cybern. 1, from memory), each with its own bound.

use super::find::{FindOptions, PlanError, Watch, problem_of};
use super::problem::Problem;
use crate::answer::{TradeOff, TradeOffLimit, TradeOffPoint};
use crate::search::{self, Choice, Row, Search, Solution, SolveOptions, choice};
use crate::traffic::Traffic;

/// Fuel is limited in parts of this many to a kilogram.
const PARTS_A_KG: f64 = 10.0;
/// Most work for one point: amounts of fuel in one row over all flights make hard problems, and a
/// curve is read by eye.
const MOST_WORK: u64 = 20_000_000;
/// Largest amount of fuel of one candidate that a row can tell, kg.
const MOST_KG: f64 = 1e8;

/// The curve with so many points for each of the two limits, from little to all that the best plan
/// takes.
///
/// # Errors
/// As [`find`](super::find()).
pub fn trade_off(
    traffic: &Traffic,
    points: usize,
    options: &FindOptions,
    watch: Watch<'_>,
) -> Result<TradeOff, PlanError> {
    let (problem, _) = problem_of(traffic, options, watch)?;
    let stop = || (watch.stop)().is_some();
    let search_watch = search::Watch { stop: &stop, progress: &|_| () };
    let ask = SolveOptions {
        seed: options.seed,
        work: options.work.min(MOST_WORK),
        gap: options.gap,
        ..SolveOptions::default()
    };
    let mut search = Search::new(&problem.model).map_err(PlanError::Model)?;
    let best = search.solve(&ask, search_watch);
    if !best.violations.is_empty() {
        return Err(PlanError::GrantRate);
    }
    let all = point(&problem, TradeOffLimit::None, &best);
    let mut curve = TradeOff { points: vec![all.clone()] };
    let moved = |_: Choice| 1;
    let parts =
        |of: Choice| (fuel_kg(&problem, of).clamp(-MOST_KG, MOST_KG) * PARTS_A_KG).round() as i32;
    for step in (1..points.max(1)).rev() {
        let share = step as f64 / points as f64;
        let most_moved = (f64::from(all.moved_flights) * share).floor() as i64;
        let row = row_of(&problem, most_moved, &moved);
        let found = search.solve_within(&[row], &ask, search_watch).map_err(PlanError::Model)?;
        if found.violations.is_empty() {
            let limit = TradeOffLimit::MovedFlights(most_moved as u32);
            curve.points.push(point(&problem, limit, &found));
        }
        watch.wanted()?;
        let most_kg = all.extra_fuel_kg * share;
        if most_kg > 0.0 {
            let row = row_of(&problem, (most_kg * PARTS_A_KG).floor() as i64, &parts);
            let found =
                search.solve_within(&[row], &ask, search_watch).map_err(PlanError::Model)?;
            if found.violations.is_empty() {
                let limit = TradeOffLimit::ExtraFuelKg(most_kg);
                curve.points.push(point(&problem, limit, &found));
            }
            watch.wanted()?;
        }
    }
    Ok(curve)
}

/// At most so much of something over all candidates chosen.
fn row_of(problem: &Problem, most: i64, amount: &dyn Fn(Choice) -> i32) -> Row {
    let candidates = (0u32..).zip(&problem.asking).flat_map(|(group, asking)| {
        (1..=asking.combinations.len() as u32).map(move |candidate| choice(group, candidate))
    });
    let terms = candidates.map(|of| (of, amount(of))).filter(|(_, amount)| *amount != 0);
    Row { slack: most, terms: terms.collect() }
}

fn fuel_kg(problem: &Problem, of: Choice) -> f64 {
    figures(problem, of).1
}

/// Contrail kilometres and fuel of a candidate.
fn figures(problem: &Problem, of: Choice) -> (f64, f64) {
    let grants = problem.combination(of).map_or(&[][..], |c| &c.grants);
    let each = grants
        .iter()
        .filter_map(|grant| problem.judged[grant.proposal][grant.alternative as usize].figures());
    each.fold((0.0, 0.0), |sum, f| (sum.0 + f.contrail_km_avoided, sum.1 + f.extra_fuel_kg))
}

fn point(problem: &Problem, limit: TradeOffLimit, solution: &Solution) -> TradeOffPoint {
    let chosen =
        (0u32..).zip(&solution.choices).map(|(group, &candidate)| choice(group, candidate));
    let mut point = TradeOffPoint {
        limit,
        moved_flights: 0,
        contrail_km_avoided: 0.0,
        extra_fuel_kg: 0.0,
        objective: problem.quantum.amount(solution.objective),
        bound: solution.bound.map(|bound| problem.quantum.amount(bound)),
    };
    for of in chosen.filter(|of| of.candidate > 0) {
        let (km, kg) = figures(problem, of);
        point.moved_flights += 1;
        point.contrail_km_avoided += km;
        point.extra_fuel_kg += kg;
    }
    point
}
