//! Loading, replacing, listing and deleting days, and what is said of bad ones.

use rimeshift_proto::v1;
use rimeshift_proto::v1::day_service_client::DayServiceClient;
use rimeshift_service::Settings;
use tonic::{Code, Status};
use tonic_types::StatusExt;

use crate::support::{
    at, eastbound, header, load, points, proposal, send, service, small, small_day,
};

/// The paths that an INVALID_ARGUMENT names.
fn bad_fields(status: &Status) -> Vec<String> {
    assert_eq!(status.code(), Code::InvalidArgument, "{status}");
    let details = status.get_error_details();
    let bad = details.bad_request().unwrap();
    bad.field_violations.iter().map(|v| v.field.clone()).collect()
}

#[tokio::test]
async fn a_day_is_loaded_shown_listed_and_deleted() {
    let channel = service(small()).await;
    let loaded = load(&channel, header("day-1"), vec![small_day()]).await.unwrap();
    let day = loaded.day.unwrap();
    assert_eq!(day.name, "days/day-1");
    assert_eq!(day.date, Some(v1::Date { year: 2031, month: 3, day: 4 }));
    let counts = day.counts.unwrap();
    assert_eq!((counts.sectors, counts.capacities, counts.flights), (2, 2, 3));
    assert_eq!((counts.points, counts.proposals), (39, 3));

    let mut client = DayServiceClient::new(channel.clone());
    let name = || "days/day-1".to_owned();
    let got = client.get_day(v1::GetDayRequest { name: name() }).await.unwrap().into_inner();
    assert_eq!(got.day.as_ref(), Some(&day));
    let listed = client.list_days(v1::ListDaysRequest::default()).await.unwrap().into_inner();
    assert_eq!(listed.days, [day]);
    client.delete_day(v1::DeleteDayRequest { name: name() }).await.unwrap();
    let gone = client.get_day(v1::GetDayRequest { name: name() }).await.unwrap_err();
    assert_eq!(gone.code(), Code::NotFound);
    assert_eq!(gone.get_error_details().resource_info().unwrap().resource_name, "days/day-1");
}

/// Rows one a message, in another order, points in pieces, defaults given outright: one day.
#[tokio::test]
async fn the_hash_does_not_depend_on_how_the_day_was_sent() {
    let channel = service(small()).await;
    let once = load(&channel, header("once"), vec![small_day()]).await.unwrap().day.unwrap();

    let day = small_day();
    let mut messages = Vec::new();
    for flight in day.flights.into_iter().rev() {
        let all = flight.points.clone().unwrap();
        let piece = |range: std::ops::Range<usize>| {
            Some(v1::Points {
                // Another epoch, the same times.
                epoch: at(-60),
                seconds_after_epoch: all.seconds_after_epoch[range.clone()]
                    .iter()
                    .map(|s| s + 60.0)
                    .collect(),
                lon_deg: all.lon_deg[range.clone()].to_vec(),
                lat_deg: all.lat_deg[range.clone()].to_vec(),
                level_ft: all.level_ft[range.clone()].to_vec(),
                fix: vec![String::new(); range.len()],
            })
        };
        let rest = v1::FlightPoints { flight: flight.flight.clone(), points: piece(5..13) };
        let first = v1::Flight { points: piece(0..5), rvsm: Some(true), ..flight };
        messages.push(v1::DayRows { flights: vec![first], ..Default::default() });
        messages.push(v1::DayRows { flight_points: vec![rest], ..Default::default() });
    }
    messages.push(v1::DayRows {
        proposals: day.proposals.into_iter().rev().collect(),
        capacities: day.capacities.into_iter().rev().collect(),
        ..Default::default()
    });
    messages.push(v1::DayRows {
        sectors: day.sectors.into_iter().rev().collect(),
        ..Default::default()
    });
    let mut pieces = header("pieces");
    pieces.policy = vec![v1::PolicySetting {
        key: "horizontal_nm".to_owned(),
        value: Some(v1::PolicyValue { kind: Some(v1::policy_value::Kind::Number(5.0)) }),
    }];
    let pieces = load(&channel, pieces, messages).await.unwrap().day.unwrap();
    assert_eq!(pieces.day_sha256, once.day_sha256);

    let mut other = small_day();
    other.flights[0] = eastbound("F1", 0.0, 50.0, 33_000.5);
    let other = load(&channel, header("other"), vec![other]).await.unwrap().day.unwrap();
    assert_ne!(other.day_sha256, once.day_sha256);
}

