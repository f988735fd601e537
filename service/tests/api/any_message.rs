//! No message, however odd, makes the service panic or fall silent.

use proptest::prelude::*;
use rimeshift_proto::v1;
use rimeshift_proto::v1::plan_service_client::PlanServiceClient;
use tonic::Code;
use tonic::transport::Channel;

use crate::support::{header, load, send, service, small, small_day};

fn number() -> impl Strategy<Value = f64> {
    prop_oneof![any::<f64>(), -200.0..200.0, Just(33_000.0), Just(f64::NAN), Just(f64::INFINITY)]
}

fn time() -> impl Strategy<Value = Option<prost_types::Timestamp>> {
    let any = (any::<i64>(), any::<i32>());
    let near = (1_930_300_000_i64..1_930_500_000, 0..1_000_000_000);
    proptest::option::of(
        prop_oneof![any, near]
            .prop_map(|(seconds, nanos)| prost_types::Timestamp { seconds, nanos }),
    )
}

fn name() -> impl Strategy<Value = String> {
    prop_oneof![Just("A".to_owned()), Just(String::new()), ".{0,3}"]
}

prop_compose! {
    fn points()(
        epoch in time(),
        n in 0..5_usize,
        odd in 0..6_usize,
        numbers in prop::collection::vec(number(), 20),
    ) -> v1::Points {
        // One column in six cases has another length.
        let column = |i: usize| numbers[i * 5..i * 5 + n.saturating_sub(usize::from(odd == i))].to_vec();
        v1::Points {
            epoch,
            seconds_after_epoch: column(0),
            lon_deg: column(1),
            lat_deg: column(2),
            level_ft: column(3),
            fix: vec![String::new(); if odd == 4 { n } else { 0 }],
        }
    }
}

prop_compose! {
    fn hand_decision()(
        name in name(),
        about in 0..3,
        must in -1..5_i32,
        option in proptest::option::of(0..3_u32),
    ) -> v1::HandDecision {
        use v1::hand_decision::About;
        let about = match about {
            0 => None,
            1 => Some(About::Flight(name)),
            _ => Some(About::Proposal(name)),
        };
        v1::HandDecision { about, must, option }
    }
}

prop_compose! {
    fn rows()(
        (names, numbers, times) in (
            prop::collection::vec(name(), 8),
            prop::collection::vec(number(), 12),
            prop::collection::vec(time(), 6),
        ),
        (points, more) in (proptest::option::of(points()), proptest::option::of(points())),
        option in 0..3_u32,
        hand in hand_decision(),
    ) -> v1::DayRows {
        let [a, b, c, d, ..] = names.as_slice() else { unreachable!() };
        v1::DayRows {
            sectors: vec![v1::Sector {
                sector: a.clone(),
                volumes: vec![v1::Volume {
                    rings: vec![v1::Ring { lon_deg: numbers[0..4].to_vec(), lat_deg: numbers[4..8].to_vec() }],
                    floor_ft: numbers[8],
                    ceiling_ft: numbers[9],
                }],
                horizontal_nm: Some(numbers[10]),
                ..Default::default()
            }],
            capacities: vec![v1::Capacity {
                sector: b.clone(),
                from: times[0],
                until: times[1],
                entries_per_hour: Some(numbers[0]),
                ..Default::default()
            }],
            airports: vec![v1::Airport { airport: c.clone(), lon_deg: Some(numbers[1]), ..Default::default() }],
            airport_capacities: vec![v1::AirportCapacity { airport: d.clone(), from: times[2], ..Default::default() }],
            aircraft: vec![v1::AircraftClass { aircraft: a.clone(), climb_fpm: Some(numbers[2]), ..Default::default() }],
            fuel: vec![v1::FuelRow { aircraft: a.clone(), level_ft: Some(numbers[3]), ..Default::default() }],
            flights: vec![v1::Flight { flight: a.clone(), points, mach: Some(numbers[4]), ..Default::default() }],
            flight_points: vec![v1::FlightPoints { flight: b.clone(), points: more }],
            proposals: vec![v1::Proposal {
                proposal: c.clone(),
                flight: d.clone(),
                options: vec![v1::ProposalOption {
                    option,
                    stretches: vec![v1::Stretch { level_ft: numbers[5], from: times[3], until: times[4] }],
                    figures: Some(v1::OptionFigures { priority: Some(numbers[6]), ..Default::default() }),
                }],
            }],
            restrictions: vec![v1::Restriction {
                restriction: a.clone(),
                volumes: vec![v1::Volume {
                    rings: vec![v1::Ring { lon_deg: numbers[1..5].to_vec(), lat_deg: numbers[5..8].to_vec() }],
                    floor_ft: numbers[9],
                    ceiling_ft: numbers[8],
                }],
                from: times[4],
                until: times[5],
                levels_allowed_ft: numbers[9..].to_vec(),
                departure: Some(b.clone()),
                destination: None,
            }],
            background: vec![v1::Background {
                sector: a.clone(),
                from: times[0],
                until: times[2],
                aircraft: Some(numbers[7]),
                level_ft: Some(numbers[8]),
                entries: Some(numbers[9]),
            }],
            flows: vec![v1::Flow {
                from_sector: a.clone(),
                from_level_ft: Some(numbers[10]),
                to_sector: b.clone(),
                to_level_ft: Some(numbers[11]),
                from: times[1],
                until: times[3],
                aircraft: Some(numbers[0]),
            }],
            decisions: vec![hand],
        }
    }
}

