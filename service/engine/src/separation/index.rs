//! Where to look: the legs of many versions, by place and level, in order of time.
//!
//! Earth-centred space is divided into cells, levels into slots of 1 000 ft; each cell and slot has
//! a list of the legs that reach into it, by their start. Two legs that may lose separation share a
//! list, and a question about any period, or any shift in time, reads a run of it. Without a map
//! there are no poles and no antimeridian.

use std::ops::Range;

use rayon::prelude::*;

use super::leg::{LONGEST_S, Leg};
use super::reach::{Bounds, Reach};

/// Legs of versions, numbered by owner and time.
#[derive(Debug, Clone, Default)]
pub(super) struct Index {
    legs: Vec<Leg>,
    bounds: Vec<Bounds>,
    /// Where the legs of each owner start; one more at the end.
    starts: Vec<u32>,
    grid: Grid,
    /// Where the list of each cell and slot starts in `entries`; one more at the end.
    lists: Vec<u32>,
    entries: Vec<Entry>,
    widest_m: f32,
}

/// A leg in a list: its start, as bits that sort like it, above its number.
type Entry = u64;

/// Dense numbers for the cells that hold anything.
#[derive(Debug, Clone, Default)]
struct Grid {
    first: [i32; 3],
    counts: [i32; 3],
    /// Numbers of cells; [`EMPTY`] for those that hold nothing.
    cells: Vec<u32>,
    used: u32,
    first_slot: i32,
    slots: i32,
}

const EMPTY: u32 = u32::MAX;

impl Grid {
    fn around(reaches: &[Reach]) -> Self {
        let mut low = [i32::MAX; 3];
        let mut high = [i32::MIN; 3];
        let (mut first_slot, mut last_slot) = (i32::MAX, i32::MIN);
        for reach in reaches {
            for k in 0..3 {
                low[k] = low[k].min(reach.low[k]);
                high[k] = high[k].max(reach.high[k]);
            }
            first_slot = first_slot.min(reach.slots.0);
            last_slot = last_slot.max(reach.slots.1);
        }
        if reaches.is_empty() {
            return Self::default();
        }
        let counts: [i32; 3] = std::array::from_fn(|k| high[k] - low[k] + 1);
        let cells = vec![EMPTY; counts.iter().map(|&n| n as usize).product()];
        let slots = last_slot - first_slot + 1;
        let mut grid = Self { first: low, counts, cells, used: 0, first_slot, slots };
        for reach in reaches {
            for cell in cells_of(reach.low, reach.high) {
                let number = &mut grid.cells[position(grid.first, grid.counts, cell)];
                if *number == EMPTY {
                    *number = grid.used;
                    grid.used += 1;
                }
            }
        }
        grid
    }

    /// The lists of a cell that lie in slots, with the first of these slots.
    fn lists(&self, cell: [i32; 3], slots: (i32, i32)) -> Option<(Range<usize>, i32)> {
        let number = self.cells[position(self.first, self.counts, cell)];
        let first = slots.0.max(self.first_slot);
        let last = slots.1.min(self.first_slot + self.slots - 1);
        (number != EMPTY && first <= last).then(|| {
            let start = number as usize * self.slots as usize + (first - self.first_slot) as usize;
            (start..start + (last - first + 1) as usize, first)
        })
    }

    /// The part of a range of cells that lies in the grid.
    fn clipped(&self, reach: &Reach) -> ([i32; 3], [i32; 3]) {
        let low = std::array::from_fn(|k| reach.low[k].max(self.first[k]));
        let high = std::array::from_fn(|k| reach.high[k].min(self.first[k] + self.counts[k] - 1));
        (low, high)
    }
}

fn position(first: [i32; 3], counts: [i32; 3], cell: [i32; 3]) -> usize {
    let at = |k: usize| (cell[k] - first[k]) as usize;
    (at(0) * counts[1] as usize + at(1)) * counts[2] as usize + at(2)
}

