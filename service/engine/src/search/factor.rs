//! A simplex basis as a product that is quick to solve with: sparse LU factors (Gilbert and Peierls
//! 1988, SIAM Journal on Scientific and Statistical Computing 9), after all that is triangular has
//! been peeled off, times one elementary matrix for every later exchange of a column (product form
//! of the inverse, Dantzig and Orchard-Hays 1954).

use std::cmp::Reverse;
use std::collections::BinaryHeap;

/// Sparse columns, end to end.
#[derive(Debug, Clone, Default)]
struct Columns {
    starts: Vec<usize>,
    entries: Vec<(u32, f64)>,
}

impl Columns {
    fn new() -> Self {
        Self { starts: vec![0], entries: Vec::new() }
    }

    fn close(&mut self) {
        self.starts.push(self.entries.len());
    }

    fn column(&self, position: usize) -> &[(u32, f64)] {
        &self.entries[self.starts[position]..self.starts[position + 1]]
    }

    fn len(&self) -> usize {
        self.starts.len() - 1
    }
}

/// Smaller entries are taken for zero.
const TINY: f64 = 1e-12;
/// A pivot below this makes the basis singular.
const SINGULAR: f64 = 1e-9;
/// A pivot is at least this share of the greatest entry of its column.
const STABLE: f64 = 0.1;

/// A factorised basis. Its rows are the inequalities; its *slots* are the positions of its columns.
#[derive(Debug, Clone)]
pub(super) struct Factor {
    size: usize,
    /// Pivot row and slot of every step.
    pivot_row: Vec<u32>,
    pivot_slot: Vec<u32>,
    diagonal: Vec<f64>,
    /// Steps with entries below the diagonal, and those entries by row.
    lower_step: Vec<u32>,
    lower: Columns,
    /// Entries above the diagonal, of each step's column and of each step's row, by step.
    upper: Columns,
    upper_rows: Columns,
    /// Later exchanges: slot, pivot, and the other entries of the entering column by slot.
    eta_slot: Vec<u32>,
    eta_pivot: Vec<f64>,
    eta: Columns,
    scratch: Vec<f64>,
}

const UNSET: u32 = u32::MAX;

impl Factor {
    /// Factorises. `columns` holds the entries (row, value) of every slot. Where the basis is
    /// singular, returns the slots that did not find a pivot, each with a row that is left over; the
    /// factors are then those of the basis with unit columns of these rows in these slots.
    pub(super) fn new(columns: &[Vec<(u32, f64)>]) -> (Self, Vec<(u32, u32)>) {
        let size = columns.len();
        let mut build = Build::new(columns);
        build.peel_columns();
        build.peel_rows();
        let patched = build.eliminate_rest();
        let mut factor = Self {
            size,
            pivot_row: build.pivot_row,
            pivot_slot: build.pivot_slot,
            diagonal: build.diagonal,
            lower_step: build.lower_step,
            lower: build.lower,
            upper_rows: transposed(&build.upper, size),
            upper: build.upper,
            eta_slot: Vec::new(),
            eta_pivot: Vec::new(),
            eta: Columns::new(),
            scratch: vec![0.0; size],
        };
        factor.scratch.fill(0.0);
        (factor, patched)
    }

    /// Exchanges made since the factors were computed.
    pub(super) fn updates(&self) -> usize {
        self.eta_slot.len()
    }

    /// Stored entries: what one solve costs at most, beside a few passes over the rows.
    pub(super) fn entries(&self) -> usize {
        self.lower.entries.len() + self.upper.entries.len() + self.eta.entries.len()
    }

