//! Losses of separation against closed forms and plain sampling, and which of them are new.

use super::support::*;
use crate::audit::path::Path;
use crate::audit::separation::{Craft, Minima, Pair, Spell};
use crate::audit::tolerances::Lean;
use crate::audit::track::Track;
use crate::audit::world::tracks;
use crate::audit::{Finding, audit};
use crate::day::{Day, DayParts, SeparationRule};
use crate::ids::FlightId;

fn spells_of(day: &Day, lean: Lean) -> Vec<Spell> {
    let tracks = tracks(day);
    let paths: Vec<Path<'_>> = tracks.iter().map(Path::filed).collect();
    let minima = Minima::new(day, &[]);
    let rvsm = |i: u32| day.flights[FlightId(i)].rvsm;
    let craft = |i: usize| Craft { path: &paths[i], minima: &minima, rvsm: rvsm(i as u32) };
    let pair = Pair::new(&day.policy, craft(0), craft(1), lean);
    let (from_s, until_s) = pair.life_s();
    pair.spells(from_s, until_s)
}

fn spells(parts: DayParts) -> Vec<Spell> {
    spells_of(&build(parts), Lean::ForPlan)
}

/// One flight along the equator and one along a meridian, both over 0 N 2 E after half an hour.
fn crossing(fl_a: f64, fl_b: f64) -> DayParts {
    let mut parts = parts();
    parts.flights.push(flight("A", &[(0.0, 0.0, 0.0, fl_a), (60.0, 4.0, 0.0, fl_a)]));
    parts.flights.push(flight("B", &[(0.0, 2.0, -2.0, fl_b), (60.0, 2.0, 2.0, fl_b)]));
    parts
}

#[test]
fn two_straight_tracks_that_cross_at_a_right_angle() {
    let day = build(crossing(350.0, 350.0));
    let tracks = tracks(&day);
    let speed = |t: &Track| t.leg_length_m(0) / 3600.0;
    // Near the crossing d = t * sqrt(u^2 + v^2); the judge takes half a metre off the minimum.
    let half_s = (9260.0 - 0.5) / speed(&tracks[0]).hypot(speed(&tracks[1]));
    let found = spells_of(&day, Lean::ForPlan);
    assert_eq!(found.len(), 1);
    assert!((found[0].from_s - (1800.0 - half_s)).abs() < 0.01, "{found:?} {half_s}");
    assert!((found[0].until_s - (1800.0 + half_s)).abs() < 0.01, "{found:?} {half_s}");
    assert!((found[0].closest_s - 1800.0).abs() < 0.01 && found[0].horizontal_m < 0.1);
}

#[test]
fn a_loss_of_a_tenth_of_a_second_is_seen() {
    let level = build(crossing(350.0, 350.0));
    let tracks = tracks(&level);
    let speed = |t: &Track| t.leg_length_m(0) / 3600.0;
    let near_s = 1800.0 - 9260.0 / speed(&tracks[0]).hypot(speed(&tracks[1]));
    for k in 0..20 {
        // B climbs through A's level and has 1 000 ft again this long after they have come near.
        let apart_s = near_s + 0.14 + 0.001 * f64::from(k);
        let lat = |s: f64| 4.0 * s / 3600.0 - 2.0;
        let mut parts = crossing(350.0, 350.0);
        let (from_s, until_s) = (apart_s - 60.0, apart_s + 60.0);
        parts.flights[1] = flight(
            "B",
            &[
                (0.0, 2.0, lat(0.0), 340.0),
                (from_s / 60.0, 2.0, lat(from_s), 340.0),
                (until_s / 60.0, 2.0, lat(until_s), 380.0),
                (60.0, 2.0, lat(3600.0), 380.0),
            ],
        );
        let found = spells(parts);
        assert_eq!(found.len(), 1, "{k}");
        let lasts_s = found[0].until_s - found[0].from_s;
        // 1.64 ft at 33 ft/s are for the plan.
        assert!((0.05..0.14).contains(&lasts_s), "{lasts_s}");
    }
}

