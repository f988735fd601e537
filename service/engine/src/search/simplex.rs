//! The linear relaxation solved by the bounded dual simplex method: steepest edge prices for the
//! leaving row (Forrest and Goldfarb 1992, Mathematical Programming 57) and a ratio test that passes
//! over bounds as long as that pays (Maros 2003, Computational Optimization and Applications 26).
//! Bounds change from node to node of a search tree, and the last basis stays a good start.
//!
//! Each group's first candidate is expressed by the others: it is 1 less their sum. What comes out
//! of here is advice (prices, fractional choices); proofs are made from the prices in whole numbers.

use super::budget::Budget;
use super::factor::Factor;
use super::index::Index;
use super::relaxation::Relaxation;

/// How a run of the simplex method ended.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Outcome {
    /// The relaxation is solved.
    Optimal,
    /// Its optimum is below the cutoff.
    Cutoff,
    /// It has no solution; the prices are a certificate for [`super::prices::proves_infeasible`].
    Infeasible,
    /// Too many steps, too little budget, or numerical trouble.
    Unfinished,
}

/// A basis to come back to.
#[derive(Debug, Clone)]
pub(super) struct Basis {
    basic: Vec<u32>,
    at_upper: Vec<bool>,
}

/// The relaxation of a part as a linear program: minimise cost · x, A x + slack = right.
#[derive(Debug)]
pub(super) struct Simplex<'i> {
    index: &'i Index,
    /// Inequalities that stand for those of the relaxation; those of groups follow.
    priced_rows: usize,
    /// Column of every variable of the index; the first of each group has none.
    column_of: Vec<u32>,
    /// Row that keeps a group's candidates to one in all, where it needs one.
    group_row: Vec<u32>,
    columns: Sparse,
    rows: Sparse,
    right: Vec<f64>,
    /// Costs are divided by this, so that the greatest is 1.
    unit: f64,
    cost: Vec<f64>,
    lower: Vec<f64>,
    upper: Vec<f64>,
    basic: Vec<u32>,
    slot_of: Vec<u32>,
    at_upper: Vec<bool>,
    x_basic: Vec<f64>,
    /// Reduced costs of all columns, slacks last.
    reduced: Vec<f64>,
    weight: Vec<f64>,
    factor: Factor,
    ray: Option<Vec<f64>>,
    base_value: f64,
    work: Work,
}

/// Vectors that are reused from step to step.
#[derive(Debug, Default)]
struct Work {
    by_row: Vec<f64>,
    by_slot: Vec<f64>,
    rho: Vec<f64>,
    column: Vec<f64>,
    tau: Vec<f64>,
    alpha: Vec<f64>,
    touched: Vec<u32>,
}

/// A sparse matrix, list by list.
#[derive(Debug)]
struct Sparse {
    starts: Vec<u32>,
    entries: Vec<(u32, f64)>,
}

impl Sparse {
    fn of(lists: &[Vec<(u32, f64)>]) -> Self {
        let mut starts = vec![0];
        let mut entries = Vec::new();
        for list in lists {
            entries.extend_from_slice(list);
            starts.push(entries.len() as u32);
        }
        Self { starts, entries }
    }

    fn list(&self, position: usize) -> &[(u32, f64)] {
        &self.entries[self.starts[position] as usize..self.starts[position + 1] as usize]
    }
}

const NONE: u32 = u32::MAX;
/// Bounds may be missed by this much.
const PRIMAL: f64 = 1e-7;
/// Reduced costs may have the wrong sign by this much.
const DUAL: f64 = 1e-9;
/// Smaller pivots are not trusted.
const PIVOT: f64 = 1e-7;
/// Steps between two factorisations.
const REFACTOR: usize = 64;

