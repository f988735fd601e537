//! Which flights come near which, minute by minute, on a coarse grid of cubes.
//!
//! A cube is wide enough that two flights whose places in the middle of a minute are not in
//! neighbouring cubes can't come within the largest minimum in that minute.

use rayon::prelude::*;

use super::path::Path;
use crate::ids::{FlightId, Id};
use crate::units::{FEET_PER_FL, SECONDS_PER_MINUTE};

/// Where a flight is in one minute.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
struct Presence {
    minute: i32,
    cube: [i32; 3],
    flight: u32,
    /// Levels passed in the minute, hundreds of feet, rounded outward.
    low_fl: i16,
    high_fl: i16,
}

/// The flights of one version of a day, by minute and cube.
#[derive(Debug)]
pub(super) struct Neighbours {
    cube_m: f64,
    floor_fl: i16,
    first_minute: i32,
    /// For each minute, its presences in the order of cubes.
    minutes: Vec<Vec<Presence>>,
}

/// A flight that comes near, and when.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Near {
    pub(super) flight: FlightId,
    pub(super) from_s: f64,
    pub(super) until_s: f64,
}

/// Greatest vertical minimum, with room for tolerances, hundreds of feet.
const TALLEST_FL: i16 = 21;

impl Neighbours {
    /// All flights; `reach_m` is the largest minimum, `fastest_mps` the greatest ground speed.
    pub(super) fn new(paths: &[&Path<'_>], reach_m: f64, fastest_mps: f64, floor_ft: f64) -> Self {
        let cube_m = reach_m + 10.0 + fastest_mps * SECONDS_PER_MINUTE * 1.05;
        let mut all = Self {
            cube_m,
            floor_fl: (floor_ft / FEET_PER_FL).floor() as i16,
            first_minute: 0,
            minutes: Vec::new(),
        };
        let mut presences: Vec<Presence> = paths
            .par_iter()
            .enumerate()
            .flat_map_iter(|(i, path)| all.presences(path, i as u32))
            .filter(|p| p.high_fl >= all.floor_fl)
            .collect();
        presences.par_sort_unstable();
        let Some((first, last)) = presences.first().zip(presences.last()) else { return all };
        all.first_minute = first.minute;
        let mut minutes = vec![Vec::new(); (last.minute - first.minute) as usize + 1];
        for presence in presences {
            minutes[(presence.minute - all.first_minute) as usize].push(presence);
        }
        all.minutes = minutes;
        all
    }

    fn presences(&self, path: &Path<'_>, flight: u32) -> Vec<Presence> {
        let minute_of = |time_s: f64| (time_s / SECONDS_PER_MINUTE).floor() as i32;
        (minute_of(path.start_s())..=minute_of(path.end_s()))
            .map(|minute| {
                let from_s = (f64::from(minute) * SECONDS_PER_MINUTE).max(path.start_s());
                let until_s = (f64::from(minute + 1) * SECONDS_PER_MINUTE).min(path.end_s());
                let middle = path.state(f64::midpoint(from_s, until_s));
                let place = path.track.centred_m(middle.filed_s);
                let (low_ft, high_ft) = path.level_range_between_ft(from_s, until_s);
                Presence {
                    minute,
                    cube: place.map(|metres| (metres / self.cube_m).floor() as i32),
                    flight,
                    low_fl: (low_ft / FEET_PER_FL).floor() as i16,
                    high_fl: (high_ft / FEET_PER_FL).ceil() as i16,
                }
            })
            .collect()
    }

    /// Flights other than `flight` that may come near a profile of it, by flight, then time;
    /// consecutive minutes are joined.
    pub(super) fn near(&self, path: &Path<'_>, flight: FlightId) -> Vec<Near> {
        let own = flight.index() as u32;
        let mut met: Vec<(u32, i32)> = Vec::new();
        for here in self.presences(path, own) {
            let minute = usize::try_from(here.minute - self.first_minute).ok();
            let Some(there) = minute.and_then(|i| self.minutes.get(i)) else { continue };
            if here.high_fl < self.floor_fl {
                continue;
            }
            let [x, y, z] = here.cube;
            for (dx, dy) in (-1..=1).flat_map(|dx| (-1..=1).map(move |dy| (dx, dy))) {
                let (low, high) = ([x + dx, y + dy, z - 1], [x + dx, y + dy, z + 1]);
                let first = there.partition_point(|p| p.cube < low);
                let close = there[first..].iter().take_while(|p| p.cube <= high);
                met.extend(
                    close
                        .filter(|p| p.flight != own)
                        .filter(|p| p.low_fl - here.high_fl < TALLEST_FL)
                        .filter(|p| here.low_fl - p.high_fl < TALLEST_FL)
                        .map(|p| (p.flight, p.minute)),
                );
            }
        }
        met.sort_unstable();
        joined(&met)
    }
}

fn joined(met: &[(u32, i32)]) -> Vec<Near> {
    let mut near: Vec<Near> = Vec::new();
    for &(flight, minute) in met {
        let flight = FlightId(flight);
        let from_s = f64::from(minute) * SECONDS_PER_MINUTE;
        let until_s = from_s + SECONDS_PER_MINUTE;
        match near.last_mut() {
            Some(last) if last.flight == flight && last.until_s - from_s >= 0.0 => {
                last.until_s = until_s;
            }
            _ => near.push(Near { flight, from_s, until_s }),
        }
    }
    near
}
