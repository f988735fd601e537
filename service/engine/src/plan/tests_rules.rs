//! Restrictions, counts without flights, decisions by hand and operators, as plans heed them: each
//! on a day that would be planned otherwise without it.

use super::tests::{eastbound, find_on, option, proposal, sector, verdicts};
use super::*;
use crate::answer::{Constraint, Rule, Verdict};
use crate::day::{
    BackgroundParts, CapacityParts, Day, DayParts, DecisionAbout, DecisionParts, HandDecision,
    HandSubject, Must, RestrictionParts, VolumeParts,
};
use crate::fixture::empty_parts;
use crate::ids::{FlightId, ProposalId};
use crate::traffic::Traffic;

fn volume(west: f64, east: f64, floor_fl: f64, ceiling_fl: f64) -> VolumeParts {
    let ring = vec![[west, -1.0], [east, -1.0], [east, 1.0], [west, 1.0], [west, -1.0]];
    VolumeParts { rings: vec![ring], floor_ft: floor_fl * 100.0, ceiling_ft: ceiling_fl * 100.0 }
}

/// A at FL 350 asks for FL 370 from second 1000 to 3000: 2.1° to 6.25° east.
fn one() -> DayParts {
    DayParts {
        flights: vec![eastbound("A", 0.0, 0.0)],
        proposals: vec![proposal("p1", "A", vec![option(1, 370.0, 1000.0, 3000.0, 50.0)])],
        ..empty_parts()
    }
}

fn restricted(restriction: RestrictionParts) -> Verdict {
    let parts = DayParts { restrictions: vec![restriction], ..one() };
    let (_, plans) = find_on(parts, &FindOptions::default());
    let decision = &plans.plans[0].decisions[0];
    if decision.verdict == Verdict::Invalid {
        let rule = &decision.reasons[0].constraint;
        assert!(matches!(rule, Constraint::Invalid(Rule::Restriction { .. })), "{rule:?}");
    }
    decision.verdict
}

fn area(floor_fl: f64, ceiling_fl: f64) -> RestrictionParts {
    RestrictionParts {
        restriction: "area".to_owned(),
        volumes: vec![volume(4.0, 5.0, floor_fl, ceiling_fl)],
        from_s: 0.0,
        until_s: 7200.0,
        ..RestrictionParts::default()
    }
}

#[test]
fn a_changed_profile_keeps_out_of_restrictions_in_force() {
    assert_eq!(restricted(area(360.0, 400.0)), Verdict::Invalid);
    // Above it, below it, beside it.
    assert_eq!(restricted(area(371.0, 400.0)), Verdict::Granted);
    assert_eq!(restricted(area(360.0, 370.0)), Verdict::Granted);
    let beside =
        RestrictionParts { volumes: vec![volume(8.0, 9.0, 360.0, 400.0)], ..area(0.0, 1.0) };
    assert_eq!(restricted(beside), Verdict::Granted);
    // Over before it comes, and begun just as it is inside (4.5° is reached at second 2160 or so).
    assert_eq!(
        restricted(RestrictionParts { until_s: 1800.0, ..area(360.0, 400.0) }),
        Verdict::Granted
    );
    assert_eq!(
        restricted(RestrictionParts { from_s: 2160.0, ..area(360.0, 400.0) }),
        Verdict::Invalid
    );
}

#[test]
fn where_the_filed_profile_is_inside_too_a_change_may_be() {
    assert_eq!(restricted(area(300.0, 400.0)), Verdict::Granted);
    // Inside where the flight is as filed, outside where it is changed: nothing is entered anew.
    let later =
        RestrictionParts { volumes: vec![volume(8.0, 9.0, 340.0, 400.0)], ..area(0.0, 1.0) };
    assert_eq!(restricted(later.clone()), Verdict::Granted);
    // As filed it has left when the period begins; changed, it is later and is caught.
    let filed_out_s = 7200.0 * 9.0 / 15.0;
    let begins = RestrictionParts { from_s: filed_out_s + 0.5, until_s: 9000.0, ..later };
    let parts = DayParts { restrictions: vec![begins], ..one() };
    let (traffic, plans) = find_on(parts, &FindOptions::default());
    let shift_s = {
        let free = find_on(one(), &FindOptions::default()).1;
        free.plans[0].decisions[0].arrival_shift_s
    };
    let expected = if shift_s > 0.6 { Verdict::Invalid } else { Verdict::Granted };
    assert_eq!(plans.plans[0].decisions[0].verdict, expected, "{shift_s}");
    assert!(traffic.day.restrictions.iter().len() == 1);
}

