//! Where to look: the legs of many versions, by place and level, in order of time.
//!
//! Earth-centred space is divided into cells, levels into slots of 1 000 ft; each cell and slot has
//! a list of the legs that reach into it, by their start. Two legs that may lose separation share a
//! list, and a question about any period, or any shift in time, reads a run of it. Without a map
//! there are no poles and no antimeridian.

use std::ops::Range;

use rayon::prelude::*;

use super::leg::{LONGEST_S, Leg};
use super::reach::{Ball, Reach, blocked_ft};

/// Owners whose legs are cut together.
const CHUNK: usize = 256;
/// Times in entries are counted from this on, seconds: times are within three days of the date, and
/// later or earlier ones, which a changed profile may reach, are taken as the last or first.
const EARLIEST_S: f64 = -2_000_000.0;
/// Steps of times in entries, a second.
const STEPS: f64 = 1024.0;
/// Unit of durations in entries, in steps: two seconds.
const LASTS_STEPS: u32 = 2048;

/// Legs of versions, numbered by owner and time.
#[derive(Debug, Clone, Default)]
pub(super) struct Index {
    legs: Vec<Leg>,
    /// Where the legs of each owner start; one more at the end.
    starts: Vec<u32>,
    grid: Grid,
    /// Where the list of each cell and slot starts in `entries`; one more at the end.
    lists: Vec<u32>,
    entries: Vec<Entry>,
    /// The start of every [`STRIDE`]th entry: small enough to stay in a cache when lists are
    /// searched by time.
    marks: Vec<u32>,
    widest_m: f32,
}

/// Entries from one mark to the next.
const STRIDE: usize = 16;

/// A leg in a list, with what most questions need of it: lists are read in sequence, legs at random.
#[derive(Debug, Clone, Copy, PartialEq)]
struct Entry {
    /// Its start above its number.
    key: u64,
    /// A packed ball around it, and below that how long it lasts.
    ball: u64,
}

/// A time in steps, rounded down.
fn steps(time_s: f64) -> u32 {
    ((time_s - EARLIEST_S) * STEPS) as u32
}

impl Entry {
    fn new(leg: &Leg, number: usize, cell: [i32; 3]) -> Self {
        let from = steps(leg.from_s);
        let lasts = (steps(leg.until_s) - from) / LASTS_STEPS + 1;
        let ball = Ball::packed(leg, cell) | u64::from(lasts.min(255));
        Self { key: u64::from(from) << 32 | number as u64, ball }
    }

    fn leg(self) -> usize {
        self.key as u32 as usize
    }

    fn from(self) -> u32 {
        (self.key >> 32) as u32
    }

    fn until(self) -> u32 {
        self.from().saturating_add(self.ball as u8 as u32 * LASTS_STEPS)
    }
}

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
            each_cell(reach.low, reach.high, |cell| {
                let position = grid.position(cell);
                if grid.cells[position] == EMPTY {
                    grid.cells[position] = grid.used;
                    grid.used += 1;
                }
            });
        }
        grid
    }

    fn position(&self, cell: [i32; 3]) -> usize {
        let at = |k: usize| (cell[k] - self.first[k]) as usize;
        (at(0) * self.counts[1] as usize + at(1)) * self.counts[2] as usize + at(2)
    }

    /// Calls `tell` with each list of the cells and slots of a reach, as far as there are any.
    #[inline]
    fn each_list(&self, reach: &Reach, mut tell: impl FnMut([i32; 3], i32, usize)) {
        let low = std::array::from_fn(|k| reach.low[k].max(self.first[k]));
        let high = std::array::from_fn(|k| reach.high[k].min(self.first[k] + self.counts[k] - 1));
        let first = reach.slots.0.max(self.first_slot);
        let last = reach.slots.1.min(self.first_slot + self.slots - 1);
        each_cell(low, high, |cell| {
            let number = self.cells[self.position(cell)];
            if number != EMPTY {
                let before = number as usize * self.slots as usize;
                for slot in first..=last {
                    tell(cell, slot, before + (slot - self.first_slot) as usize);
                }
            }
        });
    }

    fn used_cells(&self) -> Vec<([i32; 3], usize)> {
        let high = std::array::from_fn(|k| self.first[k] + self.counts[k] - 1);
        let mut used = Vec::with_capacity(self.used as usize);
        each_cell(self.first, high, |cell| {
            let number = self.cells[self.position(cell)];
            if number != EMPTY {
                used.push((cell, number as usize));
            }
        });
        used
    }
}

#[inline]
fn each_cell(low: [i32; 3], high: [i32; 3], mut tell: impl FnMut([i32; 3])) {
    for x in low[0]..=high[0] {
        for y in low[1]..=high[1] {
            for z in low[2]..=high[2] {
                tell([x, y, z]);
            }
        }
    }
}

/// The legs of consecutive owners.
#[derive(Default)]
struct Cut {
    legs: Vec<Leg>,
    reaches: Vec<Reach>,
    /// Number of legs of each owner.
    counts: Vec<u32>,
}