    /// Solves B z = x: takes x by row, which is left zero, and gives z by slot.
    pub(super) fn solve(&self, x: &mut [f64], z: &mut [f64]) {
        for (position, &step) in self.lower_step.iter().enumerate() {
            let value = x[self.pivot_row[step as usize] as usize];
            if value != 0.0 {
                for &(row, entry) in self.lower.column(position) {
                    x[row as usize] -= entry * value;
                }
            }
        }
        for step in (0..self.size).rev() {
            let row = self.pivot_row[step] as usize;
            let mut value = x[row];
            x[row] = 0.0;
            if value.abs() < TINY {
                z[self.pivot_slot[step] as usize] = 0.0;
                continue;
            }
            value /= self.diagonal[step];
            z[self.pivot_slot[step] as usize] = value;
            for &(earlier, entry) in self.upper.column(step) {
                x[self.pivot_row[earlier as usize] as usize] -= entry * value;
            }
        }
        for (position, &slot) in self.eta_slot.iter().enumerate() {
            let value = z[slot as usize];
            if value != 0.0 {
                let value = value / self.eta_pivot[position];
                z[slot as usize] = value;
                for &(other, entry) in self.eta.column(position) {
                    z[other as usize] -= entry * value;
                }
            }
        }
    }

    /// Solves Bᵀ z = x: takes x by slot, which is overwritten, and gives z by row.
    pub(super) fn solve_transposed(&mut self, x: &mut [f64], z: &mut [f64]) {
        for (position, &slot) in self.eta_slot.iter().enumerate().rev() {
            let mut value = x[slot as usize];
            for &(other, entry) in self.eta.column(position) {
                value -= entry * x[other as usize];
            }
            x[slot as usize] = value / self.eta_pivot[position];
        }
        let mut by_step = std::mem::take(&mut self.scratch);
        for step in 0..self.size {
            by_step[step] = x[self.pivot_slot[step] as usize];
        }
        for step in 0..self.size {
            let mut value = by_step[step];
            if value.abs() < TINY {
                z[self.pivot_row[step] as usize] = 0.0;
                continue;
            }
            value /= self.diagonal[step];
            z[self.pivot_row[step] as usize] = value;
            for &(later, entry) in self.upper_rows.column(step) {
                by_step[later as usize] -= entry * value;
            }
        }
        self.scratch = by_step;
        for (position, &step) in self.lower_step.iter().enumerate().rev() {
            let row = self.pivot_row[step as usize] as usize;
            let mut value = z[row];
            for &(other, entry) in self.lower.column(position) {
                value -= entry * z[other as usize];
            }
            z[row] = value;
        }
    }

    /// Puts a new column into a slot, given B⁻¹ times it.
    pub(super) fn exchange(&mut self, slot: u32, solved: &[f64]) {
        self.eta_slot.push(slot);
        self.eta_pivot.push(solved[slot as usize]);
        let others =
            (0u32..).zip(solved).filter(|&(other, entry)| other != slot && entry.abs() > TINY);
        self.eta.entries.extend(others.map(|(other, &entry)| (other, entry)));
        self.eta.close();
    }
}

fn transposed(columns: &Columns, size: usize) -> Columns {
    let mut starts = vec![0; size + 1];
    for &(row, _) in &columns.entries {
        starts[row as usize + 1] += 1;
    }
    for row in 0..size {
        starts[row + 1] += starts[row];
    }
    let mut next = starts.clone();
    let mut entries = vec![(0, 0.0); columns.entries.len()];
    for column in 0..columns.len() {
        for &(row, entry) in columns.column(column) {
            entries[next[row as usize]] = (column as u32, entry);
            next[row as usize] += 1;
        }
    }
    Columns { starts, entries }
}

/// Factorisation under way.
struct Build<'c> {
    columns: &'c [Vec<(u32, f64)>],
    slots_of_row: Vec<Vec<u32>>,
    /// Entries of a slot in rows without a pivot, and of a row in slots without one.
    slot_count: Vec<u32>,
    row_count: Vec<u32>,
    step_of_row: Vec<u32>,
    step_of_slot: Vec<u32>,
    pivot_row: Vec<u32>,
    pivot_slot: Vec<u32>,
    diagonal: Vec<f64>,
    lower_step: Vec<u32>,
    lower: Columns,
    lower_of_step: Vec<u32>,
    upper: Columns,
}