impl<'i> Simplex<'i> {
    pub(super) fn new(index: &'i Index, relaxation: &Relaxation) -> Self {
        let lp = Layout::new(index, relaxation);
        let (width, height) = (lp.cost.len(), lp.rows.len());
        let greatest = lp.cost.iter().fold(0.0, |most: f64, cost| most.max(cost.abs()));
        let unit = if greatest > 0.0 { greatest } else { 1.0 };
        let mut by_column = vec![Vec::new(); width];
        for (row, terms) in (0u32..).zip(&lp.rows) {
            for &(column, by) in terms {
                by_column[column as usize].push((row, by));
            }
        }
        let mut cost: Vec<f64> = lp.cost.iter().map(|cost| cost / unit).collect();
        cost.resize(width + height, 0.0);
        let unit_columns: Vec<Vec<(u32, f64)>> =
            (0..height as u32).map(|row| vec![(row, 1.0)]).collect();
        let mut simplex = Self {
            index,
            priced_rows: relaxation.right.len(),
            column_of: lp.column_of,
            group_row: lp.group_row,
            columns: Sparse::of(&by_column),
            rows: Sparse::of(&lp.rows),
            right: lp.right,
            unit,
            reduced: cost.clone(),
            cost,
            lower: vec![0.0; width + height],
            upper: vec![f64::INFINITY; width + height],
            basic: (width as u32..(width + height) as u32).collect(),
            slot_of: vec![NONE; width + height],
            at_upper: vec![false; width + height],
            x_basic: vec![0.0; height],
            weight: vec![1.0; height],
            factor: Factor::new(&unit_columns).0,
            ray: None,
            base_value: lp.base_value,
            work: Work::default(),
        };
        for row in 0..height {
            simplex.slot_of[width + row] = row as u32;
        }
        for vector in [&mut simplex.work.by_row, &mut simplex.work.by_slot, &mut simplex.work.rho] {
            vector.resize(height, 0.0);
        }
        simplex.work.column.resize(height, 0.0);
        simplex.work.tau.resize(height, 0.0);
        simplex.work.alpha.resize(width, 0.0);
        simplex
    }

    /// Columns that are no slacks.
    fn width(&self) -> usize {
        self.columns.starts.len() - 1
    }

    /// Sets bounds so that exactly these variables may still be chosen; every group has some left.
    pub(super) fn allow(&mut self, left: &[bool]) {
        let width = self.width();
        for group in 0..self.index.groups() {
            let vars = self.index.vars(group);
            let open = vars.clone().filter(|&var| left[var as usize]).count();
            let rest = left[vars.start as usize];
            for var in vars.start + 1..vars.end {
                let column = self.column_of[var as usize] as usize;
                let may = left[var as usize];
                self.upper[column] = f64::from(u8::from(may));
                self.lower[column] = f64::from(u8::from(may && open == 1));
            }
            let row = self.group_row[group as usize];
            if row != NONE {
                self.upper[width + row as usize] = f64::from(u8::from(rest));
            }
        }
        self.place();
    }

    /// Puts every nonbasic column at the bound that its reduced cost asks for.
    fn place(&mut self) {
        for column in 0..self.cost.len() {
            let fixed = self.lower[column] >= self.upper[column];
            if self.slot_of[column] == NONE && self.upper[column].is_finite() && !fixed {
                let reduced = self.reduced[column];
                if reduced.abs() > DUAL {
                    self.at_upper[column] = reduced < 0.0;
                }
            } else if !self.upper[column].is_finite() {
                self.at_upper[column] = false;
            }
        }
        self.recompute_x();
    }

    fn value_of(&self, column: usize) -> f64 {
        if self.at_upper[column] { self.upper[column] } else { self.lower[column] }
    }

    fn recompute_x(&mut self) {
        let width = self.width();
        let mut x = std::mem::take(&mut self.work.by_row);
        x.copy_from_slice(&self.right);
        for column in 0..self.cost.len() {
            if self.slot_of[column] != NONE {
                continue;
            }
            let value = self.value_of(column);
            if value != 0.0 {
                if column < width {
                    for &(row, by) in self.columns.list(column) {
                        x[row as usize] -= by * value;
                    }
                } else {
                    x[column - width] -= value;
                }
            }
        }
        let mut z = std::mem::take(&mut self.x_basic);
        self.factor.solve(&mut x, &mut z);
        self.x_basic = z;
        self.work.by_row = x;
    }