impl Cut {
    fn of(owners: Range<usize>, widest_m: f32, cut: impl Fn(usize, &mut Vec<Leg>)) -> Self {
        let (mut legs, mut counts) = (Vec::new(), Vec::with_capacity(owners.len()));
        for owner in owners {
            let before = legs.len();
            cut(owner, &mut legs);
            counts.push((legs.len() - before) as u32);
        }
        let reaches = legs.iter().map(|leg| Reach::of(leg, widest_m)).collect();
        Self { legs, reaches, counts }
    }
}

impl Index {
    /// Indexes the legs of owners numbered from 0 on, which `cut` appends; no horizontal minimum of
    /// theirs, or of what they are compared with, is larger than `widest_m`.
    pub(super) fn new(
        owners: usize,
        widest_m: f32,
        cut: impl Fn(usize, &mut Vec<Leg>) + Sync,
    ) -> Self {
        let chunks = owners.div_ceil(CHUNK);
        let chunk = |i: usize| i * CHUNK..owners.min((i + 1) * CHUNK);
        let cuts: Vec<Cut> = match chunks {
            0 => return Self::default(),
            1 => vec![Cut::of(chunk(0), widest_m, cut)],
            _ => (0..chunks).into_par_iter().map(|i| Cut::of(chunk(i), widest_m, &cut)).collect(),
        };
        let total: usize = cuts.iter().map(|cut| cut.legs.len()).sum();
        let mut cuts = cuts.into_iter();
        let mut all = cuts.next().unwrap_or_default();
        all.legs.reserve_exact(total - all.legs.len());
        all.reaches.reserve_exact(total - all.reaches.len());
        for cut in cuts {
            all.legs.extend_from_slice(&cut.legs);
            all.reaches.extend_from_slice(&cut.reaches);
            all.counts.extend_from_slice(&cut.counts);
        }
        let mut starts = Vec::with_capacity(owners + 1);
        let mut next = 0;
        starts.push(0);
        starts.extend(all.counts.iter().map(|count| {
            next += count;
            next
        }));
        let grid = Grid::around(&all.reaches);
        let (lists, entries) = fill(&grid, &all.legs, &all.reaches);
        let marks = entries.iter().step_by(STRIDE).map(|entry| entry.from()).collect();
        Self { legs: all.legs, starts, grid, lists, entries, marks, widest_m }
    }

    /// The legs of an owner, in order of time.
    pub(super) fn legs_of(&self, owner: u32) -> &[Leg] {
        &self.legs[self.numbers_of(owner)]
    }

    fn numbers_of(&self, owner: u32) -> Range<usize> {
        let owner = owner as usize;
        match self.starts.get(owner..owner + 2) {
            Some(&[start, end]) => start as usize..end as usize,
            _ => 0..0,
        }
    }

    /// Number of owners.
    pub(super) fn owners(&self) -> usize {
        self.starts.len().saturating_sub(1)
    }

    /// Number of legs.
    pub(super) fn len(&self) -> usize {
        self.legs.len()
    }

    /// Every leg whose time meets a period (and few others), and whose ball and levels meet those
    /// of a leg at whatever time that is flown, each once.
    #[inline]
    pub(super) fn near(&self, leg: &Leg, period_s: (f64, f64), mut visit: impl FnMut(&Leg)) {
        if self.legs.is_empty() {
            return;
        }
        let reach = Reach::of(leg, self.widest_m);
        let blocked = blocked_ft(leg);
        let earliest = steps(period_s.0 - LONGEST_S).saturating_sub(1);
        let (from, until) = (steps(period_s.0), steps(period_s.1));
        self.grid.each_list(&reach, |cell, slot, list| {
            let entries = self.list_from(list, earliest);
            let mut own = None;
            for &entry in entries.iter().take_while(|e| e.from() <= until) {
                let own = *own.get_or_insert_with(|| {
                    Ball::unpacked(Ball::packed(leg, cell)).widened(self.widest_m)
                });
                if !own.meets(&Ball::unpacked(entry.ball)) || entry.until() < from {
                    continue;
                }
                let other = &self.legs[entry.leg()];
                if meet(blocked, blocked_ft(other))
                    && reach.first_shared(&Reach::of(other, self.widest_m), cell, slot)
                {
                    visit(other);
                }
            }
        });
    }