fn message() -> impl Strategy<Value = v1::LoadDayRequest> {
    use v1::load_day_request::Content;
    let header =
        (any::<bool>(), any::<i32>(), number(), ".{0,12}").prop_map(|(known, year, value, key)| {
            let key = if known { "horizontal_nm".to_owned() } else { key };
            let value = Some(v1::PolicyValue { kind: Some(v1::policy_value::Kind::Number(value)) });
            Content::Header(v1::LoadDayHeader {
                date: Some(v1::Date { year, month: year % 13, day: 1 }),
                policy: vec![v1::PolicySetting { key, value }],
                ..header("odd")
            })
        });
    let content = prop_oneof![4 => rows().prop_map(Content::Rows), 1 => header];
    proptest::option::weighted(0.95, content).prop_map(|content| v1::LoadDayRequest { content })
}

prop_compose! {
    fn change()(
        known in any::<bool>(),
        flight in name(),
        stretches in prop::collection::vec((number(), time(), time()), 0..3),
        figures in prop::collection::vec(number(), 5),
    ) -> v1::Change {
        let stretches = stretches.into_iter();
        v1::Change {
            flight: if known { "F1".to_owned() } else { flight },
            stretches: stretches
                .map(|(level_ft, from, until)| v1::Stretch { level_ft, from, until })
                .collect(),
            figures: Some(v1::OptionFigures {
                contrail_km_avoided: Some(figures[0]),
                ef_avoided_j: Some(figures[1]),
                extra_fuel_kg: Some(figures[2]),
                max_extra_fuel_kg: Some(figures[3]),
                priority: Some(figures[4]),
            }),
        }
    }
}

prop_compose! {
    fn decision()(
        proposal in prop_oneof![Just("P1"), Just("P2"), Just("P9")],
        flight in prop_oneof![Just("F1"), Just("F2"), Just("F9")],
        verdict in 0..6_i32,
        option in proptest::option::of(0..3_u32),
        stretches in prop::collection::vec((number(), time(), time(), time()), 0..3),
        figures in prop::collection::vec(prop_oneof![-1e9..1e9, number()], 5),
        drops in proptest::option::of(prop_oneof![Just("P3"), Just("P9")]),
        limit in any::<bool>(),
    ) -> v1::Decision {
        let stretch = |(level_ft, from, until, planned)| v1::PlannedStretch {
            stretch: Some(v1::Stretch { level_ft, from, until }),
            planned_from: planned,
            planned_until: planned,
            near_fix: String::new(),
        };
        let kind = v1::constraint::Kind::NotWorthIt(v1::NotWorthItConstraint {});
        let constraint = v1::Constraint { kind: limit.then_some(kind) };
        v1::Decision {
            proposal: proposal.to_owned(),
            flight: flight.to_owned(),
            verdict,
            option,
            stretches: stretches.into_iter().map(stretch).collect(),
            net_benefit: figures[0],
            contrail_km_avoided: figures[1],
            extra_fuel_kg: figures[2],
            arrival_shift_s: figures[3],
            reasons: vec![v1::Reason { option: 1, constraint: Some(constraint) }],
            exchange: drops.map(|name| v1::Exchange {
                drops: vec![name.to_owned()],
                objective_lost: figures[4],
                proven: true,
            }),
        }
    }
}

