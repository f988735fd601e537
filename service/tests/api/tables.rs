//! The optional tables of a day: restrictions, counts without flights, decisions by hand.

use rimeshift_proto::v1;
use rimeshift_proto::v1::hand_decision::About;
use tonic::{Code, Status};
use tonic_types::StatusExt;

use crate::support::{at, header, load, service, small, small_day, square};

fn restriction(level_ft: f64, from_s: i64) -> v1::Restriction {
    v1::Restriction {
        restriction: "RANGE".to_owned(),
        volumes: square("", 30.0, 32.0).volumes,
        from: at(from_s),
        until: at(from_s + 3600),
        levels_allowed_ft: vec![level_ft, 34_000.0],
        departure: Some("XAAA".to_owned()),
        destination: None,
    }
}

fn background(sector: &str, aircraft: f64) -> v1::Background {
    v1::Background {
        sector: sector.to_owned(),
        from: at(0),
        until: at(3600),
        aircraft: Some(aircraft),
        level_ft: Some(33_000.0),
        entries: None,
    }
}

fn flow(from: &str, to: &str) -> v1::Flow {
    v1::Flow {
        from_sector: from.to_owned(),
        from_level_ft: Some(33_000.0),
        to_sector: to.to_owned(),
        to_level_ft: Some(35_000.0),
        from: at(0),
        until: at(3600),
        aircraft: Some(2.5),
    }
}

fn decision(about: About, must: v1::Must, option: Option<u32>) -> v1::HandDecision {
    v1::HandDecision { about: Some(about), must: must.into(), option }
}

fn about_proposal(name: &str) -> About {
    About::Proposal(name.to_owned())
}

/// A day with every optional table; its first two restrictions tie in name and time.
fn full_day() -> v1::DayRows {
    v1::DayRows {
        restrictions: vec![restriction(32_000.0, 0), restriction(36_000.0, 0)],
        background: vec![background("WEST", 1.5), background("WEST", 0.5), background("EAST", 1.0)],
        flows: vec![flow("WEST", "EAST"), flow("EAST", "WEST")],
        decisions: vec![
            decision(about_proposal("P1"), v1::Must::Grant, Some(1)),
            decision(about_proposal("P3"), v1::Must::Refuse, None),
            decision(About::Flight("F2".to_owned()), v1::Must::Keep, None),
        ],
        ..small_day()
    }
}

async fn hash(rows: Vec<v1::DayRows>) -> String {
    let channel = service(small()).await;
    load(&channel, header("day"), rows).await.unwrap().day.unwrap().day_sha256
}

fn bad_fields(status: &Status) -> Vec<String> {
    assert_eq!(status.code(), Code::InvalidArgument, "{status}");
    let details = status.get_error_details();
    let bad = details.bad_request().unwrap();
    bad.field_violations.iter().map(|v| v.field.clone()).collect()
}

#[tokio::test]
async fn optional_tables_are_counted() {
    let channel = service(small()).await;
    let mut day = full_day();
    day.decisions.extend_from_within(..1);
    let counts = load(&channel, header("day"), vec![day]).await.unwrap().day.unwrap().counts;
    let counts = counts.unwrap();
    let of_tables = [counts.restrictions, counts.background, counts.flows, counts.decisions];
    assert_eq!(of_tables, [2, 3, 2, 3]);
}

/// Rows in another order and spread over messages are the same day.
#[tokio::test]
async fn the_hash_does_not_depend_on_the_order_of_optional_tables() {
    let once = hash(vec![full_day()]).await;
    let mut reversed = full_day();
    reversed.restrictions.reverse();
    reversed.restrictions[0].levels_allowed_ft.reverse();
    reversed.background.reverse();
    reversed.flows.reverse();
    reversed.decisions.reverse();
    let later = v1::DayRows {
        restrictions: reversed.restrictions.split_off(1),
        decisions: reversed.decisions.split_off(2),
        ..Default::default()
    };
    assert_eq!(hash(vec![reversed, later]).await, once);
}

type Change = fn(&mut v1::DayRows);

