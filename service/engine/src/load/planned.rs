//! The counts of a planned day, and what one more change would break.

use std::sync::Arc;

use super::allowed::exceeds;
use super::cells::{Cell, Counts};
use super::day_loads::{DayLoads, Difference, Series};
use super::runs::{Excess, merge_runs};
use crate::answer::{LoadMeasure, Overload};

/// The filed counts with the differences of some changed flights added.
#[derive(Debug, Clone)]
pub struct PlannedLoads {
    loads: Arc<DayLoads>,
    /// What is added to the filed counts, by series.
    added: Vec<Counts<i32>>,
}

impl PlannedLoads {
    /// The filed day: nothing is changed yet.
    #[must_use]
    pub fn new(loads: Arc<DayLoads>) -> Self {
        let added = vec![Counts::default(); loads.all_series().count()];
        Self { loads, added }
    }

    /// The filed day behind it.
    #[must_use]
    pub fn loads(&self) -> &DayLoads {
        &self.loads
    }

    /// Adds the differences of a changed flight.
    pub fn apply(&mut self, differences: &[Difference]) {
        for &(cell, amount) in differences {
            self.added[cell.series as usize].add(cell.index..cell.index + 1, amount);
        }
    }

    /// Takes the differences of a changed flight away again.
    pub fn undo(&mut self, differences: &[Difference]) {
        for &(cell, amount) in differences {
            self.added[cell.series as usize].add(cell.index..cell.index + 1, -amount);
        }
    }

    /// The planned count of a cell.
    #[must_use]
    pub fn count(&self, cell: Cell) -> f64 {
        self.loads.filed(cell) + f64::from(self.added(cell.series).at(cell.index))
    }

    pub(super) fn added(&self, series: u32) -> &Counts<i32> {
        &self.added[series as usize]
    }

    /// What one more change would break: runs of windows or minutes to which it adds and whose
    /// count would be more than is allowed (the limit, or the filed count where that is larger), by
    /// place, measure and time. The limit told is the one in force.
    #[must_use]
    pub fn violations(&self, differences: &[Difference]) -> Vec<Overload> {
        let mut found = Vec::new();
        for group in differences.chunk_by(|a, b| a.0.series == b.0.series) {
            let one = OneMore::new(self, group);
            one.over_limit(&mut found);
            one.lasting(&mut found);
        }
        found
    }

    /// The least room left over the windows and minutes to which one more change adds, with it
    /// added; negative where it breaks a limit, `None` where nothing is limited. Where only the
    /// duration of an occupancy is limited, the room is that of the minute of the run that has
    /// most.
    #[must_use]
    pub fn least_slack(&self, differences: &[Difference]) -> Option<f64> {
        let groups = differences.chunk_by(|a, b| a.0.series == b.0.series);
        groups
            .flat_map(|group| {
                let one = OneMore::new(self, group);
                let cells = one.additions().filter_map(|cell| {
                    one.series.allowed(cell.index).map(|most| most - one.count(cell.index))
                });
                let cells: Vec<f64> = cells.chain(one.lasting_rooms().map(|(_, r)| r)).collect();
                cells
            })
            .min_by(f64::total_cmp)
    }
}

/// One more change, in one series.
struct OneMore<'p> {
    planned: &'p PlannedLoads,
    series: &'p Series,
    number: u32,
    differences: &'p [Difference],
}

impl<'p> OneMore<'p> {
    /// `differences`: at least one, all of one series, rising.
    fn new(planned: &'p PlannedLoads, differences: &'p [Difference]) -> Self {
        let (cell, _) = differences[0];
        Self { planned, series: planned.loads.series(cell), number: cell.series, differences }
    }

    /// The count with the change added.
    fn count(&self, index: i32) -> f64 {
        let found = self.differences.binary_search_by_key(&index, |(cell, _)| cell.index);
        let more = found.map_or(0, |position| self.differences[position].1);
        let added = self.planned.added(self.number).at(index) + more;
        self.series.filed.at(index) + f64::from(added)
    }

    /// The cells that the change adds to.
    fn additions(&self) -> impl Iterator<Item = Cell> {
        self.differences.iter().filter(|&&(_, amount)| amount > 0).map(|&(cell, _)| cell)
    }

    fn over_limit(&self, found: &mut Vec<Overload>) {
        let excesses = self.additions().filter_map(|cell| {
            let (limit, most) =
                (self.series.binding_limit(cell.index)?, self.series.allowed(cell.index)?);
            let count = self.count(cell.index);
            exceeds(count, most).then_some(Excess { cell, count, limit })
        });
        let what = (self.series.place, self.series.kind(), self.series.clock());
        merge_runs(self.planned.loads.times(), what, excesses, found);
    }

    fn lasting(&self, found: &mut Vec<Overload>) {
        let lasting = &self.series.lasting;
        let excesses = self.lasting_rooms().filter_map(|(minute, room)| {
            let (count, limit) = (self.count(minute), lasting.limit(minute)?);
            let cell = Cell { series: self.number, index: minute };
            exceeds(0.0, room).then_some(Excess { cell, count, limit })
        });
        let what = (self.series.place, LoadMeasure::Lasting, self.series.clock());
        merge_runs(self.planned.loads.times(), what, excesses, found);
    }

    /// The minutes at which the change may make an overload last, rising, and the room there.
    fn lasting_rooms(&self) -> impl Iterator<Item = (i32, f64)> {
        let lasting = &self.series.lasting;
        let mut next = i32::MIN;
        let additions = self.additions().filter(move |_| !lasting.is_empty());
        additions
            .flat_map(move |cell| {
                let touched = lasting.touched_by(cell.index);
                let fresh = touched.start.max(next)..touched.end;
                next = touched.end;
                fresh
            })
            .filter_map(move |minute| {
                let filed = self.series.filed.at(minute);
                lasting.room(minute, filed, |m| self.count(m)).map(|room| (minute, room))
            })
    }
}
