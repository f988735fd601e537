//! Cruising levels by direction of flight, ICAO Annex 2, Appendix 3 (RVSM table).

use crate::day::{LevelDirection, Policy};

/// Levels are compared to within this, feet: one foot less than any two tables differ by.
const SAME_LEVEL_FT: f64 = 0.5;
/// Flights this close to the boundary between two directions are counted, degrees.
const NEAR_BOUNDARY_DEG: f64 = 10.0;

/// Whether a level is one of the direction of flight.
#[must_use]
pub fn allows_level(policy: &Policy, true_track_deg: f64, level_ft: f64) -> bool {
    let track_deg = magnetic(policy, true_track_deg);
    match &policy.level_direction {
        LevelDirection::Free => true,
        LevelDirection::Semicircular => semicircular(track_deg, level_ft),
        LevelDirection::List(list) => list
            .iter()
            .filter(|entry| entry.track_from_deg <= track_deg && track_deg < entry.track_until_deg)
            .any(|entry| entry.levels_ft.iter().any(|l| (l - level_ft).abs() < SAME_LEVEL_FT)),
    }
}

/// Whether a track lies within ten degrees of the boundary between the two directions, where true
/// and magnetic track may fall on different sides.
#[must_use]
pub fn nears_direction_boundary(policy: &Policy, true_track_deg: f64) -> bool {
    if policy.level_direction != LevelDirection::Semicircular {
        return false;
    }
    let off = magnetic(policy, true_track_deg) % 180.0;
    off.min(180.0 - off) < NEAR_BOUNDARY_DEG
}

fn magnetic(policy: &Policy, true_track_deg: f64) -> f64 {
    let track = (true_track_deg - policy.variation_deg).rem_euclid(360.0);
    // The remainder of a tiny negative number rounds to 360.
    if track >= 360.0 { 0.0 } else { track }
}

/// Track [0, 180): odd FL 10 to 410, then 450, 490 ...; [180, 360): even FL 20 to 400, then 430,
/// 470 ...
fn semicircular(track_deg: f64, level_ft: f64) -> bool {
    let thousands = (level_ft / 1000.0).round();
    if (level_ft - thousands * 1000.0).abs() >= SAME_LEVEL_FT || thousands < 1.0 {
        return false;
    }
    let (first, last_low, first_high) =
        if track_deg < 180.0 { (1.0, 41.0, 45.0) } else { (2.0, 40.0, 43.0) };
    if thousands <= last_low {
        (thousands - first) % 2.0 == 0.0
    } else {
        thousands >= first_high && (thousands - first_high) % 4.0 == 0.0
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// ICAO Annex 2, Appendix 3, table of cruising levels where RVSM applies, IFR flights.
    #[test]
    fn the_table_of_annex_2() {
        let policy = Policy::default();
        let east = [290, 310, 330, 350, 370, 390, 410, 450, 490];
        let west = [300, 320, 340, 360, 380, 400, 430, 470, 510];
        for fl in 285..=515 {
            let level_ft = f64::from(fl) * 100.0;
            for track in [0.0, 90.0, 179.999] {
                assert_eq!(allows_level(&policy, track, level_ft), east.contains(&fl), "FL {fl}");
            }
            for track in [180.0, 270.0, 359.999] {
                assert_eq!(allows_level(&policy, track, level_ft), west.contains(&fl), "FL {fl}");
            }
        }
    }

    #[test]
    fn magnetic_variation_turns_the_boundary() {
        let policy = Policy { variation_deg: 5.0, ..Policy::default() };
        assert!(allows_level(&policy, 2.0, 36_000.0), "magnetic track 357");
        assert!(allows_level(&policy, 184.0, 35_000.0), "magnetic track 179");
        assert!(nears_direction_boundary(&policy, 14.0));
        assert!(!nears_direction_boundary(&policy, 16.0));
    }
}