#[test]
fn vertical_minima() {
    assert_eq!(spells(crossing(350.0, 360.0)).len(), 0);
    assert_eq!(spells(crossing(350.0, 359.0)).len(), 1);
    // Above FL 410 it takes 2 000 ft; up to FL 410, 1 000 ft do.
    assert_eq!(spells(crossing(400.0, 410.0)).len(), 0);
    assert_eq!(spells(crossing(410.0, 420.0)).len(), 1);
    assert_eq!(spells(crossing(410.0, 430.0)).len(), 0);
    let not_approved = |fl_a, fl_b| {
        let mut parts = crossing(fl_a, fl_b);
        parts.flights[1].rvsm = false;
        spells(parts).len()
    };
    assert_eq!([not_approved(270.0, 280.0), not_approved(280.0, 290.0)], [0, 1]);
    assert_eq!([not_approved(350.0, 360.0), not_approved(350.0, 370.0)], [1, 0]);
    // Below the separation floor nothing is looked for.
    assert_eq!(spells(crossing(240.0, 240.0)).len(), 0);
}

#[test]
fn exactly_at_the_minimum_is_separated_and_just_below_is_not() {
    // Along two parallels, so far apart that their distance is 5 NM and a little.
    let beside = |metres: f64| {
        let mut parts = parts();
        // A degree of latitude is 110 574 m at the equator (WGS 84).
        let lat = metres / 110_574.3;
        parts.flights.push(flight("A", &[(0.0, 0.0, 0.0, 350.0), (60.0, 8.0, 0.0, 350.0)]));
        let mut b = vec![];
        for k in 0..=16 {
            b.push((f64::from(k) * 60.0 / 16.0, f64::from(k) * 0.5, lat, 350.0));
        }
        parts.flights.push(flight("B", &b));
        build(parts)
    };
    assert_eq!(spells_of(&beside(9263.0), Lean::ForPlan).len(), 0);
    assert!(!spells_of(&beside(9250.0), Lean::ForPlan).is_empty());
    // Within half a metre it depends on whom the doubt is for.
    assert_eq!(spells_of(&beside(9259.9), Lean::ForPlan).len(), 0);
    assert!(!spells_of(&beside(9259.9), Lean::AgainstPlan).is_empty());
}

#[test]
fn looks_see_what_plain_sampling_sees() {
    for k in 0..12 {
        let mut parts = parts();
        let off = f64::from(k) * 0.02;
        parts.flights.push(flight(
            "A",
            &[(0.0, 0.0, 0.0, 300.0), (20.0, 2.0, 0.5, 340.0), (60.0, 7.0, 0.0, 340.0)],
        ));
        parts.flights.push(flight(
            "B",
            &[(0.0, 6.0 + off, 1.0, 380.0), (30.0, 2.5, off, 335.0), (60.0, 0.0, 0.4, 310.0)],
        ));
        let day = build(parts);
        let found = spells_of(&day, Lean::ForPlan);
        let tracks = tracks(&day);
        let paths: Vec<Path<'_>> = tracks.iter().map(Path::filed).collect();
        for tenth in 0..36_000 {
            let time_s = f64::from(tenth) * 0.1;
            let apart_m = crate::geometry::geodesic::distance_m(
                paths[0].geodesic_place(time_s),
                paths[1].geodesic_place(time_s),
            );
            let apart_ft =
                (paths[0].state(time_s).level_ft - paths[1].state(time_s).level_ft).abs();
            let lost = |m: f64, ft: f64| apart_m < 9260.0 - m && apart_ft < 1000.0 - ft;
            let seen = found.iter().any(|s| s.from_s <= time_s && time_s <= s.until_s);
            // A few metres around the minimum are left to rounding.
            assert!(seen || !lost(3.0, 6.0), "{k}: loss at {time_s} s not seen");
            assert!(!seen || lost(0.0, 0.0), "{k}: {time_s} s is no loss");
        }
    }
}

