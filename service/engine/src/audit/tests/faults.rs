//! One fault at a time in a plan that is sound without it.

use super::support::*;
use crate::answer::{Exchange, Rule, Verdict};
use crate::audit::{ClaimedReason, Figure, Finding, ReasonKind, WrittenFault, audit};
use crate::day::{DayParts, FuelFlow, FuelParts, SeparationRule};
use crate::ids::{FlightId, ProposalId, SectorId};

const P: ProposalId = ProposalId(0);

#[test]
fn decisions_that_do_not_fit_the_day() {
    let found = after(|p| p.decisions.clear());
    assert!(found.contains(&Finding::DecisionMissing { proposal: P }), "{found:?}");
    let found = after(|p| p.decisions.push(p.decisions[0].clone()));
    assert!(found.contains(&Finding::DecisionRepeated { proposal: P }), "{found:?}");
    let found = after(|p| {
        let mut more = p.decisions[0].clone();
        more.proposal = ProposalId(7);
        more.net_benefit = 0.0;
        p.decisions.push(more);
    });
    assert_eq!(found, [Finding::UnknownProposal { proposal: ProposalId(7) }]);
    let found = after(|p| p.decisions[0].flight = FlightId(9));
    let (claimed, flight) = (FlightId(9), FlightId(0));
    assert_eq!(found, [Finding::WrongFlight { proposal: P, claimed, flight }]);
    let found = after(|p| {
        p.decisions[0].verdict = Verdict::Amended;
        p.decisions[0].reasons = vec![ClaimedReason { option: None, kind: ReasonKind::Separation }];
    });
    let (verdict, option) = (Verdict::Amended, Some(1));
    assert_eq!(found, [Finding::VerdictMismatch { proposal: P, verdict, option }]);
    let found = after(|p| p.decisions[0].option = Some(4));
    assert!(found.contains(&Finding::UnknownOption { proposal: P, option: 4 }), "{found:?}");
    let found = after(|p| p.decisions[0].stretches[0].level_ft = 34_000.0);
    assert_eq!(found, [Finding::StretchesDiffer { proposal: P }]);
    let found = after(|p| p.decisions[0].stretches[0].until_s = None);
    assert_eq!(found, [Finding::StretchesDiffer { proposal: P }]);
}

#[test]
fn granted_options_that_break_rules() {
    let mut parts = simple();
    parts.proposals[0].alternatives[0].stretches = vec![stretch(Some(20.0), Some(115.0), 330.0)];
    let found = findings(&build(parts.clone()), &[(0, 1)]);
    let rule = Rule::UntilNotInCruise;
    assert!(found.contains(&Finding::BreaksRule { proposal: P, option: 1, rule }), "{found:?}");
    // Refused, it should be called invalid; called invalid, it is right.
    let day = build(parts);
    let rule = Rule::UntilNotInCruise;
    assert_eq!(findings(&day, &[]), [Finding::ShouldBeInvalid { proposal: P, rule }]);
    let mut invalid = plan(&day, &[]);
    invalid.decisions[0].verdict = Verdict::Invalid;
    invalid.decisions[0].reasons[0].kind = ReasonKind::Invalid;
    assert_sound(&audit(&day, &invalid));
}

#[test]
fn a_valid_option_called_invalid() {
    let day = build(simple());
    let mut wrong = plan(&day, &[]);
    wrong.decisions[0].verdict = Verdict::Invalid;
    wrong.decisions[0].reasons[0].kind = ReasonKind::Invalid;
    let kind = ReasonKind::Invalid;
    assert_eq!(
        audit(&day, &wrong).findings,
        [
            Finding::NotInvalid { proposal: P, option: 1 },
            Finding::FalseReason { proposal: P, option: 1, kind },
        ]
    );
}

