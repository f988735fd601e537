//! Restrictions, counts without flights, and decisions by hand.

use super::{check, folder_with, read_folder};
use expect_test::expect;
use rimeshift_proto::v1::hand_decision::About;
use rimeshift_proto::v1::load_day_request::Content;
use rimeshift_proto::v1::{Background, DayRows, Flow, HandDecision, Must, Restriction};
use std::fmt::Write as _;
use std::fs;

/// Two restrictions, and two rows in each table.
const TABLES: &str = r#"
=== restrictions.geojson
{"type": "FeatureCollection", "features": [
 {"type": "Feature", "properties": {"restriction": "RANGE", "floor_fl": 245, "ceiling_fl": 345.5,
   "from": "2031-03-04T10:00:00Z", "until": "2031-03-04T17:00:00.5Z", "levels_allowed": [290, 310.5],
   "departure": "XAAA", "destination": null, "fill": "red"},
  "geometry": {"type": "MultiPolygon", "coordinates": [[[[0, 50], [1, 50], [1, 51], [0, 50]]], [[[2, 50], [3, 50], [3, 51], [2, 50]]]]}},
 {"type": "Feature", "properties": {"restriction": "RANGE", "floor_fl": 245, "ceiling_fl": 345,
   "from": "2031-03-04T20:00:00Z", "until": "2031-03-04T21:00:00Z"},
  "geometry": {"type": "Polygon", "coordinates": [[[0, 50], [1, 50], [1, 51], [0, 50]]]}}]}
=== background.csv
sector,from,until,aircraft,level_fl,entries
NORTH,2031-03-04T06:00:00Z,2031-03-04T07:00:00Z,1.5,,
NORTH,2031-03-04T07:00:00Z,2031-03-04T08:00:00Z,2,350,4
=== flows.csv
from_sector,from_level_fl,to_sector,to_level_fl,from,until,aircraft
NORTH,350,NORTH,360,2031-03-04T06:00:00Z,2031-03-04T07:00:00Z,0.5
NORTH,360,NORTH,370,2031-03-04T06:00:00Z,2031-03-04T07:00:00Z,3
=== decisions.csv
proposal,flight,must,option
P1,,grant,2
,BBB2,keep,
"#;

/// All rows that a folder sends.
fn rows_of(changes: &str) -> (DayRows, Vec<String>) {
    let folder = folder_with(changes);
    let (day, warnings) = read_folder(folder.path()).expect("a sound day");
    let mut all = DayRows::default();
    for request in day.requests("day") {
        let Some(Content::Rows(rows)) = request.content else { continue };
        all.restrictions.extend(rows.restrictions);
        all.background.extend(rows.background);
        all.flows.extend(rows.flows);
        all.decisions.extend(rows.decisions);
    }
    (all, warnings)
}

fn time(text: &str) -> Option<prost_types::Timestamp> {
    text.parse().ok()
}

#[test]
fn every_column_is_sent() {
    let (rows, warnings) = rows_of(TABLES);
    assert_eq!(warnings, ["restrictions.geojson: properties that are not used: fill"]);
    let mut restrictions = rows.restrictions;
    assert_eq!(restrictions[1].levels_allowed_ft, [0.0; 0]);
    assert_eq!((restrictions.len(), restrictions[0].volumes.len()), (2, 2));
    let volume = &restrictions[0].volumes[1];
    assert_eq!((volume.floor_ft, volume.ceiling_ft), (24_500.0, 34_550.0));
    assert_eq!(volume.rings[0].lon_deg, [2.0, 3.0, 3.0, 2.0]);
    restrictions[0].volumes.clear();
    assert_eq!(
        restrictions[0],
        Restriction {
            restriction: "RANGE".to_owned(),
            volumes: Vec::new(),
            from: time("2031-03-04T10:00:00Z"),
            until: time("2031-03-04T17:00:00.5Z"),
            levels_allowed_ft: vec![29_000.0, 31_050.0],
            departure: Some("XAAA".to_owned()),
            destination: None,
        }
    );
    let background = Background {
        sector: "NORTH".to_owned(),
        from: time("2031-03-04T06:00:00Z"),
        until: time("2031-03-04T07:00:00Z"),
        aircraft: Some(1.5),
        level_ft: None,
        entries: None,
    };
    let later = Background {
        from: time("2031-03-04T07:00:00Z"),
        until: time("2031-03-04T08:00:00Z"),
        aircraft: Some(2.0),
        level_ft: Some(35_000.0),
        entries: Some(4.0),
        ..background.clone()
    };
    assert_eq!(rows.background, [background, later]);
    let flow = Flow {
        from_sector: "NORTH".to_owned(),
        from_level_ft: Some(35_000.0),
        to_sector: "NORTH".to_owned(),
        to_level_ft: Some(36_000.0),
        from: time("2031-03-04T06:00:00Z"),
        until: time("2031-03-04T07:00:00Z"),
        aircraft: Some(0.5),
    };
    assert_eq!((rows.flows.len(), &rows.flows[0]), (2, &flow));
    let about = [About::Proposal("P1".to_owned()), About::Flight("BBB2".to_owned())];
    let [grant, keep] = about.map(Some);
    assert_eq!(
        rows.decisions,
        [
            HandDecision { about: grant, must: Must::Grant.into(), option: Some(2) },
            HandDecision { about: keep, must: Must::Keep.into(), option: None },
        ]
    );
}