fn cells_of(low: [i32; 3], high: [i32; 3]) -> impl Iterator<Item = [i32; 3]> {
    (low[0]..=high[0]).flat_map(move |x| {
        (low[1]..=high[1]).flat_map(move |y| (low[2]..=high[2]).map(move |z| [x, y, z]))
    })
}

/// Bits that sort like the number.
fn sortable(x: f32) -> u32 {
    let bits = x.to_bits();
    if bits >> 31 == 0 { bits | 1 << 31 } else { !bits }
}

fn entry(from_s: f32, leg: usize) -> Entry {
    u64::from(sortable(from_s)) << 32 | leg as u64
}

impl Index {
    /// Indexes the legs of owners numbered from 0 on; no horizontal minimum of theirs, or of what
    /// they are compared with, is larger than `widest_m`.
    pub(super) fn new(by_owner: &[Vec<Leg>], widest_m: f32) -> Self {
        let mut starts = Vec::with_capacity(by_owner.len() + 1);
        let mut legs = Vec::with_capacity(by_owner.iter().map(Vec::len).sum());
        for own in by_owner {
            starts.push(legs.len() as u32);
            legs.extend_from_slice(own);
        }
        starts.push(legs.len() as u32);
        let bounds: Vec<Bounds> = legs.par_iter().map(Bounds::of).collect();
        let reaches: Vec<Reach> =
            (&legs, &bounds).into_par_iter().map(|(l, b)| Reach::of(l, b, widest_m)).collect();
        let grid = Grid::around(&reaches);
        let (lists, entries) = fill(&grid, &bounds, &reaches);
        Self { legs, bounds, starts, grid, lists, entries, widest_m }
    }

    /// The legs of an owner, in order of time.
    pub(super) fn legs_of(&self, owner: u32) -> &[Leg] {
        let at = |i: usize| self.starts.get(i).copied().unwrap_or(0) as usize;
        let owner = owner as usize;
        if owner + 1 < self.starts.len() { &self.legs[at(owner)..at(owner + 1)] } else { &[] }
    }

    /// Number of owners.
    pub(super) fn owners(&self) -> usize {
        self.starts.len().saturating_sub(1)
    }

    /// Number of legs.
    pub(super) fn len(&self) -> usize {
        self.legs.len()
    }

    /// Every leg whose time meets a period (and few others), and whose bounds meet those of a leg
    /// at whatever time that is flown, each once.
    pub(super) fn near(&self, leg: &Leg, period_s: (f64, f64), mut visit: impl FnMut(&Leg)) {
        if self.legs.is_empty() {
            return;
        }
        let bounds = Bounds::of(leg);
        let reach = Reach::of(leg, &bounds, self.widest_m);
        let (low, high) = self.grid.clipped(&reach);
        let [earliest, from, until] =
            [period_s.0 - LONGEST_S, period_s.0, period_s.1].map(|s| s as f32);
        let (earliest, from, until) =
            (earliest.next_down().next_down(), from.next_down(), until.next_up());
        for cell in cells_of(low, high) {
            let Some((lists, first_slot)) = self.grid.lists(cell, reach.slots) else { continue };
            for (slot, list) in (first_slot..).zip(lists) {
                let entries = self.list(list);
                let start = entries.partition_point(|&e| e < entry(earliest, 0));
                for &e in &entries[start..] {
                    let number = e as u32 as usize;
                    let other = &self.bounds[number];
                    if other.from_s > until {
                        break;
                    }
                    if other.until_s < from || !bounds.meets(other, self.widest_m) {
                        continue;
                    }
                    let other_leg = &self.legs[number];
                    let other_reach = Reach::of(other_leg, other, self.widest_m);
                    if reach.first_shared(&other_reach, cell, slot) {
                        visit(other_leg);
                    }
                }
            }
        }
    }

