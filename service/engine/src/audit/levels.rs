//! Which levels belong to which direction of flight.

use super::tolerances::{Lean, TRACK_DEG};
use crate::day::{LevelDirection, Policy};

/// Whether a level is one of the direction of flight on a true track.
///
/// ICAO Annex 2, Appendix 3, RVSM: magnetic tracks 000 to 179 take FL 10, 30 ... 410, then 450,
/// 490 ...; tracks 180 to 359 take FL 20, 40 ... 400, then 430, 470 ... Magnetic track is true
/// track less the variation, east positive.
pub(super) fn is_of_direction(policy: &Policy, track_deg: f64, level_ft: f64) -> bool {
    let magnetic_deg = (track_deg - policy.variation_deg).rem_euclid(360.0);
    match &policy.level_direction {
        LevelDirection::Free => true,
        LevelDirection::Semicircular => {
            let thousands = level_ft / 1000.0;
            if (thousands - thousands.round()).abs() > 1e-9 || thousands < 1.0 {
                return false;
            }
            let thousands = thousands.round() as u32;
            if magnetic_deg < 180.0 {
                (thousands % 2 == 1 && thousands <= 41)
                    || (thousands >= 45 && (thousands - 45).is_multiple_of(4))
            } else {
                (thousands.is_multiple_of(2) && thousands <= 40)
                    || (thousands >= 43 && (thousands - 43).is_multiple_of(4))
            }
        }
        LevelDirection::List(list) => list.iter().any(|entry| {
            entry.track_from_deg <= magnetic_deg
                && magnetic_deg < entry.track_until_deg
                && entry.levels_ft.iter().any(|l| (l - level_ft).abs() < 1e-6)
        }),
    }
}

/// Whether a leg forbids a new level: it is none of the direction of flight, and the filed level
/// is one. Tracks within rounding of a boundary go as they lean.
pub(super) fn leg_forbids(
    policy: &Policy,
    track_deg: f64,
    filed_ft: f64,
    new_ft: f64,
    lean: Lean,
) -> bool {
    let mut forbids = [-TRACK_DEG, 0.0, TRACK_DEG].into_iter().map(|off| {
        let track_deg = track_deg + off;
        !is_of_direction(policy, track_deg, new_ft) && is_of_direction(policy, track_deg, filed_ft)
    });
    match lean {
        Lean::ForPlan => forbids.all(|f| f),
        Lean::AgainstPlan => forbids.any(|f| f),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_table_of_annex_2() {
        // ICAO Annex 2, Appendix 3, a) RVSM, from memory: rows around the end of RVSM airspace.
        let policy = Policy::default();
        for fl in [10, 30, 290, 330, 390, 410, 450, 490] {
            assert!(is_of_direction(&policy, 90.0, f64::from(fl) * 100.0), "east {fl}");
            assert!(!is_of_direction(&policy, 270.0, f64::from(fl) * 100.0), "west {fl}");
        }
        for fl in [20, 40, 280, 320, 400, 430, 470, 510] {
            assert!(is_of_direction(&policy, 180.0, f64::from(fl) * 100.0), "west {fl}");
            assert!(!is_of_direction(&policy, 179.9, f64::from(fl) * 100.0), "east {fl}");
        }
        assert!(!is_of_direction(&policy, 90.0, 33_500.0));
    }

    #[test]
    fn variation_turns_the_boundary() {
        let policy = Policy { variation_deg: 10.0, ..Policy::default() };
        assert!(is_of_direction(&policy, 185.0, 33_000.0));
        assert!(is_of_direction(&policy, 5.0, 34_000.0));
    }
}
