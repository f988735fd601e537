//! Visits found by sampling, against visits found by cutting.

use proptest::prelude::*;

use super::flight_load::Visit;
use super::index::SectorIndex;
use crate::day::{
    CapacityParts, Date, Day, DayParts, Flight, Point, Profile, SectorParts, VolumeParts,
};
use crate::ids::SectorId;
use crate::path::{Changed, Knot, Path, Track};

const DATE: Date = Date { year: 2031, month: 3, day: 4 };

/// A day of sectors without traffic, each open around the clock.
fn day_of(sectors: Vec<Vec<VolumeParts>>) -> Option<Day> {
    let mut parts = DayParts::empty(DATE, "sampled");
    for (i, volumes) in sectors.into_iter().enumerate() {
        let sector = format!("S{i}");
        parts.capacities.push(CapacityParts {
            sector: sector.clone(),
            from_s: -1e6,
            until_s: 1e6,
            ..CapacityParts::default()
        });
        parts.sectors.push(SectorParts { sector, volumes, ..SectorParts::default() });
    }
    Day::build(parts).ok().map(|built| built.day)
}

fn rectangle([west, south, east, north]: [f64; 4], levels: (f64, f64)) -> VolumeParts {
    let ring = vec![[west, south], [east, south], [east, north], [west, north], [west, south]];
    VolumeParts { rings: vec![ring], floor_ft: levels.0, ceiling_ft: levels.1 }
}

fn track_of(points: &[(f64, f64, f64, f64)]) -> Track {
    let points = points
        .iter()
        .map(|&(time_s, lon_deg, lat_deg, level_ft)| Point {
            time_s,
            lon_deg,
            lat_deg,
            level_ft,
            fix: None,
        })
        .collect();
    Track::new(&Profile::new(points, 24_500.0).unwrap())
}

/// Whether a sector holds a place by the definition; `None` within rounding of its border.
fn holds(
    day: &Day,
    sector: SectorId,
    lon: f64,
    lat: f64,
    level_ft: f64,
    climbs: bool,
) -> Option<bool> {
    const NEAR_DEG: f64 = 1e-8;
    const NEAR_FT: f64 = 1e-5;
    let mut inside = false;
    for volume in &day.sectors[sector].volumes {
        let near_border = [volume.floor_ft, volume.ceiling_ft]
            .iter()
            .any(|border| (level_ft - border).abs() < NEAR_FT);
        if climbs && near_border {
            return None;
        }
        let at = |x: f64, y: f64| {
            // One meridian has two names.
            [-360.0, 0.0, 360.0].iter().any(|turn| volume.polygon.contains(lon + turn + x, lat + y))
        };
        let here = at(0.0, 0.0);
        let around = [(1, 1), (1, -1), (-1, 1), (-1, -1), (1, 0), (-1, 0), (0, 1), (0, -1)];
        if around.iter().any(|&(x, y)| at(f64::from(x) * NEAR_DEG, f64::from(y) * NEAR_DEG) != here)
        {
            return None;
        }
        inside |= here && volume.floor_ft <= level_ft && level_ft < volume.ceiling_ft;
    }
    Some(inside)
}

/// Where a piece is at a share of its time; longitude may lie beyond 180.
fn between(a: &Knot, b: &Knot, share: f64) -> (f64, f64, f64) {
    let mut step = b.lon_deg - a.lon_deg;
    step -= 360.0 * (step / 360.0).round();
    (
        a.lon_deg + step * share,
        a.lat_deg + (b.lat_deg - a.lat_deg) * share,
        a.level_ft + (b.level_ft - a.level_ft) * share,
    )
}