    fn recompute_reduced(&mut self) {
        let width = self.width();
        let mut by_slot = std::mem::take(&mut self.work.by_slot);
        for (slot, &column) in self.basic.iter().enumerate() {
            by_slot[slot] = self.cost[column as usize];
        }
        let mut y = std::mem::take(&mut self.work.tau);
        self.factor.solve_transposed(&mut by_slot, &mut y);
        for column in 0..width {
            let paid: f64 =
                self.columns.list(column).iter().map(|&(row, by)| y[row as usize] * by).sum();
            self.reduced[column] = self.cost[column] - paid;
        }
        for (reduced, y) in self.reduced[width..].iter_mut().zip(&y) {
            *reduced = -y;
        }
        for &column in &self.basic {
            self.reduced[column as usize] = 0.0;
        }
        self.work.by_slot = by_slot;
        self.work.tau = y;
    }

    /// Factorises the basis anew and recomputes everything from it.
    fn refactor(&mut self, budget: &mut Budget<'_>) {
        let width = self.width();
        let entries = |&column: &u32| {
            let column = column as usize;
            if column < width {
                self.columns.list(column).to_vec()
            } else {
                vec![((column - width) as u32, 1.0)]
            }
        };
        let columns: Vec<Vec<(u32, f64)>> = self.basic.iter().map(entries).collect();
        let (factor, patched) = Factor::new(&columns);
        self.factor = factor;
        for (slot, row) in patched {
            let out = self.basic[slot as usize];
            self.slot_of[out as usize] = NONE;
            self.at_upper[out as usize] = false;
            self.basic[slot as usize] = width as u32 + row;
            self.slot_of[width + row as usize] = slot;
        }
        budget.spend(4 * self.factor.entries() + self.columns.entries.len() + 4 * self.cost.len());
        self.recompute_reduced();
        self.place();
    }

    /// What the basis says the relaxation is worth: an upper bound, within rounding.
    pub(super) fn objective(&self) -> f64 {
        let mut cost: f64 = self
            .basic
            .iter()
            .zip(&self.x_basic)
            .map(|(&column, x)| self.cost[column as usize] * x)
            .sum();
        for column in 0..self.width() {
            if self.slot_of[column] == NONE {
                cost += self.cost[column] * self.value_of(column);
            }
        }
        self.base_value - cost * self.unit
    }

    /// Solves until optimal, or until the optimum is known to be below `cutoff`.
    pub(super) fn run(&mut self, cutoff: f64, steps: usize, budget: &mut Budget<'_>) -> Outcome {
        self.ray = None;
        let mut trouble = 0;
        for step in 0..steps {
            if self.factor.updates() >= REFACTOR {
                self.refactor(budget);
            }
            if step % 8 == 0 && self.objective() < cutoff {
                return Outcome::Cutoff;
            }
            if budget.is_out() {
                return Outcome::Unfinished;
            }
            let Some(slot) = self.leaving() else {
                if self.factor.updates() == 0 || trouble > 4 {
                    return if self.objective() < cutoff {
                        Outcome::Cutoff
                    } else {
                        Outcome::Optimal
                    };
                }
                // Made sure of with fresh factors.
                self.refactor(budget);
                if self.leaving().is_none() {
                    return if self.objective() < cutoff {
                        Outcome::Cutoff
                    } else {
                        Outcome::Optimal
                    };
                }
                trouble += 1;
                continue;
            };
            match self.pivot(slot, budget) {
                Step::Made => {}
                Step::Unbounded => return Outcome::Infeasible,
                Step::Unsafe if self.factor.updates() > 0 => self.refactor(budget),
                Step::Unsafe => {
                    trouble += 1;
                    self.weight[slot] *= 1e6;
                    if trouble > 20 {
                        return Outcome::Unfinished;
                    }
                }
            }
        }
        Outcome::Unfinished
    }

    /// The slot whose variable is farthest outside its bounds, measured along its edge.
    fn leaving(&self) -> Option<usize> {
        let mut best = (0.0, None);
        for (slot, &x) in self.x_basic.iter().enumerate() {
            let column = self.basic[slot] as usize;
            let outside = (x - self.upper[column]).max(self.lower[column] - x);
            if outside > PRIMAL {
                let merit = outside * outside / self.weight[slot];
                if merit > best.0 {
                    best = (merit, Some(slot));
                }
            }
        }
        best.1
    }

