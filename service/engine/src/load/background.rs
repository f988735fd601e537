//! Traffic known only as counts: it is added to the counts of the filed day, and so counts in the
//! filed and in the planned day alike.

use std::ops::Range;

use super::cells::{Clock, Times};
use crate::answer::{LoadMeasure, Place};
use crate::day::{Background, Day};

/// Adds every row: its aircraft to each minute of its period at which the sector is open, its
/// entries, spread evenly over the period, to each 60-minute window by the share that lies in the
/// window and finds the sector open.
pub(super) fn count(
    day: &Day,
    times: Times,
    add: &mut dyn FnMut(LoadMeasure, Place, Range<i32>, f64),
) {
    for row in &day.background {
        let place = Place::Sector(row.sector);
        for (from_s, until_s) in open_parts(day, row) {
            let minutes = times.minutes_within(from_s, until_s);
            add(LoadMeasure::Occupancy, place, minutes, row.aircraft);
            let Some(entries) = row.entries else { continue };
            let per_s = entries / (row.until_s - row.from_s);
            for window in times.windows_over(from_s, until_s) {
                let start_s = times.start_s(Clock::Windows, window);
                let end_s = times.end_s(Clock::Windows, window);
                let shared_s = end_s.min(until_s) - start_s.max(from_s);
                if shared_s > 0.0 {
                    add(LoadMeasure::Entries, place, window..window + 1, per_s * shared_s);
                }
            }
        }
    }
}

/// The parts of a row's period in which its sector is open.
fn open_parts<'a>(day: &'a Day, row: &'a Background) -> impl Iterator<Item = (f64, f64)> + 'a {
    let open = &day.sectors[row.sector].open;
    open.iter()
        .map(|period| (row.from_s.max(period.from_s), row.until_s.min(period.until_s)))
        .filter(|(from_s, until_s)| from_s < until_s)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::day::{BackgroundParts, CapacityParts, SectorParts, VolumeParts};
    use crate::fixture::empty_parts;

    fn day(closes_s: f64) -> Day {
        let mut parts = empty_parts();
        let ring = vec![[0.0, 0.0], [1.0, 0.0], [1.0, 1.0], [0.0, 1.0], [0.0, 0.0]];
        parts.sectors.push(SectorParts {
            sector: "S".to_owned(),
            volumes: vec![VolumeParts { rings: vec![ring], floor_ft: 0.0, ceiling_ft: 6e4 }],
            ..SectorParts::default()
        });
        parts.capacities.push(CapacityParts {
            sector: "S".to_owned(),
            until_s: closes_s,
            ..CapacityParts::default()
        });
        parts.background.push(BackgroundParts {
            sector: "S".to_owned(),
            from_s: 1800.0,
            until_s: 5400.0,
            aircraft: 2.5,
            entries: Some(6.0),
            ..BackgroundParts::default()
        });
        Day::build(parts).unwrap().day
    }

    /// Six entries an hour from 00:30 to 01:30: windows of 20 minutes' step, worked out by hand.
    #[test]
    fn entries_are_shared_out_by_time_and_aircraft_stand_at_every_minute() {
        for (closes_s, at_20, at_60) in [(7200.0, 5.0, 3.0), (4200.0, 4.0, 1.0)] {
            let day = day(closes_s);
            let times = Times::new(1200.0);
            let (mut entries, mut minutes) = ([0.0; 30], 0.0);
            count(&day, times, &mut |kind, _, range, amount| match kind {
                LoadMeasure::Entries => entries[(range.start + 10) as usize] += amount,
                _ => minutes += amount * range.len() as f64,
            });
            let close = |a: f64, b: f64| assert!((a - b).abs() < 1e-9, "{a} {b}");
            close(entries[10], 3.0);
            close(entries[11], at_20);
            close(entries[13], at_60);
            close(minutes, 2.5 * (f64::min(5400.0, closes_s) - 1800.0) / 60.0);
        }
    }
}