#[test]
fn changes_where_none_are_allowed() {
    let guarded = |from, until| {
        let mut parts = simple();
        // EAST begins at 7 E, minute 60; closed or open makes no difference.
        parts.sectors[0].no_changes = true;
        parts.capacities.remove(0);
        parts.proposals[0].alternatives[0].stretches =
            vec![stretch(Some(from), Some(until), 330.0)];
        findings(&build(parts), &[(0, 1)])
    };
    assert_eq!(guarded(20.0, 50.0), vec![]);
    let found = guarded(20.0, 58.5);
    assert!(
        matches!(
            &found[..],
            [Finding::ChangedWhereForbidden {
                flight: FlightId(0),
                rule: Rule::NoChangesSector { sector: SectorId(0), .. },
            }]
        ),
        "{found:?}"
    );
}

/// Two proposals for A that overlap, the second worth less.
fn two_of_one_flight() -> DayParts {
    let mut parts = simple();
    let second = option(1, vec![stretch(Some(90.0), Some(105.0), 340.0)]);
    parts.proposals.push(proposal("Q", "A", vec![second]));
    parts
}

#[test]
fn grants_of_one_flight_that_exclude_each_other() {
    let day = build(two_of_one_flight());
    let found = findings(&day, &[(0, 1), (1, 1)]);
    assert!(found.contains(&Finding::OwnChangesOverlap { flight: FlightId(0) }), "{found:?}");
    let mut one = plan(&day, &[(0, 1)]);
    one.decisions[1].reasons[0].kind = ReasonKind::OwnChange;
    assert_sound(&audit(&day, &one));
}

#[test]
fn limits_of_the_policy() {
    let limited = |change: fn(&mut DayParts), taken: &[(u32, u32)]| {
        let mut parts = two_of_one_flight();
        parts.proposals[0].alternatives[0].stretches[0].until_s = Some(3600.0);
        change(&mut parts);
        let day = build(parts);
        let keys: Vec<&str> = findings(&day, taken)
            .into_iter()
            .map(|f| match f {
                Finding::PolicyLimit { key, .. } => key,
                Finding::FuelLimit { .. } => "max_extra_fuel_kg",
                other => panic!("{other:?}"),
            })
            .collect();
        keys
    };
    let both = [(0, 1), (1, 1)];
    assert!(limited(|_| (), &both).is_empty());
    assert_eq!(limited(|p| p.policy.max_moved_flights = Some(0.0), &both), ["max_moved_flights"]);
    assert_eq!(
        limited(|p| p.policy.max_changes_per_flight = Some(1.0), &both),
        ["max_changes_per_flight"]
    );
    // P saves about 20 s, Q about 4.
    assert_eq!(
        limited(|p| p.policy.max_arrival_shift_s = Some(10.0), &both),
        ["max_arrival_shift_s"]
    );
    assert!(limited(|p| p.policy.max_arrival_shift_s = Some(10.0), &[(1, 1)]).is_empty());
    let fuel: fn(&mut DayParts) = |p| p.proposals[1].alternatives[0].max_extra_fuel_kg = Some(49.0);
    assert_eq!(limited(fuel, &both), ["max_extra_fuel_kg"]);
    assert!(limited(fuel, &[(0, 1)]).is_empty());
    let share: fn(&mut DayParts) = |p| {
        p.policy.max_share_per_operator = Some(0.5);
        p.flights[0].operator = Some("Invented Air".to_owned());
    };
    assert_eq!(limited(share, &both), ["max_share_per_operator"]);
}

