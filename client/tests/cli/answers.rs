//! Answers of check, ask, policy and the help, in words and in JSON.

use crate::support::{arg, day_with, program, run, told};
use expect_test::expect;
use std::process::Stdio;

#[test]
fn the_help_says_what_the_program_is_not() {
    let run = run(&["--help"]);
    assert_eq!(run.code, Some(0));
    for said in ["gives no clearances", "replaces no controller", "Left out: water vapour"] {
        assert!(run.out.replace('\n', " ").contains(said), "{}", run.out);
    }
}

#[test]
fn a_check_answers_first_and_names_the_loss() {
    let day = day_with(
        "
=== points.csv
flight,time,lon,lat,level_fl
AAA1,2031-03-04T06:00:00Z,8,50,360
AAA1,2031-03-04T07:00:00Z,-4,50,360
BBB2,2031-03-04T06:00:00Z,8,50.01,360
BBB2,2031-03-04T07:00:00Z,-4,50.01,360
CCC3,2031-03-04T06:00:00Z,8,51,360
CCC3,2031-03-04T07:00:00Z,-4,51,360
=== capacity.csv
sector,from,until,entries_per_hour
NORTH,2031-03-04T00:00:00Z,2031-03-05T00:00:00Z,2
",
    );
    let folder = arg(day.path());
    let checked = run(&["check", folder]);
    assert_eq!(checked.code, Some(0), "{}", checked.err);
    expect![[r#"
        Nowhere 2031-03-04: as filed, 1 overload and 1 loss of separation among 3 flights.
        A day ahead, times are uncertain by minutes: losses at nominal times speak of the timetable, not of
        the day.
        No flight is moved here, so no new losses are expected.

        Overloads
         where  counted          when               count  limit
         NORTH  entries an hour  03-04 05:20–07:00      3      2

        Losses of separation at filed times
         flight  other flight  closest at        NM  ft  sector
         AAA1    BBB2          03-04 06:29:21  0.60   0  NORTH

        A planning aid: it gives no clearances and replaces no controller, no flight-plan acceptance and no
        local procedure. Minima and capacities are yours to set, under local rules and licensed practice.
        Left out: water vapour, NOx and aerosol effects, speed control, lateral changes, climb performance
        near the ceiling.
    "#]].assert_eq(&checked.out);
    for (what, code) in [("loss", 1), ("overload", 1)] {
        assert_eq!(run(&["check", folder, "--fail-on", what]).code, Some(code));
    }
    let json = run(&["check", folder, "--json"]);
    let value: serde_json::Value = serde_json::from_str(&json.out).expect("JSON");
    assert_eq!(value["losses"][0]["first_flight"], "AAA1");
    assert_eq!(value["overloads"][0]["count"], 3.0);
}

#[test]
fn fail_on_lets_a_day_without_it_pass() {
    let day = day_with("");
    for what in ["loss", "overload"] {
        let run = run(&["check", arg(day.path()), "--fail-on", what]);
        assert_eq!(run.code, Some(0), "{}{}", run.out, run.err);
    }
}

#[test]
fn a_question_is_answered_yes_no_or_invalid() {
    let day = day_with("");
    let folder = arg(day.path());
    let window = ["--from", "2031-03-04T06:10:00Z", "--until", "2031-03-04T06:50:00Z"];
    let ask = |flight, level| {
        let mut args = vec!["ask", folder, "--flight", flight, "--level", level];
        args.extend(window);
        let run = run(&args);
        assert_eq!(run.code, Some(0), "{}", run.err);
        run.out
    };
    expect![[r#"
        yes: CCC3 at FL 340, against the filed day, breaks nothing.

        What it would do
          leaves its level at 03-04 06:10:00, starts to return at 03-04 06:49:38
          net benefit: 0
          contrails avoided: 0.0 km; extra fuel: 0.0 kg; arrival shifted by -21.6 s
          new losses of separation: 0; expected new losses: 0.000
        A day ahead, times are uncertain by minutes: losses at nominal times speak of the timetable, not of
        the day.

        A planning aid: it gives no clearances and replaces no controller, no flight-plan acceptance and no
        local procedure. Minima and capacities are yours to set, under local rules and licensed practice.
        Left out: water vapour, NOx and aerosol effects, speed control, lateral changes, climb performance
        near the ceiling.
    "#]].assert_eq(&ask("CCC3", "FL340"));
    expect![[r#"
        no: AAA1 at FL 380, against the filed day, is blocked.

        Blocked by
          a loss of separation with BBB2 at 03-04 06:11:00: 0.60 NM, 999 ft

        What it would do
          leaves its level at 03-04 06:10:00, starts to return at 03-04 06:50:00
          net benefit: 0
          contrails avoided: 0.0 km; extra fuel: 0.0 kg; arrival shifted by 1.0 s
          new losses of separation: 1; expected new losses: 0.073
        A day ahead, times are uncertain by minutes: losses at nominal times speak of the timetable, not of
        the day.

        A planning aid: it gives no clearances and replaces no controller, no flight-plan acceptance and no
        local procedure. Minima and capacities are yours to set, under local rules and licensed practice.
        Left out: water vapour, NOx and aerosol effects, speed control, lateral changes, climb performance
        near the ceiling.
    "#]].assert_eq(&ask("AAA1", "380"));
    expect![[r#"
        invalid: AAA1 at FL 430, against the filed day, breaks a rule of level changes.
        the aircraft's ceiling is FL 410.

        A planning aid: it gives no clearances and replaces no controller, no flight-plan acceptance and no
        local procedure. Minima and capacities are yours to set, under local rules and licensed practice.
        Left out: water vapour, NOx and aerosol effects, speed control, lateral changes, climb performance
        near the ceiling.
    "#]].assert_eq(&ask("AAA1", "430"));
}

#[test]
fn the_policy_of_a_day_shows_what_it_sets() {
    let day =
        day_with("=== day.toml\ndate = 2031-03-04\nregion = \"N\"\n[policy]\nbuffer_s = 30\n");
    let run = run(&["policy", arg(day.path()), "--json"]);
    assert_eq!(run.code, Some(0), "{}", run.err);
    let value: serde_json::Value = serde_json::from_str(&run.out).expect("JSON");
    let keys = value["policy"].as_array().expect("a list");
    let buffer = keys.iter().find(|key| key["key"] == "buffer_s").expect("the key");
    assert_eq!((&buffer["value"], &buffer["default"]), (&30.0.into(), &0.0.into()));
    assert!(keys.iter().all(|key| key["source"] != "" && key["meaning"] != ""));
}

#[test]
fn what_is_piped_is_plain() {
    let day = day_with("");
    for args in [&["check", arg(day.path())][..], &["policy"]] {
        let run = run(args);
        assert!(!run.out.contains('\u{1b}') && !run.err.contains('\u{1b}'));
        assert!(!run.out.contains('─'), "{}", run.out);
    }
}

#[test]
fn a_reader_that_goes_away_is_no_error() {
    let mut child = program(&["policy", "--json"])
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .expect("the program runs");
    drop(child.stdout.take());
    let run = told(child.wait_with_output().expect("ended"));
    assert_eq!((run.code, run.err.as_str()), (Some(0), ""));
}

#[test]
fn completions_are_written() {
    let run = run(&["completions", "bash"]);
    assert_eq!(run.code, Some(0));
    assert!(run.out.contains("rimeshift"));
}
