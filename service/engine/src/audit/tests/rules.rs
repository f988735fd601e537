//! Every rule of level changes, broken once.

use super::support::*;
use crate::answer::Rule;
use crate::audit::tolerances::Lean;
use crate::audit::world::{Broken, combine, tracks};
use crate::day::{DayParts, LevelDirection, StretchParts};
use crate::ids::FlightId;

/// The rule that a day's first proposal breaks.
fn rule(parts: DayParts) -> Option<Rule> {
    let day = build(parts);
    let tracks = tracks(&day);
    let rules = [Lean::ForPlan, Lean::AgainstPlan].map(|lean| {
        match combine(&day, &tracks, FlightId(0), &[grant(&day, 0, 1)], lean) {
            Ok(_) => None,
            Err(Broken::Rule(_, rule)) => Some(rule),
            Err(Broken::OwnChange) => panic!("one grant can't exclude another"),
        }
    });
    assert_eq!(rules[0], rules[1], "no case here is a borderline one");
    rules[0].clone()
}

fn rule_of(stretches: Vec<StretchParts>) -> Option<Rule> {
    let mut parts = simple();
    parts.proposals[0].alternatives[0].stretches = stretches;
    rule(parts)
}

#[test]
fn places_of_a_stretch() {
    let one = |from, until, fl| rule_of(vec![stretch(from, until, fl)]);
    assert_eq!(one(Some(20.0), Some(100.0), 330.0), None);
    assert_eq!(one(None, None, 330.0), None);
    assert_eq!(one(None, None, 370.0), None);
    assert_eq!(one(Some(5.0), Some(100.0), 330.0), Some(Rule::FromNotInCruise));
    assert_eq!(one(Some(110.0), Some(115.0), 330.0), Some(Rule::FromNotInCruise));
    assert_eq!(one(Some(20.0), Some(115.0), 330.0), Some(Rule::UntilNotInCruise));
    assert_eq!(one(Some(-1.0), Some(100.0), 330.0), Some(Rule::OutsideFlight));
    assert_eq!(one(Some(20.0), Some(121.0), 330.0), Some(Rule::OutsideFlight));
    assert_eq!(one(Some(40.0), Some(30.0), 330.0), Some(Rule::EndsBeforeItBegins));
    assert_eq!(one(Some(40.0), Some(41.0), 330.0), Some(Rule::NoRoomToReach));
    assert_eq!(one(Some(20.0), Some(109.0), 330.0), Some(Rule::NoRoomToReturn));
    assert_eq!(one(Some(20.0), Some(110.0), 330.0), Some(Rule::NoRoomToReturn));
    assert_eq!(one(Some(20.0), Some(100.0), 350.0), Some(Rule::SameLevel));
    assert_eq!(one(None, Some(100.0), 350.0), Some(Rule::SameLevel));
}

#[test]
fn stretches_of_one_option_may_touch_but_not_overlap() {
    let two = |second| {
        rule_of(vec![stretch(Some(20.0), Some(40.0), 330.0), stretch(Some(second), None, 340.0)])
    };
    // The return from FL 330 takes a little more than two minutes of filed time.
    assert_eq!(two(42.1), None);
    assert_eq!(two(41.9), Some(Rule::StretchesOverlap));
    assert_eq!(
        rule_of(vec![stretch(None, None, 330.0), stretch(Some(60.0), Some(80.0), 340.0)]),
        Some(Rule::StretchesOverlap)
    );
}

