use super::*;
use crate::answer::{Constraint, LossIn, Plan, Plans, Stopped, Verdict};
use crate::day::{
    AlternativeParts, CapacityParts, Day, DayParts, FlightParts, Policy, ProposalParts,
    SectorParts, StretchParts, VolumeParts,
};
use crate::fixture::{empty_parts, flight};
use crate::traffic::Traffic;

/// Eastbound along a parallel at 450 kt or so, FL 350, starting at a time.
pub(super) fn eastbound(name: &str, start_s: f64, lat_deg: f64) -> FlightParts {
    flight(name, &[(start_s, 0.0, lat_deg, 350.0), (start_s + 7200.0, 15.0, lat_deg, 350.0)])
}

pub(super) fn option(number: u32, fl: f64, from_s: f64, until_s: f64, km: f64) -> AlternativeParts {
    AlternativeParts {
        option: number,
        stretches: vec![StretchParts {
            level_ft: fl * 100.0,
            from_s: Some(from_s),
            until_s: Some(until_s),
        }],
        contrail_km_avoided: Some(km),
        ef_avoided_j: None,
        extra_fuel_kg: Some(0.0),
        max_extra_fuel_kg: None,
        priority: 1.0,
    }
}

pub(super) fn proposal(
    name: &str,
    flight: &str,
    alternatives: Vec<AlternativeParts>,
) -> ProposalParts {
    ProposalParts { proposal: name.to_owned(), flight: flight.to_owned(), alternatives }
}

/// A sector over everything between two levels, with one capacity row for the whole day.
pub(super) fn sector(
    name: &str,
    floor_fl: f64,
    ceiling_fl: f64,
    capacity: CapacityParts,
) -> (SectorParts, CapacityParts) {
    let ring = vec![[-1.0, -5.0], [20.0, -5.0], [20.0, 5.0], [-1.0, 5.0], [-1.0, -5.0]];
    let volume = VolumeParts {
        rings: vec![ring],
        floor_ft: floor_fl * 100.0,
        ceiling_ft: ceiling_fl * 100.0,
    };
    let sector =
        SectorParts { sector: name.to_owned(), volumes: vec![volume], ..SectorParts::default() };
    let capacity =
        CapacityParts { sector: name.to_owned(), from_s: 0.0, until_s: 86_400.0, ..capacity };
    (sector, capacity)
}

pub(super) fn find_on(parts: DayParts, options: &FindOptions) -> (Traffic, Plans) {
    let traffic = Traffic::new(Day::build(parts).expect("a sound day").day);
    let plans = find(&traffic, options, Watch::unattended()).expect("a plan");
    (traffic, plans)
}

pub(super) fn verdicts(plan: &Plan) -> Vec<Verdict> {
    plan.decisions.iter().map(|d| d.verdict).collect()
}

#[test]
fn a_free_sky_grants_everything() {
    let parts = DayParts {
        flights: vec![eastbound("A", 0.0, 0.0), eastbound("B", 0.0, 1.0)],
        proposals: vec![
            proposal("p1", "A", vec![option(1, 370.0, 1000.0, 3000.0, 50.0)]),
            proposal("p2", "B", vec![option(1, 330.0, 1000.0, 3000.0, 20.0)]),
        ],
        ..empty_parts()
    };
    let (_, plans) = find_on(parts, &FindOptions::default());
    let plan = &plans.plans[0];
    assert_eq!(verdicts(plan), [Verdict::Granted, Verdict::Granted]);
    let j_per_km = 1000.0 * 9e8 * 0.42;
    assert!((plan.objective / (70.0 * j_per_km) - 1.0).abs() < 1e-9);
    assert_eq!((plans.gap(), plans.stopped), (Some(0.0), Stopped::Optimal));
    assert_eq!(plan.moved.len(), 2);
}

