//! Losses of filed days: nothing is missed by the index, and minima are kept exactly.

use super::*;
use crate::answer::Loss;
use crate::path::Path;
use crate::separation::{Version, losses_against_filed, losses_of_moved, pair_losses};

/// The same losses, but for the rounding of times at which slices cut them.
pub(in crate::separation) fn assert_same(one: &[Loss], other: &[Loss]) {
    assert_eq!(one.len(), other.len(), "{one:#?} {other:#?}");
    for (a, b) in one.iter().zip(other) {
        assert_eq!((a.first, a.second), (b.first, b.second));
        let near = |x: f64, y: f64| (x - y).abs() < 1e-5;
        assert!(near(a.from_s, b.from_s) && near(a.until_s, b.until_s), "{a:?} {b:?}");
        assert!((a.horizontal_m - b.horizontal_m).abs() < 0.03, "{a:?} {b:?}");
    }
}

fn all_pairs(scene: &Scene, count: u32) -> Vec<Loss> {
    let pairs = (0..count).flat_map(|a| (a + 1..count).map(move |b| (a, b)));
    pairs
        .flat_map(|(a, b)| pair_losses(scene, &scene.filed(FlightId(a)), &scene.filed(FlightId(b))))
        .collect()
}

#[test]
fn the_index_misses_no_pair() {
    for (i, centre) in CENTRES.into_iter().enumerate() {
        for seed in 0..3 {
            let day = day_of(crowd(300, centre, 10 * seed + i as u64), Policy::default());
            let scene = scene_of(&day);
            assert!(scene.losses().len() > 50);
            assert_same(scene.losses(), &all_pairs(&scene, 300));
        }
    }
}

#[test]
fn one_flight_against_all_others_finds_its_losses() {
    let day = day_of(crowd(200, CENTRES[0], 7), Policy::default());
    let scene = scene_of(&day);
    for flight in (0..200).map(FlightId) {
        let own: Vec<Loss> = scene
            .losses()
            .iter()
            .filter(|l| l.first == flight || l.second == flight)
            .copied()
            .collect();
        assert_same(&losses_against_filed(&scene, &scene.filed(flight)), &own);
    }
}

#[test]
fn moving_every_flight_by_nothing_keeps_the_losses() {
    let day = day_of(crowd(200, CENTRES[1], 8), Policy::default());
    let scene = scene_of(&day);
    let versions: Vec<Version<'_>> = (0..200).map(|i| scene.filed(FlightId(i))).collect();
    assert_same(&losses_of_moved(&scene, &versions), scene.losses());
    // With some of the flights, those that involve one of them.
    let some = &versions[..40];
    let own: Vec<Loss> = scene.losses().iter().filter(|l| l.first.0 < 40).copied().collect();
    assert_same(&losses_of_moved(&scene, some), &own);
}

/// Two flights eastwards along the equator, the second one behind and beside or above.
fn two(apart: impl Fn(f64, f64) -> Points) -> Vec<Loss> {
    let first: Points = vec![(0.0, 10.0, 0.0, 35_000.0), (3600.0, 18.0, 0.0, 35_000.0)];
    let day = day_of(vec![(true, first), (true, apart(0.0, 3600.0))], Policy::default());
    scene_of(&day).losses().to_vec()
}

/// Degrees of longitude that span 5 NM along the equator of WGS 84 (radius 6 378 137 m).
const FIVE_NM_DEG: f64 = 9260.0 / 6_378_137.0 * 180.0 / std::f64::consts::PI;

#[test]
fn exactly_at_the_horizontal_minimum_is_separated() {
    let behind = |deg: f64| {
        two(|from, until| {
            vec![(from, 10.0 - deg, 0.0, 35_000.0), (until, 18.0 - deg, 0.0, 35_000.0)]
        })
    };
    assert_eq!(behind(FIVE_NM_DEG), vec![]);
    let inside = behind(FIVE_NM_DEG * (1.0 - 1e-4));
    assert_eq!(inside.len(), 1);
    assert_eq!((inside[0].from_s, inside[0].until_s), (0.0, 3600.0));
    assert!((inside[0].horizontal_m - 9259.074).abs() < 0.02, "{inside:?}");
    // All the way at one distance: the earliest time is the first.
    assert_eq!(inside[0].closest_s, 0.0);
}

