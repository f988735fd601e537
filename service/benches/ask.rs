//! "May this flight change level now?" over gRPC on loopback, one caller, against a day of 17 000
//! flights and 450 sectors (that of the engine's benches, a real one where `RIMESHIFT_DAY` names its
//! folder); beside it an empty call (a health check) of the same server in the same run, to which the
//! answer's time is to be compared.

#![expect(clippy::expect_used, reason = "a bench fails by panicking")]

#[path = "../engine/benches/support/mod.rs"]
mod support;

use std::hint::black_box;

use criterion::{Criterion, criterion_group, criterion_main};
use prost_types::Timestamp;
use rimeshift_engine::change::change_levels;
use rimeshift_engine::day::{Day, Flight, Stretch};
use rimeshift_engine::ids::FlightId;
use rimeshift_engine::traffic::Traffic;
use rimeshift_proto::v1;
use rimeshift_proto::v1::day_service_client::DayServiceClient;
use rimeshift_proto::v1::load_day_request::Content;
use rimeshift_proto::v1::plan_service_client::PlanServiceClient;
use rimeshift_service::{Settings, serve};
use support::{Sectors, day, stretches};
use tokio::net::TcpListener;
use tokio::runtime::Runtime;
use tonic::transport::server::TcpIncoming;
use tonic::transport::{Channel, Endpoint};
use tonic_health::pb::HealthCheckRequest;
use tonic_health::pb::health_client::HealthClient;

/// 2031-03-04T00:00:00Z.
const MIDNIGHT: i64 = 1_930_348_800;

fn at(time_s: f64) -> Option<Timestamp> {
    Some(Timestamp { seconds: MIDNIGHT + time_s as i64, nanos: 0 })
}

/// The day's sectors and flights as rows.
fn rows_of(day: &Day) -> Vec<v1::DayRows> {
    let ring = |ring: &Vec<[f64; 2]>| v1::Ring {
        lon_deg: ring.iter().map(|place| place[0]).collect(),
        lat_deg: ring.iter().map(|place| place[1]).collect(),
    };
    let sectors = day.sectors.iter().map(|sector| v1::Sector {
        sector: sector.name.clone(),
        volumes: sector
            .volumes
            .iter()
            .map(|volume| v1::Volume {
                rings: volume.polygon.rings().iter().map(ring).collect(),
                floor_ft: volume.floor_ft,
                ceiling_ft: volume.ceiling_ft,
            })
            .collect(),
        ..Default::default()
    });
    let capacities = day.sectors.iter().map(|sector| v1::Capacity {
        sector: sector.name.clone(),
        from: at(-86_400.0),
        until: at(2.0 * 86_400.0),
        entries_per_hour: Some(40.0),
        occupancy_limit: Some(18.0),
        ..Default::default()
    });
    let flight = |flight: &Flight| {
        let points = flight.profile.points();
        v1::Flight {
            flight: flight.name.clone(),
            departure: "XAAA".to_owned(),
            destination: "XBBB".to_owned(),
            aircraft: "JET".to_owned(),
            points: Some(v1::Points {
                epoch: at(0.0),
                seconds_after_epoch: points.iter().map(|p| p.time_s).collect(),
                lon_deg: points.iter().map(|p| p.lon_deg).collect(),
                lat_deg: points.iter().map(|p| p.lat_deg).collect(),
                level_ft: points.iter().map(|p| p.level_ft).collect(),
                fix: Vec::new(),
            }),
            ..Default::default()
        }
    };
    let mut rows = vec![v1::DayRows {
        sectors: sectors.collect(),
        capacities: capacities.collect(),
        ..Default::default()
    }];
    rows.extend(day.flights.as_slice().chunks(1000).map(|part| v1::DayRows {
        flights: part.iter().map(flight).collect(),
        ..Default::default()
    }));
    rows
}

/// A valid change of each of some flights.
fn questions(day: Day) -> Vec<v1::AskChangeRequest> {
    let traffic = Traffic::new(day);
    let flights = traffic.day.flights.len();
    let question = |i: usize| {
        let id = FlightId((i * 37 % flights) as u32);
        let flight = traffic.flight(id);
        let valid = |stretch: &&Stretch| {
            change_levels(&traffic.day, flight, &traffic.tracks[id], &[**stretch]).is_ok()
        };
        let stretch = *stretches(&traffic.day, id).iter().find(valid)?;
        Some(v1::AskChangeRequest {
            day: "days/bench".to_owned(),
            plan: String::new(),
            change: Some(v1::Change {
                flight: flight.name.clone(),
                stretches: vec![v1::Stretch {
                    level_ft: stretch.level_ft,
                    from: stretch.from_s.and_then(at),
                    until: stretch.until_s.and_then(at),
                }],
                figures: None,
            }),
        })
    };
    (0..flights).filter_map(question).take(4000).collect()
}

async fn load(channel: &Channel, rows: Vec<v1::DayRows>) {
    let header = v1::LoadDayHeader {
        day_id: "bench".to_owned(),
        date: Some(v1::Date { year: 2031, month: 3, day: 4 }),
        region: "Invented Sea".to_owned(),
        ..Default::default()
    };
    let messages =
        std::iter::once(Content::Header(header)).chain(rows.into_iter().map(Content::Rows));
    let messages: Vec<_> =
        messages.map(|content| v1::LoadDayRequest { content: Some(content) }).collect();
    let mut days = DayServiceClient::new(channel.clone());
    days.load_day(tokio_stream::iter(messages)).await.expect("a sound day");
}

fn ask(c: &mut Criterion) {
    let day = day(Sectors::Lattice);
    let rows = rows_of(&day);
    let questions = questions(day);
    let runtime = Runtime::new().expect("a runtime");
    let channel = runtime.block_on(async {
        let listener = TcpListener::bind("127.0.0.1:0").await.expect("a port");
        let address = listener.local_addr().expect("its address");
        let incoming = TcpIncoming::from(listener).with_nodelay(Some(true));
        tokio::spawn(serve(incoming, Settings::default(), std::future::pending()));
        let endpoint = Endpoint::from_shared(format!("http://{address}")).expect("an address");
        let channel = endpoint.tcp_nodelay(true).connect().await.expect("a connection");
        load(&channel, rows).await;
        channel
    });
    let mut health = HealthClient::new(channel.clone());
    c.bench_function("empty call", |b| {
        b.iter(|| {
            let call = health.check(HealthCheckRequest::default());
            black_box(runtime.block_on(call).expect("health"));
        });
    });
    let mut plans = PlanServiceClient::new(channel);
    let mut next = 0;
    c.bench_function("ask", |b| {
        b.iter(|| {
            next = (next + 1) % questions.len();
            let call = plans.ask_change(questions[next].clone());
            black_box(runtime.block_on(call).expect("an answer"));
        });
    });
}

criterion_group!(benches, ask);
criterion_main!(benches);