#[test]
fn of_two_that_would_meet_the_more_valuable_is_granted_and_the_other_says_why() {
    // Four miles apart abeam, at FL 350 and FL 310: both ask for FL 330.
    let low = flight("B", &[(0.0, 0.0, 0.05, 310.0), (7200.0, 15.0, 0.05, 310.0)]);
    let parts = DayParts {
        flights: vec![eastbound("A", 0.0, 0.0), low],
        proposals: vec![
            proposal("p1", "A", vec![option(1, 330.0, 1000.0, 3000.0, 50.0)]),
            proposal("p2", "B", vec![option(1, 330.0, 1000.0, 3000.0, 20.0)]),
        ],
        ..empty_parts()
    };
    let (_, plans) = find_on(parts, &FindOptions::default());
    let plan = &plans.plans[0];
    assert_eq!(verdicts(plan), [Verdict::Granted, Verdict::Refused]);
    let refused = &plan.decisions[1];
    assert!(
        matches!(refused.reasons[0].constraint, Constraint::Separation { horizontal_m, .. }
            if horizontal_m < 9260.0),
        "{:?}",
        refused.reasons
    );
    let exchange = refused.exchange.as_ref().expect("an exchange");
    assert_eq!(exchange.drops, [plan.decisions[0].proposal]);
    assert_eq!(exchange.objective_lost, plan.decisions[0].net_benefit);
}

#[test]
fn one_flight_s_move_makes_room_for_another() {
    // B is where A wants to go; B itself wants to leave, for nothing in return.
    let b = flight("B", &[(0.0, 0.0, 0.05, 330.0), (7200.0, 15.0, 0.05, 330.0)]);
    let parts = DayParts {
        flights: vec![eastbound("A", 0.0, 0.0), b],
        proposals: vec![
            proposal("p1", "A", vec![option(1, 330.0, 1000.0, 3000.0, 50.0)]),
            proposal("p2", "B", vec![option(1, 310.0, 600.0, 3800.0, 0.0)]),
        ],
        ..empty_parts()
    };
    let (_, plans) = find_on(parts, &FindOptions::default());
    assert_eq!(verdicts(&plans.plans[0]), [Verdict::Granted, Verdict::Granted]);
    assert_eq!(plans.plans[0].decisions[1].net_benefit, 0.0);
}

#[test]
fn a_full_window_grants_as_many_as_fit() {
    let limits = CapacityParts { entries_per_hour: Some(2.0), ..CapacityParts::default() };
    let (high, capacity) = sector("HIGH", 360.0, 460.0, limits);
    let names = ["A", "B", "C"];
    let parts = DayParts {
        sectors: vec![high],
        capacities: vec![capacity],
        flights: (0..3).map(|i| eastbound(names[i], 0.0, i as f64)).collect(),
        proposals: (0..3)
            .map(|i| {
                let km = 10.0 * (i + 1) as f64;
                proposal(&format!("p{i}"), names[i], vec![option(1, 370.0, 1300.0, 3000.0, km)])
            })
            .collect(),
        ..empty_parts()
    };
    let (_, plans) = find_on(parts, &FindOptions { plans: 2, ..FindOptions::default() });
    let plan = &plans.plans[0];
    assert_eq!(verdicts(plan), [Verdict::Refused, Verdict::Granted, Verdict::Granted]);
    let Constraint::Load { count, limit, from_s, until_s, .. } =
        plan.decisions[0].reasons[0].constraint
    else {
        panic!("{:?}", plan.decisions[0].reasons)
    };
    assert_eq!((count, limit), (3.0, 2.0));
    // Entries about 1320 s: windows from -1200 (ends 2400) to 1200 (ends 4800).
    assert_eq!((from_s, until_s), (-1200.0, 4800.0));
    let exchange = plan.decisions[0].exchange.as_ref().expect("an exchange");
    assert_eq!(exchange.drops, [plan.decisions[1].proposal]);
    // The second plan differs, and is the next best.
    assert_eq!(verdicts(&plans.plans[1]), [Verdict::Granted, Verdict::Refused, Verdict::Granted]);
}

