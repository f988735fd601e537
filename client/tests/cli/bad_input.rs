//! Whatever is wrong with what is given: named with its place, exit code 2, and nothing on standard
//! output.

use crate::support::{arg, day_with, run};
use expect_test::{Expect, expect};

/// Checks the day with some files changed; what is said, and that it is an error.
fn check(changes: &str, expected: Expect) {
    let day = day_with(changes);
    let run = run(&["check", arg(day.path())]);
    assert_eq!((run.code, run.out.as_str()), (Some(2), ""), "{}", run.err);
    expected.assert_eq(&run.err);
}

#[test]
fn what_the_reader_finds() {
    check(
        "=== flights.csv\nflight,departure,destination,aircraft,mach\nAAA1,XAAA,XBBB,MJET,fast\n",
        expect![[r#"
            error: flights.csv:2: column mach: "fast" is not a number
        "#]],
    );
    check(
        "=== day.toml\ndate = \"2031-03-04\"\nregion = \"N\"\n[policy]\nbufer_s = 3\n",
        expect![[r#"
            error: day.toml:4: key policy.bufer_s: is no key that is known here
              hint: was buffer_s meant?
        "#]],
    );
}

#[test]
fn what_the_service_finds_is_led_back_to_file_and_line() {
    check(
        "
=== capacity.csv
sector,from,until,entries_per_hour
NORTH,2031-03-04T00:00:00Z,2031-03-04T12:00:00Z,30
SOUTH,2031-03-04T00:00:00Z,2031-03-04T12:00:00Z,30
NORTH,2031-03-04T11:00:00Z,2031-03-04T13:00:00Z,-1
=== flights.csv
flight,departure,destination,aircraft
AAA1,XAAA,XBBB,MJET
AAA1,XAAA,XBBB,MJET
BBB2,XAAA,XBBB,MJET
CCC3,XAAA,XBBB,MJET
=== points.csv
flight,time,lon,lat,level_fl
BBB2,2031-03-04T06:00:00Z,8,50,380
CCC3,2031-03-04T06:00:00Z,8,51,3600
BBB2,2031-03-04T05:00:00Z,-4,50,380
CCC3,2031-03-04T07:00:00Z,-4,91,360
AAA1,2031-03-04T06:00:00Z,8,50,360
=== proposals.csv
proposal,flight,level_fl
P1,ZZZ9,380
P2,CCC3,3400
",
        expect![[r#"
            error: capacity.csv:3: column sector: `SOUTH` is no sector of this day
              hint: name one of the day's sectors
            error: capacity.csv:4: column entries_per_hour: `-1` is out of range
              hint: a number from 0 to 1000000000, or blank
            error: capacity.csv:4: column from: this period of `NORTH` overlaps that of capacity.csv:2
              hint: periods of one place must not overlap
            error: flights.csv:3: column flight: `AAA1` is there twice
              hint: names must be unique; the first is flights.csv:2
            error: flights.csv:2: has 1 points
              hint: a flight has at least two points
            error: flights.csv:3: has 0 points
              hint: a flight has at least two points
            error: points.csv:4: column time: does not lie after the time of the point before
              hint: points of a flight must be in time order, strictly
            error: points.csv:3: column level_fl: FL 3600 is not plausible
              hint: FL -20 to 660
            error: points.csv:5: column lat: `91` is no latitude
              hint: degrees from -90 to 90
            error: proposals.csv:2: column flight: `ZZZ9` is no usable flight of this day
              hint: name a flight of the flights table
            error: proposals.csv:3: column level_fl: `340000` ft is no plausible level
              hint: FL -20 to 660
            error: proposals.csv:3: column flight: `CCC3` is no usable flight of this day
              hint: name a flight of the flights table
        "#]],
    );
}

#[test]
fn a_policy_value_that_the_service_refuses() {
    check(
        "=== day.toml\ndate = \"2031-03-04\"\nregion = \"N\"\n\n[policy]\nentry_step_min = -20\nseparation = \"none\"\n",
        expect![[r#"
            error: day.toml:5: key policy.entry_step_min: `-20` is out of range
              hint: a number from 1 to 60
            error: day.toml:6: key policy.separation: `none` is not known here
              hint: one of "nominal", "buffered", "risk", "priced"
        "#]],
    );
}

#[test]
fn sectors_that_are_no_volumes() {
    check(
        r#"
=== sectors.geojson
{"type": "FeatureCollection", "features": [
 {"type": "Feature", "properties": {"sector": "NORTH", "floor_fl": 660, "ceiling_fl": 245},
  "geometry": {"type": "Polygon", "coordinates": [[[-10, 49], [10, 49], [10, 52]]]}}]}
"#,
        expect![[r#"
            error: sectors.geojson: feature 1 (sector "NORTH"): property floor_fl: floor FL 660 is not below ceiling FL 245
              hint: the floor must lie below the ceiling
            error: sectors.geojson: feature 1 (sector "NORTH"): ring 0 has 3 positions, fewer than 4
              hint: closed rings of at least 4 positions whose edges do not cross (RFC 7946)
        "#]],
    );
}

#[test]
fn folders_that_are_none() {
    let day = day_with("");
    let nothing = day.path().join("nothing");
    let file = day.path().join("day.toml");
    for (path, said) in [(nothing, "there is no such folder"), (file, "is a file")] {
        let run = run(&["check", arg(&path)]);
        assert_eq!(run.code, Some(2));
        assert!(run.err.contains(said) && run.err.contains(arg(&path)), "{}", run.err);
    }
}

#[test]
fn more_than_a_hundred_defects_are_counted() {
    let rows: String = (0..250).map(|row| format!("NORTH,{row},x,y\n")).collect();
    let day = day_with(&format!("=== capacity.csv\nsector,from,until,entries_per_hour\n{rows}"));
    let run = run(&["check", arg(day.path())]);
    assert_eq!(run.code, Some(2));
    assert_eq!(run.err.lines().filter(|line| line.starts_with("error: ")).count(), 100);
    assert!(run.err.trim_end().ends_with("… and 650 more"), "{}", run.err);
}

#[test]
fn arguments_that_make_no_sense() {
    let day = day_with("");
    let folder = arg(day.path());
    for args in [
        &["check"][..],
        &["chekc", folder],
        &["ask", folder, "--flight", "AAA1", "--level", "high"],
        &["ask", folder, "--flight", "AAA1", "--level", "380", "--from", "06:00"],
        &["plan", folder, "--out", "x", "--gap", "2"],
        &["plan", folder, "--out", "x", "--plans", "0"],
        &["plan", folder, "--out", "x", "--seconds", "-1"],
        &["check", folder, "--server", "nowhere"],
        &["check", folder, "--fail-on", "rain"],
    ] {
        let run = run(args);
        assert_eq!((run.code, run.out.as_str()), (Some(2), ""), "{args:?}: {}", run.err);
        assert!(run.err.starts_with("error: "), "{args:?}: {}", run.err);
    }
}

#[test]
fn a_flight_that_the_day_does_not_have() {
    let day = day_with("");
    let run = run(&["ask", arg(day.path()), "--flight", "ZZZ9", "--level", "380"]);
    assert_eq!(run.code, Some(2), "{}", run.err);
    assert!(run.err.contains("ZZZ9"), "{}", run.err);
}