#[test]
fn defects_in_restrictions_name_feature_and_property() {
    check(
        r#"
=== restrictions.geojson
{"type": "FeatureCollection", "features": [
 {"type": "Feature", "properties": {"restriction": "A", "floor": 245, "ceiling_fl": 345,
   "from": "2031-03-04T10:00:00+01:00", "until": 17, "levels_allowed": "290", "departure": ["XAAA"]},
  "geometry": {"type": "Polygon", "coordinates": [[[0, 50], [1, 50], [1, 51], [0, 50]]]}},
 {"type": "Feature", "properties": {"restriction": "B", "floor_fl": 245, "ceiling_fl": 345,
   "from": "10:00", "until": "2031-03-04T17:00:00Z", "levels_allowed": [290, "310"]},
  "geometry": {"type": "Point", "coordinates": [0, 50]}},
 {"type": "Feature", "properties": {"floor_fl": 245, "ceiling_fl": 345},
  "geometry": {"type": "Polygon", "coordinates": [[[0, 50], [1, 50], [1, 51], [0, 50]]]}}]}
"#,
        expect![[r#"
            warning: restrictions.geojson: properties that are not used: floor
            restrictions.geojson: feature 1 (restriction "A"): property floor_fl: is missing
              hint: was "floor" meant to be floor_fl?
            restrictions.geojson: feature 1 (restriction "A"): property from: "2031-03-04T10:00:00+01:00" is not in UTC
              hint: convert it to UTC; every time ends in Z
            restrictions.geojson: feature 1 (restriction "A"): property until: 17 is not a time as text
            restrictions.geojson: feature 1 (restriction "A"): property levels_allowed: "290" is not a list of flight levels
            restrictions.geojson: feature 1 (restriction "A"): property departure: ["XAAA"] is not text
            restrictions.geojson: feature 2 (restriction "B"): property from: "10:00" is not an RFC 3339 time
              hint: write times as 2031-03-04T06:15:00Z
            restrictions.geojson: feature 2 (restriction "B"): property levels_allowed: [290,"310"] is not a list of flight levels
            restrictions.geojson: feature 2 (restriction "B"): has a geometry of type Point
              hint: a restriction is a Polygon or a MultiPolygon
            restrictions.geojson: feature 3: property restriction: is missing
            restrictions.geojson: feature 3: property from: is missing
            restrictions.geojson: feature 3: property until: is missing
        "#]],
    );
    check(
        "=== restrictions.geojson\n{}\n",
        expect![[r#"
        restrictions.geojson: has no type
          hint: restrictions are a FeatureCollection of RFC 7946
    "#]],
    );
}

#[test]
fn defects_in_counts_and_decisions_name_line_and_column() {
    check(
        "
=== background.csv
sector,from,until,aircraft,level_fl,entries
,2031-03-04T06:00:00Z,7,many,high,-inf
=== flows.csv
from_sector,from_level_fl,to_sector,to_level_fl,from,until,aircraft
NORTH,x,,360,2031-03-04T06:00:00Z,2031-03-04T07:00:00+01:00,
=== decisions.csv
proposal,flight,must,option
P1,BBB2,grant,
,,refuse,
P1,,allow,0
P1,,,
",
        expect![[r#"
            background.csv:2: column sector: is blank, and a value is required
            background.csv:2: column until: "7" is not an RFC 3339 time
              hint: write times as 2031-03-04T06:15:00Z
            background.csv:2: column aircraft: "many" is not a number
            background.csv:2: column level_fl: "high" is not a number
            background.csv:2: column entries: "-inf" is not a finite number
            flows.csv:2: column from_level_fl: "x" is not a number
            flows.csv:2: column to_sector: is blank, and a value is required
            flows.csv:2: column until: "2031-03-04T07:00:00+01:00" is not in UTC
              hint: convert it to UTC; every time ends in Z
            flows.csv:2: column aircraft: is blank, and a value is required
            decisions.csv:2: names both a proposal and a flight
              hint: leave one of them blank: grant and refuse are about proposals, keep about flights
            decisions.csv:3: names neither a proposal nor a flight
            decisions.csv:4: column must: "allow" is not grant, refuse or keep
            decisions.csv:4: column option: "0" is not a whole number from 1
            decisions.csv:5: column must: is blank, and a value is required
        "#]],
    );
    check(
        "=== flows.csv\nfrom_sector,to_sector,from,until,aircraft\n=== decisions.csv\nproposal\n",
        expect![[r#"
            flows.csv: has no column from_level_fl
            flows.csv: has no column to_level_fl
            decisions.csv: has no column must
        "#]],
    );
}

#[test]
fn paths_of_optional_tables_lead_back_to_the_folder() {
    let folder = folder_with(TABLES);
    let (day, _) = read_folder(folder.path()).expect("a sound day");
    let mut out = String::new();
    for path in [
        "restrictions[0].volumes[1].polygon",
        "restrictions[1].volumes[0].floor_ft",
        "restrictions[1].until",
        "restrictions[0].levels_allowed_ft",
        "restrictions[0]",
        "restrictions[2].until",
        "background[1].sector",
        "background[0].level_ft",
        "flows[1].to_sector",
        "flows[0].from_level_ft",
        "flows[0].to_level_ft",
        "decisions[1].must",
        "decisions[0].option",
    ] {
        writeln!(out, "{path} -> {}", day.place_of(path)).expect("text");
    }
    out.push_str(&day.in_file_terms("contradicts decisions[1]"));
    expect![[r#"
        restrictions[0].volumes[1].polygon -> restrictions.geojson: feature 1 (restriction "RANGE")
        restrictions[1].volumes[0].floor_ft -> restrictions.geojson: feature 2 (restriction "RANGE"): property floor_fl
        restrictions[1].until -> restrictions.geojson: feature 2 (restriction "RANGE"): property until
        restrictions[0].levels_allowed_ft -> restrictions.geojson: feature 1 (restriction "RANGE"): property levels_allowed
        restrictions[0] -> restrictions.geojson: feature 1 (restriction "RANGE")
        restrictions[2].until -> restrictions[2].until
        background[1].sector -> background.csv:3: column sector
        background[0].level_ft -> background.csv:2: column level_fl
        flows[1].to_sector -> flows.csv:3: column to_sector
        flows[0].from_level_ft -> flows.csv:2: column from_level_fl
        flows[0].to_level_ft -> flows.csv:2: column to_level_fl
        decisions[1].must -> decisions.csv:3: column must
        decisions[0].option -> decisions.csv:2: column option
        contradicts decisions.csv:3"#]].assert_eq(&out);
}

#[test]
fn optional_tables_may_be_packed_and_named() {
    let folder = folder_with(
        "
=== day.toml
date = 2031-03-04
region = \"Nowhere\"
[files]
restrictions = \"restrictions-of-march.json\"
background = \"counts.csv.zst\"
",
    );
    let file = |name: &str| {
        let part = TABLES.split("=== ").find_map(|part| part.strip_prefix(name));
        part.expect("a file").trim_start().to_owned()
    };
    let packed = zstd::encode_all(file("background.csv").as_bytes(), 1).expect("packed");
    fs::write(folder.path().join("counts.csv.zst"), packed).expect("written");
    let restrictions = file("restrictions.geojson");
    fs::write(folder.path().join("restrictions-of-march.json"), restrictions).expect("written");
    let (day, warnings) = read_folder(folder.path()).expect("a sound day");
    assert_eq!(warnings, ["restrictions-of-march.json: properties that are not used: fill"]);
    assert_eq!((day.restrictions.rows.len(), day.background.rows.len()), (2, 2));
    assert_eq!(day.place_of("background[1].aircraft"), "counts.csv.zst:3: column aircraft");
}

#[test]
fn a_file_that_is_named_must_be_there() {
    check(
        "
=== day.toml
date = 2031-03-04
region = \"Nowhere\"
[files]
restrictions = \"ranges.geojson\"
decisions = \"by-hand.csv\"
",
        expect![[r#"
            ranges.geojson: there is no such file
            by-hand.csv: there is no such file
        "#]],
    );
}