/// Compares visits with samples at regular times and a little before and after each border. Says
/// how many samples lay inside.
fn check(day: &Day, track: &Track) -> usize {
    const BESIDE_S: f64 = 1e-3;
    let index = SectorIndex::new(day);
    let path = Path::filed(track);
    let visits = index.inside(&path);
    let knots: Vec<Knot> = path.knots_from(0).collect();
    let mut samples_inside = 0;
    for sector in day.sectors.ids() {
        let own: Vec<&Visit> = visits.iter().filter(|v| v.sector == sector).collect();
        for visit in &own {
            assert!(visit.in_s < visit.out_s, "{visit:?}");
            assert!(path.start_s() <= visit.in_s && visit.out_s <= path.end_s(), "{visit:?}");
        }
        for pair in own.windows(2) {
            assert!(pair[0].out_s < pair[1].in_s, "not maximal: {pair:?}");
        }
        let borders = own.iter().flat_map(|v| [v.in_s, v.out_s]);
        let mut times_s: Vec<f64> =
            borders.clone().flat_map(|t| [t - BESIDE_S, t + BESIDE_S]).collect();
        for pair in knots.windows(2) {
            let lasts_s = pair[1].time_s - pair[0].time_s;
            times_s
                .extend((0..40).map(|k| pair[0].time_s + lasts_s * (f64::from(k) + 0.37) / 40.0));
        }
        for time_s in times_s {
            if time_s <= path.start_s()
                || time_s >= path.end_s()
                || borders.clone().any(|t| (t - time_s).abs() < 0.9 * BESIDE_S)
            {
                continue;
            }
            let piece = path.piece_at(time_s);
            let (a, b) = (&knots[piece], &knots[piece + 1]);
            let share = (time_s - a.time_s) / (b.time_s - a.time_s);
            let (lon, lat, level_ft) = between(a, b, share);
            let climbs = a.level_ft != b.level_ft;
            let Some(expected) = holds(day, sector, lon, lat, level_ft, climbs) else { continue };
            let found = own.iter().any(|v| v.in_s <= time_s && time_s < v.out_s);
            assert_eq!(
                found, expected,
                "{sector:?} at {time_s} s, [{lon}, {lat}], {level_ft} ft; visits {own:?}"
            );
            samples_inside += usize::from(found);
        }
    }
    samples_inside
}

/// A ring around a place whose corners lie at even angles, so that it never crosses itself.
fn star([lon, lat]: [f64; 2], radii: &[f64]) -> Vec<[f64; 2]> {
    let corner = |i: usize| {
        let angle = std::f64::consts::TAU * (i as f64 + 0.1) / radii.len() as f64;
        [lon + radii[i] * angle.cos(), lat + radii[i] * angle.sin()]
    };
    (0..radii.len()).chain([0]).map(corner).collect()
}

prop_compose! {
    fn levels()(floor in 0_u32..16, height in 1_u32..10) -> (f64, f64) {
        let floor_ft = 28_000.0 + 500.0 * f64::from(floor);
        (floor_ft, floor_ft + 500.0 * f64::from(height))
    }
}

/// A star with a hole, around a place off the middle of the region.
fn star_volume(middle: f64) -> impl Strategy<Value = Vec<VolumeParts>> {
    let outer = prop::collection::vec(0.8_f64..2.0, 6..12);
    let hole = prop::option::of(prop::collection::vec(0.1_f64..0.6, 3..8));
    (-1.5_f64..1.5, -1.5_f64..1.5, outer, hole, levels()).prop_map(
        move |(x, y, outer, hole, (floor_ft, ceiling_ft))| {
            let at = [(middle + x).clamp(-178.0, 178.0), 45.0 + y];
            let mut rings = vec![star(at, &outer)];
            rings.extend(hole.map(|radii| star(at, &radii)));
            vec![VolumeParts { rings, floor_ft, ceiling_ft }]
        },
    )
}

/// A rectangle on whole quarters of a degree, cut in two where it spans the meridian of 180.
fn rectangle_volumes(middle: f64) -> impl Strategy<Value = Vec<VolumeParts>> {
    (-12_i32..8, -12_i32..8, 1_i32..10, 1_i32..10, levels()).prop_map(
        move |(x, y, w, h, levels)| {
            let (west, south) = (middle + 0.25 * f64::from(x), 45.0 + 0.25 * f64::from(y));
            let (east, north) = (west + 0.25 * f64::from(w), south + 0.25 * f64::from(h));
            let turn = 360.0 * ((west + 180.0) / 360.0).floor();
            let (west, east) = (west - turn, east - turn);
            if east <= 180.0 {
                vec![rectangle([west, south, east, north], levels)]
            } else {
                vec![
                    rectangle([west, south, 180.0, north], levels),
                    rectangle([-180.0, south, east - 360.0, north], levels),
                ]
            }
        },
    )
}

fn sector(middle: f64) -> impl Strategy<Value = Vec<VolumeParts>> {
    let volumes = prop_oneof![star_volume(middle), rectangle_volumes(middle)];
    prop::collection::vec(volumes, 1..4).prop_map(|volumes| volumes.concat())
}

/// Points on and off the quarters of a degree, climbs and level legs.
fn track(middle: f64) -> impl Strategy<Value = Track> {
    let place =
        prop_oneof![(-12_i32..12).prop_map(|quarters| 0.25 * f64::from(quarters)), -3.0_f64..3.0,];
    let point = (10.0_f64..900.0, place.clone(), place, 0_u32..20, prop::bool::ANY);
    prop::collection::vec(point, 2..8).prop_map(move |points| {
        let (mut time_s, mut level_ft) = (0.0, 33_000.0);
        let mut track = Vec::new();
        for (lasts_s, x, y, level, changes) in points {
            time_s += lasts_s;
            if changes {
                level_ft = 28_000.0 + 500.0 * f64::from(level);
            }
            let lon = middle + x;
            let lon = lon - 360.0 * ((lon + 180.0) / 360.0).floor();
            track.push((time_s, lon, 45.0 + y, level_ft));
        }
        track_of(&track)
    })
}