impl<'c> Build<'c> {
    fn new(columns: &'c [Vec<(u32, f64)>]) -> Self {
        let size = columns.len();
        let mut slots_of_row = vec![Vec::new(); size];
        for (slot, column) in (0u32..).zip(columns) {
            for &(row, _) in column {
                slots_of_row[row as usize].push(slot);
            }
        }
        Self {
            columns,
            slot_count: columns.iter().map(|column| column.len() as u32).collect(),
            row_count: slots_of_row.iter().map(|slots| slots.len() as u32).collect(),
            slots_of_row,
            step_of_row: vec![UNSET; size],
            step_of_slot: vec![UNSET; size],
            pivot_row: Vec::with_capacity(size),
            pivot_slot: Vec::with_capacity(size),
            diagonal: Vec::with_capacity(size),
            lower_step: Vec::new(),
            lower: Columns::new(),
            lower_of_step: Vec::with_capacity(size),
            upper: Columns::new(),
        }
    }

    /// Makes a pivot and counts down what it touches.
    fn pivot(&mut self, row: u32, slot: u32, diagonal: f64) {
        let step = self.pivot_row.len() as u32;
        self.step_of_row[row as usize] = step;
        self.step_of_slot[slot as usize] = step;
        self.pivot_row.push(row);
        self.pivot_slot.push(slot);
        self.diagonal.push(diagonal);
        for &other in &self.slots_of_row[row as usize] {
            self.slot_count[other as usize] -= 1;
        }
        for &(other, _) in &self.columns[slot as usize] {
            self.row_count[other as usize] -= 1;
        }
    }

    /// Stores an untouched column: what lies in rows that have a pivot goes above the diagonal,
    /// the rest, divided by the pivot, below.
    fn store(&mut self, row: u32, slot: u32) -> f64 {
        let columns = self.columns;
        let mut diagonal = 0.0;
        for &(other, entry) in &columns[slot as usize] {
            let step = self.step_of_row[other as usize];
            if other == row {
                diagonal = entry;
            } else if step != UNSET {
                self.upper.entries.push((step, entry));
            }
        }
        self.upper.close();
        let before = self.lower.entries.len();
        for &(other, entry) in &columns[slot as usize] {
            if other != row && self.step_of_row[other as usize] == UNSET {
                self.lower.entries.push((other, entry / diagonal));
            }
        }
        self.close_lower(before);
        diagonal
    }

    fn close_lower(&mut self, before: usize) {
        if self.lower.entries.len() > before {
            self.lower_of_step.push(self.lower_step.len() as u32);
            self.lower_step.push(self.lower_of_step.len() as u32 - 1);
            self.lower.close();
        } else {
            self.lower_of_step.push(UNSET);
        }
    }

    /// Pivots on columns with a single entry in the rows left, as long as there are any.
    fn peel_columns(&mut self) {
        let size = self.columns.len() as u32;
        let mut queue: Vec<u32> =
            (0..size).rev().filter(|&slot| self.slot_count[slot as usize] == 1).collect();
        while let Some(slot) = queue.pop() {
            if self.step_of_slot[slot as usize] != UNSET || self.slot_count[slot as usize] != 1 {
                continue;
            }
            let entries = self.columns[slot as usize].iter();
            let mut open = entries.filter(|&&(row, _)| self.step_of_row[row as usize] == UNSET);
            let Some(&(row, entry)) = open.next() else { continue };
            if entry.abs() < SINGULAR {
                continue;
            }
            let diagonal = self.store(row, slot);
            self.pivot(row, slot, diagonal);
            for &other in &self.slots_of_row[row as usize] {
                if self.slot_count[other as usize] == 1 {
                    queue.push(other);
                }
            }
        }
    }

