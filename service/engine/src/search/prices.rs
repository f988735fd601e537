//! Bounds from prices. Put any price ≥ 0 on every inequality of the relaxation (at most the cost
//! where going above it is possible); then no feasible choices are worth more than what every group
//! could earn alone after paying, plus what the right sides are worth: weak duality (Geoffrion 1974,
//! Mathematical Programming Study 2). The sum is done in whole numbers, so a bound is proven however
//! the prices were found.

use super::budget::Budget;
use super::index::Index;
use super::relaxation::Relaxation;

/// Prices are whole multiples of 2^-20.
const SCALE: f64 = (1u64 << 20) as f64;
const SHIFT: u32 = 20;
/// No price is above 2^61 multiples.
const DEAREST: f64 = (1u64 << 61) as f64;

/// The bound that prices prove over the variables that are left, with all in whole numbers.
#[derive(Debug)]
pub(super) struct Proof {
    /// Nothing feasible is worth more.
    pub(super) bound: i64,
    /// Value less prices paid, in multiples of 2^-20.
    net: Vec<i128>,
    /// Greatest of `net` among what is left of each group.
    best: Vec<i128>,
    total: i128,
}

impl Proof {
    /// Evaluates prices; `left` says which variables may still be chosen. If some group has none
    /// left, nothing is feasible and the bound is the least there is.
    pub(super) fn new(
        index: &Index,
        relaxation: &Relaxation,
        prices: &[f64],
        left: &[bool],
    ) -> Self {
        Self::of(index, relaxation, prices, left, &index.value)
    }

    fn of(
        index: &Index,
        relaxation: &Relaxation,
        prices: &[f64],
        left: &[bool],
        value: &[i64],
    ) -> Self {
        let mut net: Vec<i128> = value.iter().map(|&value| i128::from(value) << SHIFT).collect();
        let mut total = 0;
        for (row, &price) in (0u32..).zip(prices) {
            let price = whole(price, relaxation.cap[row as usize]);
            if price > 0 {
                total += price * i128::from(relaxation.right[row as usize]);
                for &(var, by) in &relaxation.rows[row] {
                    net[var as usize] -= price * i128::from(by);
                }
            }
        }
        let open = |group| index.vars(group).filter(|&var| left[var as usize]);
        let greatest = |group| open(group).map(|var| net[var as usize]).max();
        let best: Option<Vec<i128>> = (0..index.groups()).map(greatest).collect();
        let Some(best) = best else {
            return Self { bound: i64::MIN, net, best: Vec::new(), total: i128::MIN };
        };
        total += best.iter().sum::<i128>();
        let bound =
            i64::try_from(total >> SHIFT).unwrap_or(if total > 0 { i64::MAX } else { i64::MIN });
        Self { bound, net, best, total }
    }

    /// `chosen` and, of all others, the `spare` candidates that cost the bound least.
    pub(super) fn core(&self, index: &Index, chosen: &[u32], spare: usize) -> Vec<bool> {
        let mut core = vec![false; index.value.len()];
        let mut open = Vec::new();
        for group in 0..index.groups() {
            for var in index.vars(group) {
                let loss = self.best[group as usize] - self.net[var as usize];
                if loss > 0 && chosen[group as usize] != var {
                    open.push((loss, var));
                } else {
                    core[var as usize] = true;
                }
            }
        }
        open.sort_unstable();
        for (_, var) in open.into_iter().take(spare) {
            core[var as usize] = true;
        }
        core
    }

    /// Whether the choice of `var` can't be part of anything worth `target` or more.
    pub(super) fn excludes(&self, index: &Index, var: u32, target: i64) -> bool {
        let Some(best) = self.best.get(index.group_of[var as usize] as usize) else { return true };
        self.total - best + self.net[var as usize] < i128::from(target) << SHIFT
    }
}

fn whole(price: f64, cap: Option<i64>) -> i128 {
    let whole = if price > 0.0 { (price * SCALE).round().min(DEAREST) as i128 } else { 0 };
    cap.map_or(whole, |cap| whole.min(i128::from(cap) << SHIFT))
}

/// Whether these prices prove that nothing is feasible: with all values 0, the bound is below 0.
pub(super) fn proves_infeasible(
    index: &Index,
    relaxation: &Relaxation,
    prices: &[f64],
    left: &[bool],
) -> bool {
    // Soft inequalities can always be paid for, so they must not take part.
    let hard = |(price, cap): (&f64, &Option<i64>)| if cap.is_none() { *price } else { 0.0 };
    let prices: Vec<f64> = prices.iter().zip(&relaxation.cap).map(hard).collect();
    let nothing = vec![0; index.value.len()];
    Proof::of(index, relaxation, &prices, left, &nothing).total < 0
}

/// Improves prices: from none at all by a hundred long steps first, then by short ones. Returns the
/// best prices met; never worse than the given ones.
pub(super) fn descend(
    index: &Index,
    relaxation: &Relaxation,
    known: Option<i64>,
    budget: &mut Budget<'_>,
) -> Vec<f64> {
    let mut prices = relaxation.start.clone();
    if prices.iter().all(|&price| price <= 0.0) {
        prices = glide(index, relaxation, prices, known.unwrap_or(0) as f64, budget);
    }
    settle(index, relaxation, prices, known, budget)
}

/// Most long and short steps.
const LONG_STEPS: usize = 120;
const SHORT_STEPS: usize = 800;