fn region() -> impl Strategy<Value = (Vec<Vec<VolumeParts>>, Track)> {
    prop_oneof![Just(11.0), Just(180.0), Just(-179.25)]
        .prop_flat_map(|middle: f64| (prop::collection::vec(sector(middle), 1..5), track(middle)))
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(400))]

    #[test]
    fn visits_are_what_sampling_finds((sectors, track) in region()) {
        let Some(day) = day_of(sectors) else { return Err(TestCaseError::reject("no day")) };
        check(&day, &track);
    }

    /// What is told from the filed visits, against cutting the whole changed path.
    #[test]
    fn a_changed_flight_visits_what_its_whole_path_does(
        (sectors, track) in region(),
        shares in (0.0..1.0_f64, 0.0..1.0_f64),
        level in 0_u32..20,
        pace in prop_oneof![Just(1.0), 0.97..1.03_f64],
    ) {
        let Some(day) = day_of(sectors) else { return Err(TestCaseError::reject("no day")) };
        let last = track.knots().len() - 1;
        let at = |share: f64| (share * last as f64) as usize;
        let (leave, back) = (at(shares.0.min(shares.1)), at(shares.0.max(shares.1)) + 1);
        let changed = change(&track, (leave, back), 28_000.0 + 500.0 * f64::from(level), pace);
        let (index, flight) = (SectorIndex::new(&day), flight());
        let filed = index.flight_load(&Path::filed(&track), &flight, &day);
        let path = Path::changed(&track, &changed);
        let whole = index.flight_load(&path, &flight, &day);
        let told = index.changed_load(&path, &flight, &day, &filed);
        prop_assert_eq!(&told.level_changes, &whole.level_changes);
        prop_assert_eq!(told.visits.len(), whole.visits.len(), "{:?} {:?}", told, whole);
        // Crossings at one time may come in either order.
        for visit in &told.visits {
            let same = |v: &&Visit| {
                v.sector == visit.sector
                    && (v.in_s - visit.in_s).abs() < 1e-6
                    && (v.out_s - visit.out_s).abs() < 1e-6
            };
            prop_assert!(whole.visits.iter().any(|v| same(&v)), "{:?} {:?}", visit, whole);
        }
    }
}

/// A flight between airports that are not listed.
fn flight() -> Flight {
    let parts = crate::fixture::flight("F1", &[(0.0, 0.0, 0.0, 330.0), (600.0, 1.0, 0.0, 330.0)]);
    crate::fixture::day_of(vec![parts]).flights[crate::ids::FlightId(0)].clone()
}

/// A change from one knot to another: to another level, slower or faster, and back.
fn change(track: &Track, (leave, back): (usize, usize), level_ft: f64, pace: f64) -> Changed {
    let filed = track.knots();
    let leave_s = filed[leave].time_s;
    let shift_s = ((filed[back].time_s - leave_s) * (pace - 1.0) * 1000.0).round() / 1000.0;
    let knots = filed[leave + 1..=back].iter().enumerate().map(|(i, knot)| {
        let is_last = leave + 1 + i == back;
        Knot {
            time_s: if is_last {
                knot.time_s + shift_s
            } else {
                leave_s + (knot.time_s - leave_s) * pace
            },
            level_ft: if is_last { knot.level_ft } else { level_ft },
            ..*knot
        }
    });
    Changed {
        kept: leave + 1,
        knots: knots.collect(),
        resume: back + 1,
        shift_s,
        off_level_s: Vec::new(),
    }
}

const ALL_LEVELS: (f64, f64) = (0.0, 60_000.0);

fn visits_of(
    sectors: Vec<Vec<VolumeParts>>,
    points: &[(f64, f64, f64, f64)],
) -> Vec<(u32, f64, f64)> {
    let day = day_of(sectors).unwrap();
    let track = track_of(points);
    check(&day, &track);
    let visits = SectorIndex::new(&day).inside(&Path::filed(&track));
    visits.iter().map(|v| (v.sector.0, v.in_s, v.out_s)).collect()
}

