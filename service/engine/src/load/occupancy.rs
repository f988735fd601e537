//! Occupancy: flights inside a sector at a whole minute.

use std::ops::Range;

use super::cells::{Clock, Times};
use super::flight_load::FlightLoad;
use super::measure::{Measure, Places};
use crate::answer::{LoadMeasure, Place};
use crate::day::{Day, period_at};

/// Visits with in ≤ m < out, at each whole minute m at which the sector is open.
#[derive(Debug)]
pub(super) struct Occupancy;

impl Measure for Occupancy {
    fn kind(&self) -> LoadMeasure {
        LoadMeasure::Occupancy
    }

    fn places(&self) -> Places {
        Places::Sectors
    }

    fn clock(&self) -> Clock {
        Clock::Minutes
    }

    fn limit(&self, day: &Day, place: Place, from_s: f64, _until_s: f64) -> Option<f64> {
        let Place::Sector(sector) = place else { return None };
        period_at(&day.sectors[sector].open, from_s)?.limits.occupancy_limit
    }

    fn count(
        &self,
        day: &Day,
        times: Times,
        load: &FlightLoad,
        add: &mut dyn FnMut(Place, Range<i32>),
    ) {
        for visit in &load.visits {
            let open = &day.sectors[visit.sector].open;
            let first = open.partition_point(|period| period.until_s <= visit.in_s);
            for period in open[first..].iter().take_while(|p| p.from_s < visit.out_s) {
                let from_s = visit.in_s.max(period.from_s);
                let until_s = visit.out_s.min(period.until_s);
                add(Place::Sector(visit.sector), times.minutes_within(from_s, until_s));
            }
        }
    }
}