#[test]
fn allowed_levels_may_be_held_but_not_passed_through() {
    let allowed = |fl: f64, ceiling_fl: f64| RestrictionParts {
        levels_allowed_ft: vec![fl * 100.0],
        ..area(360.0, ceiling_fl)
    };
    assert_eq!(restricted(allowed(370.0, 400.0)), Verdict::Granted);
    assert_eq!(restricted(allowed(390.0, 400.0)), Verdict::Invalid);
    // The climb from FL 350 to 370 begins at 2.1° and passes FL 360 inside.
    let around_climb =
        RestrictionParts { volumes: vec![volume(2.0, 2.4, 355.0, 400.0)], ..allowed(370.0, 400.0) };
    assert_eq!(restricted(around_climb), Verdict::Invalid);
}

#[test]
fn restrictions_may_be_about_some_flights_only() {
    let about = |departure: Option<&str>, destination: Option<&str>| RestrictionParts {
        departure: departure.map(str::to_owned),
        destination: destination.map(str::to_owned),
        ..area(360.0, 400.0)
    };
    // Flights here go from XAAA to XBBB.
    assert_eq!(restricted(about(Some("XAAA"), None)), Verdict::Invalid);
    assert_eq!(restricted(about(Some("XAAA"), Some("XBBB"))), Verdict::Invalid);
    assert_eq!(restricted(about(Some("XCCC"), None)), Verdict::Granted);
    assert_eq!(restricted(about(Some("XAAA"), Some("XCCC"))), Verdict::Granted);
}

#[test]
fn traffic_known_only_as_counts_takes_room() {
    let limits = CapacityParts { occupancy_limit: Some(2.0), ..CapacityParts::default() };
    let high = sector("HIGH", 360.0, 400.0, limits);
    let with = |aircraft: f64| {
        let background = BackgroundParts {
            sector: "HIGH".to_owned(),
            from_s: 0.0,
            until_s: 7200.0,
            aircraft,
            ..BackgroundParts::default()
        };
        let parts = DayParts {
            sectors: vec![high.0.clone()],
            capacities: vec![high.1.clone()],
            background: vec![background],
            ..one()
        };
        let (_, plans) = find_on(parts, &FindOptions::default());
        plans.plans[0].clone()
    };
    assert_eq!(verdicts(&with(1.0)), [Verdict::Granted]);
    let full = with(1.5);
    assert_eq!(verdicts(&full), [Verdict::Refused]);
    let reason = &full.decisions[0].reasons[0].constraint;
    assert!(
        matches!(reason, Constraint::Load { count, limit, .. } if (*count, *limit) == (2.5, 2.0)),
        "{reason:?}"
    );
}

/// Two flights that want the same place; the first is worth more.
fn rivals() -> DayParts {
    let low = crate::fixture::flight("B", &[(0.0, 0.0, 0.05, 310.0), (7200.0, 15.0, 0.05, 310.0)]);
    DayParts {
        flights: vec![eastbound("A", 0.0, 0.0), low],
        proposals: vec![
            proposal(
                "p1",
                "A",
                vec![option(1, 330.0, 1000.0, 3000.0, 50.0), option(2, 370.0, 1000.0, 3000.0, 9.0)],
            ),
            proposal("p2", "B", vec![option(1, 330.0, 1000.0, 3000.0, 20.0)]),
        ],
        ..empty_parts()
    }
}