#[test]
fn wrong_figures() {
    let wrong = |found: Vec<Finding>| -> Vec<Figure> {
        found
            .into_iter()
            .map(|f| match f {
                Finding::WrongFigure { figure, .. } => figure,
                other => panic!("{other:?}"),
            })
            .collect()
    };
    let of = |change: fn(&mut crate::audit::PlanUnderAudit)| wrong(after(change));
    assert_eq!(
        of(|p| {
            p.decisions[0].net_benefit *= 1.0 + 1e-7;
            p.objective = p.decisions[0].net_benefit;
        }),
        [Figure::NetBenefit]
    );
    assert_eq!(of(|p| p.objective *= 1.0 + 1e-7), [Figure::Objective]);
    assert_eq!(of(|p| p.objective = f64::NAN), [Figure::Objective]);
    assert_eq!(of(|p| p.decisions[0].contrail_km_avoided += 0.001), [Figure::ContrailKm]);
    assert_eq!(of(|p| p.decisions[0].arrival_shift_s += 0.003), [Figure::ArrivalShift]);
    assert_eq!(of(|p| p.decisions[0].arrival_shift_s += 0.001), []);
    assert_eq!(of(|p| p.decisions[0].stretches[0].planned_from_s = None), [Figure::PlannedFrom]);
    assert_eq!(
        of(|p| p.decisions[0].stretches[0].planned_until_s = Some(6000.0)),
        [Figure::PlannedUntil]
    );
    // Fuel off by a kilogram takes the net benefit with it.
    assert_eq!(
        of(|p| p.decisions[0].extra_fuel_kg += 1.0),
        [Figure::ExtraFuel, Figure::NetBenefit]
    );
}

#[test]
fn the_net_benefit_by_hand() {
    // 100 km by night at 9e8 J/m and a ratio of 0.42, less 50 kg of fuel at 100 years:
    // 3.16 * 8.95e-14 * 5.101e14 * 3.15576e7 J/kg.
    let day = build(simple());
    let expected_j: f64 = 0.42 * 100e3 * 9e8 - 50.0 * 3.16 * 1.440_738e9;
    let plan = plan(&day, &[(0, 1)]);
    assert!((plan.objective / expected_j - 1.0).abs() < 1e-6, "{} {expected_j}", plan.objective);
}

#[test]
fn bound_and_gap() {
    assert!(after(|p| p.bound = Some(p.objective * 1.5)).is_empty());
    let found = after(|p| p.bound = Some(p.objective * 0.999));
    assert!(matches!(found[..], [Finding::BoundBelowObjective { .. }]), "{found:?}");
    assert!(after(|p| (p.bound, p.gap) = (Some(p.objective * 2.0), Some(0.5))).is_empty());
    let found = after(|p| (p.bound, p.gap) = (Some(p.objective * 2.0), Some(0.4)));
    assert!(matches!(found[..], [Finding::WrongFigure { figure: Figure::Gap, .. }]), "{found:?}");
}

#[test]
fn fuel_from_the_users_table() {
    let mut parts = simple();
    for (level_ft, kg) in [(33_000.0, 42.0), (35_000.0, 40.0)] {
        parts.fuel.push(FuelParts {
            aircraft: "ANY".to_owned(),
            level_ft,
            flow: FuelFlow::KgPerMin(kg),
            mass_kg: None,
        });
    }
    parts.proposals[0].alternatives[0].extra_fuel_kg = None;
    let day = build(parts);
    let mut claimed = plan(&day, &[(0, 1)]);
    let shift_min = claimed.decisions[0].arrival_shift_s / 60.0;
    let stretch = claimed.decisions[0].stretches[0];
    let held_min =
        (stretch.planned_until_s.unwrap() - stretch.planned_from_s.unwrap()) / 60.0 - 2.0;
    // Everything at 40 kg/min but what is held at 42, and two transitions of two minutes at 41.
    let fuel_kg = shift_min * 40.0 + held_min * 2.0 + 4.0;
    claimed.decisions[0].extra_fuel_kg = fuel_kg;
    let per_kg_j = 3.16 * 8.95e-14 * 5.101e14 * 3.15576e7;
    claimed.decisions[0].net_benefit = 0.42 * 100e3 * 9e8 - fuel_kg * per_kg_j;
    claimed.objective = claimed.decisions[0].net_benefit;
    assert_sound(&audit(&day, &claimed));
    claimed.decisions[0].extra_fuel_kg += 1.0;
    let found = audit(&day, &claimed).findings;
    assert!(
        matches!(found[0], Finding::WrongFigure { figure: Figure::ExtraFuel, .. }),
        "{found:?}"
    );
}

