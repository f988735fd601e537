//! A service to talk to, and a small day to load.

use hyper_util::rt::TokioIo;
use prost_types::Timestamp;
use rimeshift_proto::v1;
use rimeshift_proto::v1::day_service_client::DayServiceClient;
use rimeshift_proto::v1::load_day_request::Content;
use rimeshift_service::{Settings, pipe, serve};
use tonic::Status;
use tonic::transport::{Channel, Endpoint};

/// 2031-03-04T00:00:00Z (date -u -d 2031-03-04 +%s).
pub(crate) const MIDNIGHT: i64 = 1_930_348_800;

/// A channel to a service of its own, which ends with the test's runtime.
pub(crate) async fn service(settings: Settings) -> Channel {
    // The service's log is shown with a test that fails. Only the first call can set it.
    let log = tracing_subscriber::fmt().with_max_level(tracing::Level::WARN).with_test_writer();
    let _ = log.try_init();
    let (connector, incoming) = pipe();
    tokio::spawn(serve(incoming, settings, std::future::pending()));
    Endpoint::from_static("http://in-memory")
        .http2_max_header_list_size(128 * 1024)
        .connect_with_connector(tower::service_fn(move |_| {
            let connector = connector.clone();
            async move { connector.connect().await.map(TokioIo::new) }
        }))
        .await
        .unwrap()
}

pub(crate) fn small() -> Settings {
    Settings { search_threads: 1, ask_threads: 1, ..Settings::default() }
}

/// A time of the day, seconds after its midnight.
pub(crate) fn at(time_s: i64) -> Option<Timestamp> {
    Some(Timestamp { seconds: MIDNIGHT + time_s, nanos: 0 })
}

pub(crate) fn header(day_id: &str) -> v1::LoadDayHeader {
    v1::LoadDayHeader {
        day_id: day_id.to_owned(),
        date: Some(v1::Date { year: 2031, month: 3, day: 4 }),
        region: "Invented Sea".to_owned(),
        ..Default::default()
    }
}

pub(crate) fn points(rows: &[(f64, f64, f64, f64)]) -> Option<v1::Points> {
    Some(v1::Points {
        epoch: at(0),
        seconds_after_epoch: rows.iter().map(|r| r.0).collect(),
        lon_deg: rows.iter().map(|r| r.1).collect(),
        lat_deg: rows.iter().map(|r| r.2).collect(),
        level_ft: rows.iter().map(|r| r.3).collect(),
        fix: Vec::new(),
    })
}

/// An eastbound flight in cruise along a parallel, of two hours at some 460 kt, from `from_s` on.
pub(crate) fn eastbound(flight: &str, from_s: f64, lat_deg: f64, level_ft: f64) -> v1::Flight {
    let place = |k: u32| 10.0 + 2.0 * f64::from(k);
    let rows: Vec<_> =
        (0..=12).map(|k| (from_s + 600.0 * f64::from(k), place(k), lat_deg, level_ft)).collect();
    v1::Flight {
        flight: flight.to_owned(),
        departure: "XAAA".to_owned(),
        destination: "XBBB".to_owned(),
        aircraft: "JET".to_owned(),
        points: points(&rows),
        ..Default::default()
    }
}

pub(crate) fn square(sector: &str, west: f64, east: f64) -> v1::Sector {
    v1::Sector {
        sector: sector.to_owned(),
        volumes: vec![v1::Volume {
            rings: vec![v1::Ring {
                lon_deg: vec![west, east, east, west, west],
                lat_deg: vec![40.0, 40.0, 60.0, 60.0, 40.0],
            }],
            floor_ft: 24_500.0,
            ceiling_ft: 66_000.0,
        }],
        ..Default::default()
    }
}

pub(crate) fn capacity(sector: &str, occupancy_limit: f64) -> v1::Capacity {
    v1::Capacity {
        sector: sector.to_owned(),
        from: at(0),
        until: at(86_400),
        occupancy_limit: Some(occupancy_limit),
        ..Default::default()
    }
}

/// A proposal of one stretch in mid-cruise, said to avoid 100 km of contrail.
pub(crate) fn proposal(name: &str, flight: &str, level_ft: f64, from_s: i64) -> v1::Proposal {
    v1::Proposal {
        proposal: name.to_owned(),
        flight: flight.to_owned(),
        options: vec![v1::ProposalOption {
            option: 1,
            stretches: vec![v1::Stretch {
                level_ft,
                from: at(from_s + 1800),
                until: at(from_s + 4800),
            }],
            figures: Some(v1::OptionFigures {
                contrail_km_avoided: Some(100.0),
                ..Default::default()
            }),
        }],
    }
}

/// Two sectors, three flights one behind the other, three proposals.
pub(crate) fn small_day() -> v1::DayRows {
    v1::DayRows {
        sectors: vec![square("WEST", 9.0, 20.0), square("EAST", 20.0, 40.0)],
        capacities: vec![capacity("WEST", 10.0), capacity("EAST", 10.0)],
        flights: vec![
            eastbound("F1", 0.0, 50.0, 33_000.0),
            eastbound("F2", 900.0, 50.0, 33_000.0),
            eastbound("F3", 1800.0, 50.0, 33_000.0),
        ],
        proposals: vec![
            proposal("P1", "F1", 35_000.0, 0),
            proposal("P2", "F2", 35_000.0, 900),
            proposal("P3", "F3", 37_000.0, 1800),
        ],
        ..Default::default()
    }
}

/// Sends a header and messages of rows.
pub(crate) async fn load(
    channel: &Channel,
    header: v1::LoadDayHeader,
    rows: Vec<v1::DayRows>,
) -> Result<v1::LoadDayResponse, Status> {
    let mut messages = vec![v1::LoadDayRequest { content: Some(Content::Header(header)) }];
    messages
        .extend(rows.into_iter().map(|r| v1::LoadDayRequest { content: Some(Content::Rows(r)) }));
    send(channel, messages).await
}

/// Sends any messages.
pub(crate) async fn send(
    channel: &Channel,
    messages: Vec<v1::LoadDayRequest>,
) -> Result<v1::LoadDayResponse, Status> {
    let stream = tokio_stream::iter(messages);
    DayServiceClient::new(channel.clone()).load_day(stream).await.map(tonic::Response::into_inner)
}
