//! Entries: visits that begin in a 60-minute window.

use std::ops::Range;

use super::cells::{Clock, Times};
use super::flight_load::FlightLoad;
use super::measure::{Measure, Places};
use crate::answer::{LoadMeasure, Place};
use crate::day::{Day, smallest_limit};

/// Visits whose entry time lies in the window, if the sector is open then; opening is no entry.
#[derive(Debug)]
pub(super) struct Entries;

impl Measure for Entries {
    fn kind(&self) -> LoadMeasure {
        LoadMeasure::Entries
    }

    fn places(&self) -> Places {
        Places::Sectors
    }

    fn clock(&self) -> Clock {
        Clock::Windows
    }

    fn limit(&self, day: &Day, place: Place, from_s: f64, until_s: f64) -> Option<f64> {
        let Place::Sector(sector) = place else { return None };
        smallest_limit(&day.sectors[sector].open, from_s, until_s, |l| l.entries_per_hour)
    }

    fn count(
        &self,
        day: &Day,
        times: Times,
        load: &FlightLoad,
        add: &mut dyn FnMut(Place, Range<i32>),
    ) {
        for visit in &load.visits {
            if day.sectors[visit.sector].is_open(visit.in_s) {
                add(Place::Sector(visit.sector), times.windows_around(visit.in_s));
            }
        }
    }
}
