//! Plans: found, written, audited, asked beside; the demo.

use crate::support::{arg, bytes_in, day_with, program, run, told};
use expect_test::expect;
use std::fs;
use std::process::Stdio;
use std::time::Instant;

#[test]
fn a_plan_is_written_holds_in_the_audit_and_can_be_asked_beside() {
    let day = day_with("");
    let within = tempfile::tempdir().expect("a folder");
    let plan = within.path().join("plan");
    let (folder, out) = (arg(day.path()), arg(&plan));
    let planned = run(&["plan", folder, "--out", out]);
    assert_eq!(planned.code, Some(0), "{}", planned.err);
    expect![[r#"
        Nowhere 2031-03-04: 1 of 2 proposals granted, proven to be the best there is.
        Net benefit 3.771e13 J (proven bound 3.771e13 J); 100.0 km of contrails avoided; 20.0 kg of extra
        fuel.
        Granted as asked 1, amended 0, refused 1, invalid 0.
        New losses of separation: 0; filed losses removed: 0; expected new losses: 0.000.
        A day ahead, times are uncertain by minutes: losses at nominal times speak of the timetable, not of
        the day.
        Refusals by reason (one may have several): separation 1.

        Granted
         proposal  flight  option  level   leaves          returns         km avoided  extra kg  shift s
         P2        CCC3    1       FL 340  03-04 06:10:00  03-04 06:49:38       100.0      20.0    -21.6

        Refused
         proposal  flight  why not                                                            what would make room
         P1        AAA1    a loss of separation with BBB2 at 03-04 06:11:00: 0.60 NM, 999 ft

        Written to PLAN

        A planning aid: it gives no clearances and replaces no controller, no flight-plan acceptance and no
        local procedure. Minima and capacities are yours to set, under local rules and licensed practice.
        Left out: water vapour, NOx and aerosol effects, speed control, lateral changes, climb performance
        near the ceiling.
    "#]].assert_eq(&planned.out.replace(out, "PLAN"));

    let audited = run(&["audit", folder, out]);
    assert_eq!(audited.code, Some(0), "{}{}", audited.out, audited.err);
    assert!(audited.out.starts_with("Nowhere 2031-03-04: the plan holds"), "{}", audited.out);

    let again = within.path().join("again");
    assert_eq!(run(&["plan", folder, "--out", arg(&again)]).code, Some(0));
    assert_eq!(bytes_in(&plan), bytes_in(&again));

    let refused = run(&["plan", folder, "--out", out]);
    assert_eq!(refused.code, Some(2), "{}", refused.err);
    assert!(refused.err.contains("--replace"), "{}", refused.err);
    assert_eq!(run(&["plan", folder, "--out", out, "--replace"]).code, Some(0));

    let window = ["--from", "2031-03-04T06:10:00Z", "--until", "2031-03-04T06:50:00Z"];
    let mut args = vec!["ask", folder, "--plan", out, "--flight", "AAA1", "--level", "340"];
    args.extend(window);
    let asked = run(&args);
    assert_eq!(asked.code, Some(0), "{}", asked.err);
    assert!(asked.out.contains("beside the plan"), "{}", asked.out);
}

#[test]
fn a_plan_that_is_tampered_with_fails_the_audit() {
    let day = day_with("");
    let within = tempfile::tempdir().expect("a folder");
    let plan = within.path().join("plan");
    let (folder, out) = (arg(day.path()), arg(&plan));
    assert_eq!(run(&["plan", folder, "--out", out]).code, Some(0));
    let document = plan.join("plan.json");
    let text = fs::read_to_string(&document).expect("text");
    let refused = "\"verdict\": \"refused\",\n          \"option\": null";
    assert!(text.contains(refused), "{text}");
    let granted = "\"verdict\": \"granted\",\n          \"option\": 1";
    fs::write(&document, text.replace(refused, granted)).expect("written");
    let audited = run(&["audit", folder, out]);
    assert_eq!(audited.code, Some(4), "{}{}", audited.out, audited.err);
    assert!(audited.out.contains("the plan does not hold"), "{}", audited.out);
}

#[test]
fn a_plan_of_another_day_is_refused() {
    let day = day_with("");
    let other = day_with("=== aircraft.csv\naircraft,ceiling_fl\nMJET,430\n");
    let within = tempfile::tempdir().expect("a folder");
    let plan = within.path().join("plan");
    assert_eq!(run(&["plan", arg(day.path()), "--out", arg(&plan)]).code, Some(0));
    let audited = run(&["audit", arg(other.path()), arg(&plan)]);
    assert_eq!(audited.code, Some(2), "{}", audited.err);
    assert!(audited.err.contains("is a plan for another day"), "{}", audited.err);
}

#[test]
fn proposals_of_another_file_take_the_place_of_the_days() {
    let day = day_with("");
    let within = tempfile::tempdir().expect("a folder");
    let plan = within.path().join("plan");
    let proposals = within.path().join("wishes.csv");
    fs::write(&proposals, "proposal,flight,level_fl,from_time,until_time,contrail_km_avoided\nW1,CCC3,340,2031-03-04T06:10:00Z,2031-03-04T06:50:00Z,50\n").expect("written");
    let args =
        ["plan", arg(day.path()), "--out", arg(&plan), "--proposals", arg(&proposals), "--json"];
    let planned = run(&args);
    assert_eq!(planned.code, Some(0), "{}", planned.err);
    let value: serde_json::Value = serde_json::from_str(&planned.out).expect("JSON");
    assert_eq!(value["decisions"].as_array().map(Vec::len), Some(1));
    assert_eq!(value["decisions"][0]["proposal"], "W1");
}

#[test]
fn decisions_by_hand_are_kept_or_named_or_planned_around() {
    let day = day_with("");
    let within = tempfile::tempdir().expect("a folder");
    let plan = within.path().join("plan");
    let (folder, out) = (arg(day.path()), arg(&plan));
    let unmet = run(&["plan", folder, "--out", out, "--grant", "P1=1"]);
    assert_eq!(unmet.code, Some(2), "{}", unmet.err);
    expect![[r#"
        error: grant proposal `P1` with option 1: can't be met: option 1: a loss of separation with flight `BBB2` at 06:11:00 (0.60 NM, 999 ft)
    "#]].assert_eq(&unmet.err);
    assert!(!plan.exists());

    let args = ["--grant", "P1=1", "--refuse", "P2", "--around-decisions", "--json"];
    let around = run(&[["plan", folder, "--out", out].as_slice(), &args].concat());
    assert_eq!(around.code, Some(0), "{}", around.err);
    let value: serde_json::Value = serde_json::from_str(&around.out).expect("JSON");
    assert_eq!(value["granted"], 0);
    assert_eq!(value["around_decisions"], true);
    assert_eq!(value["unmet"][0]["proposal"], "P1");
    let document = fs::read_to_string(plan.join("plan.json")).expect("text");
    assert!(document.contains("\"around_decisions\": true"), "{document}");
    let audited = run(&["audit", folder, out]);
    assert_eq!(audited.code, Some(0), "{}{}", audited.out, audited.err);

    // The audit knows what was decided: without it, the refusal has no reason.
    let decided = "{\n      \"proposal\": \"P2\",\n      \"must\": \"refuse\"\n    }";
    assert!(document.contains(decided), "{document}");
    let other = document.replace(decided, "{\"flight\": \"BBB2\", \"must\": \"keep\"}");
    fs::write(plan.join("plan.json"), other).expect("written");
    assert_eq!(run(&["audit", folder, out]).code, Some(4));
}

#[test]
fn decisions_that_contradict_the_days_are_named() {
    let day = day_with("=== decisions.csv\nproposal,flight,must\nP1,,refuse\n,CCC3,keep\n");
    let within = tempfile::tempdir().expect("a folder");
    let plan = within.path().join("plan");
    let (folder, out) = (arg(day.path()), arg(&plan));
    let both = run(&["plan", folder, "--out", out, "--keep", "AAA1", "--grant", "P1"]);
    assert_eq!(both.code, Some(2), "{}", both.err);
    expect![[r#"
        error: --grant P1: contradicts --keep AAA1
          hint: decide each proposal and flight one way
        error: --grant P1: contradicts the day's own decision to refuse proposal `P1`
          hint: decide each proposal and flight one way
    "#]]
    .assert_eq(&both.err);
    let planned = run(&["plan", folder, "--out", out, "--keep", "AAA1"]);
    assert_eq!(planned.code, Some(0), "{}", planned.err);
    assert!(planned.out.contains("0 of 2 proposals granted"), "{}", planned.out);
}

#[test]
fn the_demo_runs_from_any_folder() {
    let within = tempfile::tempdir().expect("a folder");
    let output = program(&["demo", "--write", "day", "--out", "plan", "--json"])
        .current_dir(within.path())
        .output()
        .expect("the program runs");
    let run = told(output);
    assert_eq!(run.code, Some(0), "{}", run.err);
    let value: serde_json::Value = serde_json::from_str(&run.out).expect("JSON");
    assert!(value["plan"]["granted"].as_u64().is_some_and(|granted| granted > 0));
    assert!(within.path().join("day/flights.csv").is_file());
    assert!(within.path().join("plan/plan.json").is_file());
}

/// Killed at any moment while it replaces a plan, the program leaves a whole plan: the old or the
/// new one.
#[test]
fn killed_while_it_writes_it_leaves_a_whole_plan() {
    let day = day_with("");
    let within = tempfile::tempdir().expect("a folder");
    let plan = within.path().join("plan");
    let (folder, out) = (arg(day.path()), arg(&plan));
    let began = Instant::now();
    assert_eq!(run(&["plan", folder, "--out", out]).code, Some(0));
    let whole = began.elapsed();
    let kept = bytes_in(&plan);
    // From far too early to just finished, densest at the end, where the writing is.
    for round in 0..40 {
        let share = 1.1 * (1.0 - (f64::from(round) / 39.0).powi(2));
        let mut child = program(&["plan", folder, "--out", out, "--replace"])
            .stdout(Stdio::null())
            .stderr(Stdio::null())
            .spawn()
            .expect("the program runs");
        std::thread::sleep(whole.mul_f64(share));
        // It may have ended by itself.
        let _ = child.kill();
        child.wait().expect("an end");
        assert_eq!(bytes_in(&plan), kept, "round {round}");
    }
    assert_eq!(run(&["audit", folder, out]).code, Some(0));
}

#[test]
fn a_model_is_exported_with_names_that_people_read() {
    let day = day_with("");
    let within = tempfile::tempdir().expect("a folder");
    let file = within.path().join("model.mps");
    let exported = run(&["export", arg(day.path()), "--out", arg(&file)]);
    assert_eq!(exported.code, Some(0), "{}", exported.err);
    let text = fs::read_to_string(&file).expect("a file");
    // One loss of separation, with a flight that cannot move, fixes the first proposal.
    expect![[r#"
        * net benefits are counted in units of 1e0
        NAME Nowhere-2031
        OBJSENSE
         MAX
        ROWS
         N net-benefit
         E one-AAA1-0
         E one-CCC3-1
        COLUMNS
         MARK MARKER INTORG
         AAA1=filed net-benefit 0
         AAA1=filed one-AAA1-0 1
         AAA1=P1.1 net-benefit 37708945921353
         AAA1=P1.1 one-AAA1-0 1
         CCC3=filed net-benefit 0
         CCC3=filed one-CCC3-1 1
         CCC3=P2.1 net-benefit 37708945921353
         CCC3=P2.1 one-CCC3-1 1
         MARK MARKER INTEND
        RHS
         RHS one-AAA1-0 1
         RHS one-CCC3-1 1
        BOUNDS
         BV BND AAA1=filed
         FX BND AAA1=P1.1 0
         BV BND CCC3=filed
         BV BND CCC3=P2.1
        ENDATA
    "#]]
    .assert_eq(&text);
    assert_eq!(bytes_in(within.path()).len(), 1, "nothing else is left");
}

#[test]
fn two_plans_are_compared() {
    let day = day_with("");
    let within = tempfile::tempdir().expect("a folder");
    let (one, other) = (within.path().join("one"), within.path().join("other"));
    let folder = arg(day.path());
    for plan in [&one, &other] {
        assert_eq!(run(&["plan", folder, "--out", arg(plan)]).code, Some(0));
    }
    let alike = run(&["compare", folder, arg(&one), arg(&other)]);
    assert_eq!(alike.code, Some(0), "{}", alike.err);
    assert!(alike.out.contains("the two plans decide alike"), "{}", alike.out);
    let document = other.join("plan.json");
    let text = fs::read_to_string(&document).expect("text");
    let granted = "\"verdict\": \"granted\",\n          \"option\": 1";
    assert!(text.contains(granted), "{text}");
    let refused = "\"verdict\": \"refused\",\n          \"option\": null";
    fs::write(&document, text.replace(granted, refused)).expect("written");
    let differ = run(&["compare", folder, arg(&one), arg(&other), "--json"]);
    assert_eq!(differ.code, Some(0), "{}", differ.err);
    let value: serde_json::Value = serde_json::from_str(&differ.out).expect("JSON");
    assert_eq!(value["differences"][0]["proposal"], "P2");
    assert_eq!(value["differences"][0]["second"]["verdict"], "refused");
    assert_eq!(value["second"]["granted_or_amended"], 0);
}

#[test]
fn a_new_day_folder_passes_the_check_and_can_be_planned() {
    let within = tempfile::tempdir().expect("a folder");
    let folder = within.path().join("day");
    let made = run(&["new", arg(&folder)]);
    assert_eq!(made.code, Some(0), "{}", made.err);
    let checked = run(&["check", arg(&folder)]);
    assert_eq!((checked.code, checked.err.as_str()), (Some(0), ""), "{}", checked.out);
    let plan = within.path().join("plan");
    let planned = run(&["plan", arg(&folder), "--out", arg(&plan)]);
    assert!(planned.out.contains("1 of 1 proposal granted"), "{}", planned.out);
    let again = run(&["new", arg(&folder)]);
    assert_eq!(again.code, Some(2), "{}", again.out);
}

#[test]
fn a_refusal_is_explained() {
    // AAA1 and DDD4, a mile and a half apart and both at another level now, want the same one.
    let day = day_with(
        "=== flights.csv
flight,departure,destination,aircraft
AAA1,XAAA,XBBB,MJET
BBB2,XAAA,XBBB,MJET
=== points.csv
flight,time,lon,lat,level_fl
AAA1,2031-03-04T06:00:00Z,8,50,360
AAA1,2031-03-04T07:00:00Z,-4,50,360
BBB2,2031-03-04T06:00:00Z,8,50.02,320
BBB2,2031-03-04T07:00:00Z,-4,50.02,320
=== proposals.csv
proposal,flight,level_fl,from_time,until_time,contrail_km_avoided,extra_fuel_kg
P1,AAA1,340,2031-03-04T06:10:00Z,2031-03-04T06:50:00Z,100,0
P2,BBB2,340,2031-03-04T06:10:00Z,2031-03-04T06:50:00Z,60,0
",
    );
    let within = tempfile::tempdir().expect("a folder");
    let plan = within.path().join("plan");
    let (folder, out) = (arg(day.path()), arg(&plan));
    assert_eq!(run(&["plan", folder, "--out", out]).code, Some(0));
    let why = run(&["why", folder, out, "--proposal", "P2", "--json"]);
    assert_eq!(why.code, Some(0), "{}", why.err);
    let value: serde_json::Value = serde_json::from_str(&why.out).expect("JSON");
    // 40 km less, at 9e8 J a metre, times the ratio of 0.42.
    let lost = value["objective_lost_j"].as_f64().expect("a number");
    assert!((lost / (40_000.0 * 9e8 * 0.42) - 1.0).abs() < 1e-9, "{lost}");
    assert_eq!(value["least_objective_lost_j"], value["objective_lost_j"]);
    assert_eq!(value["drops"], serde_json::json!(["P1"]));
    assert_eq!(value["reasons"][0]["kind"], "separation");
    let text = run(&["why", folder, out, "--proposal", "P2"]);
    assert!(text.out.contains("proven to be the least"), "{}", text.out);
    let unknown = run(&["why", folder, out, "--proposal", "P9"]);
    assert_eq!(unknown.code, Some(2), "{}", unknown.err);
    assert!(unknown.err.contains("--proposal"), "{}", unknown.err);
}

#[test]
fn a_trade_off_ends_in_the_best_plan() {
    let day = day_with("");
    let traced = run(&["trade-off", arg(day.path()), "--points", "2", "--json"]);
    assert_eq!(traced.code, Some(0), "{}", traced.err);
    let value: serde_json::Value = serde_json::from_str(&traced.out).expect("JSON");
    assert_eq!(value["points"][0]["moved_flights"], 1);
    assert_eq!(value["points"][0]["gap"], 0.0);
    let separation = ["--separation", "priced"];
    let within = tempfile::tempdir().expect("a folder");
    let plan = within.path().join("plan");
    let mut args = vec!["plan", arg(day.path()), "--out", arg(&plan)];
    args.extend(separation);
    assert_eq!(run(&args).code, Some(0));
    let text = fs::read_to_string(plan.join("plan.json")).expect("text");
    assert!(text.contains("\"separation\": \"priced\""), "{text}");
}
