use super::*;
use crate::answer::Rule;
use crate::day::{AircraftParts, Day, DayParts, FlightParts, Stretch};
use crate::fixture::{day_of, empty_parts, flight, stretch};
use crate::ids::FlightId;
use crate::path::{Path, Track};

/// Along the equator to the east at about 450 kt: climb to FL 350, two hours of cruise, descent.
fn eastbound() -> FlightParts {
    flight(
        "F1",
        &[
            (0.0, 0.0, 0.0, 0.0),
            (1200.0, 2.0, 0.0, 350.0),
            (4800.0, 9.5, 0.0, 350.0),
            (8400.0, 17.0, 0.0, 350.0),
            (9600.0, 19.0, 0.0, 0.0),
        ],
    )
}

fn change(day: &Day, stretches: &[Stretch]) -> Result<Change, Rule> {
    let flight = &day.flights[FlightId(0)];
    change_levels(day, flight, &Track::new(&flight.profile), stretches)
}

fn of(flight: FlightParts, stretches: &[Stretch]) -> Result<Change, Rule> {
    change(&day_of(vec![flight]), stretches)
}

/// FL 350 to 330 at constant Mach number in ISA: 581.615 / 576.419 kt of sound (ICAO Doc 7488), so
/// 0.536 minutes are gained in an hour.
#[test]
fn an_hour_at_a_lower_level_gains_half_a_minute() {
    let made = of(eastbound(), &[stretch(330.0, Some(2000.0), Some(5600.0))]).unwrap();
    let at_new_level_s = 3600.0 - 120.0;
    let hold_s = -at_new_level_s * (1.0 - 576.419 / 581.615);
    // Two transitions of two minutes at the mean of both speeds.
    let transitions_s = -2.0 * 120.0 * 0.5 * (1.0 - 576.419 / 581.615);
    let shift_s = made.arrival_shift_s();
    assert!((shift_s - (hold_s + transitions_s)).abs() < 0.05, "{shift_s}");
    assert!((shift_s / 60.0 + 0.536).abs() < 0.01, "{shift_s}");
}

#[test]
fn the_profile_leaves_and_returns_where_it_is_told() {
    let day = day_of(vec![eastbound()]);
    let made = change(&day, &[stretch(370.0, Some(2000.0), Some(5600.0))]).unwrap();
    let track = Track::new(&day.flights[FlightId(0)].profile);
    let path = Path::changed(&track, &made.changed);
    let times = made.times[0];
    assert_eq!(times.planned_from_s, 2000.0);
    assert_eq!(path.level_ft_at(2000.0), 35_000.0);
    assert!((path.level_ft_at(2060.0) - 36_000.0).abs() < 1e-6);
    assert_eq!(path.level_ft_at(2120.0), 37_000.0);
    assert_eq!(path.level_ft_at(times.planned_until_s), 37_000.0);
    assert!((path.level_ft_at(times.planned_until_s + 120.0) - 35_000.0).abs() < 20.0);
    // The return starts at the place that was filed for 5600 s, a little later in time.
    let there = path.knots_from(0).find(|k| k.filed_s >= 5600.0).unwrap();
    assert!((there.time_s - times.planned_until_s).abs() < 1e-3);
    // The off-level interval is one, from leaving to having returned.
    let off = &made.changed.off_level_s;
    assert_eq!(off.len(), 1);
    assert_eq!(off[0].0, 2000.0);
    assert!((off[0].1 - (times.planned_until_s + 120.0)).abs() < 2e-3);
    // Strictly increasing, and every later knot moves by the shift.
    let knots: Vec<_> = path.knots_from(0).collect();
    assert!(knots.windows(2).all(|w| w[0].time_s < w[1].time_s));
    assert!((knots.last().unwrap().time_s - 9600.0 - made.arrival_shift_s()).abs() < 1e-9);
}

#[test]
fn from_the_climb_a_lower_level_is_taken_in_passing() {
    let made = of(eastbound(), &[stretch(310.0, None, Some(5600.0))]).unwrap();
    let passed_s = 1200.0 * 310.0 / 350.0;
    assert!((made.times[0].planned_from_s - passed_s).abs() < 1e-3);
    let higher = of(eastbound(), &[stretch(370.0, None, Some(5600.0))]).unwrap();
    assert_eq!(higher.times[0].planned_from_s, 1200.0);
}

