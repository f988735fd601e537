//! What a kind of count is.

use std::ops::Range;

use super::cells::{Clock, Times};
use super::flight_load::FlightLoad;
use super::{airports, entries, level_changes, occupancy};
use crate::answer::{LoadMeasure, Place};
use crate::day::Day;

/// A kind of count: where and when it is taken, what limits it, and what a flight adds to it.
pub trait Measure: Sync {
    /// Its name in answers.
    fn kind(&self) -> LoadMeasure;

    /// Where it is counted.
    fn places(&self) -> Places;

    /// When it is counted.
    fn clock(&self) -> Clock;

    /// The limit at a place in the window or at the minute `[from_s, until_s)`, if there is one.
    fn limit(&self, day: &Day, place: Place, from_s: f64, until_s: f64) -> Option<f64>;

    /// Whether a plan must keep the limit, or it is only shown.
    fn binds(&self) -> bool {
        true
    }

    /// Calls `add` with each place and the range of windows or minutes where a flight counts one.
    fn count(
        &self,
        day: &Day,
        times: Times,
        load: &FlightLoad,
        add: &mut dyn FnMut(Place, Range<i32>),
    );
}

/// Where a measure is counted.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Places {
    /// In every sector.
    Sectors,
    /// At every listed airport.
    Airports,
}

/// Every kind of count, in the order in which one place's are listed.
pub const MEASURES: &[&dyn Measure] = &[
    &entries::Entries,
    &occupancy::Occupancy,
    &level_changes::LevelChanges,
    &airports::Arrivals,
    &airports::Departures,
];