    /// Pivots on rows with a single entry in the columns left, as long as there are any.
    fn peel_rows(&mut self) {
        let size = self.columns.len() as u32;
        let single = |build: &Self, row: u32| {
            build.row_count[row as usize] == 1 && build.step_of_row[row as usize] == UNSET
        };
        let mut queue: Vec<u32> = (0..size).rev().filter(|&row| single(self, row)).collect();
        while let Some(row) = queue.pop() {
            if !single(self, row) {
                continue;
            }
            let mut open = self.slots_of_row[row as usize].iter().copied();
            let Some(slot) = open.find(|&slot| self.step_of_slot[slot as usize] == UNSET) else {
                continue;
            };
            let column = &self.columns[slot as usize];
            let entry = column.iter().find(|entry| entry.0 == row).map_or(0.0, |entry| entry.1);
            let greatest = column.iter().map(|entry| entry.1.abs()).fold(0.0, f64::max);
            if entry.abs() < STABLE * greatest || entry.abs() < SINGULAR {
                continue;
            }
            let diagonal = self.store(row, slot);
            self.pivot(row, slot, diagonal);
            let columns = self.columns;
            queue.extend(
                columns[slot as usize]
                    .iter()
                    .map(|&(other, _)| other)
                    .filter(|&other| single(self, other)),
            );
        }
    }

    /// Eliminates the columns that are left, shortest first.
    fn eliminate_rest(&mut self) -> Vec<(u32, u32)> {
        let size = self.columns.len();
        let open = |step: &u32| *step == UNSET;
        let mut rest: Vec<u32> =
            (0..size as u32).filter(|&slot| open(&self.step_of_slot[slot as usize])).collect();
        rest.sort_by_key(|&slot| (self.slot_count[slot as usize], slot));
        let mut x = vec![0.0; size];
        let mut failed = Vec::new();
        for slot in rest {
            let touched = self.eliminate(slot, &mut x);
            if !self.pivot_on_best(slot, &touched, &mut x) {
                failed.push(slot);
            }
        }
        let free: Vec<u32> =
            (0..size as u32).filter(|&row| open(&self.step_of_row[row as usize])).collect();
        for (&slot, &row) in failed.iter().zip(&free) {
            self.upper.close();
            self.close_lower(self.lower.entries.len());
            self.step_of_row[row as usize] = self.pivot_row.len() as u32;
            self.pivot_row.push(row);
            self.pivot_slot.push(slot);
            self.diagonal.push(1.0);
        }
        failed.into_iter().zip(free).collect()
    }

    /// Applies all earlier steps to a column; returns the rows that it then has entries in.
    fn eliminate(&self, slot: u32, x: &mut [f64]) -> Vec<u32> {
        let mut touched = Vec::new();
        let mut steps = BinaryHeap::new();
        let mut touch = |row: u32, steps: &mut BinaryHeap<Reverse<u32>>| {
            touched.push(row);
            let step = self.step_of_row[row as usize];
            if step != UNSET && self.lower_of_step[step as usize] != UNSET {
                steps.push(Reverse(step));
            }
        };
        for &(row, entry) in &self.columns[slot as usize] {
            touch(row, &mut steps);
            x[row as usize] = entry;
        }
        let mut last = UNSET;
        while let Some(Reverse(step)) = steps.pop() {
            if step == last {
                continue;
            }
            last = step;
            let value = x[self.pivot_row[step as usize] as usize];
            for &(row, entry) in self.lower.column(self.lower_of_step[step as usize] as usize) {
                if x[row as usize] == 0.0 {
                    touch(row, &mut steps);
                }
                x[row as usize] -= entry * value;
            }
        }
        touched.sort_unstable();
        touched.dedup();
        touched
    }