    fn pivot(&mut self, slot: usize, budget: &mut Budget<'_>) -> Step {
        let width = self.width();
        let leaving = self.basic[slot] as usize;
        let above = self.x_basic[slot] > self.upper[leaving];
        let goal = if above { self.upper[leaving] } else { self.lower[leaving] };
        let sign = if above { 1.0 } else { -1.0 };
        self.price_row(slot);
        let slope = (self.x_basic[slot] - goal).abs();
        budget.spend(self.work.touched.len() + 2 * self.factor.entries() + 4 * self.right.len());
        let Some((entering, flips)) = self.ratio_test(sign, slope) else {
            let ray = self.work.rho.iter().take(self.priced_rows).map(|rho| -sign * rho).collect();
            self.ray = Some(ray);
            self.clear_row();
            return Step::Unbounded;
        };
        let alpha_row = self.alpha(entering);
        self.solve_column(entering);
        let alpha = self.work.column[slot];
        if alpha.abs() < PIVOT || (alpha - alpha_row).abs() > 1e-6 * (1.0 + alpha.abs()) {
            self.clear_row();
            return Step::Unsafe;
        }
        self.update_reduced(entering, leaving, alpha_row);
        self.flip(&flips);
        self.update_weights(slot, alpha);
        let step = (self.x_basic[slot] - goal) / alpha;
        let from = self.value_of(entering);
        for (x, by) in self.x_basic.iter_mut().zip(&self.work.column) {
            *x -= step * by;
        }
        self.x_basic[slot] = from + step;
        self.at_upper[leaving] = above;
        self.slot_of[leaving] = NONE;
        self.slot_of[entering] = slot as u32;
        self.basic[slot] = entering as u32;
        self.factor.exchange(slot as u32, &self.work.column);
        self.clear_row();
        debug_assert!(entering < width + self.right.len());
        Step::Made
    }

    /// Row `slot` of B⁻¹ and of the tableau.
    fn price_row(&mut self, slot: usize) {
        let work = &mut self.work;
        work.by_slot.fill(0.0);
        work.by_slot[slot] = 1.0;
        self.factor.solve_transposed(&mut work.by_slot, &mut work.rho);
        for (row, &rho) in work.rho.iter().enumerate() {
            if rho.abs() < 1e-11 {
                continue;
            }
            for &(column, by) in self.rows.list(row) {
                let alpha = &mut work.alpha[column as usize];
                if *alpha == 0.0 {
                    work.touched.push(column);
                }
                *alpha += rho * by;
                if *alpha == 0.0 {
                    *alpha = 1e-300;
                }
            }
        }
    }

    fn clear_row(&mut self) {
        for &column in &self.work.touched {
            self.work.alpha[column as usize] = 0.0;
        }
        self.work.touched.clear();
    }

    fn alpha(&self, column: usize) -> f64 {
        let width = self.width();
        if column < width { self.work.alpha[column] } else { self.work.rho[column - width] }
    }