/// Subgradient steps of Polyak's length towards a `target` near the optimum, along directions
/// smoothed over steps (Polyak 1969; Camerini, Fratta and Maffioli 1975, Mathematical Programming
/// Study 3).
fn glide(
    index: &Index,
    relaxation: &Relaxation,
    mut prices: Vec<f64>,
    target: f64,
    budget: &mut Budget<'_>,
) -> Vec<f64> {
    let size = relaxation.columns.items_len() + index.value.len();
    let mut best = prices.clone();
    let mut least = f64::INFINITY;
    let mut direction = vec![0.0; prices.len()];
    let mut boldness = 1.0;
    let mut since_better = 0;
    for _ in 0..LONG_STEPS {
        let (bound, room) = evaluate(index, relaxation, &prices);
        if bound < least {
            if bound < least - 1e-6 * bound.abs() {
                since_better = 0;
            }
            least = bound;
            best.copy_from_slice(&prices);
        } else {
            since_better += 1;
        }
        if since_better > 6 {
            boldness *= 0.6;
            since_better = 0;
            prices.copy_from_slice(&best);
            direction.fill(0.0);
            if boldness < 1e-3 {
                break;
            }
        }
        let mut length = 0.0;
        for (row, direction) in direction.iter_mut().enumerate() {
            // What lies at a limit and would cross it does not count.
            let blocked = room[row] > 0.0 && prices[row] <= 0.0;
            let step = if blocked { 0.0 } else { -room[row] };
            *direction = 0.7 * *direction + step;
            length += *direction * *direction;
        }
        if length < 1e-9 || !budget.spend(2 * size) {
            break;
        }
        let step = boldness * (bound - target).max(1.0) / length;
        for (row, price) in prices.iter_mut().enumerate() {
            let dearest = relaxation.cap[row].map_or(f64::MAX, |cap| cap as f64);
            *price = (*price + step * direction[row]).clamp(0.0, dearest);
        }
    }
    best
}

/// Improves prices by the volume algorithm (Barahona and Anbil 2000, Mathematical Programming 87):
/// steps from the best prices so far, towards a `goal` below the bound, along a mean of the choices
/// that earlier prices led to. Returns the best prices met; never worse than the given ones.
fn settle(
    index: &Index,
    relaxation: &Relaxation,
    start: Vec<f64>,
    known: Option<i64>,
    budget: &mut Budget<'_>,
) -> Vec<f64> {
    let size = relaxation.columns.items_len() + index.value.len();
    let (mut least, mut mean) = evaluate(index, relaxation, &start);
    let floor = known.map_or(least - 0.05 * least.abs(), |known| known as f64);
    let mut goal = floor;
    let mut best = start.clone();
    let mut prices = start;
    let (mut boldness, mut memory) = (0.03, 0.1);
    let mut failures = 0;
    let mut before = least;
    for step in 1..=SHORT_STEPS {
        let length = length(&mean, &best);
        if least - floor < 1.0 || length < 1e-9 || !budget.spend(2 * size) {
            break;
        }
        if least - goal < 0.0005 * least.abs() {
            goal = floor.max(least - 0.001 * least.abs());
        }
        let stride = boldness * (least - goal).max(1.0) / length;
        for (row, price) in prices.iter_mut().enumerate() {
            let dearest = relaxation.cap[row].map_or(f64::MAX, |cap| cap as f64);
            *price = (best[row] - stride * mean[row]).clamp(0.0, dearest);
        }
        let (bound, room) = evaluate(index, relaxation, &prices);
        let agreement: f64 = room.iter().zip(&mean).map(|(a, b)| a * b).sum();
        for (mean, room) in mean.iter_mut().zip(&room) {
            *mean = memory * room + (1.0 - memory) * *mean;
        }
        if bound < least {
            boldness *= if agreement > 0.0 { 1.5 } else { 1.1 };
            boldness = boldness.min(2.0);
            failures = 0;
            least = bound;
            best.copy_from_slice(&prices);
        } else {
            failures += 1;
            if failures == PATIENCE {
                boldness *= 0.67;
                failures = 0;
            }
        }
        if step % REVIEW == 0 {
            if before - least < 1e-5 * least.abs() && before - least < 0.02 * (least - floor) {
                break;
            }
            if before - least < 1e-4 * least.abs() {
                memory = (0.5 * memory).max(1e-3);
            }
            before = least;
        }
    }
    best
}

/// Steps without a better bound until they become shorter.
const PATIENCE: usize = 10;
/// Steps between two looks at whether they still help.
const REVIEW: usize = 50;

/// The squared length of a direction, without what prices of 0 can't follow.
fn length(mean: &[f64], prices: &[f64]) -> f64 {
    let free = mean.iter().zip(prices).filter(|&(&mean, &price)| mean <= 0.0 || price > 0.0);
    free.map(|(mean, _)| mean * mean).sum()
}

/// The bound of these prices, and what each inequality has left of its right side when every group
/// takes what earns it most.
fn evaluate(index: &Index, relaxation: &Relaxation, prices: &[f64]) -> (f64, Vec<f64>) {
    let mut room: Vec<f64> = relaxation.right.iter().map(|&right| right as f64).collect();
    let mut bound: f64 = room.iter().zip(prices).map(|(room, price)| room * price).sum();
    for group in 0..index.groups() {
        let mut best = (f64::NEG_INFINITY, 0);
        for var in index.vars(group) {
            let paid: f64 = relaxation.columns[var]
                .iter()
                .map(|&(row, by)| prices[row as usize] * by as f64)
                .sum();
            let net = index.value[var as usize] as f64 - paid;
            if net > best.0 {
                best = (net, var);
            }
        }
        bound += best.0;
        for &(row, by) in &relaxation.columns[best.1] {
            room[row as usize] -= by as f64;
        }
    }
    (bound, room)
}