#[test]
fn until_the_descent_a_lower_level_is_kept_and_a_higher_one_is_left_in_time() {
    let lower = of(eastbound(), &[stretch(310.0, Some(5000.0), None)]).unwrap();
    let filed_passing_s = 8400.0 + 1200.0 * (350.0 - 310.0) / 350.0;
    assert!((lower.times[0].filed_returned_s - filed_passing_s).abs() < 1e-6);
    let higher = of(eastbound(), &[stretch(370.0, Some(5000.0), None)]).unwrap();
    assert!((higher.times[0].filed_returned_s - 8400.0).abs() < 1e-6);
    let last = higher.marks[higher.marks.len() - 1];
    assert_eq!(last.level_ft, 35_000.0);
    assert!((last.time_s - higher.times[0].planned_until_s - 120.0).abs() < 2e-3);
}

#[test]
fn two_stretches_follow_each_other_and_may_not_overlap() {
    let first = stretch(370.0, Some(2000.0), Some(3000.0));
    let second = stretch(330.0, Some(5000.0), Some(6000.0));
    let both = of(eastbound(), &[first, second]).unwrap();
    assert_eq!(both.changed.off_level_s.len(), 2);
    let alone = |s| of(eastbound(), &[s]).unwrap().arrival_shift_s();
    assert!((both.arrival_shift_s() - alone(first) - alone(second)).abs() < 2e-3);
    // The first return ends about 3120 s.
    let early = stretch(330.0, Some(3050.0), Some(6000.0));
    assert_eq!(of(eastbound(), &[first, early]), Err(Rule::StretchesOverlap));
}

#[test]
fn a_filed_step_climb_is_replaced_while_ground_speed_there_stays() {
    let stepping = flight(
        "F1",
        &[
            (0.0, 0.0, 0.0, 330.0),
            (3600.0, 7.5, 0.0, 330.0),
            (3720.0, 7.75, 0.0, 350.0),
            (7200.0, 15.0, 0.0, 350.0),
        ],
    );
    let made = of(stepping, &[stretch(370.0, Some(1800.0), Some(5400.0))]).unwrap();
    let levels: Vec<f64> = made.marks.iter().map(|m| m.level_ft).collect();
    assert_eq!(levels.first(), Some(&33_000.0));
    assert_eq!(levels.last(), Some(&35_000.0), "returns to the level filed there");
    let at = |filed_s: f64| made.marks.iter().find(|m| m.filed_s == filed_s).unwrap();
    let over_the_step = at(3720.0).time_s - at(3600.0).time_s;
    assert!((over_the_step - 120.0).abs() < 1.1e-3, "{over_the_step}");
}

#[test]
fn rules_are_named() {
    let cases: Vec<(Stretch, Rule)> = vec![
        (stretch(350.0, Some(2000.0), Some(3000.0)), Rule::SameLevel),
        (stretch(370.0, Some(600.0), Some(3000.0)), Rule::FromNotInCruise),
        (stretch(370.0, Some(2000.0), Some(9000.0)), Rule::UntilNotInCruise),
        (stretch(370.0, Some(2000.0), Some(99_000.0)), Rule::OutsideFlight),
        (stretch(370.0, Some(3000.0), Some(3000.0)), Rule::EndsBeforeItBegins),
        (stretch(370.0, Some(2000.0), Some(2100.0)), Rule::NoRoomToReach),
        (stretch(370.0, Some(2000.0), Some(8390.0)), Rule::NoRoomToReturn),
        (stretch(230.0, Some(2000.0), Some(3000.0)), Rule::BelowFloor { floor_ft: 24_500.0 }),
    ];
    for (asked, rule) in cases {
        assert_eq!(of(eastbound(), &[asked]), Err(rule), "{asked:?}");
    }
    let wrong = of(eastbound(), &[stretch(360.0, Some(2000.0), Some(3000.0))]);
    assert!(
        matches!(wrong, Err(Rule::WrongDirection { track_deg }) if (track_deg - 90.0).abs() < 1e-6)
    );
    let old = FlightParts { rvsm: false, ..eastbound() };
    assert_eq!(of(old, &[stretch(370.0, Some(2000.0), Some(3000.0))]), Err(Rule::NotRvsm));
    let fixed = FlightParts { movable: false, ..eastbound() };
    assert_eq!(of(fixed, &[stretch(370.0, Some(2000.0), Some(3000.0))]), Err(Rule::NotMovable));
}