#[test]
fn written_points() {
    let off = |found: Vec<Finding>| match found[..] {
        [Finding::WrittenOff { fault, .. }] => fault,
        _ => panic!("{found:?}"),
    };
    let found = after(|p| p.written = Some(vec![]));
    assert_eq!(found, [Finding::WrittenMissing { flight: FlightId(0) }]);
    let found = after(|p| {
        let mut other = p.written.clone().unwrap();
        other[0].flight = FlightId(3);
        p.written.as_mut().unwrap().extend(other);
    });
    assert_eq!(found, [Finding::WrittenUnexpected { flight: FlightId(3) }]);
    let of = |change: fn(&mut Vec<crate::answer::ProfilePoint>)| {
        off(after(|p| change(&mut p.written.as_mut().unwrap()[0].points)))
    };
    assert_eq!(of(|p| p.truncate(1)), WrittenFault::TooFewPoints);
    assert_eq!(of(|p| p[3].time_s = p[2].time_s), WrittenFault::TimeOrder);
    assert_eq!(of(|p| p[0].time_s -= 1.0), WrittenFault::Ends);
    // 2 m north; 2 ft up; not a number.
    assert_eq!(of(|p| p[2].lat_deg += 2e-5), WrittenFault::Place);
    assert_eq!(of(|p| p[4].level_ft += 2.0), WrittenFault::Level);
    assert_eq!(of(|p| p.last_mut().unwrap().lat_deg = f64::NAN), WrittenFault::Place);
    // Every written point is right, but the bottom of the way down is left out.
    let found = after(|p| {
        let points = &mut p.written.as_mut().unwrap()[0].points;
        let at = points.iter().position(|q| q.level_ft == 33_000.0).unwrap();
        points.remove(at);
    });
    let is_level =
        |f: &Finding| matches!(f, Finding::WrittenOff { fault: WrittenFault::Level, .. });
    assert!(found.iter().any(is_level), "{found:?}");
}

#[test]
fn what_could_be_added_or_switched() {
    let day = build(simple());
    let found = findings(&day, &[]);
    assert!(matches!(found[..], [Finding::CouldAdd { proposal: P, option: 1, .. }]), "{found:?}");
    let mut parts = simple();
    let mut better = option(2, vec![stretch(Some(20.0), Some(100.0), 310.0)]);
    better.contrail_km_avoided = Some(200.0);
    parts.proposals[0].alternatives.push(better);
    let day = build(parts.clone());
    let found = findings(&day, &[(0, 1)]);
    assert!(
        matches!(found[..], [Finding::CouldSwitch { proposal: P, option: 2, .. }]),
        "{found:?}"
    );
    let mut amended = plan(&day, &[(0, 2)]);
    amended.decisions[0].reasons[0].kind = ReasonKind::BetterOption;
    assert_sound(&audit(&day, &amended));
    // The better one is blocked by another flight at its level, the one as asked by a limit.
    parts.flights.push(flight("B", &[(0.0, -0.2, 0.0, 310.0), (120.0, 14.2, 0.0, 310.0)]));
    let day = build(parts);
    assert_eq!(findings(&day, &[(0, 1)]), vec![]);
}

#[test]
fn what_is_blocked_can_not_be_added() {
    // By load: LOW is entered at FL 330 and full.
    let mut parts = simple();
    let (mut low, mut capacity) = sector("LOW", -5.0, 20.0);
    low.volumes[0].ceiling_ft = 34_000.0;
    capacity.occupancy_limit = Some(0.0);
    parts.sectors.push(low);
    parts.capacities.push(capacity);
    parts.flights[0] = flight("A", &[(0.0, 0.0, 0.0, 350.0), (120.0, 14.0, 0.0, 350.0)]);
    assert_eq!(findings(&build(parts.clone()), &[]), vec![]);
    parts.capacities[2].occupancy_limit = Some(1.0);
    let found = findings(&build(parts.clone()), &[]);
    assert!(matches!(found[..], [Finding::CouldAdd { .. }]), "{found:?}");
    // By a lasting limit, from ten minutes on.
    parts.capacities[2].occupancy_limit = None;
    parts.capacities[2].occupancy_lasting = Some(0.5);
    assert_eq!(findings(&build(parts.clone()), &[]), vec![]);
    parts.policy.lasting_min = 90.0;
    let found = findings(&build(parts.clone()), &[]);
    assert!(matches!(found[..], [Finding::CouldAdd { .. }]), "{found:?}");
    // By the policy.
    parts.policy.max_moved_flights = Some(0.0);
    assert_eq!(findings(&build(parts), &[]), vec![]);
}

