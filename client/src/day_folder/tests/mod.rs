//! A day folder as one text in, what reading it says out.

mod optional_tables;
mod parquet_files;

use super::{DayFolder, Reading, read};
use crate::tables::findings::Findings;
use expect_test::{Expect, expect};
use rimeshift_proto::v1::load_day_request::Content;
use std::fmt::Write as _;
use std::fs;
use std::io::Write as _;
use std::path::Path;
use tempfile::TempDir;

/// A small sound day. `=== NAME` begins a file.
const SOUND: &str = r#"
=== day.toml
date = "2031-03-04"
region = "Nowhere"
=== sectors.geojson
{"type": "FeatureCollection", "features": [
 {"type": "Feature", "properties": {"sector": "NORTH", "floor_fl": 245, "ceiling_fl": 660},
  "geometry": {"type": "Polygon", "coordinates": [[[0, 50], [1, 50], [1, 51], [0, 50]]]}}]}
=== capacity.csv
sector,from,until,entries_per_hour
NORTH,2031-03-04T00:00:00Z,2031-03-05T00:00:00Z,30
=== flights.csv
flight,departure,destination,aircraft
AAA1,XAAA,XBBB,MJET
BBB2,XBBB,XAAA,MJET
=== points.csv
flight,time,lon,lat,level_fl
AAA1,2031-03-04T06:00:00Z,0,50,350
BBB2,2031-03-04T06:00:00.250Z,1,51,360
AAA1,2031-03-04T06:10:00Z,1,50,350
BBB2,2031-03-04T06:10:00Z,0,51,360
"#;

/// The files of a folder's text: name and content.
fn files_of(text: &str) -> Vec<(&str, &str)> {
    text.split("=== ")
        .filter_map(|part| part.split_once('\n'))
        .filter(|(name, _)| !name.is_empty())
        .collect()
}

/// Writes the sound day with the files of `changes` in place of its own; a file without content is
/// left out.
fn folder_with(changes: &str) -> TempDir {
    let folder = TempDir::new().expect("a temporary folder");
    for (name, content) in files_of(SOUND).into_iter().chain(files_of(changes)) {
        let path = folder.path().join(name);
        if content.is_empty() {
            fs::remove_file(path).expect("a file to leave out");
        } else {
            fs::write(path, content).expect("a file written");
        }
    }
    folder
}

fn read_folder(folder: &Path) -> Result<(DayFolder, Vec<String>), Findings> {
    let keys = ["buffer_s", "level_direction", "separation"].map(str::to_owned);
    read(folder, Reading { policy_keys: &keys, proposals: None })
}

/// What reading a folder says: defects, or the rows and the warnings.
fn outcome(folder: &Path) -> String {
    let mut out = String::new();
    match read_folder(folder) {
        Err(findings) => {
            for warning in findings.warnings {
                writeln!(out, "warning: {warning}").expect("text");
            }
            writeln!(out, "{}", findings.defects).expect("text");
        }
        Ok((day, warnings)) => {
            for warning in warnings {
                writeln!(out, "warning: {warning}").expect("text");
            }
            let points: usize = day.point_lines.lines.iter().map(Vec::len).sum();
            writeln!(
                out,
                "{} sectors, {} capacities, {} flights, {points} points, {} proposals",
                day.sectors.rows.len(),
                day.capacities.rows.len(),
                day.flights.rows.len(),
                day.proposals.rows.len(),
            )
            .expect("text");
        }
    }
    out
}

/// Reads the sound day with some files changed.
fn check(changes: &str, expected: Expect) {
    expected.assert_eq(&outcome(folder_with(changes).path()));
}

/// The same with one file of raw bytes.
fn check_bytes(name: &str, bytes: &[u8], expected: Expect) {
    let folder = folder_with("");
    fs::write(folder.path().join(name), bytes).expect("a file written");
    expected.assert_eq(&outcome(folder.path()));
}

