//! Rough counts of the filed traffic, from positions every 20 seconds: what capacities are set
//! from. The planner's own counts are continuous and differ a little.

use crate::{flight::Flight, profile};

/// Seconds between samples.
const SAMPLE_S: f64 = 20.0;
/// Minutes before 00:00 that are counted.
pub const LEAD_MIN: usize = 360;
/// Minutes counted in all.
pub const SPAN_MIN: usize = LEAD_MIN + 1440 + 1080;
/// Minutes between the starts of entry windows.
pub const STEP_MIN: usize = 20;

/// Counts of one sector.
#[derive(Debug, Clone)]
pub struct SectorTally {
    /// Entries in each minute, from `LEAD_MIN` before 00:00.
    pub entries: Vec<u32>,
    /// Aircraft inside at each whole minute.
    pub inside: Vec<u32>,
    /// Climbs and descents begun in each minute.
    pub changes: Vec<u32>,
    /// Time spent by all visits, seconds.
    pub visit_s: f64,
    /// Number of visits.
    pub visits: u32,
}

/// Index of the minute that a time lies in, if it is counted.
fn minute_of(time_s: f64) -> Option<usize> {
    let minute = (time_s / 60.0).floor() + 360.0;
    #[expect(
        clippy::cast_possible_truncation,
        clippy::cast_sign_loss,
        clippy::cast_precision_loss,
        reason = "in range by the test before"
    )]
    (minute >= 0.0 && minute < SPAN_MIN as f64).then_some(minute as usize)
}

/// Counts the flights in each of `sectors` sectors; `locate` appends the sectors at a longitude,
/// latitude and FL.
pub fn count(
    flights: &[Flight],
    sectors: usize,
    locate: impl Fn(f64, f64, f64, &mut Vec<usize>),
) -> Vec<SectorTally> {
    let empty = SectorTally {
        entries: vec![0; SPAN_MIN],
        inside: vec![0; SPAN_MIN],
        changes: vec![0; SPAN_MIN],
        visit_s: 0.0,
        visits: 0,
    };
    let mut tallies = vec![empty; sectors];
    let (mut before, mut here) = (Vec::new(), Vec::new());
    for flight in flights {
        before.clear();
        let mut was_level = true;
        let mut time_s = (flight.start_s() / SAMPLE_S).ceil() * SAMPLE_S;
        while let Some((lon, lat, level_fl)) = profile::at_time(&flight.points, time_s) {
            here.clear();
            locate(lon, lat, level_fl, &mut here);
            let minute = minute_of(time_s);
            let ahead_fl = profile::at_time(&flight.points, time_s + 1.0).map_or(level_fl, |p| p.2);
            let is_level = ahead_fl.total_cmp(&level_fl).is_eq();
            for sector in &here {
                let tally = &mut tallies[*sector];
                tally.visit_s += SAMPLE_S;
                let entered = !before.contains(sector);
                tally.visits += u32::from(entered);
                if let Some(minute) = minute {
                    tally.entries[minute] += u32::from(entered);
                    tally.inside[minute] += u32::from((time_s / 60.0).fract() < 1e-6);
                    tally.changes[minute] += u32::from(was_level && !is_level);
                }
            }
            was_level = is_level;
            std::mem::swap(&mut before, &mut here);
            time_s += SAMPLE_S;
        }
    }
    tallies
}

/// Sums over the hours that start every 20 minutes and lie inside [from, until) (minutes from
/// 00:00).
#[must_use]
pub fn hourly(per_minute: &[u32], from_min: i32, until_min: i32) -> Vec<u32> {
    let index = |minute: i32| usize::try_from(minute + 360).unwrap_or(0).min(SPAN_MIN);
    (index(from_min)..index(until_min).saturating_sub(59))
        .filter(|start| start.is_multiple_of(STEP_MIN))
        .map(|start| per_minute[start..start + 60].iter().sum())
        .collect()
}

/// The minutes of [from, until), minutes from 00:00.
#[must_use]
pub fn minutes(per_minute: &[u32], from_min: i32, until_min: i32) -> &[u32] {
    let index = |minute: i32| usize::try_from(minute + 360).unwrap_or(0).min(SPAN_MIN);
    &per_minute[index(from_min)..index(until_min)]
}

/// The smallest value that at least `share` of the counts do not exceed; 0 for none.
#[must_use]
pub fn quantile(counts: &[u32], share: f64) -> u32 {
    let mut sorted = counts.to_vec();
    sorted.sort_unstable();
    #[expect(
        clippy::cast_possible_truncation,
        clippy::cast_sign_loss,
        clippy::cast_precision_loss,
        reason = "a share of a length"
    )]
    let rank = (share.clamp(0.0, 1.0) * sorted.len() as f64).ceil() as usize;
    sorted.get(rank.max(1) - 1).copied().unwrap_or(0)
}

/// Adds one at the minute of a time, if it is counted.
pub fn add_at(per_minute: &mut [u32], time_s: f64) {
    if let Some(count) = minute_of(time_s).and_then(|minute| per_minute.get_mut(minute)) {
        *count += 1;
    }
}

/// Arrivals of each minute at an airport.
#[must_use]
pub fn arrivals(flights: &[Flight], airport: &str) -> Vec<u32> {
    let mut per_minute = vec![0; SPAN_MIN];
    for flight in flights.iter().filter(|f| f.destination == airport) {
        add_at(&mut per_minute, flight.end_s());
    }
    per_minute
}

/// Departures of each minute at an airport.
#[must_use]
pub fn departures(flights: &[Flight], airport: &str) -> Vec<u32> {
    let mut per_minute = vec![0; SPAN_MIN];
    for flight in flights.iter().filter(|f| f.departure == airport) {
        add_at(&mut per_minute, flight.start_s());
    }
    per_minute
}