    fn pivot_on_best(&mut self, slot: u32, touched: &[u32], x: &mut [f64]) -> bool {
        let open = |row: &&u32| self.step_of_row[**row as usize] == UNSET;
        let greatest =
            touched.iter().filter(open).map(|&row| x[row as usize].abs()).fold(0.0, f64::max);
        let stable = |row: &&u32| x[**row as usize].abs() >= STABLE * greatest;
        let best = touched
            .iter()
            .filter(open)
            .filter(stable)
            .min_by_key(|&&row| (self.row_count[row as usize], row));
        let best = best.copied().filter(|_| greatest >= SINGULAR);
        if let Some(pivot_row) = best {
            let diagonal = x[pivot_row as usize];
            let before = self.lower.entries.len();
            for &row in touched {
                let entry = x[row as usize];
                let step = self.step_of_row[row as usize];
                if row == pivot_row || entry.abs() < TINY {
                    continue;
                } else if step == UNSET {
                    self.lower.entries.push((row, entry / diagonal));
                } else {
                    self.upper.entries.push((step, entry));
                }
            }
            self.upper.close();
            self.close_lower(before);
            self.pivot(pivot_row, slot, diagonal);
        }
        for &row in touched {
            x[row as usize] = 0.0;
        }
        best.is_some()
    }
}

#[cfg(test)]
mod tests {
    use rand::{RngExt, SeedableRng};
    use rand_pcg::Pcg64;

    use super::*;

    /// B times what was solved for gives back the right side, also after exchanges of columns.
    #[test]
    fn solutions_solve() {
        let mut rng = Pcg64::seed_from_u64(1);
        for size in 1..60 {
            let mut columns: Vec<Vec<(u32, f64)>> =
                (0..size).map(|slot| random_column(&mut rng, size, slot)).collect();
            let (mut factor, patched) = Factor::new(&columns);
            for (slot, row) in patched {
                columns[slot as usize] = vec![(row, 1.0)];
            }
            for _ in 0..5 {
                assert_solves(&mut rng, &mut factor, &columns);
                let slot = rng.random_range(0..size);
                let column = random_column(&mut rng, size, slot);
                let solved = solve(&factor, &column, size as usize);
                if solved[slot as usize].abs() > 0.01 {
                    factor.exchange(slot, &solved);
                    columns[slot as usize] = column;
                }
            }
        }
    }

    fn random_column(rng: &mut Pcg64, size: u32, slot: u32) -> Vec<(u32, f64)> {
        let mut column = vec![(slot, rng.random_range(1.0..3.0))];
        for _ in 0..rng.random_range(0..4) {
            column.push((rng.random_range(0..size), rng.random_range(-2.0..2.0)));
        }
        column.sort_by_key(|entry| entry.0);
        column.dedup_by_key(|entry| entry.0);
        column
    }

    fn solve(factor: &Factor, column: &[(u32, f64)], size: usize) -> Vec<f64> {
        let (mut x, mut z) = (vec![0.0; size], vec![0.0; size]);
        for &(row, entry) in column {
            x[row as usize] = entry;
        }
        factor.solve(&mut x, &mut z);
        z
    }

    fn assert_solves(rng: &mut Pcg64, factor: &mut Factor, columns: &[Vec<(u32, f64)>]) {
        let size = columns.len();
        let right: Vec<f64> = (0..size).map(|_| rng.random_range(-1.0..1.0)).collect();
        let mut z = vec![0.0; size];
        factor.solve(&mut right.clone(), &mut z);
        let mut product = vec![0.0; size];
        for (column, value) in columns.iter().zip(&z) {
            column.iter().for_each(|&(row, entry)| product[row as usize] += entry * value);
        }
        assert_close(&product, &right);
        factor.solve_transposed(&mut right.clone(), &mut z);
        let dot = |column: &Vec<(u32, f64)>| {
            column.iter().map(|&(row, entry)| entry * z[row as usize]).sum()
        };
        assert_close(&columns.iter().map(dot).collect::<Vec<f64>>(), &right);
    }

    fn assert_close(a: &[f64], b: &[f64]) {
        for (a, b) in a.iter().zip(b) {
            assert!((a - b).abs() < 1e-6, "{a} {b}");
        }
    }
}
