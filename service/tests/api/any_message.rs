//! No message, however odd, makes the service panic or fall silent.

use proptest::prelude::*;
use rimeshift_proto::v1;
use tonic::Code;

use crate::support::{header, send, service, small};

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
    fn rows()(
        (names, numbers, times) in (
            prop::collection::vec(name(), 8),
            prop::collection::vec(number(), 12),
            prop::collection::vec(time(), 6),
        ),
        (points, more) in (proptest::option::of(points()), proptest::option::of(points())),
        option in 0..3_u32,
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