#[test]
fn levels_and_aircraft() {
    let mut low = simple();
    low.proposals[0].alternatives[0].stretches = vec![stretch(Some(20.0), Some(80.0), 240.0)];
    assert_eq!(rule(low), Some(Rule::BelowFloor { floor_ft: 24_500.0 }));

    let mut not_approved = simple();
    not_approved.flights[0].rvsm = false;
    assert_eq!(rule(not_approved), Some(Rule::NotRvsm));

    let mut fixed = simple();
    fixed.flights[0].movable = false;
    assert_eq!(rule(fixed), Some(Rule::NotMovable));

    let mut heavy = simple();
    heavy.aircraft.push(crate::day::AircraftParts {
        aircraft: "ANY".to_owned(),
        ceiling_ft: Some(32_000.0),
        ..Default::default()
    });
    assert_eq!(rule(heavy), Some(Rule::AboveCeiling { ceiling_ft: 32_000.0 }));

    let mut no_cruise = simple();
    no_cruise.flights[0] =
        flight("A", &[(0.0, 0.0, 0.0, 100.0), (60.0, 7.0, 0.0, 350.0), (120.0, 14.0, 0.0, 50.0)]);
    assert_eq!(rule(no_cruise), Some(Rule::NoCruise));
}

#[test]
fn open_ends() {
    let level = |fl| {
        let mut parts = simple();
        parts.flights[0] = flight("A", &[(0.0, 0.0, 0.0, 350.0), (120.0, 14.0, 0.0, 350.0)]);
        parts.proposals[0].alternatives[0].stretches = fl;
        rule(parts)
    };
    assert_eq!(level(vec![stretch(None, Some(60.0), 330.0)]), Some(Rule::BeginsInCruise));
    assert_eq!(level(vec![stretch(Some(60.0), None, 330.0)]), Some(Rule::EndsInCruise));

    let shallow = |stretches| {
        let mut parts = simple();
        parts.flights[0] = flight(
            "A",
            &[
                (0.0, 0.0, 0.0, 340.0),
                (10.0, 1.0, 0.0, 350.0),
                (110.0, 13.0, 0.0, 350.0),
                (120.0, 14.0, 0.0, 340.0),
            ],
        );
        parts.proposals[0].alternatives[0].stretches = stretches;
        rule(parts)
    };
    assert_eq!(shallow(vec![stretch(None, Some(60.0), 330.0)]), Some(Rule::NotPassedInClimb));
    assert_eq!(shallow(vec![stretch(Some(60.0), None, 330.0)]), Some(Rule::NotPassedInDescent));
}

#[test]
fn direction_of_flight() {
    let eastbound = |filed_fl, new_fl| {
        let mut parts = simple();
        parts.policy.level_direction = LevelDirection::Semicircular;
        parts.flights[0] = eastward("A", 0.0, filed_fl);
        parts.proposals[0].alternatives[0].stretches =
            vec![stretch(Some(20.0), Some(100.0), new_fl)];
        rule(parts)
    };
    assert_eq!(eastbound(350.0, 330.0), None);
    assert!(matches!(eastbound(350.0, 340.0), Some(Rule::WrongDirection { track_deg })
        if (track_deg - 90.0).abs() < 1e-6));
    // The filed level breaks the rule too.
    assert_eq!(eastbound(360.0, 340.0), None);
}

#[test]
fn the_direction_of_every_leg_between_counts() {
    let turning = |until| {
        let mut parts = simple();
        parts.policy.level_direction = LevelDirection::Semicircular;
        let p = &mut parts.flights[0].points;
        (p[3].lon_deg, p[3].lat_deg, p[4].lon_deg, p[4].lat_deg) = (4.0, 4.0, 3.0, 4.0);
        parts.proposals[0].alternatives[0].stretches =
            vec![stretch(Some(20.0), Some(until), 330.0)];
        rule(parts)
    };
    assert_eq!(turning(50.0), None);
    // Westbound after minute 60, where the filed FL 350 breaks the rule too.
    assert_eq!(turning(100.0), None);
    let mut parts = simple();
    parts.policy.level_direction = LevelDirection::List(vec![crate::day::DirectionLevels {
        track_from_deg: 0.0,
        track_until_deg: 180.0,
        levels_ft: vec![33_000.0, 35_000.0],
    }]);
    assert_eq!(rule(parts.clone()), None);
    parts.proposals[0].alternatives[0].stretches = vec![stretch(Some(20.0), Some(100.0), 370.0)];
    assert!(matches!(rule(parts), Some(Rule::WrongDirection { .. })));
}
