//! "May this flight change level now?" over gRPC on loopback, one caller, against a day of 17 000
//! flights and 450 sectors; beside it an empty call (a health check) of the same server in the same
//! run, to which the answer's time is to be compared.

#![expect(clippy::expect_used, reason = "a bench fails by panicking")]

use std::hint::black_box;

use criterion::{Criterion, criterion_group, criterion_main};
use prost_types::Timestamp;
use rimeshift_proto::v1;
use rimeshift_proto::v1::day_service_client::DayServiceClient;
use rimeshift_proto::v1::load_day_request::Content;
use rimeshift_proto::v1::plan_service_client::PlanServiceClient;
use rimeshift_service::{Settings, serve};
use tokio::net::TcpListener;
use tokio::runtime::Runtime;
use tonic::transport::server::TcpIncoming;
use tonic::transport::{Channel, Endpoint};
use tonic_health::pb::HealthCheckRequest;
use tonic_health::pb::health_client::HealthClient;

/// 2031-03-04T00:00:00Z.
const MIDNIGHT: i64 = 1_930_348_800;
const FLIGHTS: u32 = 17_000;
const COLUMNS: u32 = 15;
const ROWS: u32 = 10;
const FLOORS_FT: [f64; 4] = [24_500.0, 33_500.0, 37_500.0, 66_000.0];

fn at(time_s: f64) -> Option<Timestamp> {
    Some(Timestamp { seconds: MIDNIGHT + time_s as i64, nanos: 0 })
}

/// A number from 0 to 1 that looks random, the same each time (a multiplicative hash).
fn spread(number: u32, salt: u32) -> f64 {
    let mixed = number.wrapping_mul(2_654_435_761).wrapping_add(salt.wrapping_mul(40_503));
    f64::from(mixed.rotate_left(13).wrapping_mul(2_246_822_519) >> 8) / f64::from(1u32 << 24)
}

/// A flight of about 700 NM in cruise over the region, at a level of its direction.
fn flight(number: u32) -> v1::Flight {
    let east = number.is_multiple_of(2);
    let start_s = 80_000.0 * spread(number, 1);
    let (lon, lat) = (15.0 * spread(number, 2), 40.0 + 18.0 * spread(number, 3));
    let (rise, steps) = (2.0 * spread(number, 4) - 1.0, 9);
    let level_ft =
        29_000.0 + 2000.0 * (6.0 * spread(number, 5)).floor() + f64::from(!east) * 1000.0;
    let step = |k: i32| f64::from(k);
    let lon_at = |k: i32| if east { lon + 2.0 * step(k) } else { 30.0 - lon - 2.0 * step(k) };
    let points = v1::Points {
        epoch: at(0.0),
        seconds_after_epoch: (0..=steps).map(|k| start_s + 700.0 * step(k)).collect(),
        lon_deg: (0..=steps).map(lon_at).collect(),
        lat_deg: (0..=steps).map(|k| lat + rise * step(k) / 9.0).collect(),
        level_ft: vec![level_ft; steps as usize + 1],
        fix: Vec::new(),
    };
    v1::Flight {
        flight: format!("F{number:05}"),
        departure: "XAAA".to_owned(),
        destination: "XBBB".to_owned(),
        aircraft: "JET".to_owned(),
        points: Some(points),
        ..Default::default()
    }
}

fn sectors() -> (Vec<v1::Sector>, Vec<v1::Capacity>) {
    let mut sectors = Vec::new();
    for (column, row, layer) in (0..COLUMNS)
        .flat_map(|c| (0..ROWS).flat_map(move |r| (0..3_usize).map(move |layer| (c, r, layer))))
    {
        let (west, south) = (2.2 * f64::from(column) - 1.0, 39.0 + 2.1 * f64::from(row));
        let (east, north) = (west + 2.2, south + 2.1);
        sectors.push(v1::Sector {
            sector: format!("S{column:02}{row:02}{layer}"),
            volumes: vec![v1::Volume {
                rings: vec![v1::Ring {
                    lon_deg: vec![west, east, east, west, west],
                    lat_deg: vec![south, south, north, north, south],
                }],
                floor_ft: FLOORS_FT[layer],
                ceiling_ft: FLOORS_FT[layer + 1],
            }],
            ..Default::default()
        });
    }
    let capacity = |sector: &v1::Sector| v1::Capacity {
        sector: sector.sector.clone(),
        from: at(0.0),
        until: at(86_400.0),
        entries_per_hour: Some(40.0),
        occupancy_limit: Some(18.0),
        ..Default::default()
    };
    let capacities = sectors.iter().map(capacity).collect();
    (sectors, capacities)
}

async fn load(channel: &Channel) {
    let header = v1::LoadDayHeader {
        day_id: "bench".to_owned(),
        date: Some(v1::Date { year: 2031, month: 3, day: 4 }),
        region: "Invented Sea".to_owned(),
        ..Default::default()
    };
    let (sectors, capacities) = sectors();
    let mut rows = vec![v1::DayRows { sectors, capacities, ..Default::default() }];
    let flights: Vec<v1::Flight> = (0..FLIGHTS).map(flight).collect();
    rows.extend(
        flights
            .chunks(1000)
            .map(|part| v1::DayRows { flights: part.to_vec(), ..Default::default() }),
    );
    let messages =
        std::iter::once(Content::Header(header)).chain(rows.into_iter().map(Content::Rows));
    let messages: Vec<_> =
        messages.map(|content| v1::LoadDayRequest { content: Some(content) }).collect();
    let mut days = DayServiceClient::new(channel.clone());
    days.load_day(tokio_stream::iter(messages)).await.expect("a sound day");
}

fn question(number: u32) -> v1::AskChangeRequest {
    let filed = flight(number);
    let points = filed.points.unwrap_or_default();
    let start_s = points.seconds_after_epoch.first().copied().unwrap_or(0.0);
    let level_ft = points.level_ft.first().copied().unwrap_or(0.0);
    v1::AskChangeRequest {
        day: "days/bench".to_owned(),
        plan: String::new(),
        change: Some(v1::Change {
            flight: filed.flight,
            stretches: vec![v1::Stretch {
                level_ft: level_ft + 2000.0,
                from: at(start_s + 1200.0),
                until: at(start_s + 4200.0),
            }],
            figures: None,
        }),
    }
}

fn ask(c: &mut Criterion) {
    let runtime = Runtime::new().expect("a runtime");
    let channel = runtime.block_on(async {
        let listener = TcpListener::bind("127.0.0.1:0").await.expect("a port");
        let address = listener.local_addr().expect("its address");
        let incoming = TcpIncoming::from(listener).with_nodelay(Some(true));
        tokio::spawn(serve(incoming, Settings::default(), std::future::pending()));
        let endpoint = Endpoint::from_shared(format!("http://{address}")).expect("an address");
        let channel = endpoint.tcp_nodelay(true).connect().await.expect("a connection");
        load(&channel).await;
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
            next = (next + 37) % FLIGHTS;
            let call = plans.ask_change(question(next));
            black_box(runtime.block_on(call).expect("an answer"));
        });
    });
}

criterion_group!(benches, ask);
criterion_main!(benches);