#[test]
fn a_flight_that_begins_or_ends_in_cruise_has_no_climb_or_descent() {
    let over = flight("F1", &[(0.0, 0.0, 0.0, 350.0), (7200.0, 15.0, 0.0, 350.0)]);
    assert_eq!(of(over.clone(), &[stretch(370.0, None, Some(3000.0))]), Err(Rule::BeginsInCruise));
    assert_eq!(of(over, &[stretch(370.0, Some(3000.0), None)]), Err(Rule::EndsInCruise));
}

#[test]
fn a_leg_that_breaks_the_direction_rule_as_filed_does_not_block() {
    // Eastbound at an even level, as filed.
    let odd = flight("F1", &[(0.0, 0.0, 0.0, 360.0), (7200.0, 15.0, 0.0, 360.0)]);
    assert!(of(odd, &[stretch(340.0, Some(2000.0), Some(4000.0))]).is_ok());
}

#[test]
fn the_class_sets_ceiling_and_rates() {
    let class = AircraftParts {
        aircraft: "T1".to_owned(),
        ceiling_ft: Some(37_000.0),
        climb_fpm: Some(500.0),
        ..AircraftParts::default()
    };
    let parts = DayParts { flights: vec![eastbound()], aircraft: vec![class], ..empty_parts() };
    let day = Day::build(parts).unwrap().day;
    let made = change(&day, &[stretch(370.0, Some(2000.0), Some(4000.0))]).unwrap();
    assert!((made.marks[2].time_s - 2240.0).abs() < 1e-9, "2000 ft at 500 ft/min");
    let high = change(&day, &[stretch(390.0, Some(2000.0), Some(4000.0))]);
    assert_eq!(high, Err(Rule::AboveCeiling { ceiling_ft: 37_000.0 }));
}

#[test]
fn midnight_and_the_antimeridian_make_no_difference() {
    let shifted = flight(
        "F1",
        &[
            (82_800.0, 172.0, 0.0, 350.0),
            (86_400.0, 179.5, 0.0, 350.0),
            (90_000.0, -173.0, 0.0, 350.0),
        ],
    );
    let plain = flight(
        "F1",
        &[(0.0, 0.0, 0.0, 350.0), (3600.0, 7.5, 0.0, 350.0), (7200.0, 15.0, 0.0, 350.0)],
    );
    let a = of(shifted, &[stretch(330.0, Some(84_000.0), Some(88_000.0))]).unwrap();
    let b = of(plain, &[stretch(330.0, Some(1200.0), Some(5200.0))]).unwrap();
    assert!((a.arrival_shift_s() - b.arrival_shift_s()).abs() < 1.1e-3);
    for (x, y) in a.changed.knots.iter().zip(&b.changed.knots) {
        assert!((x.time_s - 82_800.0 - y.time_s).abs() < 1.1e-3);
        assert!(x.lon_deg.abs() <= 180.0);
    }
}

#[test]
fn written_points_have_whole_milliseconds_and_steps_of_a_thousand_feet() {
    let day = day_of(vec![eastbound()]);
    let made = change(&day, &[stretch(390.0, Some(2000.123), Some(5600.0))]).unwrap();
    let written = written_points(&day.flights[FlightId(0)].profile, &made);
    for w in written.windows(2) {
        assert!(w[0].time_s < w[1].time_s);
        let in_cruise = w[0].level_ft >= 35_000.0 && w[1].level_ft >= 35_000.0;
        assert!(!in_cruise || (w[0].level_ft - w[1].level_ft).abs() <= 1000.0 + 1e-6);
    }
    for p in &written {
        assert!((p.time_s * 1000.0 - (p.time_s * 1000.0).round()).abs() < 1e-6);
    }
    assert_eq!(
        written.len(),
        5 + made.marks.len() - made.marks.iter().filter(|m| m.filed_s == 4800.0).count()
    );
}
