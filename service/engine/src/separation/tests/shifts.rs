//! Shift sets against flights that are really shifted, and probabilities against published ones.

use super::*;
use crate::path::Path;
use crate::separation::crossing::shifts;
use crate::separation::leg::push_legs;
use crate::separation::minima::{Rules, limit_vertical_ft};
use crate::separation::{
    ShiftSet, Version, expected_new_losses, pair_losses, pair_probability, pair_risks, shift_set,
};
use crate::units::kt_to_mps;

#[test]
fn a_set_holds_the_shifts_at_which_a_shifted_flight_loses_separation() {
    let (mut lost, mut kept) = (0, 0);
    for (i, centre) in CENTRES.into_iter().enumerate() {
        let flights = crowd(60, centre, 90 + i as u64);
        let day = day_of(flights.clone(), Policy::default());
        let scene = scene_of(&day);
        for shift_s in [-611.0, -333.0, -97.0, 0.0, 20.0, 200.0, 480.0] {
            let mut shifted = flights.clone();
            for (_, points) in &mut shifted {
                points.iter_mut().for_each(|p| p.0 += shift_s);
            }
            let tracks = tracks_of(&day_of(shifted, Policy::default()));
            for (a, b) in (0..60).flat_map(|a| (a + 1..60).map(move |b| (a, b))) {
                let (first, second) = (scene.filed(FlightId(a)), scene.filed(FlightId(b)));
                let set = shift_set(&scene, &first, &second, (-700.0, 700.0));
                let edge =
                    |i: &(f64, f64)| (i.0 - shift_s).abs() < 0.01 || (i.1 - shift_s).abs() < 0.01;
                if set.intervals().iter().any(edge) {
                    continue;
                }
                let later = Version { path: Path::filed(&tracks[FlightId(b)]), ..second };
                let losses = pair_losses(&scene, &first, &later);
                let inside = set.meets((shift_s, shift_s));
                assert_eq!(inside, !losses.is_empty(), "{a} {b} {shift_s}: {set:?} {losses:?}");
                if inside {
                    lost += 1;
                } else {
                    kept += 1;
                }
            }
        }
    }
    assert!(lost > 200 && kept > 1000, "{lost} {kept}");
}

#[test]
fn minima_of_sectors_are_those_of_the_unshifted_profiles() {
    use crate::separation::HorizontalMinimum;
    // One behind the other by 1 000 s at 240 m/s; the first has 10 NM while 3 000 s < t < 4 000 s,
    // wherever the second is then.
    let mps_deg = 240.0 / 6_378_137.0 * 180.0 / std::f64::consts::PI;
    let from = |start_s: f64| -> Points {
        vec![(start_s, 0.0, 0.0, 35e3), (start_s + 6000.0, 6000.0 * mps_deg, 0.0, 35e3)]
    };
    let day = day_of(vec![(true, from(0.0)), (true, from(1000.0))], Policy::default());
    let own = vec![HorizontalMinimum { from_s: 3000.0, until_s: 4000.0, horizontal_nm: 10.0 }];
    let scene = Scene::new(&day, tracks_of(&day), vec![own, Vec::new()].into());
    let (a, b) = (scene.filed(FlightId(0)), scene.filed(FlightId(1)));
    let set = shift_set(&scene, &a, &b, (-2000.0, 2000.0));
    let expected = 18_520.0 / 240.0;
    let &[(low, high)] = set.intervals() else { panic!("{set:?}") };
    assert!((low + 1000.0 + expected).abs() < 0.01 && (high + 1000.0 - expected).abs() < 0.01);
}

/// Two flights of 480 kt near the crossing of the equator and a meridian, at right angles, the
/// second one later at the crossing.
fn crossing(later_s: f64, time_sigma_s: f64) -> f64 {
    let deg = |s: f64| s * kt_to_mps(480.0) / 6_378_137.0 * 180.0 / std::f64::consts::PI;
    // The meridian is more strongly curved there: its radius is a (1 - e²).
    let north = |s: f64| deg(s) / (1.0 - 0.006_694_38);
    let half_s = 4000.0;
    let first = vec![(0.0, -deg(half_s), 0.0, 35e3), (2.0 * half_s, deg(half_s), 0.0, 35e3)];
    let second = vec![
        (later_s, 0.0, -north(half_s), 35e3),
        (later_s + half_s, 0.0, 0.0, 35e3),
        (later_s + 2.0 * half_s, 0.0, north(half_s), 35e3),
    ];
    probability_of(first, second, time_sigma_s)
}

