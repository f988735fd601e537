//! The four ways of separation, on two flights whose tracks cross a minute and a half apart at one level.

use super::tests::{eastbound, find_on, option, proposal, verdicts};
use super::*;
use crate::answer::{Constraint, Plan, Verdict};
use crate::day::{DayParts, Policy, SeparationRule};
use crate::fixture::{empty_parts, flight};

/// A asks for FL 370, at which B crosses its track from south to north, 90 s after it.
fn crossing(policy: Policy) -> DayParts {
    // A is at 5° east after 2400 s, B there after 2490 s.
    let b = flight("B", &[(90.0, 5.0, -5.0, 370.0), (4890.0, 5.0, 5.0, 370.0)]);
    DayParts {
        policy,
        flights: vec![eastbound("A", 0.0, 0.0), b],
        proposals: vec![proposal("p1", "A", vec![option(1, 370.0, 1000.0, 4000.0, 50.0)])],
        ..empty_parts()
    }
}

fn plan_under(policy: Policy) -> Plan {
    let (_, plans) = find_on(crossing(policy), &FindOptions::default());
    plans.plans[0].clone()
}

fn policy(separation: SeparationRule) -> Policy {
    Policy { separation, time_sigma_s: 60.0, ..Policy::default() }
}

#[test]
fn at_the_planned_times_they_are_apart() {
    let plan = plan_under(policy(SeparationRule::Nominal));
    assert_eq!(verdicts(&plan), [Verdict::Granted]);
    // 0.3 or so: a minute and a half between them, a deviation of 85 s, and separation lost within
    // 56 s of being there together (a normal distribution's share).
    assert!((0.2..0.45).contains(&plan.expected_new_losses), "{}", plan.expected_new_losses);
}

#[test]
fn a_buffer_on_each_flight_s_time_may_bring_them_together() {
    let buffered = |buffer_s| Policy { buffer_s, ..policy(SeparationRule::Buffered) };
    // They lose separation when B is earlier by about 34 s to 146 s.
    assert_eq!(verdicts(&plan_under(buffered(5.0))), [Verdict::Granted]);
    let plan = plan_under(buffered(30.0));
    assert_eq!(verdicts(&plan), [Verdict::Refused]);
    let reason = &plan.decisions[0].reasons[0].constraint;
    assert!(matches!(reason, Constraint::SeparationRisk { .. }), "{reason:?}");
}

#[test]
fn a_pair_s_probability_has_a_limit() {
    let at_most =
        |max_pair_probability| Policy { max_pair_probability, ..policy(SeparationRule::Risk) };
    assert_eq!(verdicts(&plan_under(at_most(0.7))), [Verdict::Granted]);
    let plan = plan_under(at_most(0.1));
    assert_eq!(verdicts(&plan), [Verdict::Refused]);
    let reason = &plan.decisions[0].reasons[0].constraint;
    let Constraint::SeparationRisk { probability, limit, .. } = reason else {
        panic!("{reason:?}");
    };
    assert!((0.2..0.45).contains(probability) && *limit == 0.1);
}

#[test]
fn a_loss_to_be_expected_has_a_price() {
    let at = |loss_price_j| Policy { loss_price_j, ..policy(SeparationRule::Priced) };
    let cheap = plan_under(at(1e12));
    assert_eq!(verdicts(&cheap), [Verdict::Granted]);
    let expected = cheap.decisions[0].net_benefit - 1e12 * cheap.expected_new_losses;
    assert!((cheap.objective - expected).abs() < 2.0, "{} {expected}", cheap.objective);
    let dear = plan_under(at(1e14));
    assert_eq!(verdicts(&dear), [Verdict::Refused]);
    assert_eq!(dear.decisions[0].reasons[0].constraint, Constraint::NotWorthIt);
    assert_eq!(dear.objective, 0.0);
}

/// Where both move, the price is that of what both fly.
#[test]
fn two_moved_flights_are_priced_together() {
    let mut parts = crossing(Policy { loss_price_j: 1e14, ..policy(SeparationRule::Priced) });
    // B may go to FL 390, for nothing in return, and leaves the crossing free.
    parts.proposals.push(proposal("p2", "B", vec![option(1, 390.0, 700.0, 4600.0, 0.0)]));
    parts.policy.level_direction = crate::day::LevelDirection::Free;
    let (_, plans) = find_on(parts, &FindOptions::default());
    assert_eq!(verdicts(&plans.plans[0]), [Verdict::Granted, Verdict::Granted]);
    assert!(plans.plans[0].expected_new_losses < 1e-6);
    assert_eq!(plans.gap(), Some(0.0));
}