/// Every field of every optional table tells in the hash.
#[tokio::test]
async fn the_hash_depends_on_every_optional_field() {
    let changes: &[Change] = &[
        |day| day.restrictions.clear(),
        |day| day.background.clear(),
        |day| day.flows.clear(),
        |day| day.decisions.clear(),
        |day| day.restrictions[0].restriction = "OTHER".to_owned(),
        |day| day.restrictions[0].volumes[0].floor_ft += 1000.0,
        |day| day.restrictions[0].from = at(60),
        |day| day.restrictions[0].until = at(7200),
        |day| day.restrictions[0].levels_allowed_ft[0] = 31_000.0,
        |day| day.restrictions[0].departure = None,
        |day| day.restrictions[0].destination = Some("XBBB".to_owned()),
        |day| day.background[0].sector = "EAST".to_owned(),
        |day| day.background[0].from = at(60),
        |day| day.background[0].until = at(60),
        |day| day.background[0].aircraft = Some(3.0),
        |day| day.background[0].level_ft = None,
        |day| day.background[0].entries = Some(0.0),
        |day| day.flows[0].from_sector = "EAST".to_owned(),
        |day| day.flows[0].to_sector = "WEST".to_owned(),
        |day| day.flows[0].from_level_ft = Some(34_000.0),
        |day| day.flows[0].to_level_ft = Some(34_000.0),
        |day| day.flows[0].from = at(60),
        |day| day.flows[0].until = at(60),
        |day| day.flows[0].aircraft = Some(3.0),
        |day| day.decisions[0].option = None,
        |day| day.decisions[0].about = Some(about_proposal("P2")),
        |day| day.decisions[1].must = v1::Must::Grant.into(),
        |day| day.decisions[2].about = Some(About::Flight("F3".to_owned())),
    ];
    let mut hashes = vec![hash(vec![full_day()]).await];
    for change in changes {
        let mut day = full_day();
        // The kept flight has a proposal that some of the changes would grant.
        day.decisions[2].about = Some(About::Flight("F2".to_owned()));
        change(&mut day);
        if day.decisions.iter().any(|d| d.about == Some(about_proposal("P2"))) {
            day.decisions.truncate(2);
        }
        hashes.push(hash(vec![day]).await);
    }
    let all = hashes.len();
    hashes.sort();
    hashes.dedup();
    assert_eq!(hashes.len(), all);
}

#[tokio::test]
async fn every_bad_field_of_optional_tables_is_named() {
    let channel = service(small()).await;
    let mut day = full_day();
    day.restrictions[1].until = None;
    day.restrictions[1].volumes[0].rings[0].lat_deg.pop();
    day.background[0].aircraft = None;
    day.background[2].from = None;
    day.flows[1].to_level_ft = None;
    day.flows[1].aircraft = None;
    day.decisions[0].about = None;
    day.decisions[1].must = 77;
    day.decisions[2].option = Some(1);
    let status = load(&channel, header("bad"), vec![day]).await.unwrap_err();
    assert_eq!(
        bad_fields(&status),
        [
            "restrictions[1].until",
            "restrictions[1].volumes[0].rings[0]",
            "background[0].aircraft",
            "background[2].from",
            "flows[1].to_level_ft",
            "flows[1].aircraft",
            "decisions[0].about",
            "decisions[1].must",
            "decisions[2].option",
        ]
    );
}

/// What only the whole day shows to be wrong keeps its path, counted over all messages.
#[tokio::test]
async fn what_contradicts_the_day_is_named() {
    let channel = service(small()).await;
    let mut more = v1::DayRows {
        restrictions: vec![restriction(32_000.0, 0)],
        background: vec![background("NOWHERE", 1.0), background("WEST", -1.0)],
        flows: vec![flow("WEST", "NOWHERE")],
        decisions: vec![
            decision(about_proposal("P9"), v1::Must::Refuse, None),
            decision(about_proposal("P1"), v1::Must::Refuse, None),
            decision(about_proposal("P2"), v1::Must::Grant, Some(2)),
        ],
        ..Default::default()
    };
    more.restrictions[0].volumes.clear();
    let status = load(&channel, header("bad"), vec![full_day(), more]).await.unwrap_err();
    assert_eq!(
        bad_fields(&status),
        [
            "restrictions[2].volumes",
            "background[3].sector",
            "background[4].aircraft",
            "flows[2].to_sector",
            "decisions[3].proposal",
            "decisions[5].option",
            "decisions[4].must",
        ]
    );
}