fn probability_of(first: Points, second: Points, time_sigma_s: f64) -> f64 {
    let policy = Policy { time_sigma_s, ..Policy::default() };
    let day = day_of(vec![(true, first), (true, second)], policy);
    let scene = scene_of(&day);
    pair_probability(&scene, &scene.filed(FlightId(0)), &scene.filed(FlightId(1)))
}

/// Conflict probability before departure, 480 kt, at right angles, 0.3 NM of error across the
/// track, after Paielli & Erzberger 1997 (J. Guid. Control Dyn. 20), solved from their formula. A
/// shift set has errors of time alone, which 0.3 NM beside 40 NM along the track changes by less
/// than the last digit. A nominal miss of m NM at equal speeds is m √2 of the way behind.
#[test]
fn published_probabilities_before_departure() {
    for (sigma_min, values) in [(5.0, [0.0995, 0.0964, 0.0878]), (2.0, [0.2453, 0.2031, 0.1152])] {
        for (miss_nm, expected) in [0.0, 10.0, 20.0].into_iter().zip(values) {
            let later_s = miss_nm * std::f64::consts::SQRT_2 / 480.0 * 3600.0;
            let found = crossing(later_s, sigma_min * 60.0);
            assert!((found - expected).abs() < 2e-4, "{miss_nm} NM: {found}, not {expected}");
        }
    }
    // The same source: 0.0987 just inside and just outside the minimum.
    for miss_nm in [4.9, 5.1] {
        let found = crossing(miss_nm * std::f64::consts::SQRT_2 / 480.0 * 3600.0, 300.0);
        assert!((found - 0.0987).abs() < 2e-4, "{miss_nm} NM: {found}");
    }
}

/// In trail at 480 kt, 3 min of error each: the same formula.
#[test]
fn published_probabilities_in_trail() {
    let track = |from_s: f64| {
        let deg = 9000.0 * kt_to_mps(480.0) / 6_378_137.0 * 180.0 / std::f64::consts::PI;
        vec![(from_s, 10.0, 0.0, 35e3), (from_s + 9000.0, 10.0 + deg, 0.0, 35e3)]
    };
    for (behind_min, expected) in [(5.0, 0.0588), (10.0, 0.0074)] {
        let found = probability_of(track(0.0), track(behind_min * 60.0), 180.0);
        assert!((found - expected).abs() < 1e-4, "{behind_min} min: {found}, not {expected}");
    }
}

/// The formula itself: P = Φ((s−m)/σn) − Φ((−s−m)/σn), σn² = nᵀ(QA + QB)n, n along the miss, for
/// two flights of equal speed whose tracks cross at an angle.
fn conflict_probability(crossing_deg: f64, miss_nm: f64, along_nm: f64, across_nm: f64) -> f64 {
    // At equal speeds the relative velocity halves the angle of the tracks, and so does the miss.
    let half = (crossing_deg / 2.0).to_radians();
    let deviation_nm =
        (2.0 * ((along_nm * half.cos()).powi(2) + (across_nm * half.sin()).powi(2))).sqrt();
    let phi = |x: f64| libm::erfc(-x / std::f64::consts::SQRT_2) / 2.0;
    phi((5.0 - miss_nm) / deviation_nm) - phi((-5.0 - miss_nm) / deviation_nm)
}

/// Paielli & Erzberger 1997, solved from the formula and confirmed by simulation: 5 NM along and
/// 1 NM across.
#[test]
fn the_published_formula() {
    for (angle, values) in [(90.0, [0.6732, 0.4751, 0.1618]), (120.0, [0.8186, 0.4962, 0.0907])] {
        for (miss_nm, expected) in [0.0, 5.0, 10.0].into_iter().zip(values) {
            let found = conflict_probability(angle, miss_nm, 5.0, 1.0);
            assert!((found - expected).abs() < 5e-5, "{angle}° {miss_nm} NM: {found}");
        }
    }
    // Along the track alone, which is what a shift set has.
    for (angle, expected) in [(90.0, 0.6827), (120.0, 0.8427)] {
        assert!((conflict_probability(angle, 0.0, 5.0, 0.0) - expected).abs() < 5e-5);
    }
}

#[test]
fn a_shift_set_gives_the_formula_without_error_across() {
    // 5 NM along the track at 480 kt are 37.5 s.
    let found = crossing(0.0, 37.5);
    assert!((found - 0.6827).abs() < 1e-4, "{found}");
}