#[test]
fn a_sound_day_is_read() {
    check(
        "",
        expect![[r#"
        1 sectors, 1 capacities, 2 flights, 4 points, 0 proposals
    "#]],
    );
}

#[test]
fn crlf_byte_order_mark_blank_lines_and_quotes_are_read() {
    check_bytes(
        "flights.csv",
        b"\xef\xbb\xbfaircraft,flight,departure,destination\r\n\r\n\"MJET\",AAA1,XAAA,XBBB\r\nMJET,\"BBB2\",XBBB,XAAA",
        expect![[r#"
            1 sectors, 1 capacities, 2 flights, 4 points, 0 proposals
        "#]],
    );
}

#[test]
fn lines_are_counted_over_crlf_blank_lines_and_quoted_line_breaks() {
    check_bytes(
        "flights.csv",
        b"flight,departure,destination,aircraft,mach\r\n\r\nAAA1,XAAA,\"XB\r\nBB\",MJET,x\r\n\r\n\r\nBBB2,XBBB,XAAA,MJET,y",
        expect![[r#"
            flights.csv:3: column mach: "x" is not a number
            flights.csv:7: column mach: "y" is not a number
        "#]],
    );
}

#[test]
fn every_defect_of_every_table_is_named_with_its_place() {
    check(
        r#"
=== day.toml
date = "2031-02-30"
regoin = "Nowhere"
[policy]
bufer_s = 10
separation = true
=== capacity.csv
sector,from,until,entries_per_hour
NORTH,2031-03-04 00:00,2031-03-05T00:00:00+02:00,many
NORTH,2031-03-04T00:00:00Z
=== airports.csv
airport,lon,latitude
XAAA,0,50
=== flights.csv
flight,departure,destination,aircraft,mach,rvsm
AAA1,XAAA,,MJET,NaN,maybe
=== points.csv
flight,time,lon,lat,level_fl
AAA1,2031-03-04T06:00:00Z,zero,50,1e999
CCC3,2031-03-04T06:00:00Z,0,50,350
CCC3,2031-03-04T06:01:00Z,0,50,350
=== fuel.csv
aircraft,level_fl,kg_per_min,kg_per_nm
MJET,350,,
MJET,360,40,5
"#,
        expect![[r#"
            warning: airports.csv: columns that are not used: latitude
            day.toml:1: key date: "2031-02-30" is no date
              hint: date = 2031-03-04
            day.toml:2: key regoin: is no key that is known here
              hint: was region meant?
            day.toml:4: key policy.bufer_s: is no key that is known here
              hint: was buffer_s meant?
            day.toml:5: key policy.separation: true is no finite number
            day.toml: has no region
              hint: region = "…"
            capacity.csv:2: column from: "2031-03-04 00:00" is not an RFC 3339 time
              hint: write times as 2031-03-04T06:15:00Z
            capacity.csv:2: column until: "2031-03-05T00:00:00+02:00" is not in UTC
              hint: convert it to UTC; every time ends in Z
            capacity.csv:2: column entries_per_hour: "many" is not a number
            capacity.csv:3: has 2 cells where the header names 4
            airports.csv: has no column lat
              hint: was "latitude" meant to be lat?
            fuel.csv:2: has neither kg_per_min nor kg_per_nm
            fuel.csv:3: has both kg_per_min and kg_per_nm
              hint: leave one of them blank
            flights.csv:2: column destination: is blank, and a value is required
            flights.csv:2: column mach: "NaN" is not a finite number
            flights.csv:2: column rvsm: "maybe" is not true or false
            points.csv:2: column lon: "zero" is not a number
            points.csv:2: column level_fl: "1e999" is not a finite number
        "#]],
    );
}

#[test]
fn defects_in_sectors_name_feature_and_property() {
    check(
        r#"
=== sectors.geojson
{"type": "FeatureCollection", "features": [
 {"type": "Feature", "properties": {"sector": "A", "floor": 245, "ceiling_fl": "660"},
  "geometry": {"type": "Polygon", "coordinates": [[[0, 50], [1, 50], [1, 51], [0, 50]]]}},
 {"type": "Feature", "properties": {"sector": 7, "floor_fl": 245, "ceiling_fl": 660},
  "geometry": {"type": "Point", "coordinates": [0, 50]}},
 {"type": "Feature", "properties": {"sector": "B", "floor_fl": 245, "ceiling_fl": 660},
  "geometry": {"type": "Polygon", "coordinates": [[[0], [1, 50]]]}},
 {"type": "Feature", "properties": null, "geometry": null},
 {"type": "Nothing"},
 {"type": "Feature", "properties": {"sector": "C", "floor_fl": 245, "ceiling_fl": 350, "no_changes": true, "horizontal_nm": 3},
  "geometry": {"type": "Polygon", "coordinates": [[[0, 50], [1, 50], [1, 51], [0, 50]]]}},
 {"type": "Feature", "properties": {"sector": "C", "floor_fl": 350, "ceiling_fl": 660, "horizontal_nm": 5},
  "geometry": {"type": "Polygon", "coordinates": [[[0, 50], [1, 50], [1, 51], [0, 50]]]}}
]}
"#,
        expect![[r#"
            warning: sectors.geojson: properties that are not used: floor
            sectors.geojson: feature 1 (sector "A"): property floor_fl: is missing
              hint: was "floor" meant to be floor_fl?
            sectors.geojson: feature 1 (sector "A"): property ceiling_fl: "660" is not a number
            sectors.geojson: feature 2: property sector: 7 is not text
            sectors.geojson: feature 2: has a geometry of type Point
              hint: a sector is a Polygon or a MultiPolygon
            sectors.geojson: feature 3 (sector "B"): has a position without two coordinates
            sectors.geojson: feature 4: property sector: is missing
            sectors.geojson: feature 4: property floor_fl: is missing
            sectors.geojson: feature 4: property ceiling_fl: is missing
            sectors.geojson: feature 4: has no geometry
            sectors.geojson: feature 5: is no GeoJSON feature: unknown variant `Nothing`, expected `Feature`
            sectors.geojson: feature 7 (sector "C"): property horizontal_nm: differs from 3.0 in an earlier feature of the sector
              hint: it stands for the whole sector: give the same in all its features
            sectors.geojson: feature 7 (sector "C"): property no_changes: differs from true in an earlier feature of the sector
              hint: it stands for the whole sector: give the same in all its features
        "#]],
    );
    check(
        "=== sectors.geojson\n{\"type\": \"Feature\"}\n",
        expect![[r#"
        sectors.geojson: is a "Feature"
          hint: sectors are a FeatureCollection of RFC 7946
    "#]],
    );
    check(
        "=== sectors.geojson\n[1, 2\n",
        expect![[r#"
        sectors.geojson: is not JSON: EOF while parsing a list at line 2 column 0
          hint: sectors are a FeatureCollection of RFC 7946
    "#]],
    );
}

#[test]
fn features_and_polygons_of_one_sector_are_its_volumes() {
    let folder = folder_with(
        r#"
=== sectors.geojson
{"type": "FeatureCollection", "features": [
 {"type": "Feature", "properties": {"sector": "A", "floor_fl": 245, "ceiling_fl": 350, "fill": "red"},
  "geometry": {"type": "MultiPolygon", "coordinates": [[[[0, 50], [1, 50], [1, 51], [0, 50]]], [[[2, 50], [3, 50], [3, 51], [2, 50]]]]}},
 {"type": "Feature", "properties": {"sector": "A", "floor_fl": 350, "ceiling_fl": 660},
  "geometry": {"type": "Polygon", "coordinates": [[[0, 50], [1, 50, 99], [1, 51], [0, 50]]]}}]}
"#,
    );
    let (day, warnings) = read_folder(folder.path()).expect("a sound day");
    assert_eq!(warnings, ["sectors.geojson: properties that are not used: fill"]);
    assert_eq!(day.sectors.rows.len(), 1);
    assert_eq!(day.sectors.rows[0].volumes.len(), 3);
    assert_eq!(day.sectors.rows[0].volumes[2].floor_ft, 35_000.0);
    assert_eq!(
        day.place_of("sectors[0].volumes[2].polygon"),
        "sectors.geojson: feature 2 (sector \"A\")"
    );
    assert_eq!(
        day.place_of("sectors[0].volumes[1].floor_ft"),
        "sectors.geojson: feature 1 (sector \"A\"): property floor_fl"
    );
}

#[test]
fn rows_of_a_proposal_are_gathered_into_options() {
    let folder = folder_with(
        "
=== proposals.csv
proposal,flight,level_fl,from_time,until_time,option,contrail_km_avoided,extra_fuel_kg,max_extra_fuel_kg,priority
P1,AAA1,370,2031-03-04T06:01:00Z,2031-03-04T06:02:00Z,,10,,,2
P2,BBB2,340,,,1,,,,
P1,AAA1,330,2031-03-04T06:03:00Z,,1,5.5,20,90,
P1,AAA1,390,,,2,,,,
",
    );
    let (day, _) = read_folder(folder.path()).expect("a sound day");
    let proposals = &day.proposals.rows;
    assert_eq!(proposals.len(), 2);
    assert_eq!(proposals[0].options.len(), 2);
    assert_eq!(proposals[0].options[0].stretches.len(), 2);
    assert_eq!(proposals[0].options[0].stretches[1].level_ft, 33_000.0);
    let figures = proposals[0].options[0].figures.expect("figures");
    assert_eq!(figures.contrail_km_avoided, Some(15.5));
    assert_eq!(figures.extra_fuel_kg, Some(20.0));
    assert_eq!(figures.ef_avoided_j, None);
    assert_eq!(figures.max_extra_fuel_kg, Some(90.0));
    assert_eq!(figures.priority, Some(2.0));
    assert_eq!(
        day.place_of("proposals[0].options[0].stretches[1].from"),
        "proposals.csv:4: column from_time"
    );
    assert_eq!(day.place_of("proposals[1].flight"), "proposals.csv:3: column flight");
    assert_eq!(
        day.place_of("proposals[0].options[1].level_ft"),
        "proposals.csv:5: column level_fl"
    );
}

#[test]
fn proposals_that_contradict_themselves_are_defects() {
    check(
        "
=== proposals.csv
proposal,flight,level_fl,option,priority,max_extra_fuel_kg
P1,AAA1,370,1,2,
P1,BBB2,330,1,3,
P1,AAA1,330,0,,
",
        expect![[r#"
            proposals.csv:3: column flight: proposal "P1" names "BBB2" here and "AAA1" before
              hint: a proposal is about one flight; give the other its own
            proposals.csv:3: column priority: is 3 here and 2 in another row of the same option
              hint: it stands for the whole option: give it once, or the same in every row
            proposals.csv:4: column option: "0" is not a whole number from 1
        "#]],
    );
    check(
        "
=== proposals.csv
proposal,flight,level_fl,option
P1,AAA1,370,2
P1,AAA1,330,3
",
        expect![[r#"
            proposals.csv:2: proposal "P1" has no option 1
              hint: option 1 is the change as asked; number the alternatives from 2
        "#]],
    );
}

#[test]
fn paths_of_the_service_lead_back_to_lines() {
    let folder = folder_with("");
    let (day, _) = read_folder(folder.path()).expect("a sound day");
    let mut out = String::new();
    for path in [
        "flights[1].points[1].level_ft",
        "flights[1].points[0].time",
        "flights[0].points",
        "flights[1].departure",
        "flights[0]",
        "rows.capacities[0].sector",
        "sectors[0].horizontal_nm",
        "date",
        "flights[9].points[0]",
        "anything else",
    ] {
        writeln!(out, "{path} -> {}", day.place_of(path)).expect("text");
    }
    out.push_str(&day.in_file_terms("it overlaps flights[1].points[1], see capacities[0]."));
    expect![[r#"
        flights[1].points[1].level_ft -> points.csv:5: column level_fl
        flights[1].points[0].time -> points.csv:3: column time
        flights[0].points -> flights.csv:2
        flights[1].departure -> flights.csv:3: column departure
        flights[0] -> flights.csv:2
        rows.capacities[0].sector -> capacity.csv:2: column sector
        sectors[0].horizontal_nm -> sectors.geojson: feature 1 (sector "NORTH"): property horizontal_nm
        date -> day.toml: key date
        flights[9].points[0] -> flights[9].points[0]
        anything else -> anything else
        it overlaps points.csv:5, see capacity.csv:2."#]]
    .assert_eq(&out);
}

#[test]
fn files_may_be_named_and_packed() {
    let folder = folder_with(
        "
=== day.toml
date = 2031-03-04
region = \"Nowhere\"
[files]
flights = \"plans.of.today.csv.gz\"
[policy]
buffer_s = 1_0
level_direction = [{track_from = 0, track_until = 360, levels = [310, 0x14a]}]
=== flights.csv
",
    );
    let table = "flight,departure,destination,aircraft\nAAA1,XAAA,XBBB,MJET\nBBB2,XBBB,XAAA,MJET\n";
    let packed = fs::File::create(folder.path().join("plans.of.today.csv.gz")).expect("a file");
    let mut gzip = flate2::write::GzEncoder::new(packed, flate2::Compression::fast());
    gzip.write_all(table.as_bytes()).and_then(|()| gzip.try_finish()).expect("packed");
    let points = fs::read(folder.path().join("points.csv")).expect("points");
    fs::remove_file(folder.path().join("points.csv")).expect("removed");
    let packed = zstd::encode_all(points.as_slice(), 1).expect("packed");
    fs::write(folder.path().join("points.csv.zst"), &packed).expect("written");
    expect![[r#"
        1 sectors, 1 capacities, 2 flights, 4 points, 0 proposals
    "#]]
    .assert_eq(&outcome(folder.path()));

    let name = folder.path().join("plans.of.today.csv.gz");
    let whole = fs::read(&name).expect("packed");
    fs::write(&name, &whole[..whole.len() / 2]).expect("cut short");
    fs::write(folder.path().join("points.csv.zst"), &packed[..packed.len() - 9]).expect("cut");
    expect![[r#"
        plans.of.today.csv.gz: ends too early: the packed data is cut short
        points.csv.zst: ends too early: the packed data is cut short
    "#]]
    .assert_eq(&outcome(folder.path()));
}

#[test]
fn a_table_in_two_formats_is_a_defect() {
    check(
        "=== flights.parquet\nx\n=== points.csv.gz\nx\n",
        expect![[r#"
        flights.csv: the folder holds flights.parquet too
          hint: keep one of them, or name one under [files] in day.toml: flights = "…"
        points.csv: the folder holds points.csv.gz too
          hint: keep one of them, or name one under [files] in day.toml: points = "…"
    "#]],
    );
}

#[test]
fn missing_and_empty_files_are_named() {
    check(
        "=== flights.csv\n=== day.toml\n=== capacity.csv\nsector,from,until\n",
        expect![[r#"
            day.toml: there is no such file
            flights.csv: there is no such file, and a day needs one
              hint: it may be flights.csv, .csv.gz, .csv.zst or .parquet
        "#]],
    );
    check_bytes(
        "points.csv",
        b"",
        expect![[r#"
        points.csv: is empty
          hint: its first line names the columns: flight,time,lon,lat,level_fl,fix
    "#]],
    );
    check_bytes(
        "day.toml",
        b"",
        expect![[r#"
        day.toml: is empty
    "#]],
    );
    check_bytes(
        "sectors.geojson",
        b"",
        expect![[r#"
        sectors.geojson: is empty
    "#]],
    );
}

#[test]
fn what_is_no_text_is_named() {
    check_bytes(
        "flights.csv",
        b"flight,departure,destination,aircraft\nA\xff1,X,Y,Z\n",
        expect![[r#"
            flights.csv:2: column flight: holds bytes that are not UTF-8 text
        "#]],
    );
    check_bytes(
        "flights.csv",
        b"\xff\xfef\0l\0i\0g\0h\0t\0",
        expect![[r#"
            flights.csv:1: the header "��f\0l\0i\0g\0h\0t\0" is not UTF-8 text
              hint: save the file as UTF-8
        "#]],
    );
    check_bytes(
        "day.toml",
        b"date = \"\xff\"\n",
        expect![[r#"
        day.toml: line 1 holds bytes that are not UTF-8 text
          hint: save the file as UTF-8
    "#]],
    );
}

#[test]
fn an_endless_line_does_not_fill_the_memory() {
    let mut long = b"flight,departure,destination,aircraft\nAAA1,XAAA,".to_vec();
    long.resize(long.len() + 10_000_000, b'x');
    check_bytes(
        "flights.csv",
        &long,
        expect![[r#"
            flights.csv:2: the record that begins here is longer than 1048576 bytes
              hint: is a closing quote missing, or is this no CSV?
        "#]],
    );
    let mut open = b"flight,departure,destination,aircraft\nAAA1,\"".to_vec();
    for _ in 0..1_000_000 {
        open.extend_from_slice(b"XAAA,X\nBBB");
    }
    check_bytes(
        "flights.csv",
        &open,
        expect![[r#"
            flights.csv:2: the record that begins here is longer than 1048576 bytes
              hint: is a closing quote missing, or is this no CSV?
        "#]],
    );
}

#[test]
fn columns_are_matched_by_name() {
    check(
        "
=== flights.csv
flight,departure,destination,aircraft,colour,Flight
AAA1,XAAA,XBBB,MJET,red,x
BBB2,XBBB,XAAA,MJET,red,x
=== points.csv
flight,time,lon,lat,flight_level,lat
",
        expect![[r#"
            warning: flights.csv: columns that are not used: colour, Flight
            warning: points.csv: columns that are not used: flight_level
            points.csv: has the column lat twice
            points.csv: has no column level_fl
        "#]],
    );
}

#[test]
fn tables_that_are_not_used_are_warned_of() {
    check(
        "=== weather.grib2\nx\n=== restrictions.csv\nx\n=== pionts.csv\nx\n",
        expect![[r#"
        warning: pionts.csv: is not read; was points meant?
        warning: restrictions.csv: is not read; was restrictions.geojson meant?
        warning: weather.grib2: this version does not use it yet
        1 sectors, 1 capacities, 2 flights, 4 points, 0 proposals
    "#]],
    );
}

#[test]
fn a_folder_that_is_none_is_named() {
    let folder = folder_with("");
    let file = folder.path().join("day.toml");
    let nothing = folder.path().join("nothing");
    for path in [file, nothing] {
        let said = outcome(&path);
        assert!(said.starts_with(&path.display().to_string()), "{said}");
    }
    fs::remove_file(folder.path().join("points.csv")).expect("removed");
    fs::create_dir(folder.path().join("points.csv")).expect("a folder");
    expect![[r#"
        points.csv: is a folder, not a file
    "#]]
    .assert_eq(&outcome(folder.path()));
}

#[test]
fn a_day_is_sent_in_messages_under_four_mebibytes() {
    let mut points = String::from("flight,time,lon,lat,level_fl,fix\n");
    for point in 0..100_000_u32 {
        let (hour, minute, second) = (point / 3600, point / 60 % 60, point % 60);
        let fix = if point % 7 == 0 { "ESKRA" } else { "" };
        writeln!(
            points,
            "AAA1,2031-03-0{}T{:02}:{minute:02}:{second:02}Z,{},50,350,{fix}",
            4 + hour / 24,
            hour % 24,
            f64::from(point) * 1e-4,
        )
        .expect("text");
    }
    let folder = folder_with(&format!("=== points.csv\n{points}"));
    let (day, _) = read_folder(folder.path()).expect("a sound day");
    let (mut seconds, mut fixes) = (Vec::new(), Vec::new());
    let mut messages = 0;
    for request in day.requests("day") {
        messages += 1;
        assert!(prost::Message::encoded_len(&request) < 2 << 20);
        let Some(Content::Rows(rows)) = request.content else { continue };
        let of_flights = rows.flights.into_iter().filter(|flight| flight.flight == "AAA1");
        let points = of_flights.filter_map(|flight| flight.points);
        for points in points.chain(rows.flight_points.into_iter().filter_map(|more| more.points)) {
            seconds.extend(points.seconds_after_epoch);
            fixes.extend(points.fix);
        }
    }
    assert!(messages > 3);
    assert_eq!(seconds, (0..100_000).map(f64::from).collect::<Vec<_>>());
    assert_eq!(fixes.len(), seconds.len());
    assert_eq!((fixes[7].as_str(), fixes[8].as_str()), ("ESKRA", ""));
}
