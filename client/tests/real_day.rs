//! The main job on real days, from folder to folder: departures and airports are real, routes,
//! levels, sectors and requests modelled (sources and licence: `tests/data/real-days`).
//!
//! A day of one country (17 000 flights) and one of three airports (about 960). What is asked of
//! the plan: it passes the audit, refuses some and not most, and each kind of reason that such a
//! day can produce occurs often enough to be believed.

#![expect(clippy::expect_used, reason = "a test fails by panicking")]

use std::collections::BTreeMap;
use std::path::Path;
use std::process::Command;

use rimeshift_tests::real_day::{Options, Source, write_day};
use serde_json::Value;

fn rimeshift(arguments: &[&str]) -> String {
    let output = Command::new(env!("CARGO_BIN_EXE_rimeshift"))
        .args(arguments)
        .output()
        .expect("the program runs");
    let errors = String::from_utf8_lossy(&output.stderr);
    assert!(output.status.success(), "{arguments:?}: {} {errors}", output.status);
    String::from_utf8(output.stdout).expect("UTF-8")
}

/// Plans a day and audits the plan as a user would; gives plan.json.
fn planned(source: Source, options: &Options) -> Value {
    let folder = tempfile::tempdir().expect("a folder");
    let (day, plan) = (folder.path().join("day"), folder.path().join("plan"));
    write_day(source, options, &day).expect("a day");
    let text = |path: &Path| path.to_str().expect("a plain path").to_owned();
    let (day, plan) = (text(&day), text(&plan));
    rimeshift(&["plan", &day, "--out", &plan]);
    let verdict = rimeshift(&["audit", &day, &plan]);
    assert!(verdict.contains("the plan holds"), "{verdict}");
    let json = std::fs::read_to_string(Path::new(&plan).join("plan.json")).expect("plan.json");
    serde_json::from_str(&json).expect("JSON")
}

fn decisions(plan: &Value) -> &Vec<Value> {
    plan["plans"][0]["decisions"].as_array().expect("decisions")
}

/// How many proposals have each kind of reason.
fn reasons(plan: &Value) -> BTreeMap<String, usize> {
    let mut counts = BTreeMap::new();
    for decision in decisions(plan) {
        let kinds = decision["reasons"].as_array().into_iter().flatten();
        let mut kinds: Vec<&str> = kinds.filter_map(|r| r["kind"].as_str()).collect();
        kinds.sort_unstable();
        kinds.dedup();
        for kind in kinds {
            *counts.entry(kind.to_owned()).or_default() += 1;
        }
    }
    counts
}

fn share_refused(plan: &Value) -> f64 {
    let all = decisions(plan);
    let refused = all.iter().filter(|d| d["verdict"] == "refused").count();
    refused as f64 / all.len() as f64
}

#[test]
fn a_day_of_a_whole_country() {
    let plan = planned(Source::Us2001, &Options::of(Source::Us2001));
    assert_eq!(decisions(&plan).len(), 1000);
    let share = share_refused(&plan);
    assert!((0.05..=0.30).contains(&share), "{share} refused");
    let reasons = reasons(&plan);
    for kind in ["sector-entries", "sector-occupancy", "separation"] {
        assert!(reasons.get(kind).is_some_and(|&n| n >= 20), "{kind}: {reasons:?}");
    }
    let (objective, bound) = (plan["objective"].as_f64(), plan["bound"].as_f64());
    assert!(bound >= objective, "{bound:?} {objective:?}");
}

#[test]
fn a_day_of_three_airports() {
    let options = Options { proposals: 100, ..Options::of(Source::Nyc2013) };
    let plan = planned(Source::Nyc2013, &options);
    assert!(!decisions(&plan).is_empty());
    assert!(share_refused(&plan) < 1.0);
}