#[test]
fn risks_are_those_of_every_pair() {
    let policy = Policy { time_sigma_s: 120.0, ..Policy::default() };
    let day = day_of(crowd(90, CENTRES[0], 12), policy);
    let (scene, tracks) = (scene_of(&day), tracks_of(&day));
    let changed: Vec<(FlightId, Changed)> = tracks
        .iter_with_id()
        .filter(|(id, track)| id.0 % 4 == 0 && track.knots().len() > 4)
        .map(|(id, track)| (id, change(track, (1, track.knots().len() - 2), 36e3, 1.01)))
        .collect();
    let moved: Vec<Version<'_>> = changed
        .iter()
        .map(|(flight, changed)| Version {
            flight: *flight,
            path: Path::changed(&tracks[*flight], changed),
            minima: &[],
        })
        .collect();
    let planned = |flight: FlightId| {
        moved.iter().find(|v| v.flight == flight).copied().unwrap_or_else(|| scene.filed(flight))
    };
    let risks = pair_risks(&scene, &moved);
    let mut expected = 0.0;
    for (a, b) in (0..90).flat_map(|a| (a + 1..90).map(move |b| (FlightId(a), FlightId(b)))) {
        let found = risks.iter().find(|r| (r.first, r.second) == (a, b));
        if moved.iter().all(|v| v.flight != a && v.flight != b) {
            assert!(found.is_none());
            continue;
        }
        let filed_p = pair_probability(&scene, &scene.filed(a), &scene.filed(b));
        let planned_p = pair_probability(&scene, &planned(a), &planned(b));
        expected += (planned_p - filed_p).max(0.0);
        // A pair that is left out is as it was.
        let (x, y) = found.map_or((filed_p, filed_p), |r| (r.filed, r.planned));
        assert!((x - filed_p).abs() < 1e-9 && (y - planned_p).abs() < 1e-9, "{a:?} {b:?}");
    }
    let found = expected_new_losses(&scene, &moved);
    assert!((found - expected).abs() < 1e-6 && expected > 1.0, "{found}, not {expected}");
}

/// The shifts of two filed flights, from every two pieces of their tracks, at a minimum of a little
/// more or less.
fn shifts_of_pieces(scene: &Scene, pair: (u32, u32), more_m: f32) -> ShiftSet {
    let rules = Rules { deepest_m: 0.0, chord_m: scene.rules.chord_m + more_m, ..scene.rules };
    let legs = |flight: u32| {
        let course = scene.course(&scene.filed(FlightId(flight)));
        let mut legs = Vec::new();
        push_legs(flight, &course, &rules, 0..course.path.len() - 1, &mut legs);
        legs
    };
    let (a_legs, b_legs) = (legs(pair.0), legs(pair.1));
    let mut found = Vec::new();
    for (a, b) in a_legs.iter().flat_map(|a| b_legs.iter().map(move |b| (a, b))) {
        let limit_ft = limit_vertical_ft([a.class_ft(), b.class_ft()], [a.rvsm, b.rvsm]);
        found.extend(shifts(a, b, f64::from(rules.chord_m), limit_ft));
    }
    ShiftSet::union(found)
}

/// Pieces taken together as one leg change no minimum by more than half a metre.
#[test]
fn a_set_of_legs_lies_between_those_of_their_pieces() {
    let always = (f64::NEG_INFINITY, f64::INFINITY);
    let inside = |one: &ShiftSet, other: &ShiftSet| {
        one.intervals()
            .iter()
            .all(|i| other.intervals().iter().any(|o| o.0 <= i.0 + 1e-4 && i.1 <= o.1 + 1e-4))
    };
    let mut counted = 0;
    for (i, centre) in CENTRES.into_iter().enumerate() {
        let day = day_of(crowd(60, centre, 190 + i as u64), Policy::default());
        let scene = scene_of(&day);
        let pieces: usize = tracks_of(&day).iter().map(|t| t.knots().len() - 1).sum();
        assert!(scene.index.len() * 3 < pieces * 2, "too few pieces are taken together");
        for (a, b) in (0..60).flat_map(|a| (a + 1..60).map(move |b| (a, b))) {
            let set =
                shift_set(&scene, &scene.filed(FlightId(a)), &scene.filed(FlightId(b)), always);
            let [narrow, wide] = [-0.5, 0.5].map(|more_m| shifts_of_pieces(&scene, (a, b), more_m));
            assert!(inside(&narrow, &set) && inside(&set, &wide), "{narrow:?} {set:?} {wide:?}");
            counted += set.intervals().len();
        }
    }
    assert!(counted > 300, "{counted}");
}

#[test]
fn a_change_of_nothing_adds_no_risk() {
    let day = day_of(crowd(80, CENTRES[0], 13), Policy::default());
    let scene = scene_of(&day);
    let moved: Vec<_> = (0..40).map(|i| scene.filed(FlightId(i))).collect();
    let found = expected_new_losses(&scene, &moved);
    assert!(found.abs() < 1e-9, "{found}");
}