    /// The entering column, and the columns that change bounds on the way to it.
    fn ratio_test(&self, sign: f64, mut slope: f64) -> Option<(usize, Vec<u32>)> {
        let width = self.width();
        let slacks = (0..self.right.len()).map(|row| width + row);
        let columns = self.work.touched.iter().map(|&column| column as usize).chain(slacks);
        let mut breaks: Vec<(f64, f64, usize)> = Vec::new();
        for column in columns {
            let alpha = sign * self.alpha(column);
            if alpha.abs() < PIVOT
                || self.slot_of[column] != NONE
                || self.lower[column] >= self.upper[column]
            {
                continue;
            }
            let forward = if self.at_upper[column] { -alpha } else { alpha };
            if forward > 0.0 {
                let distance = if self.at_upper[column] {
                    -self.reduced[column]
                } else {
                    self.reduced[column]
                };
                breaks.push((distance.max(0.0) / forward, forward, column));
            }
        }
        breaks.sort_unstable_by(|a, b| {
            a.0.total_cmp(&b.0).then(b.1.total_cmp(&a.1)).then(a.2.cmp(&b.2))
        });
        let mut passed = 0;
        for &(_, alpha, column) in &breaks {
            slope -= alpha * (self.upper[column] - self.lower[column]);
            // Nothing is left outside its bounds within tolerance: this one can enter.
            if slope <= PRIMAL {
                break;
            }
            passed += 1;
        }
        if passed == breaks.len() {
            return None;
        }
        // Among those that come within tolerance of the next break, the greatest pivot.
        let reach = breaks[passed..]
            .iter()
            .map(|&(ratio, alpha, _)| ratio + DUAL / alpha)
            .fold(f64::INFINITY, f64::min);
        let near = breaks[passed..].iter().take_while(|&&(ratio, ..)| ratio <= reach);
        let entering = near.max_by(|a, b| a.1.total_cmp(&b.1).then(b.2.cmp(&a.2)))?;
        let flips = breaks[..passed].iter().map(|&(.., column)| column as u32).collect();
        Some((entering.2, flips))
    }

    /// B⁻¹ times a column.
    fn solve_column(&mut self, column: usize) {
        let width = self.width();
        let work = &mut self.work;
        if column < width {
            for &(row, by) in self.columns.list(column) {
                work.by_row[row as usize] = by;
            }
        } else {
            work.by_row[column - width] = 1.0;
        }
        self.factor.solve(&mut work.by_row, &mut work.column);
    }

    fn update_reduced(&mut self, entering: usize, leaving: usize, alpha: f64) {
        let width = self.width();
        let theta = self.reduced[entering] / alpha;
        for &column in &self.work.touched {
            if self.slot_of[column as usize] == NONE {
                self.reduced[column as usize] -= theta * self.work.alpha[column as usize];
            }
        }
        for (row, &rho) in self.work.rho.iter().enumerate() {
            if self.slot_of[width + row] == NONE {
                self.reduced[width + row] -= theta * rho;
            }
        }
        self.reduced[entering] = 0.0;
        self.reduced[leaving] = -theta;
    }

    /// Moves columns to their other bounds.
    fn flip(&mut self, flips: &[u32]) {
        if flips.is_empty() {
            return;
        }
        let width = self.width();
        for &column in flips {
            let column = column as usize;
            let from = self.value_of(column);
            self.at_upper[column] = !self.at_upper[column];
            let by_how_much = self.value_of(column) - from;
            if column < width {
                for &(row, by) in self.columns.list(column) {
                    self.work.by_row[row as usize] += by * by_how_much;
                }
            } else {
                self.work.by_row[column - width] += by_how_much;
            }
        }
        let work = &mut self.work;
        self.factor.solve(&mut work.by_row, &mut work.tau);
        for (x, by) in self.x_basic.iter_mut().zip(&work.tau) {
            *x -= by;
        }
    }

    fn update_weights(&mut self, slot: usize, alpha: f64) {
        let work = &mut self.work;
        let length: f64 = work.rho.iter().map(|rho| rho * rho).sum();
        work.by_row.copy_from_slice(&work.rho);
        self.factor.solve(&mut work.by_row, &mut work.tau);
        for (other, &by) in work.column.iter().enumerate() {
            if other != slot && by != 0.0 {
                let ratio = by / alpha;
                let weight =
                    self.weight[other] - 2.0 * ratio * work.tau[other] + ratio * ratio * length;
                self.weight[other] = weight.max(1e-4);
            }
        }
        self.weight[slot] = (length / (alpha * alpha)).max(1e-4);
    }

    /// Prices of the relaxation's inequalities: those of the last basis, or the certificate of
    /// infeasibility if the last run ended so.
    pub(super) fn prices(&self) -> Vec<f64> {
        if let Some(ray) = &self.ray {
            return ray.iter().map(|price| price.max(0.0)).collect();
        }
        let width = self.width();
        let slacks = &self.reduced[width..width + self.priced_rows];
        slacks.iter().map(|reduced| (reduced * self.unit).max(0.0)).collect()
    }