    /// Every pair of legs that meet in time and whose bounds meet, each once, told in parallel by
    /// cell; what is found is in no particular order. `count` is told how many pairs met in time.
    pub(super) fn pairs<T: Send>(
        &self,
        tell: impl Fn(&Leg, &Leg, &mut Vec<T>) + Sync,
    ) -> (Vec<T>, u64) {
        let cells: Vec<([i32; 3], u32)> = self.used_cells();
        let found: Vec<(Vec<T>, u64)> = cells
            .par_iter()
            .with_min_len(16)
            .fold(
                || (Vec::new(), 0),
                |mut found, &(cell, number)| {
                    let slots = self.grid.slots as usize;
                    let first = number as usize * slots;
                    for (slot, list) in (self.grid.first_slot..).zip(first..first + slots) {
                        found.1 += self.pairs_in(cell, slot, list, &tell, &mut found.0);
                    }
                    found
                },
            )
            .collect();
        let count = found.iter().map(|(_, n)| n).sum();
        (found.into_iter().flat_map(|(found, _)| found).collect(), count)
    }

    fn pairs_in<T>(
        &self,
        cell: [i32; 3],
        slot: i32,
        list: usize,
        tell: &impl Fn(&Leg, &Leg, &mut Vec<T>),
        found: &mut Vec<T>,
    ) -> u64 {
        let entries = self.list(list);
        let mut count = 0;
        for (i, &e) in entries.iter().enumerate() {
            let number = e as u32 as usize;
            let bounds = &self.bounds[number];
            // All that begin before this one ends.
            let end = entry(bounds.until_s.next_up(), 0);
            for &later in entries[i + 1..].iter().take_while(|&&later| later < end) {
                count += 1;
                let other_number = later as u32 as usize;
                let other_bounds = &self.bounds[other_number];
                if !bounds.meets(other_bounds, self.widest_m) {
                    continue;
                }
                let (leg, other) = (&self.legs[number], &self.legs[other_number]);
                let reach = Reach::of(leg, bounds, self.widest_m);
                let other_reach = Reach::of(other, other_bounds, self.widest_m);
                if leg.owner != other.owner && reach.first_shared(&other_reach, cell, slot) {
                    tell(leg, other, found);
                }
            }
        }
        count
    }

    fn list(&self, list: usize) -> &[Entry] {
        &self.entries[self.lists[list] as usize..self.lists[list + 1] as usize]
    }

    fn used_cells(&self) -> Vec<([i32; 3], u32)> {
        let Grid { first, counts, cells, .. } = &self.grid;
        let high = std::array::from_fn(|k| first[k] + counts[k] - 1);
        let numbered = cells_of(*first, high).zip(cells.iter().copied());
        numbered.filter(|&(_, number)| number != EMPTY).collect()
    }
}

/// Sorts legs into lists.
fn fill(grid: &Grid, bounds: &[Bounds], reaches: &[Reach]) -> (Vec<u32>, Vec<Entry>) {
    let mut lists = vec![0_u32; grid.used as usize * grid.slots as usize + 1];
    let lists_of = |reach: &Reach| {
        let slots = reach.slots;
        let cells = cells_of(reach.low, reach.high);
        cells.filter_map(move |cell| grid.lists(cell, slots)).flat_map(|(lists, _)| lists)
    };
    for reach in reaches {
        for list in lists_of(reach) {
            lists[list + 1] += 1;
        }
    }
    for list in 1..lists.len() {
        lists[list] += lists[list - 1];
    }
    let total = lists.last().map_or(0, |&n| n as usize);
    let mut entries = vec![0; total];
    let mut next = lists.clone();
    for (number, (reach, bounds)) in reaches.iter().zip(bounds).enumerate() {
        for list in lists_of(reach) {
            entries[next[list] as usize] = entry(bounds.from_s, number);
            next[list] += 1;
        }
    }
    let mut rest = entries.as_mut_slice();
    let mut parts = Vec::with_capacity(grid.used as usize);
    for cell in lists.windows(grid.slots.max(1) as usize + 1).step_by(grid.slots.max(1) as usize) {
        let (part, after) = rest.split_at_mut((cell[cell.len() - 1] - cell[0]) as usize);
        parts.push((cell, part));
        rest = after;
    }
    parts.into_par_iter().for_each(|(cell, part)| {
        for list in cell.windows(2) {
            part[(list[0] - cell[0]) as usize..(list[1] - cell[0]) as usize].sort_unstable();
        }
    });
    (lists, entries)
}
