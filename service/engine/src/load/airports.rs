//! Arrivals and departures of listed airports in 60-minute windows.

use std::ops::Range;

use super::cells::{Clock, Times};
use super::flight_load::FlightLoad;
use super::measure::{Measure, Places};
use crate::answer::{LoadMeasure, Place};
use crate::day::{Day, smallest_limit};

/// Flights whose last point is at the airport, by its time.
#[derive(Debug)]
pub(super) struct Arrivals;

impl Measure for Arrivals {
    fn kind(&self) -> LoadMeasure {
        LoadMeasure::Arrivals
    }

    fn places(&self) -> Places {
        Places::Airports
    }

    fn clock(&self) -> Clock {
        Clock::Windows
    }

    fn limit(&self, day: &Day, place: Place, from_s: f64, until_s: f64) -> Option<f64> {
        let Place::Airport(airport) = place else { return None };
        smallest_limit(&day.airports[airport].periods, from_s, until_s, |l| l.arrivals_per_hour)
    }

    fn count(
        &self,
        _day: &Day,
        times: Times,
        load: &FlightLoad,
        add: &mut dyn FnMut(Place, Range<i32>),
    ) {
        if let Some((airport, time_s)) = load.arrival {
            add(Place::Airport(airport), times.windows_around(time_s));
        }
    }
}

/// Flights whose first point is at the airport, by its time. A level change never alters it.
#[derive(Debug)]
pub(super) struct Departures;

impl Measure for Departures {
    fn kind(&self) -> LoadMeasure {
        LoadMeasure::Departures
    }

    fn places(&self) -> Places {
        Places::Airports
    }

    fn clock(&self) -> Clock {
        Clock::Windows
    }

    fn limit(&self, day: &Day, place: Place, from_s: f64, until_s: f64) -> Option<f64> {
        let Place::Airport(airport) = place else { return None };
        smallest_limit(&day.airports[airport].periods, from_s, until_s, |l| l.departures_per_hour)
    }

    fn binds(&self) -> bool {
        false
    }

    fn count(
        &self,
        _day: &Day,
        times: Times,
        load: &FlightLoad,
        add: &mut dyn FnMut(Place, Range<i32>),
    ) {
        if let Some((airport, time_s)) = load.departure {
            add(Place::Airport(airport), times.windows_around(time_s));
        }
    }
}