#[test]
fn a_worthless_grant_that_makes_room_for_nothing() {
    let mut parts = simple();
    parts.proposals[0].alternatives[0].contrail_km_avoided = Some(0.0);
    let day = build(parts);
    let found = findings(&day, &[(0, 1)]);
    assert!(matches!(found[..], [Finding::CouldDrop { proposal: P, .. }]), "{found:?}");
    let mut refused = plan(&day, &[]);
    refused.decisions[0].reasons[0].kind = ReasonKind::NotWorthIt;
    assert_sound(&audit(&day, &refused));
}

#[test]
fn reasons_and_exchanges() {
    // B flies at FL 330 ahead of A all the way: P is blocked by separation.
    let mut parts = simple();
    parts.flights.push(flight("B", &[(0.0, -0.2, 0.0, 330.0), (120.0, 14.2, 0.0, 330.0)]));
    let day = build(parts);
    let with = |kind| {
        let mut plan = plan(&day, &[]);
        plan.decisions[0].reasons[0].kind = kind;
        audit(&day, &plan).findings
    };
    assert_eq!(with(ReasonKind::Separation), vec![]);
    for kind in [
        ReasonKind::NotWorthIt,
        ReasonKind::OwnChange,
        ReasonKind::FuelLimit,
        ReasonKind::PlanLimit,
        ReasonKind::BetterOption,
        ReasonKind::Invalid,
    ] {
        assert_eq!(with(kind), [Finding::FalseReason { proposal: P, option: 1, kind }]);
    }
    let mut silent = plan(&day, &[]);
    silent.decisions[0].reasons.clear();
    assert_eq!(audit(&day, &silent).findings, [Finding::ReasonMissing { proposal: P }]);
    let mut exchange = plan(&day, &[]);
    exchange.decisions[0].exchange =
        Some(Exchange { drops: vec![P], objective_lost: 5.0, proven: false });
    let found = audit(&day, &exchange).findings;
    assert_eq!(found[0], Finding::ExchangeDropsNothing { proposal: P, dropped: P });
    assert!(matches!(found[1], Finding::WrongFigure { figure: Figure::ObjectiveLost, .. }));
}

#[test]
fn what_is_not_judged_is_said() {
    let mut parts = simple();
    parts.policy.separation = SeparationRule::Risk;
    let day = build(parts);
    let report = audit(&day, &plan(&day, &[(0, 1)]));
    assert_sound(&report);
    use crate::audit::NotJudged::{Maximality, Separation};
    assert_eq!(report.not_judged, [Separation, Maximality]);
}

#[test]
fn the_report_does_not_depend_on_the_number_of_threads() {
    let mut parts = two_of_one_flight();
    for k in 0..30 {
        let name = format!("F{k:02}");
        let lat = f64::from(k) * 0.1 - 1.5;
        parts.flights.push(eastward(&name, lat, if k % 2 == 0 { 350.0 } else { 330.0 }));
        let asked = option(1, vec![stretch(Some(20.0), Some(100.0), 340.0)]);
        parts.proposals.push(proposal(&format!("R{k:02}"), &name, vec![asked]));
    }
    parts.capacities[0].occupancy_limit = Some(20.0);
    let day = build(parts);
    let plan = plan(&day, &(0..20).map(|k| (k, 1)).collect::<Vec<_>>());
    let with = |threads| {
        let pool = rayon::ThreadPoolBuilder::new().num_threads(threads).build().unwrap();
        pool.install(|| audit(&day, &plan))
    };
    let one = with(1);
    assert_eq!(one, with(3));
    assert!(!one.passed());
}