#[test]
fn a_level_flight_at_a_floor_is_inside_and_at_a_ceiling_outside() {
    let square = [0.0, 0.0, 2.0, 2.0];
    let sectors = vec![
        vec![rectangle(square, (25_000.0, 33_000.0))],
        vec![rectangle(square, (33_000.0, 41_000.0))],
    ];
    let found = visits_of(sectors, &[(0.0, 1.0, 0.5, 33_000.0), (100.0, 1.0, 0.6, 33_000.0)]);
    assert_eq!(found, [(1, 0.0, 100.0)]);
}

#[test]
fn a_climb_passes_from_sector_to_sector_at_one_time() {
    let square = [0.0, 0.0, 2.0, 2.0];
    let sectors = vec![
        vec![rectangle(square, (25_000.0, 33_000.0))],
        vec![rectangle(square, (33_000.0, 41_000.0))],
    ];
    let found = visits_of(sectors, &[(0.0, 1.0, 0.5, 31_000.0), (400.0, 1.0, 0.6, 35_000.0)]);
    assert_eq!(found, [(0, 0.0, 200.0), (1, 200.0, 400.0)]);
}

#[test]
fn volumes_that_touch_make_one_visit_across_the_meridian_of_180_too() {
    let sectors = vec![
        vec![
            rectangle([179.0, 0.0, 180.0, 1.0], ALL_LEVELS),
            rectangle([-180.0, 0.0, -179.0, 1.0], ALL_LEVELS),
        ],
        vec![rectangle([-180.0, 0.0, -179.0, 1.0], ALL_LEVELS)],
    ];
    let found = visits_of(sectors, &[(0.0, 179.9, 0.5, 33_000.0), (80.0, -179.9, 0.5, 33_000.0)]);
    assert_eq!(found.len(), 2);
    assert_eq!(found[0], (0, 0.0, 80.0));
    assert!((found[1].1 - 40.0).abs() < 1e-6 && found[1].2 == 80.0, "{found:?}");
}

#[test]
fn neighbours_share_the_time_at_which_their_edge_is_crossed() {
    // The same edge, run through in opposite directions.
    let left = vec![[0.0, 0.0], [1.1, 0.0], [1.37, 1.0], [0.0, 1.0], [0.0, 0.0]];
    let right = vec![[1.37, 1.0], [1.1, 0.0], [3.0, 0.0], [3.0, 1.0], [1.37, 1.0]];
    let volume = |ring| VolumeParts { rings: vec![ring], floor_ft: 0.0, ceiling_ft: 60_000.0 };
    let points = [(0.0, 1.1, 0.21, 33_000.0), (77.0, 1.29, 0.48, 33_000.0)];
    let found = visits_of(vec![vec![volume(left)], vec![volume(right)]], &points);
    assert_eq!(found.len(), 2);
    assert!(found[0].2 == found[1].1 || found[1].2 == found[0].1, "{found:?}");
}

#[test]
fn a_corner_that_is_touched_is_no_visit() {
    let triangle = vec![[0.5, 0.0], [1.0, 0.5], [0.0, 0.5], [0.5, 0.0]];
    let volume = VolumeParts { rings: vec![triangle], floor_ft: 0.0, ceiling_ft: 60_000.0 };
    let found =
        visits_of(vec![vec![volume]], &[(0.0, 0.4, 0.0, 33_000.0), (90.0, 0.6, 0.0, 33_000.0)]);
    assert_eq!(found, []);
}

#[test]
fn an_hour_in_one_place_counts() {
    let sectors = vec![vec![rectangle([0.0, 0.0, 1.0, 1.0], ALL_LEVELS)]];
    let found = visits_of(sectors, &[(0.0, 0.5, 0.5, 33_000.0), (3600.0, 0.5, 0.5, 33_000.0)]);
    assert_eq!(found, [(0, 0.0, 3600.0)]);
}

#[test]
fn a_place_at_a_floor_or_a_west_edge_is_inside() {
    let square = [0.0, 0.0, 2.0, 2.0];
    let day = day_of(vec![
        vec![rectangle(square, (25_000.0, 33_000.0))],
        vec![rectangle(square, (33_000.0, 41_000.0))],
    ])
    .unwrap();
    let index = SectorIndex::new(&day);
    let at = |lon, lat, level_ft| index.sectors_at(lon, lat, level_ft);
    assert_eq!(at(1.0, 1.0, 33_000.0), [SectorId(1)]);
    assert_eq!(at(1.0, 1.0, 32_999.0), [SectorId(0)]);
    assert_eq!(at(0.0, 0.0, 33_000.0), [SectorId(1)]);
    assert_eq!(at(2.0, 1.0, 33_000.0), []);
    assert_eq!(at(90.0, 1.0, 33_000.0), []);
}
