//! Times of changed profiles against arithmetic done here by hand.

use super::support::*;
use crate::audit::tolerances::Lean;
use crate::audit::world::{combine, tracks};
use crate::day::{AircraftParts, Day};
use crate::ids::FlightId;

/// Ratio of the speeds of sound, below the tropopause (ISO 2533).
fn sound(fl: f64, over_fl: f64) -> f64 {
    let kelvin = |fl: f64| 288.15 - 0.0065 * fl * 30.48;
    (kelvin(fl) / kelvin(over_fl)).sqrt()
}

fn shift_and_times(day: &Day, taken: &[(u32, u32)]) -> (f64, Vec<Vec<(f64, f64)>>) {
    let tracks = tracks(day);
    let grants: Vec<_> = taken.iter().map(|&(p, o)| grant(day, p, o)).collect();
    let one = combine(day, &tracks, FlightId(0), &grants, Lean::ForPlan).unwrap();
    (one.path.end_s() - day.flights[FlightId(0)].profile.end_s(), one.planned_s)
}

#[test]
fn two_thousand_feet_lower_arrive_earlier() {
    let day = build(simple());
    let (shift_s, planned) = shift_and_times(&day, &[(0, 1)]);
    // Down 350 -> 330 and up again in steps of 60 s each, held in between.
    let (k345, k335, k330) = (sound(345.0, 350.0), sound(335.0, 350.0), sound(330.0, 350.0));
    let reach_filed_s = 60.0 * (k345 + k335);
    let hold_filed_s = 80.0 * 60.0 - reach_filed_s;
    let expected_s =
        (120.0 - reach_filed_s) + (hold_filed_s / k330 - hold_filed_s) + (120.0 - reach_filed_s);
    assert!((shift_s - expected_s).abs() < 1e-3, "{shift_s} {expected_s}");
    // 0.54 min an hour at the lower level, for a little less than 80 minutes.
    assert!((-44.0..-41.0).contains(&shift_s), "{shift_s}");
    let until_s = 1200.0 + 120.0 + hold_filed_s / k330;
    assert!((planned[0][0].0 - 1200.0).abs() < 1e-9);
    assert!((planned[0][0].1 - until_s).abs() < 1e-3);
}

#[test]
fn a_transition_over_the_end_of_a_leg_takes_each_legs_own_speed() {
    let mut parts = simple();
    // The second cruise leg is twice as fast as the first.
    let p = &mut parts.flights[0].points;
    (p[2].lon_deg, p[3].lon_deg, p[4].lon_deg) = (6.0, 16.0, 17.0);
    parts.proposals[0].alternatives[0].stretches = vec![stretch(Some(59.5), Some(100.0), 330.0)];
    let day = build(parts);
    let (shift_s, _) = shift_and_times(&day, &[(0, 1)]);
    // Half a minute of filed time before the point at minute 60: the middle level of the part
    // follows from its own duration x: x k(350 - 5 x / 60) = 30.
    let x = (0..50).fold(30.0, |x: f64, _| 30.0 / sound(350.0 - 5.0 * x / 60.0, 350.0));
    let joined_fl = 350.0 - 10.0 * x / 60.0;
    let rest = (60.0 - x) * sound((joined_fl + 340.0) / 2.0, 350.0) + 60.0 * sound(335.0, 350.0);
    let back = 60.0 * (sound(335.0, 350.0) + sound(345.0, 350.0));
    let hold_filed_s = 40.0 * 60.0 - rest;
    let hold_s = hold_filed_s / sound(330.0, 350.0);
    let expected_s = (120.0 - 30.0 - rest) + (hold_s - hold_filed_s) + (120.0 - back);
    assert!((shift_s - expected_s).abs() < 1e-3, "{shift_s} {expected_s}");
}

#[test]
fn a_filed_step_climb_under_a_stretch_keeps_its_ground_speed() {
    let mut parts = simple();
    parts.flights[0] = super::support::flight(
        "A",
        &[
            (0.0, 0.0, 0.0, 100.0),
            (10.0, 1.0, 0.0, 330.0),
            (50.0, 6.0, 0.0, 330.0),
            (54.0, 6.5, 0.0, 350.0),
            (110.0, 13.0, 0.0, 350.0),
            (120.0, 14.0, 0.0, 50.0),
        ],
    );
    // Held at FL 310 over the step climb, back to the level filed at minute 100, FL 350.
    parts.proposals[0].alternatives[0].stretches = vec![stretch(Some(20.0), Some(100.0), 310.0)];
    let day = build(parts);
    let (shift_s, planned) = shift_and_times(&day, &[(0, 1)]);
    let reach = 60.0 * (sound(325.0, 330.0) + sound(315.0, 330.0));
    let before = (30.0 * 60.0 - reach) / sound(310.0, 330.0);
    let after = 46.0 * 60.0 / sound(310.0, 350.0);
    let held_until_s = 1200.0 + 120.0 + before + 240.0 + after;
    assert!((planned[0][0].1 - held_until_s).abs() < 1e-3);
    let back: f64 = [315.0, 325.0, 335.0, 345.0].map(|fl| 60.0 * sound(fl, 350.0)).iter().sum();
    let expected_s = held_until_s + 240.0 - (6000.0 + back);
    assert!((shift_s - expected_s).abs() < 1e-3, "{shift_s} {expected_s}");
}