#[test]
fn each_way_out_of_a_plan_has_its_reason() {
    let policy = Policy { max_arrival_shift_s: Some(60.0), ..Policy::default() };
    let fuel = AlternativeParts {
        extra_fuel_kg: Some(100.0),
        max_extra_fuel_kg: Some(50.0),
        ..option(1, 370.0, 1000.0, 3000.0, 50.0)
    };
    let slow = option(1, 250.0, 100.0, 6500.0, 50.0);
    let parts = DayParts {
        policy,
        flights: (0..5).map(|i| eastbound(&format!("F{i}"), 0.0, f64::from(i))).collect(),
        proposals: vec![
            proposal("p0", "F0", vec![option(1, 360.0, 1000.0, 3000.0, 50.0)]),
            proposal("p1", "F1", vec![fuel]),
            proposal("p2", "F2", vec![slow]),
            proposal("p3", "F3", vec![option(1, 370.0, 1000.0, 3000.0, -1.0)]),
            proposal(
                "p4",
                "F4",
                vec![
                    option(1, 370.0, 1000.0, 3000.0, 10.0),
                    option(2, 330.0, 1000.0, 3000.0, 30.0),
                ],
            ),
            proposal("p5", "F4", vec![option(1, 370.0, 2000.0, 5000.0, 5.0)]),
        ],
        ..empty_parts()
    };
    let (_, plans) = find_on(parts, &FindOptions::default());
    let plan = &plans.plans[0];
    let first = |i: usize| &plan.decisions[i].reasons[0].constraint;
    assert_eq!(verdicts(plan)[0], Verdict::Invalid);
    assert!(matches!(first(0), Constraint::Invalid(_)));
    assert!(matches!(first(1), Constraint::FuelLimit { .. }));
    assert!(
        matches!(first(2), Constraint::PlanLimit { key: "max_arrival_shift_s", .. }),
        "{:?}",
        first(2)
    );
    assert!(matches!(first(3), Constraint::NotWorthIt));
    assert_eq!(plan.decisions[4].verdict, Verdict::Amended);
    assert_eq!(*first(4), Constraint::BetterOption { taken: 2 });
    assert_eq!(*first(5), Constraint::OwnChange);
}

#[test]
fn a_known_loss_downstream_does_not_block_and_one_in_trail_does() {
    // B crosses A's track an hour after A has returned; C follows A by two miles all the way.
    let b = flight("B", &[(3900.0, 10.0, -2.0, 350.0), (5700.0, 10.0, 2.0, 350.0)]);
    let parts = |others: Vec<FlightParts>| DayParts {
        flights: [vec![eastbound("A", 0.0, 0.0)], others].concat(),
        proposals: vec![proposal("p1", "A", vec![option(1, 330.0, 1000.0, 3000.0, 50.0)])],
        ..empty_parts()
    };
    let (traffic, plans) = find_on(parts(vec![b]), &FindOptions::default());
    assert_eq!(traffic.scene.losses().len(), 1);
    let plan = &plans.plans[0];
    assert_eq!(verdicts(plan), [Verdict::Granted]);
    let versions: Vec<LossIn> = plan.losses.iter().map(|l| l.version).collect();
    // By time: the planned one comes a little earlier.
    assert_eq!(versions, [LossIn::Planned, LossIn::Filed]);
    assert!(plan.losses.iter().all(|l| !l.new));
    let (_, plans) = find_on(parts(vec![eastbound("C", 16.0, 0.0)]), &FindOptions::default());
    // Leaving the level within the minima is a new loss of its own.
    assert_eq!(verdicts(&plans.plans[0]), [Verdict::Refused]);
    assert!(plans.plans[0].decisions[0].exchange.is_none(), "C can't be asked to go");
}

#[test]
fn the_number_of_moved_flights_can_be_limited() {
    let policy = Policy { max_moved_flights: Some(1.0), ..Policy::default() };
    let parts = DayParts {
        policy,
        flights: vec![eastbound("A", 0.0, 0.0), eastbound("B", 0.0, 1.0)],
        proposals: vec![
            proposal("p1", "A", vec![option(1, 370.0, 1000.0, 3000.0, 50.0)]),
            proposal("p2", "B", vec![option(1, 330.0, 1000.0, 3000.0, 60.0)]),
        ],
        ..empty_parts()
    };
    let (_, plans) = find_on(parts, &FindOptions::default());
    let plan = &plans.plans[0];
    assert_eq!(verdicts(plan), [Verdict::Refused, Verdict::Granted]);
    assert!(matches!(
        plan.decisions[0].reasons[0].constraint,
        Constraint::PlanLimit { key: "max_moved_flights", .. }
    ));
}

/// Four independent grants: only one maximal plan exists, and nothing else is handed out.
#[test]
fn more_plans_than_maximal_ones_exist_are_not_made_up() {
    let flights: Vec<_> =
        (0..4u8).map(|i| eastbound(&format!("F{i}"), 0.0, f64::from(i))).collect();
    let ask = |i: u8| {
        let km = 10.0 + f64::from(i);
        proposal(&format!("p{i}"), &format!("F{i}"), vec![option(1, 370.0, 1000.0, 3000.0, km)])
    };
    let parts = DayParts { flights, proposals: (0..4).map(ask).collect(), ..empty_parts() };
    let (_, plans) = find_on(parts, &FindOptions { plans: 5, ..FindOptions::default() });
    assert_eq!(plans.plans.len(), 1);
}