#[tokio::test]
async fn every_bad_field_is_named_by_its_path() {
    let channel = service(small()).await;
    let mut rows = small_day();
    rows.capacities[1].until = None;
    rows.airports =
        vec![v1::Airport { airport: "XAAA".into(), lat_deg: Some(5.0), ..Default::default() }];
    rows.fuel =
        vec![v1::FuelRow { aircraft: "JET".into(), level_ft: Some(1.0), ..Default::default() }];
    rows.flights[2].points.as_mut().unwrap().lat_deg.pop();
    rows.flight_points = vec![v1::FlightPoints { flight: "F9".into(), points: None }];
    rows.proposals[0].options[0].stretches[0].from =
        Some(prost_types::Timestamp { seconds: 0, nanos: -1 });
    let mut bad_header = header("bad");
    bad_header.policy = vec![v1::PolicySetting { key: "no_such_key".into(), value: None }];
    let status = load(&channel, bad_header, vec![rows]).await.unwrap_err();
    assert_eq!(
        bad_fields(&status),
        [
            "policy[0].key",
            "capacities[1].until",
            "airports[0].lon_deg",
            "fuel[0].flow",
            "flights[2].points.lat_deg",
            "flight_points[0].flight",
            "proposals[0].options[0].stretches[0].from",
        ]
    );
}

/// Defects that the engine finds keep their paths, counted over all messages.
#[tokio::test]
async fn indexes_in_paths_count_over_all_messages() {
    let channel = service(small()).await;
    let mut more = v1::DayRows {
        flights: vec![eastbound("F4", 0.0, 52.0, 33_000.0)],
        proposals: vec![proposal("P4", "F9", 35_000.0, 0)],
        ..Default::default()
    };
    more.flights[0].points.as_mut().unwrap().level_ft[7] = f64::NAN;
    let status = load(&channel, header("bad"), vec![small_day(), more]).await.unwrap_err();
    assert_eq!(bad_fields(&status), ["flights[3].points[7].level_ft", "proposals[3].flight"]);
}

#[tokio::test]
async fn the_caller_says_how_many_defects_it_can_take() {
    let channel = service(small()).await;
    let mut rows = small_day();
    rows.flights = (0..300).map(|i| eastbound(&format!("G{i}"), 0.0, 99.0, 33_000.0)).collect();
    rows.proposals.clear();
    let few = load(&channel, header("bad"), vec![rows.clone()]).await.unwrap_err();
    let all = v1::LoadDayHeader { max_defects: 100, ..header("bad") };
    let all = load(&channel, all, vec![rows]).await.unwrap_err();
    assert_eq!(bad_fields(&all).len(), 101);
    assert!(bad_fields(&few).len() < 101);
}

#[tokio::test]
async fn a_day_is_there_whole_or_not_at_all() {
    let channel = service(small()).await;
    let mut client = DayServiceClient::new(channel.clone());
    let first = load(&channel, header("day"), vec![small_day()]).await.unwrap().day.unwrap();

    let again = load(&channel, header("day"), vec![small_day()]).await.unwrap_err();
    assert_eq!(again.code(), Code::AlreadyExists);

    let replace = || v1::LoadDayHeader { allow_replace: true, ..header("day") };
    let mut broken = small_day();
    broken.flights[0].points = points(&[(0.0, 0.0, 0.0, 0.0)]);
    load(&channel, replace(), vec![broken]).await.unwrap_err();
    let request = || v1::GetDayRequest { name: "days/day".to_owned() };
    let kept = client.get_day(request()).await.unwrap().into_inner().day.unwrap();
    assert_eq!(kept, first);

    let mut fewer = small_day();
    fewer.proposals.pop();
    load(&channel, replace(), vec![fewer]).await.unwrap();
    let now = client.get_day(request()).await.unwrap().into_inner().day.unwrap();
    assert_eq!(now.counts.unwrap().proposals, 2);
}

#[tokio::test]
async fn a_stream_without_its_header_is_refused() {
    let channel = service(small()).await;
    let no_messages = send(&channel, vec![]).await.unwrap_err();
    assert_eq!(bad_fields(&no_messages), ["header"]);
    let rows = v1::load_day_request::Content::Rows(small_day());
    let rows_first = v1::LoadDayRequest { content: Some(rows) };
    assert_eq!(bad_fields(&send(&channel, vec![rows_first]).await.unwrap_err()), ["header"]);
    let second = v1::load_day_request::Content::Header(header("day"));
    let second = v1::LoadDayRequest { content: Some(second) };
    let twice = vec![second.clone(), second];
    assert_eq!(bad_fields(&send(&channel, twice).await.unwrap_err()), ["header"]);

    for (change, path) in [
        (v1::LoadDayHeader { date: None, ..header("day") }, "header.date"),
        (v1::LoadDayHeader { day_id: "No Id".into(), ..header("day") }, "header.day_id"),
        (
            v1::LoadDayHeader {
                date: Some(v1::Date { year: 2031, month: 2, day: 30 }),
                ..header("day")
            },
            "header.date",
        ),
    ] {
        assert_eq!(bad_fields(&load(&channel, change, vec![]).await.unwrap_err()), [path]);
    }
}