fn decided(about: DecisionAbout, must: Must) -> Vec<Verdict> {
    let decisions = vec![DecisionParts { about, must }];
    let (_, plans) = find_on(DayParts { decisions, ..rivals() }, &FindOptions::default());
    let plan = &plans.plans[0];
    for decision in &plan.decisions {
        let by_hand = decision.reasons.iter().any(|r| r.constraint == Constraint::ByHand);
        if must == Must::Refuse && decision.proposal == ProposalId(0) {
            assert!(by_hand);
        }
    }
    verdicts(plan)
}

#[test]
fn decisions_by_hand_are_kept() {
    let p1 = || DecisionAbout::Proposal("p1".to_owned());
    let p2 = || DecisionAbout::Proposal("p2".to_owned());
    use Verdict::{Amended, Granted, Refused};
    // Left alone: the second best option of p1 leaves room for p2, and p1 as asked is worth less
    // than both.
    assert_eq!(find_on(rivals(), &FindOptions::default()).1.plans.len(), 1);
    assert_eq!(
        verdicts(&find_on(rivals(), &FindOptions::default()).1.plans[0]),
        [Granted, Refused]
    );
    assert_eq!(decided(p2(), Must::Grant { option: None }), [Amended, Granted]);
    assert_eq!(decided(p1(), Must::Grant { option: Some(2) }), [Amended, Granted]);
    assert_eq!(decided(p1(), Must::Refuse), [Refused, Granted]);
    let keep = DecisionAbout::Flight("A".to_owned());
    assert_eq!(decided(keep, Must::Keep), [Refused, Granted]);
}

#[test]
fn a_decision_that_cannot_be_met_is_answered_with_what_it_breaks_or_planned_around() {
    let traffic = Traffic::new(Day::build(rivals()).unwrap().day);
    let grant = |proposal: u32, option: u32| HandDecision {
        about: HandSubject::Proposal(ProposalId(proposal)),
        must: Must::Grant { option: Some(option) },
    };
    let mut options =
        FindOptions { decisions: vec![grant(0, 1), grant(1, 1)], ..FindOptions::default() };
    let refused = find(&traffic, &options, Watch::unattended());
    let Err(PlanError::UnmetDecision { decision, breaks }) = refused else {
        panic!("{refused:?}");
    };
    assert_eq!(decision, grant(1, 1));
    assert!(
        matches!(breaks[0].constraint, Constraint::Separation { other: FlightId(0), .. }),
        "{breaks:?}"
    );
    options.unmet = Unmet::PlanAround;
    let plans = find(&traffic, &options, Watch::unattended()).unwrap();
    assert_eq!(plans.unmet, [grant(1, 1)]);
    assert_eq!(verdicts(&plans.plans[0]), [Verdict::Granted, Verdict::Refused]);
}

/// Four flights far apart, three of operator ONE, all wanting up; p1 to p3 are worth more.
fn operators() -> DayParts {
    let flight = |name: &str, operator: &str, lat_deg: f64| {
        let mut flight = eastbound(name, 0.0, lat_deg);
        flight.operator = Some(operator.to_owned());
        flight
    };
    let ask = |name: &str, flight: &str, km: f64| {
        proposal(name, flight, vec![option(1, 370.0, 1000.0, 3000.0, km)])
    };
    DayParts {
        flights: vec![
            flight("A", "ONE", 0.0),
            flight("B", "ONE", 1.0),
            flight("C", "ONE", 2.0),
            flight("D", "TWO", 3.0),
        ],
        proposals: vec![
            ask("p1", "A", 50.0),
            ask("p2", "B", 40.0),
            ask("p3", "C", 30.0),
            ask("p4", "D", 5.0),
        ],
        ..empty_parts()
    }
}

