//! Rows for reports: every count beside its limit, and every run of overload.

use std::ops::Range;

use super::allowed::exceeds;
use super::cells::{Cell, Clock};
use super::day_loads::Series;
use super::planned::PlannedLoads;
use super::runs::{Excess, merge_runs};
use crate::answer::{LoadCount, LoadMeasure, Overload};

impl PlannedLoads {
    /// Filed and planned counts by place, measure and time, wherever either has traffic. An
    /// occupancy row has the greatest minute of the slice that starts where a window does, and the
    /// smallest limit in force in it.
    #[must_use]
    pub fn load_counts(&self) -> Vec<LoadCount> {
        let mut rows = Vec::new();
        for (number, series) in self.loads().all_series() {
            match series.clock() {
                Clock::Windows => self.window_rows(number, series, &mut rows),
                Clock::Minutes => self.slice_rows(number, series, &mut rows),
            }
        }
        rows
    }

    /// Where the planned counts are above the limits, whether the plan or the filed day made them
    /// so: one a run of windows or minutes, by place, measure and time.
    #[must_use]
    pub fn overloads(&self) -> Vec<Overload> {
        let times = self.loads().times();
        let mut found = Vec::new();
        for (number, series) in self.loads().all_series() {
            let count = |index| self.count(Cell { series: number, index });
            let range = self.traffic_range(number, series);
            let excesses = range.clone().filter_map(|index| {
                let (count, limit) = (count(index), series.limits.at(index)?);
                let cell = Cell { series: number, index };
                exceeds(count, limit).then_some(Excess { cell, count, limit })
            });
            merge_runs(times, (series.place, series.kind(), series.clock()), excesses, &mut found);
            let lasting = series.lasting.overloads(range, count);
            let excesses = lasting.into_iter().filter_map(|minute| {
                let (count, limit) = (count(minute), series.lasting.limit(minute)?);
                Some(Excess { cell: Cell { series: number, index: minute }, count, limit })
            });
            let what = (series.place, LoadMeasure::Lasting, series.clock());
            merge_runs(times, what, excesses, &mut found);
        }
        found
    }

    fn window_rows(&self, number: u32, series: &Series, rows: &mut Vec<LoadCount>) {
        for index in self.traffic_range(number, series) {
            let filed = series.filed.at(index);
            let planned = self.count(Cell { series: number, index });
            if filed > 0.0 || planned > 0.0 {
                rows.push(LoadCount {
                    place: series.place,
                    measure: series.kind(),
                    window_start_s: self.loads().times().start_s(series.clock(), index),
                    filed,
                    planned,
                    limit: series.limits.at(index),
                });
            }
        }
    }

    fn slice_rows(&self, number: u32, series: &Series, rows: &mut Vec<LoadCount>) {
        let times = self.loads().times();
        let minutes = self.traffic_range(number, series);
        if minutes.is_empty() {
            return;
        }
        for slice in times.slice_of(minutes.start)..=times.slice_of(minutes.end - 1) {
            let (mut filed, mut planned, mut limit) = (0.0_f64, 0.0_f64, None::<f64>);
            for index in times.slice_minutes(slice) {
                filed = filed.max(series.filed.at(index));
                planned = planned.max(self.count(Cell { series: number, index }));
                if let Some(at) = series.limits.at(index) {
                    limit = Some(limit.map_or(at, |smallest| smallest.min(at)));
                }
            }
            if filed > 0.0 || planned > 0.0 {
                let window_start_s = times.start_s(Clock::Windows, slice);
                let (place, measure) = (series.place, series.kind());
                rows.push(LoadCount { place, measure, window_start_s, filed, planned, limit });
            }
        }
    }

    /// Windows or minutes outside which there is neither filed nor planned traffic.
    fn traffic_range(&self, number: u32, series: &Series) -> Range<i32> {
        let (filed, added) = (series.filed.range(), self.added(number).range());
        match (filed.is_empty(), added.is_empty()) {
            (_, true) => filed,
            (true, false) => added,
            _ => filed.start.min(added.start)..filed.end.max(added.end),
        }
    }
}