/// A eastbound at FL 350, proposal P to FL 330; B crosses at minute 60, 7 E, at a level.
fn with_crosser(fl: f64) -> DayParts {
    let mut parts = simple();
    // A passes 7 E about 20 s early at FL 330; B passes the equator at minute 60.
    parts.flights.push(flight("B", &[(30.0, 7.0, -3.0, fl), (90.0, 7.0, 3.0, fl)]));
    parts
}

#[test]
fn a_new_loss_is_found_and_a_clear_level_is_not_one() {
    let found = findings(&build(with_crosser(330.0)), &[(0, 1)]);
    assert!(
        matches!(found[..], [Finding::NewLoss { first: FlightId(0), second: FlightId(1), .. }]),
        "{found:?}"
    );
    assert_sound(&audit(
        &build(with_crosser(310.0)),
        &plan(&build(with_crosser(310.0)), &[(0, 1)]),
    ));
    // The filed day's loss at FL 350 is none of the plan's.
    let day = build(with_crosser(350.0));
    assert_sound(&audit(&day, &plan(&day, &[(0, 1)])));
}

/// A at another level from minute 20 to 40 only; B crosses at minute 60, at A's filed level.
fn with_known_loss(margin_nm: f64) -> Day {
    let mut parts = with_crosser(350.0);
    parts.proposals[0].alternatives[0].stretches = vec![stretch(Some(20.0), Some(40.0), 330.0)];
    parts.policy.known_loss_margin_nm = margin_nm;
    // Filed, A passes 7 E 40 s before B; about 10 s more after the change.
    let points = &mut parts.flights[1].points;
    for p in points {
        p.time_s -= 25.0;
    }
    build(parts)
}

#[test]
fn a_loss_that_the_filed_day_holds_is_known_unless_it_gets_much_closer() {
    let day = with_known_loss(5.0);
    let report = audit(&day, &plan(&day, &[(0, 1)]));
    assert_sound(&report);
    assert_eq!(report.checked.losses, 1);
    let day = with_known_loss(0.1);
    let found = findings(&day, &[(0, 1)]);
    assert!(matches!(found[..], [Finding::NewLoss { .. }]), "{found:?}");
}

#[test]
fn a_loss_at_a_new_level_is_never_known() {
    // B changes level itself, so that the filed day holds a loss at FL 350 and the plan one below.
    let mut parts = with_crosser(350.0);
    parts.flights[1].points[0].level_ft = 33_500.0;
    parts.flights[1].points[1].level_ft = 34_500.0;
    let day = build(parts);
    let found = findings(&day, &[(0, 1)]);
    assert!(found.iter().any(|f| matches!(f, Finding::NewLoss { .. })), "{found:?}");
}

#[test]
fn a_sector_may_set_its_own_minimum() {
    // B flies beside A, 8 NM south, at FL 330.
    let beside = |own_nm| {
        let mut parts = simple();
        let lat = -8.0 * 1852.0 / 110_574.3;
        parts.flights.push(flight("B", &[(0.0, -0.2, lat, 330.0), (120.0, 14.2, lat, 330.0)]));
        for sector in &mut parts.sectors {
            sector.horizontal_nm = own_nm;
        }
        findings(&build(parts), &[(0, 1)])
    };
    assert_eq!(beside(None), vec![]);
    assert_eq!(beside(Some(7.0)), vec![]);
    assert!(matches!(beside(Some(10.0))[..], [Finding::NewLoss { .. }, ..]));
}

#[test]
fn time_errors_bring_losses_that_the_timetable_does_not_have() {
    // B passes the crossing two minutes after A's new time: 16 NM.
    let buffered = |buffer_s| {
        let mut parts = with_crosser(330.0);
        for p in &mut parts.flights[1].points {
            p.time_s += 100.0;
        }
        parts.policy.separation = SeparationRule::Buffered;
        parts.policy.buffer_s = buffer_s;
        findings(&build(parts), &[(0, 1)])
    };
    assert_eq!(buffered(0.0), vec![]);
    assert_eq!(buffered(20.0), vec![]);
    let found = buffered(60.0);
    assert!(
        found.iter().all(|f| matches!(f, Finding::NewLoss { shift_s, .. } if *shift_s != 0.0))
            && !found.is_empty(),
        "{found:?}"
    );
}