#[test]
fn no_operator_gets_more_than_its_share() {
    let mut parts = operators();
    parts.policy.max_share_per_operator = Some(0.5);
    let (_, plans) = find_on(parts, &FindOptions::default());
    use Verdict::{Granted, Refused};
    assert_eq!(verdicts(&plans.plans[0]), [Granted, Refused, Refused, Granted]);
    let reason = &plans.plans[0].decisions[1].reasons[0].constraint;
    let Constraint::PlanLimit { key, count, limit } = reason else { panic!("{reason:?}") };
    assert_eq!((*key, *limit), ("max_share_per_operator", 0.5));
    assert!((count - 2.0 / 3.0).abs() < 1e-9);
}

#[test]
fn every_operator_gets_its_least() {
    let mut parts = operators();
    parts.policy.max_moved_flights = Some(2.0);
    let free = find_on(parts.clone(), &FindOptions::default()).1;
    use Verdict::{Granted, Refused};
    assert_eq!(verdicts(&free.plans[0]), [Granted, Granted, Refused, Refused]);
    parts.policy.min_grant_rate_per_operator = Some(0.3);
    let fair = find_on(parts.clone(), &FindOptions::default()).1;
    assert_eq!(verdicts(&fair.plans[0]), [Granted, Refused, Refused, Granted]);
    parts.policy.min_grant_rate_per_operator = Some(0.9);
    let traffic = Traffic::new(Day::build(parts).unwrap().day);
    let impossible = find(&traffic, &FindOptions::default(), Watch::unattended());
    assert_eq!(impossible, Err(PlanError::GrantRate));
}

/// A window for two of three: the third is what one more would gain.
#[test]
fn what_a_limit_costs_is_what_one_more_would_gain() {
    let limits = CapacityParts { entries_per_hour: Some(1.0), ..CapacityParts::default() };
    let high = sector("HIGH", 360.0, 400.0, limits);
    let ask = |name: &str, flight: &str, km: f64| {
        proposal(name, flight, vec![option(1, 370.0, 1000.0, 3000.0, km)])
    };
    let parts = DayParts {
        sectors: vec![high.0],
        capacities: vec![high.1],
        flights: vec![eastbound("A", 0.0, 0.0), eastbound("B", 0.0, 1.0), eastbound("C", 0.0, 2.0)],
        proposals: vec![ask("p1", "A", 50.0), ask("p2", "B", 40.0), ask("p3", "C", 30.0)],
        ..empty_parts()
    };
    let options = FindOptions { exact_limits: 5, ..FindOptions::default() };
    let (_, plans) = find_on(parts.clone(), &options);
    let per_km = 1000.0 * 9e8 * 0.42;
    assert!((plans.plans[0].objective / (50.0 * per_km) - 1.0).abs() < 1e-9);
    // Several windows hold the same entries; raising one of them alone gains nothing, and no price
    // is more than what the second flight is worth.
    assert!(!plans.limit_prices.is_empty());
    for price in &plans.limit_prices {
        assert!(price.estimate > 0.0 && price.estimate <= 40.0 * per_km * (1.0 + 1e-9));
        assert_eq!(price.exact, Some(0.0));
    }
    // Windows that do not overlap: one holds them all, and one more is worth the second flight.
    let mut apart = parts;
    apart.policy.entry_step_min = 60.0;
    let (_, plans) = find_on(apart, &options);
    assert_eq!(plans.limit_prices.len(), 1);
    let exact = plans.limit_prices[0].exact.unwrap();
    assert!((exact / (40.0 * per_km) - 1.0).abs() < 1e-9);
}

#[test]
fn a_trade_off_buys_the_dearest_first() {
    let traffic = Traffic::new(Day::build(operators()).unwrap().day);
    let options = FindOptions::default();
    let curve = trade_off(&traffic, 4, &options, Watch::unattended()).unwrap();
    let by_moved: Vec<(u32, f64)> = curve
        .points
        .iter()
        .filter(|p| !matches!(p.limit, crate::answer::TradeOffLimit::ExtraFuelKg(_)))
        .map(|p| (p.moved_flights, p.contrail_km_avoided))
        .collect();
    assert_eq!(by_moved, [(4, 125.0), (3, 120.0), (2, 90.0), (1, 50.0)]);
    assert!(curve.points.iter().all(|p| p.bound == Some(p.objective)));
}