    /// How much of each variable the relaxation chooses.
    pub(super) fn shares(&self) -> Vec<f64> {
        let mut shares = vec![0.0; self.index.value.len()];
        for group in 0..self.index.groups() {
            let vars = self.index.vars(group);
            let mut rest = 1.0;
            for var in vars.start + 1..vars.end {
                let column = self.column_of[var as usize] as usize;
                let slot = self.slot_of[column];
                let share =
                    if slot == NONE { self.value_of(column) } else { self.x_basic[slot as usize] };
                shares[var as usize] = share.clamp(0.0, 1.0);
                rest -= share;
            }
            shares[vars.start as usize] = rest.clamp(0.0, 1.0);
        }
        shares
    }

    pub(super) fn basis(&self) -> Basis {
        Basis { basic: self.basic.clone(), at_upper: self.at_upper.clone() }
    }

    /// Goes back to a basis; bounds must be set again afterwards.
    pub(super) fn restore(&mut self, basis: &Basis, budget: &mut Budget<'_>) {
        self.slot_of.fill(NONE);
        self.basic.copy_from_slice(&basis.basic);
        self.at_upper.copy_from_slice(&basis.at_upper);
        for (slot, &column) in (0u32..).zip(&self.basic) {
            self.slot_of[column as usize] = slot;
        }
        self.weight.fill(1.0);
        self.refactor(budget);
    }
}

enum Step {
    Made,
    Unbounded,
    Unsafe,
}

/// The linear program before it is stored.
struct Layout {
    column_of: Vec<u32>,
    group_row: Vec<u32>,
    rows: Vec<Vec<(u32, f64)>>,
    right: Vec<f64>,
    cost: Vec<f64>,
    base_value: f64,
}

impl Layout {
    fn new(index: &Index, relaxation: &Relaxation) -> Self {
        let mut layout = Self {
            column_of: vec![NONE; index.value.len()],
            group_row: vec![NONE; index.groups() as usize],
            rows: Vec::new(),
            right: Vec::new(),
            cost: Vec::new(),
            base_value: 0.0,
        };
        for group in 0..index.groups() {
            let vars = index.vars(group);
            let base = index.value[vars.start as usize];
            layout.base_value += base as f64;
            for var in vars.start + 1..vars.end {
                layout.column_of[var as usize] = layout.cost.len() as u32;
                layout.cost.push((base - index.value[var as usize]) as f64);
            }
        }
        for row in 0..relaxation.right.len() as u32 {
            layout.add_row(index, relaxation, row);
        }
        for group in 0..index.groups() {
            let vars = index.vars(group);
            if vars.len() > 2 {
                layout.group_row[group as usize] = layout.rows.len() as u32;
                let columns =
                    (vars.start + 1..vars.end).map(|var| (layout.column_of[var as usize], 1.0));
                layout.rows.push(columns.collect());
                layout.right.push(1.0);
            }
        }
        layout
    }

    /// An inequality with each group's first candidate expressed by the others.
    fn add_row(&mut self, index: &Index, relaxation: &Relaxation, row: u32) {
        let mut right = relaxation.right[row as usize] as f64;
        let mut terms = Vec::new();
        let group = |var: u32| index.group_of[var as usize];
        for run in relaxation.rows[row].chunk_by(|a, b| group(a.0) == group(b.0)) {
            let vars = index.vars(group(run[0].0));
            if run[0].0 != vars.start {
                terms
                    .extend(run.iter().map(|&(var, by)| (self.column_of[var as usize], by as f64)));
                continue;
            }
            let base = run[0].1;
            right -= base as f64;
            for var in vars.start + 1..vars.end {
                let by = run.iter().find(|term| term.0 == var).map_or(0, |term| term.1);
                if by != base {
                    terms.push((self.column_of[var as usize], (by - base) as f64));
                }
            }
        }
        if let Some(cap) = relaxation.cap[row as usize] {
            terms.push((self.cost.len() as u32, -1.0));
            self.cost.push(cap as f64);
        }
        self.rows.push(terms);
        self.right.push(right);
    }
}