/// Runs a test against a service that holds the small day.
fn with_small_day<F: Future<Output = ()>>(test: impl FnOnce(Channel, v1::Day) -> F) {
    let runtime = tokio::runtime::Runtime::new().unwrap();
    runtime.block_on(async {
        let channel = service(small()).await;
        let day = load(&channel, header("day"), vec![small_day()]).await.unwrap().day.unwrap();
        test(channel, day).await;
    });
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(100))]

    #[test]
    fn no_question_makes_the_service_fail(changes in prop::collection::vec(change(), 1..4)) {
        with_small_day(|channel, _| async move {
            let mut client = PlanServiceClient::new(channel);
            for change in changes {
                let request =
                    v1::AskChangeRequest { day: "days/day".into(), change: Some(change), ..Default::default() };
                if let Err(status) = client.ask_change(request).await {
                    assert_eq!(status.code(), Code::InvalidArgument, "{status}");
                }
            }
        });
    }

    #[test]
    fn no_plan_makes_the_service_fail(
        decisions in prop::collection::vec(decision(), 0..4),
        points in proptest::option::of(points()),
        objective in number(),
        question in change(),
    ) {
        with_small_day(|channel, day| async move {
            use v1::load_plan_request::Content;
            let origin = v1::PlanOrigin {
                day_sha256: day.day_sha256,
                stopped: v1::Stopped::Work.into(),
                ..Default::default()
            };
            let header = v1::LoadPlanHeader {
                parent: day.name.clone(),
                plan_id: "odd".into(),
                plan: Some(v1::Plan { origin: Some(origin), objective, ..Default::default() }),
                ..Default::default()
            };
            let moved = v1::FlightPoints { flight: "F1".into(), points };
            let rows = v1::PlanRows { decisions, moved_points: vec![moved], ..Default::default() };
            let messages = [Content::Header(header), Content::Rows(rows)]
                .map(|content| v1::LoadPlanRequest { content: Some(content) });
            let mut client = PlanServiceClient::new(channel);
            let plan = match client.load_plan(tokio_stream::iter(messages)).await {
                Ok(loaded) => loaded.into_inner().plan.unwrap().name,
                Err(status) => {
                    assert_eq!(status.code(), Code::InvalidArgument, "{status}");
                    return;
                }
            };
            client.audit_plan(v1::AuditPlanRequest { name: plan.clone() }).await.unwrap();
            let request = v1::AskChangeRequest { day: day.name, plan, change: Some(question) };
            if let Err(status) = client.ask_change(request).await {
                let told = [Code::InvalidArgument, Code::FailedPrecondition];
                assert!(told.contains(&status.code()), "{status}");
            }
        });
    }
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(200))]
    #[test]
    fn no_message_makes_the_service_fail(messages in prop::collection::vec(message(), 0..4)) {
        let runtime = tokio::runtime::Runtime::new().unwrap();
        runtime.block_on(async {
            let channel = service(small()).await;
            use v1::load_day_request::Content;
            let mut sent = vec![v1::LoadDayRequest { content: Some(Content::Header(header("odd"))) }];
            sent.extend(messages);
            if let Err(status) = send(&channel, sent).await {
                assert_eq!(status.code(), Code::InvalidArgument, "{status}");
            }
        });
    }
}
