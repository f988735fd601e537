//! Level-change workload: climbs and descents begun inside a sector in a 60-minute window.

use std::ops::Range;

use super::cells::{Clock, Times};
use super::flight_load::FlightLoad;
use super::measure::{Measure, Places};
use crate::answer::{LoadMeasure, Place};
use crate::day::{Day, smallest_limit};

/// Maximal climbs and descents, filed ones included, begun while the sector is open.
#[derive(Debug)]
pub(super) struct LevelChanges;

impl Measure for LevelChanges {
    fn kind(&self) -> LoadMeasure {
        LoadMeasure::LevelChanges
    }

    fn places(&self) -> Places {
        Places::Sectors
    }

    fn clock(&self) -> Clock {
        Clock::Windows
    }

    fn limit(&self, day: &Day, place: Place, from_s: f64, until_s: f64) -> Option<f64> {
        let Place::Sector(sector) = place else { return None };
        smallest_limit(&day.sectors[sector].open, from_s, until_s, |l| l.level_changes_per_hour)
    }

    fn count(
        &self,
        day: &Day,
        times: Times,
        load: &FlightLoad,
        add: &mut dyn FnMut(Place, Range<i32>),
    ) {
        for change in &load.level_changes {
            if day.sectors[change.sector].is_open(change.begin_s) {
                add(Place::Sector(change.sector), times.windows_around(change.begin_s));
            }
        }
    }
}