    /// Every pair of legs of two owners that meet in time and whose balls and levels meet, each
    /// once. What is found is in an order that depends on the legs alone. Also how many pairs met
    /// in a list.
    pub(super) fn pairs<T: Send>(
        &self,
        tell: impl Fn(&Leg, &Leg, &mut Vec<T>) + Sync,
    ) -> (Vec<T>, u64) {
        let found: Vec<(Vec<T>, u64)> = self
            .grid
            .used_cells()
            .par_chunks(16)
            .map(|cells| {
                let (mut found, mut count) = (Vec::new(), 0);
                for &(cell, number) in cells {
                    let slots = self.grid.slots as usize;
                    let lists = number * slots..(number + 1) * slots;
                    for (slot, list) in (self.grid.first_slot..).zip(lists) {
                        count += self.pairs_in(cell, slot, list, &tell, &mut found);
                    }
                }
                (found, count)
            })
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
        for (i, &entry) in entries.iter().enumerate() {
            let ball = Ball::unpacked(entry.ball).widened(self.widest_m);
            let until = entry.until();
            // Made when another ball is met for the first time.
            let mut own = None;
            for &later in entries[i + 1..].iter().take_while(|e| e.from() <= until) {
                count += 1;
                if !ball.meets(&Ball::unpacked(later.ball)) {
                    continue;
                }
                let (leg, numbers, blocked) = own.get_or_insert_with(|| {
                    let leg = &self.legs[entry.leg()];
                    (leg, self.numbers_of(leg.owner), blocked_ft(leg))
                });
                // By number: to look into the leg is to wait for memory, and most are a flight's
                // own next ones.
                if numbers.contains(&later.leg()) {
                    continue;
                }
                let other = &self.legs[later.leg()];
                let widest_m = self.widest_m;
                if meet(*blocked, blocked_ft(other))
                    && Reach::of(leg, widest_m).first_shared(
                        &Reach::of(other, widest_m),
                        cell,
                        slot,
                    )
                {
                    tell(leg, other, found);
                }
            }
        }
        count
    }

    fn list(&self, list: usize) -> &[Entry] {
        &self.entries[self.lists[list] as usize..self.lists[list + 1] as usize]
    }

    /// A list from about a time on: few of its entries are earlier. Searched by marks: a search of
    /// the entries themselves misses the cache at every step, and was two thirds of the time in
    /// which one flight's losses are found.
    fn list_from(&self, list: usize, earliest: u32) -> &[Entry] {
        let (start, end) = (self.lists[list] as usize, self.lists[list + 1] as usize);
        let first_mark = start.div_ceil(STRIDE);
        let marks = self.marks.get(first_mark..end.div_ceil(STRIDE)).unwrap_or_default();
        let earlier = marks.partition_point(|&from| from < earliest);
        // From the last mark that is too early on.
        let from = if earlier == 0 { start } else { (first_mark + earlier - 1) * STRIDE };
        &self.entries[from..end]
    }
}

/// Whether two open intervals overlap.
fn meet(one: (f64, f64), other: (f64, f64)) -> bool {
    one.0 < other.1 && other.0 < one.1
}

/// Sorts legs into lists.
fn fill(grid: &Grid, legs: &[Leg], reaches: &[Reach]) -> (Vec<u32>, Vec<Entry>) {
    let mut lists = vec![0_u32; grid.used as usize * grid.slots as usize + 1];
    for reach in reaches {
        grid.each_list(reach, |_, _, list| lists[list + 1] += 1);
    }
    for list in 1..lists.len() {
        lists[list] += lists[list - 1];
    }
    let total = lists.last().map_or(0, |&n| n as usize);
    let mut entries = vec![Entry { key: 0, ball: 0 }; total];
    // A few flights are not worth waking other threads.
    let few = legs.len() < CHUNK * 32;
    let groups = if few { 1 } else { rayon::current_num_threads().clamp(1, 8) };
    let mut rest = entries.as_mut_slice();
    let mut parts = Vec::with_capacity(groups);
    let mut first = 0;
    for group in 1..=groups {
        let end = (total * group).div_ceil(groups) as u32;
        let last =
            if group == groups { lists.len() - 1 } else { lists.partition_point(|&n| n < end) };
        let last = last.max(first);
        let (part, after) = rest.split_at_mut((lists[last] - lists[first]) as usize);
        parts.push((first..last, part));
        (rest, first) = (after, last);
    }
    let fill = |(range, part): (Range<usize>, &mut [Entry])| {
        fill_part(grid, legs, reaches, &lists[range.start..=range.end], range.start, part);
    };
    if few {
        parts.into_iter().for_each(fill)
    } else {
        parts.into_par_iter().for_each(fill)
    }
    (lists, entries)
}

/// Fills consecutive lists, the first of which has a number, and sorts them.
fn fill_part(
    grid: &Grid,
    legs: &[Leg],
    reaches: &[Reach],
    lists: &[u32],
    first_list: usize,
    entries: &mut [Entry],
) {
    let Some((&before, ends)) = lists.split_first() else { return };
    let mut next = lists[..ends.len()].to_vec();
    for (number, (reach, leg)) in reaches.iter().zip(legs).enumerate() {
        let mut made: Option<([i32; 3], Entry)> = None;
        grid.each_list(reach, |cell, _, list| {
            let Some(next) = list.checked_sub(first_list).and_then(|i| next.get_mut(i)) else {
                return;
            };
            let entry = match made {
                Some((of, entry)) if of == cell => entry,
                _ => Entry::new(leg, number, cell),
            };
            made = Some((cell, entry));
            entries[(*next - before) as usize] = entry;
            *next += 1;
        });
    }
    for list in lists.windows(2) {
        let list = (list[0] - before) as usize..(list[1] - before) as usize;
        entries[list].sort_unstable_by_key(|entry| entry.key);
    }
}
