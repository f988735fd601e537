//! A flight as the program makes it, and its cruise runs.

use crate::{levels, profile::Point, route};

/// A filed flight.
#[derive(Debug, Clone)]
pub struct Flight {
    /// Unique name.
    pub flight: String,
    /// Radio callsign; may be empty.
    pub callsign: String,
    /// Code of the operator; may be empty.
    pub operator: String,
    /// Airport of departure.
    pub departure: String,
    /// Airport of destination.
    pub destination: String,
    /// Aircraft class.
    pub aircraft: String,
    /// Cruise Mach number, where it is to be written.
    pub mach: Option<f64>,
    /// Mass in kilograms, where it is to be written.
    pub mass_kg: Option<f64>,
    /// Approved for reduced vertical separation minima.
    pub rvsm: bool,
    /// Whether the planner may change it.
    pub movable: bool,
    /// Highest level that it may be moved to, in FL.
    pub ceiling_fl: u32,
    /// Vertical rate that its requests reckon with, feet a minute: the slower of both directions.
    pub change_fpm: f64,
    /// Fuel in cruise, kilograms a minute, for the figures given with proposals.
    pub cruise_kg_per_min: f64,
    /// Filed profile.
    pub points: Vec<Point>,
}

/// A maximal part of a profile at one level in cruise.
#[derive(Debug, Clone, Copy)]
pub struct CruiseRun {
    /// Index of its first point.
    pub first: usize,
    /// Index of its last point.
    pub last: usize,
    /// Start, seconds from 00:00.
    pub from_s: f64,
    /// End, seconds from 00:00.
    pub until_s: f64,
    /// Its level.
    pub level_fl: u32,
}

impl Flight {
    /// Time of the first point.
    #[must_use]
    pub fn start_s(&self) -> f64 {
        self.points.first().map_or(0.0, |p| p.time_s)
    }

    /// Time of the last point.
    #[must_use]
    pub fn end_s(&self) -> f64 {
        self.points.last().map_or(0.0, |p| p.time_s)
    }

    /// Level runs at or above a floor, in time order.
    #[must_use]
    pub fn cruise_runs(&self, floor_fl: f64) -> Vec<CruiseRun> {
        let mut runs: Vec<CruiseRun> = Vec::new();
        for (index, pair) in self.points.windows(2).enumerate() {
            if pair[0].level_fl.total_cmp(&pair[1].level_fl).is_ne() || pair[0].level_fl < floor_fl
            {
                continue;
            }
            match runs.last_mut() {
                Some(run) if run.last == index => {
                    run.last = index + 1;
                    run.until_s = pair[1].time_s;
                }
                _ => runs.push(CruiseRun {
                    first: index,
                    last: index + 1,
                    from_s: pair[0].time_s,
                    until_s: pair[1].time_s,
                    level_fl: whole_fl(pair[0].level_fl),
                }),
            }
        }
        runs
    }

    /// True tracks at the start and end of each leg that overlaps a period, in degrees.
    #[must_use]
    pub fn tracks_deg(&self, from_s: f64, until_s: f64) -> Vec<f64> {
        self.points
            .windows(2)
            .filter(|pair| pair[1].time_s > from_s && pair[0].time_s < until_s)
            .map(|pair| {
                let a = (pair[0].lon_deg, pair[0].lat_deg);
                route::distance_and_track(a, (pair[1].lon_deg, pair[1].lat_deg)).1
            })
            .collect()
    }

    /// Whether a level suits the direction of every leg in a period.
    #[must_use]
    pub fn suits(&self, level_fl: u32, from_s: f64, until_s: f64) -> bool {
        self.tracks_deg(from_s, until_s).iter().all(|track| levels::suits(level_fl, *track))
    }
}

/// A flight level as a whole number; levels of this program are whole and between 0 and 660.
#[must_use]
#[expect(
    clippy::cast_possible_truncation,
    clippy::cast_sign_loss,
    reason = "clamped to 0..=660 before the cast"
)]
pub fn whole_fl(level_fl: f64) -> u32 {
    level_fl.round().clamp(0.0, 660.0) as u32
}