#[test]
fn exactly_at_the_vertical_minimum_is_separated() {
    let above = |ft: f64| {
        two(|from, until| vec![(from, 10.0, 0.0, 35_000.0 + ft), (until, 18.0, 0.0, 35_000.0 + ft)])
    };
    assert_eq!(above(1000.0), vec![]);
    assert_eq!(above(-1000.0), vec![]);
    let inside = above(999.99);
    assert_eq!(inside.len(), 1);
    assert_eq!((inside[0].horizontal_m, inside[0].closest_s), (0.0, 0.0));
    // A climb through it: 1 000 ft below at 1000 s and above at 3000 s.
    let climb = two(|from, until| vec![(from, 10.0, 0.0, 33_000.0), (until, 18.0, 0.0, 36_600.0)]);
    assert_eq!(climb.len(), 1);
    assert!((climb[0].from_s - 1000.0).abs() < 1e-3, "{climb:?}");
    assert!((climb[0].until_s - 3000.0).abs() < 1e-3, "{climb:?}");
}

#[test]
fn a_loss_of_two_seconds_is_a_loss() {
    // Head on at 4.99 NM to the side: closer than 5 NM over twice sqrt(5² - 4.99²) NM of relative
    // motion, but for the bulge of the geodesic towards the pole between ends 4° from its middle.
    let side_deg = 4.99 * 1852.0 / 110_574.28 * 4.0_f64.to_radians().cos();
    let losses = two(|from, until| {
        vec![(from, 18.0, side_deg, 35_000.0), (until, 10.0, side_deg, 35_000.0)]
    });
    let relative_mps = 2.0 * 8.0_f64.to_radians() * 6_378_137.0 / 3600.0;
    let expected_s = 2.0 * (5.0_f64.powi(2) - 4.99_f64.powi(2)).sqrt() * 1852.0 / relative_mps;
    assert_eq!(losses.len(), 1);
    let lasts_s = losses[0].until_s - losses[0].from_s;
    assert!((lasts_s - expected_s).abs() < 0.02, "{lasts_s} {expected_s}");
    assert!((losses[0].closest_s - 1800.0).abs() < 1e-3);
}

#[test]
fn flights_that_share_one_moment_lose_separation_in_it() {
    for moment_s in [900.0, 1000.0] {
        let first: Points = vec![(0.0, 10.0, 0.0, 35_000.0), (moment_s, 11.0, 0.0, 35_000.0)];
        let second: Points = vec![(moment_s, 11.0, 0.0, 35_000.0), (1800.0, 12.0, 0.0, 35_000.0)];
        let day = day_of(vec![(true, first), (true, second)], Policy::default());
        let losses = scene_of(&day).losses().to_vec();
        assert_eq!(losses.len(), 1);
        assert_eq!((losses[0].from_s, losses[0].until_s), (moment_s, moment_s));
    }
}

#[test]
fn the_larger_minimum_of_two_sectors_holds() {
    use crate::separation::HorizontalMinimum;
    let at =
        |lat: f64| -> Points { vec![(0.0, 10.0, lat, 35_000.0), (3600.0, 18.0, lat, 35_000.0)] };
    // 8 NM apart.
    let day =
        day_of(vec![(true, at(0.0)), (true, at(8.0 * 1852.0 / 110_574.28))], Policy::default());
    assert_eq!(scene_of(&day).losses(), &[]);
    let own = vec![HorizontalMinimum { from_s: 600.0, until_s: 1200.0, horizontal_nm: 10.0 }];
    let smaller = vec![HorizontalMinimum { from_s: 0.0, until_s: 900.0, horizontal_nm: 3.0 }];
    let scene = Scene::new(&day, tracks_of(&day), vec![own, smaller].into());
    let found: Vec<_> = scene.losses().iter().map(|l| (l.from_s, l.until_s)).collect();
    assert_eq!(found, vec![(600.0, 1200.0)]);
}

#[test]
fn versions_of_one_flight_never_lose_separation() {
    let day = day_of(crowd(2, CENTRES[0], 3), Policy::default());
    let scene = scene_of(&day);
    let tracks = tracks_of(&day);
    let again =
        Version { flight: FlightId(0), path: Path::filed(&tracks[FlightId(0)]), minima: &[] };
    assert_eq!(pair_losses(&scene, &scene.filed(FlightId(0)), &again), vec![]);
}