#[tokio::test]
async fn limits_answer_resource_exhausted() {
    let subject = |status: Status| {
        assert_eq!(status.code(), Code::ResourceExhausted, "{status}");
        status.get_error_details().quota_failure().unwrap().violations[0].subject.clone()
    };
    // The small day brings 39 points and 30 other rows, nested ones included.
    let tight = Settings { max_days: 1, max_load_rows: 100, ..small() };
    let channel = service(tight).await;
    load(&channel, header("one"), vec![small_day()]).await.unwrap();
    let second = load(&channel, header("two"), vec![small_day()]).await.unwrap_err();
    assert_eq!(subject(second), "days");
    let replace = v1::LoadDayHeader { allow_replace: true, ..header("one") };
    let rows = load(&channel, replace, vec![small_day(), small_day()]).await.unwrap_err();
    assert_eq!(subject(rows), "load_rows");

    let channel = service(Settings { max_load_bytes: 1000, ..small() }).await;
    let bytes = load(&channel, header("one"), vec![small_day()]).await.unwrap_err();
    assert_eq!(subject(bytes), "load_bytes");

    let channel = service(Settings { max_loads: 0, ..small() }).await;
    let loads = load(&channel, header("one"), vec![small_day()]).await.unwrap_err();
    assert_eq!(subject(loads), "loads");
}

#[tokio::test]
async fn a_client_that_falls_silent_is_let_go() {
    let idle = std::time::Duration::from_millis(50);
    let channel = service(Settings { load_idle: idle, ..small() }).await;
    let content = Some(v1::load_day_request::Content::Header(header("day")));
    let first = tokio_stream::iter([v1::LoadDayRequest { content }]);
    let silent = tokio_stream::StreamExt::chain(first, tokio_stream::pending());
    let status = DayServiceClient::new(channel).load_day(silent).await.unwrap_err();
    assert_eq!(status.code(), Code::DeadlineExceeded);
}

#[tokio::test]
async fn days_are_listed_page_by_page() {
    let channel = service(small()).await;
    for id in ["c", "a", "b"] {
        load(&channel, header(id), vec![small_day()]).await.unwrap();
    }
    let mut client = DayServiceClient::new(channel);
    let mut names = Vec::new();
    let mut page_token = String::new();
    loop {
        let request = v1::ListDaysRequest { page_size: 2, page_token };
        let page = client.list_days(request).await.unwrap().into_inner();
        assert!(page.days.len() <= 2);
        names.extend(page.days.into_iter().map(|day| day.name));
        page_token = page.next_page_token;
        if page_token.is_empty() {
            break;
        }
    }
    assert_eq!(names, ["days/a", "days/b", "days/c"]);
    for bad in [
        v1::ListDaysRequest { page_size: -1, page_token: String::new() },
        v1::ListDaysRequest { page_size: 0, page_token: "?".into() },
    ] {
        let status = client.list_days(bad).await.unwrap_err();
        assert_eq!(status.code(), Code::InvalidArgument);
    }
}

#[tokio::test]
async fn the_keys_of_the_policy_are_listed_with_the_days_values() {
    let channel = service(small()).await;
    let number = |n| Some(v1::PolicyValue { kind: Some(v1::policy_value::Kind::Number(n)) });
    let mut header = header("day");
    header.policy = vec![v1::PolicySetting { key: "horizontal_nm".into(), value: number(8.0) }];
    load(&channel, header, vec![small_day()]).await.unwrap();
    let mut client = DayServiceClient::new(channel);
    for (day, value) in [("", 5.0), ("days/day", 8.0)] {
        let request = v1::ListPolicyKeysRequest { day: day.into() };
        let keys = client.list_policy_keys(request).await.unwrap().into_inner().keys;
        let key = keys.iter().find(|k| k.key == "horizontal_nm").unwrap();
        assert_eq!((&key.value, &key.default_value), (&number(value), &number(5.0)));
        assert_eq!(key.unit, "NM");
        let limit = keys.iter().find(|k| k.key == "max_moved_flights").unwrap();
        assert_eq!(limit.value, None);
    }
}