#[test]
fn from_the_climb_and_until_the_descent_lower() {
    let mut parts = simple();
    parts.proposals[0].alternatives[0].stretches = vec![stretch(None, None, 310.0)];
    let day = build(parts);
    let (shift_s, planned) = shift_and_times(&day, &[(0, 1)]);
    // The climb from FL 100 to 350 in 600 s passes FL 310 after 504 s; the descent from FL 350 to
    // 50 in 600 s passes it 80 s after minute 110.
    let cruise_s = 6000.0 / sound(310.0, 350.0);
    assert!((planned[0][0].0 - 504.0).abs() < 1e-9);
    assert!((planned[0][0].1 - (600.0 + cruise_s + 80.0)).abs() < 1e-3);
    assert!((shift_s - (cruise_s - 6000.0)).abs() < 1e-3);
}

#[test]
fn from_the_climb_and_until_the_descent_higher() {
    let mut parts = simple();
    parts.aircraft.push(AircraftParts {
        aircraft: "ANY".to_owned(),
        climb_fpm: Some(500.0),
        descent_fpm: Some(2000.0),
        ..AircraftParts::default()
    });
    // From FL 310, so that all levels are below the tropopause.
    parts.flights[0] = eastward("A", 0.0, 310.0);
    parts.proposals[0].alternatives[0].stretches = vec![stretch(None, None, 330.0)];
    let day = build(parts);
    let (shift_s, planned) = shift_and_times(&day, &[(0, 1)]);
    let up_filed = 120.0 * (sound(315.0, 310.0) + sound(325.0, 310.0));
    let down_filed = 30.0 * (sound(325.0, 310.0) + sound(315.0, 310.0));
    let hold_s = (6000.0 - up_filed - down_filed) / sound(330.0, 310.0);
    assert!((planned[0][0].0 - 600.0).abs() < 1e-9);
    assert!((planned[0][0].1 - (600.0 + 240.0 + hold_s)).abs() < 1e-3);
    assert!((shift_s - (240.0 + hold_s + 60.0 - 6000.0)).abs() < 1e-3);
}

#[test]
fn several_stretches_and_proposals_add_up() {
    let mut parts = simple();
    parts.proposals[0].alternatives[0].stretches =
        vec![stretch(Some(20.0), Some(40.0), 330.0), stretch(Some(50.0), Some(70.0), 340.0)];
    let second = option(1, vec![stretch(Some(80.0), Some(90.0), 330.0)]);
    parts.proposals.push(proposal("Q", "A", vec![second]));
    let day = build(parts);
    let (both_s, planned) = shift_and_times(&day, &[(0, 1), (1, 1)]);
    let (first_s, _) = shift_and_times(&day, &[(0, 1)]);
    let (second_s, alone) = shift_and_times(&day, &[(1, 1)]);
    assert!((both_s - first_s - second_s).abs() < 2e-3);
    // The second proposal begins as much earlier as the first has gained.
    assert!((planned[1][0].0 - alone[0][0].0 - first_s).abs() < 2e-3);
}

#[test]
fn steps_are_thousands_of_feet_from_the_level_left() {
    let mut parts = simple();
    parts.proposals[0].alternatives[0].stretches = vec![stretch(Some(20.0), Some(100.0), 370.0)];
    parts.flights[0] = eastward("A", 0.0, 355.0);
    let day = build(parts);
    let (shift_s, planned) = shift_and_times(&day, &[(0, 1)]);
    // Up 355 -> 365 -> 370, down 370 -> 360 -> 355; colder air above only up to the tropopause.
    let k = |fl: f64| sound(fl.min(11_000.0 / 30.48), 355.0);
    let up = 60.0 * k(360.0) + 30.0 * k(367.5);
    let down = 60.0 * k(365.0) + 30.0 * k(357.5);
    let hold_filed_s = 80.0 * 60.0 - up;
    let hold_s = hold_filed_s / k(370.0);
    assert!((planned[0][0].1 - (1200.0 + 90.0 + hold_s)).abs() < 1e-3);
    let expected_s = (90.0 - up) + (hold_s - hold_filed_s) + (90.0 - down);
    assert!((shift_s - expected_s).abs() < 1e-3, "{shift_s} {expected_s}");
}

#[test]
fn a_return_until_the_descent_counts_its_steps_from_the_level_left() {
    let mut parts = simple();
    parts.proposals[0].alternatives[0].stretches = vec![stretch(Some(20.0), None, 370.0)];
    parts.flights[0] = eastward("A", 0.0, 355.0);
    let day = build(parts);
    let (shift_s, planned) = shift_and_times(&day, &[(0, 1)]);
    let k = |fl: f64| sound(fl.min(11_000.0 / 30.48), 355.0);
    let up = 60.0 * k(360.0) + 30.0 * k(367.5);
    let down = 60.0 * k(365.0) + 30.0 * k(357.5);
    // At the filed level again at minute 110.
    let hold_s = (90.0 * 60.0 - up - down) / k(370.0);
    assert!((planned[0][0].1 - (1200.0 + 90.0 + hold_s)).abs() < 1e-3);
    assert!((shift_s - (90.0 + hold_s + 90.0 - 5400.0)).abs() < 1e-3);
}
