//! What is said of a filed day.

use rimeshift_proto::v1;
use rimeshift_proto::v1::check_day_response::Content;
use rimeshift_proto::v1::traffic_service_client::TrafficServiceClient;
use tonic::Code;
use tonic::transport::Channel;

use crate::support::{capacity, eastbound, header, load, proposal, service, small, small_day};

/// The small day with a limit that its three flights break, two flights that lose separation, and
/// a proposal at a level of the other direction.
async fn busy_day(channel: &Channel) {
    let mut rows = small_day();
    rows.capacities = vec![capacity("WEST", 2.0), capacity("EAST", 10.0)];
    rows.flights.push(eastbound("F2B", 910.0, 50.0, 33_000.0));
    rows.proposals.push(proposal("P4", "F1", 36_000.0, 0));
    load(channel, header("day"), vec![rows]).await.unwrap();
}

#[tokio::test]
async fn a_check_counts_overloads_losses_and_invalid_proposals() {
    let channel = service(small()).await;
    busy_day(&channel).await;
    let mut client = TrafficServiceClient::new(channel);
    let request = v1::CheckDayRequest { day: "days/day".into() };
    let mut stream = client.check_day(request).await.unwrap().into_inner();
    let Some(Content::Summary(summary)) = stream.message().await.unwrap().unwrap().content else {
        panic!("the summary comes first");
    };
    let (mut overloads, mut invalid) = (Vec::new(), Vec::new());
    while let Some(message) = stream.message().await.unwrap() {
        let Some(Content::Rows(rows)) = message.content else { panic!("rows come next") };
        overloads.extend(rows.overloads);
        invalid.extend(rows.invalid_proposals);
    }
    assert_eq!((summary.flights, summary.proposals, summary.losses), (4, 4, 1));
    assert_eq!(summary.overloads as usize, overloads.len());
    assert_eq!(summary.invalid_proposals as usize, invalid.len());
    let worst = overloads.iter().find(|o| o.measure() == v1::LoadMeasure::Occupancy).unwrap();
    let west = v1::place::Place::Sector("WEST".into());
    assert_eq!(worst.place.as_ref().unwrap().place, Some(west));
    assert_eq!((worst.count, worst.limit), (4.0, 2.0));
    let [invalid] = invalid.as_slice() else { panic!("{invalid:?}") };
    assert_eq!(invalid.proposal, "P4");
    let rule = invalid.broken_rule.as_ref().unwrap();
    assert_eq!(rule.rule(), v1::ChangeRule::WrongDirection);
    assert!((80.0..100.0).contains(&rule.track_deg.unwrap()), "{rule:?}");
}

#[tokio::test]
async fn losses_name_both_flights_and_where() {
    let channel = service(small()).await;
    busy_day(&channel).await;
    let mut client = TrafficServiceClient::new(channel);
    let ask = |flights: &[&str], sectors: &[&str]| v1::ListLossesRequest {
        parent: "days/day".into(),
        flights: flights.iter().map(|&f| f.to_owned()).collect(),
        sectors: sectors.iter().map(|&s| s.to_owned()).collect(),
        ..Default::default()
    };
    let losses = client.list_losses(ask(&[], &[])).await.unwrap().into_inner().losses;
    let [loss] = losses.as_slice() else { panic!("{losses:?}") };
    assert_eq!((loss.first_flight.as_str(), loss.second_flight.as_str()), ("F2", "F2B"));
    // Two degrees of longitude at 50 N in 600 s, 10 s behind each other: 2/60 degree, 71.695 km a
    // degree (WGS 84, from memory), 1.29 NM.
    assert!((loss.horizontal_nm - 1.29).abs() < 0.01, "{}", loss.horizontal_nm);
    assert_eq!(loss.vertical_ft, 0.0);
    assert_eq!(loss.sector, "WEST");

    let count = |r: tonic::Response<v1::ListLossesResponse>| r.into_inner().losses.len();
    assert_eq!(count(client.list_losses(ask(&["F2B"], &["WEST"])).await.unwrap()), 1);
    assert_eq!(count(client.list_losses(ask(&["F1"], &[])).await.unwrap()), 0);
    assert_eq!(count(client.list_losses(ask(&[], &["EAST"])).await.unwrap()), 0);
    let unknown = client.list_losses(ask(&["F9"], &[])).await.unwrap_err();
    assert_eq!(unknown.code(), Code::InvalidArgument);
}

#[tokio::test]
async fn loads_are_listed_page_by_page_and_filtered() {
    let channel = service(small()).await;
    busy_day(&channel).await;
    let mut client = TrafficServiceClient::new(channel.clone());
    let all = v1::ListLoadsRequest { parent: "days/day".into(), ..Default::default() };
    let whole = client.list_loads(all.clone()).await.unwrap().into_inner();
    assert_eq!(whole.next_page_token, "");
    assert!(whole.loads.iter().all(|l| l.filed == l.planned));
    let mut paged = Vec::new();
    let mut page_token = String::new();
    loop {
        let request = v1::ListLoadsRequest { page_size: 7, page_token, ..all.clone() };
        let page = client.list_loads(request).await.unwrap().into_inner();
        paged.extend(page.loads);
        page_token = page.next_page_token;
        if page_token.is_empty() {
            break;
        }
        // A token outlives neither its day nor a change of its text.
        let bad = v1::ListLoadsRequest { page_token: format!("{page_token}0"), ..all.clone() };
        assert_eq!(client.list_loads(bad).await.unwrap_err().code(), Code::InvalidArgument);
    }
    assert_eq!(paged, whole.loads);

    let east = v1::ListLoadsRequest {
        sectors: vec!["EAST".into()],
        measures: vec![v1::LoadMeasure::Entries.into()],
        ..all.clone()
    };
    let east = client.list_loads(east).await.unwrap().into_inner().loads;
    assert!(!east.is_empty());
    for load in &east {
        assert_eq!(load.measure(), v1::LoadMeasure::Entries);
        let place = load.place.as_ref().unwrap().place.clone();
        assert_eq!(place, Some(v1::place::Place::Sector("EAST".into())));
    }
    let bad = v1::ListLoadsRequest { measures: vec![0], ..all };
    assert_eq!(client.list_loads(bad).await.unwrap_err().code(), Code::InvalidArgument);
}
