//! A plan written, read back, replaced, and refused.

use super::{Existing, FoundPlan, FoundPlans, check_place, read, write};
use crate::exit::Failure;
use crate::tables::time::parse_utc;
use expect_test::expect;
use rimeshift_proto::v1::constraint::Kind;
use rimeshift_proto::v1::hand_decision::About;
use rimeshift_proto::v1::policy_value;
use rimeshift_proto::v1::*;
use std::fs;
use std::path::Path;

fn at(clock: &str) -> Option<prost_types::Timestamp> {
    let text = format!("2031-03-04T{clock}Z");
    Some(crate::tables::rows::wire_time(parse_utc(text.as_bytes()).expect("a time")))
}

fn sector(name: &str) -> Option<Place> {
    Some(Place { place: Some(place::Place::Sector(name.to_owned())) })
}

fn reason(option: u32, kind: Kind) -> Reason {
    Reason { option, constraint: Some(Constraint { kind: Some(kind) }) }
}

fn setting(key: &str, kind: Option<policy_value::Kind>) -> PolicySetting {
    let value = kind.map(|kind| PolicyValue { kind: Some(kind) });
    PolicySetting { key: key.to_owned(), value }
}

fn stretch(level_ft: f64) -> PlannedStretch {
    PlannedStretch {
        stretch: Some(Stretch { level_ft, from: at("06:10:00"), until: None }),
        planned_from: at("06:10:00"),
        planned_until: at("07:00:12.345"),
        near_fix: "ESKRA".to_owned(),
    }
}

/// Plans with one reason of every kind.
pub(crate) fn plans() -> FoundPlans {
    let granted = Decision {
        proposal: "P1".to_owned(),
        flight: "AAA1".to_owned(),
        verdict: Verdict::Amended.into(),
        option: Some(2),
        stretches: vec![stretch(37_250.0)],
        net_benefit: 1.0 / 3.0 * 1e13,
        contrail_km_avoided: 12.5,
        extra_fuel_kg: -3.25,
        arrival_shift_s: 17.0,
        reasons: vec![reason(1, Kind::BetterOption(BetterOptionConstraint { taken: 2 }))],
        exchange: None,
    };
    let load = LoadConstraint {
        place: sector("NORTH"),
        measure: LoadMeasure::Occupancy.into(),
        from: at("06:20:00"),
        until: at("06:31:00"),
        count: 13.0,
        limit: 12.5,
    };
    let broken = BrokenRule {
        rule: ChangeRule::AboveCeiling.into(),
        level_ft: Some(41_000.0),
        ..BrokenRule::default()
    };
    let refused = Decision {
        proposal: "P2".to_owned(),
        flight: "BBB2".to_owned(),
        verdict: Verdict::Refused.into(),
        option: None,
        stretches: vec![PlannedStretch {
            planned_from: None,
            planned_until: None,
            near_fix: String::new(),
            ..stretch(33_000.0)
        }],
        reasons: vec![
            reason(1, Kind::Load(load)),
            reason(
                1,
                Kind::Separation(SeparationConstraint {
                    other_flight: "CCC3".to_owned(),
                    time: at("06:25:01.500"),
                    horizontal_nm: 3.2,
                    vertical_ft: 0.0,
                }),
            ),
            reason(
                2,
                Kind::SeparationRisk(SeparationRiskConstraint {
                    other_flight: "DDD4".to_owned(),
                    probability: 0.11,
                    limit: 0.05,
                }),
            ),
            reason(2, Kind::OwnChange(OwnChangeConstraint {})),
            reason(
                3,
                Kind::FuelLimit(FuelLimitConstraint { extra_fuel_kg: 120.5, limit_kg: 90.0 }),
            ),
            reason(
                3,
                Kind::PlanLimit(PlanLimitConstraint {
                    key: "max_arrival_shift_s".to_owned(),
                    count: 61.0,
                    limit: 45.0,
                }),
            ),
            reason(4, Kind::NotWorthIt(NotWorthItConstraint {})),
            reason(5, Kind::Invalid(broken)),
        ],
        exchange: Some(Exchange {
            drops: vec!["P1".to_owned()],
            objective_lost: 3e12,
            proven: true,
        }),
        ..Decision::default()
    };
    let points = Points {
        epoch: at("00:00:00"),
        seconds_after_epoch: vec![21_600.0, 22_200.125, 25_200.345],
        lon_deg: vec![0.1, -0.25, 1.0],
        lat_deg: vec![50.0, 50.5, 51.000_000_1],
        level_ft: vec![35_000.0, 37_250.0, 35_000.0],
        fix: vec!["ESKRA".to_owned(), String::new(), "KE,SKO".to_owned()],
    };
    let loss = Loss {
        first_flight: "AAA1".to_owned(),
        second_flight: "CCC3".to_owned(),
        from: at("08:00:00"),
        until: at("08:00:30"),
        closest_time: at("08:00:12"),
        horizontal_nm: 4.25,
        vertical_ft: 0.0,
        sector: "NORTH".to_owned(),
    };
    let rows = PlanRows {
        decisions: vec![granted, refused],
        moved_points: vec![FlightPoints { flight: "AAA1".to_owned(), points: Some(points) }],
        loads: vec![
            LoadCount {
                place: sector("NORTH"),
                measure: LoadMeasure::Entries.into(),
                window_start: at("06:00:00"),
                filed: 10.0,
                planned: 11.5,
                limit: Some(11.0),
            },
            LoadCount {
                place: Some(Place { place: Some(place::Place::Airport("XAAA".to_owned())) }),
                measure: LoadMeasure::Departures.into(),
                window_start: at("06:00:00"),
                filed: 4.0,
                planned: 4.0,
                limit: None,
            },
        ],
        losses: vec![PlanLoss {
            loss: Some(loss),
            version: LossVersion::Filed.into(),
            is_new: false,
        }],
    };
    let origin = PlanOrigin {
        day_sha256: "ab".repeat(32),
        program_version: "0.1.0".to_owned(),
        policy: vec![
            setting("separation", Some(policy_value::Kind::Text("nominal".to_owned()))),
            setting("horizontal_nm", Some(policy_value::Kind::Number(5.0))),
            setting(
                "level_direction",
                Some(policy_value::Kind::Levels(DirectionLevelsList {
                    directions: vec![DirectionLevels {
                        track_from_deg: 0.0,
                        track_until_deg: 180.0,
                        levels_ft: vec![31_000.0, 33_000.0],
                    }],
                })),
            ),
            setting("max_moved_flights", None),
        ],
        seed: 7,
        stopped: Stopped::Gap.into(),
        bound: Some(3.5e12),
        gap: Some(0.047_619),
        decisions: vec![
            by_hand(About::Proposal("P1".to_owned()), Must::Grant, Some(2)),
            by_hand(About::Flight("BBB2".to_owned()), Must::Keep, None),
        ],
        around_decisions: true,
        unmet: vec![by_hand(About::Proposal("P1".to_owned()), Must::Grant, Some(2))],
    };
    let plan = Plan {
        rank: 1,
        objective: 1.0 / 3.0 * 1e13,
        expected_new_losses: 0.125,
        counts: Some(PlanCounts {
            amended: 1,
            refused: 1,
            moved_flights: 1,
            removed_losses: 1,
            ..PlanCounts::default()
        }),
        ..Plan::default()
    };
    let other = FoundPlan {
        plan: Plan { rank: 2, objective: 0.0, ..Plan::default() },
        rows: PlanRows::default(),
    };
    FoundPlans {
        day: Day {
            date: Some(Date { year: 2031, month: 3, day: 4 }),
            region: "Nowhere".to_owned(),
            ..Day::default()
        },
        origin,
        plans: vec![FoundPlan { plan, rows }, other],
        limit_prices: Vec::new(),
    }
}

fn by_hand(about: About, must: Must, option: Option<u32>) -> HandDecision {
    HandDecision { about: Some(about), must: must.into(), option }
}

fn names_in(folder: &Path) -> Vec<String> {
    let entries = fs::read_dir(folder).expect("a folder");
    let mut names: Vec<String> = entries
        .map(|entry| entry.expect("an entry").file_name().into_string().expect("a name"))
        .collect();
    names.sort();
    names
}

fn refusal(outcome: Result<(), Failure>) -> String {
    match outcome {
        Err(Failure::BadInput(findings)) => findings.defects.to_string(),
        other => panic!("not refused: {other:?}"),
    }
}

#[test]
fn a_plan_reads_back_as_it_was_written() {
    let within = tempfile::tempdir().expect("a folder");
    let folder = within.path().join("deep/plan");
    let found = plans();
    write(&folder, &found, Existing::Keep).expect("written");
    assert_eq!(
        names_in(&folder),
        ["loads.csv", "losses.csv", "plan.json", "points-2.csv", "points.csv"]
    );
    assert_eq!(names_in(&within.path().join("deep")), ["plan"]);
    let back = read(&folder, &found.origin.day_sha256).expect("read").0;
    let best = &found.plans[0];
    assert_eq!(back.rows, best.rows);
    let mut expected = best.plan.clone();
    expected.counts = None;
    expected.origin = Some(found.origin.clone());
    let mut plan = back.plan;
    for policy in [&mut plan, &mut expected].map(|plan| &mut plan.origin.as_mut().unwrap().policy) {
        policy.sort_by(|a, b| a.key.cmp(&b.key));
    }
    assert_eq!(plan, expected);
}

#[test]
fn the_same_plan_gives_the_same_bytes() {
    let within = tempfile::tempdir().expect("a folder");
    let (first, second) = (within.path().join("first"), within.path().join("second"));
    write(&first, &plans(), Existing::Keep).expect("written");
    write(&second, &plans(), Existing::Keep).expect("written");
    for name in names_in(&first) {
        let [a, b] = [&first, &second].map(|folder| fs::read(folder.join(&name)).expect("a file"));
        assert_eq!(a, b, "{name}");
    }
}

#[test]
fn the_files_are_as_described() {
    let within = tempfile::tempdir().expect("a folder");
    let folder = within.path().join("plan");
    write(&folder, &plans(), Existing::Keep).expect("written");
    let text = |name: &str| fs::read_to_string(folder.join(name)).expect("text");
    expect![[r#"
        flight,time,lon,lat,level_fl,fix
        AAA1,2031-03-04T06:00:00.000Z,0.1,50,350,ESKRA
        AAA1,2031-03-04T06:10:00.125Z,-0.25,50.5,372.5,
        AAA1,2031-03-04T07:00:00.345Z,1,51.0000001,350,"KE,SKO"
    "#]]
    .assert_eq(&text("points.csv"));
    expect![[r#"
        sector,airport,measure,window_start,filed,planned,limit
        NORTH,,entries,2031-03-04T06:00:00.000Z,10,11.5,11
        ,XAAA,departures,2031-03-04T06:00:00.000Z,4,4,
    "#]]
    .assert_eq(&text("loads.csv"));
    expect![[r#"
        first_flight,second_flight,from,until,closest_time,horizontal_nm,vertical_ft,sector,in,new
        AAA1,CCC3,2031-03-04T08:00:00.000Z,2031-03-04T08:00:30.000Z,2031-03-04T08:00:12.000Z,4.25,0,NORTH,filed,false
    "#]].assert_eq(&text("losses.csv"));
    expect![[r#"
        {
          "date": "2031-03-04",
          "region": "Nowhere",
          "day_sha256": "abababababababababababababababababababababababababababababababab",
          "program_version": "0.1.0",
          "policy": {
            "horizontal_nm": 5.0,
            "level_direction": [
              {
                "levels": [
                  310.0,
                  330.0
                ],
                "track_from": 0.0,
                "track_until": 180.0
              }
            ],
            "max_moved_flights": null,
            "separation": "nominal"
          },
          "seed": 7,
          "stopped": "gap",
          "objective": 3333333333333.333,
          "bound": 3500000000000.0,
          "gap": 0.047619,
          "expected_new_losses": 0.125,
          "by_hand": [
            {
              "proposal": "P1",
              "must": "grant",
              "option": 2
            },
            {
              "flight": "BBB2",
              "must": "keep"
            }
          ],
          "around_decisions": true,
          "unmet": [
            {
              "proposal": "P1",
              "must": "grant",
              "option": 2
            }
          ],
          "plans": [
            {
              "rank": 1,
              "objective": 3333333333333.333,
              "decisions": [
                {
                  "proposal": "P1",
                  "flight": "AAA1",
                  "verdict": "amended",
                  "option": 2,
                  "stretches": [
                    {
                      "level_fl": 372.5,
                      "from_time": "2031-03-04T06:10:00.000Z",
                      "until_time": null,
                      "planned_from": "2031-03-04T06:10:00.000Z",
                      "planned_until": "2031-03-04T07:00:12.345Z",
                      "near_fix": "ESKRA"
                    }
                  ],
                  "net_benefit_j": 3333333333333.333,
                  "contrail_km_avoided": 12.5,
                  "extra_fuel_kg": -3.25,
                  "arrival_shift_s": 17.0,
                  "reasons": [
                    {
                      "kind": "better-option",
                      "option": 1
                    }
                  ]
                },
                {
                  "proposal": "P2",
                  "flight": "BBB2",
                  "verdict": "refused",
                  "option": null,
                  "stretches": [
                    {
                      "level_fl": 330.0,
                      "from_time": "2031-03-04T06:10:00.000Z",
                      "until_time": null,
                      "planned_from": null,
                      "planned_until": null
                    }
                  ],
                  "net_benefit_j": 0.0,
                  "contrail_km_avoided": 0.0,
                  "extra_fuel_kg": 0.0,
                  "arrival_shift_s": 0.0,
                  "reasons": [
                    {
                      "kind": "sector-occupancy",
                      "option": 1,
                      "sector": "NORTH",
                      "from": "2031-03-04T06:20:00.000Z",
                      "until": "2031-03-04T06:31:00.000Z",
                      "count": 13.0,
                      "limit": 12.5
                    },
                    {
                      "kind": "separation",
                      "option": 1,
                      "other_flight": "CCC3",
                      "time": "2031-03-04T06:25:01.500Z",
                      "horizontal_nm": 3.2,
                      "vertical_ft": 0.0
                    },
                    {
                      "kind": "separation-risk",
                      "option": 2,
                      "count": 0.11,
                      "limit": 0.05,
                      "other_flight": "DDD4"
                    },
                    {
                      "kind": "own-change",
                      "option": 2
                    },
                    {
                      "kind": "fuel-limit",
                      "option": 3,
                      "count": 120.5,
                      "limit": 90.0
                    },
                    {
                      "kind": "plan-limit",
                      "option": 3,
                      "count": 61.0,
                      "limit": 45.0,
                      "rule": "max_arrival_shift_s"
                    },
                    {
                      "kind": "not-worth-it",
                      "option": 4
                    },
                    {
                      "kind": "invalid",
                      "option": 5,
                      "limit": 410.0,
                      "rule": "above-ceiling"
                    }
                  ],
                  "exchange": {
                    "drops": [
                      "P1"
                    ],
                    "objective_lost_j": 3000000000000.0,
                    "proven": true
                  }
                }
              ]
            },
            {
              "rank": 2,
              "objective": 0.0,
              "decisions": []
            }
          ]
        }
    "#]]
    .assert_eq(&text("plan.json"));
}

#[test]
fn what_is_there_is_replaced_only_when_it_is_a_plan_and_that_is_asked_for() {
    let within = tempfile::tempdir().expect("a folder");
    let folder = within.path().join("plan");
    fs::create_dir(&folder).expect("made");
    write(&folder, &plans(), Existing::Keep).expect("an empty folder takes a plan");
    let mut better = plans();
    better.plans.truncate(1);
    let said = refusal(write(&folder, &better, Existing::Keep));
    assert!(said.contains("holds a plan already"), "{said}");
    write(&folder, &better, Existing::Replace).expect("replaced");
    assert_eq!(names_in(&folder), ["loads.csv", "losses.csv", "plan.json", "points.csv"]);
    assert_eq!(names_in(within.path()), ["plan"]);

    fs::write(folder.join("diary.txt"), "mine").expect("written");
    let said = refusal(write(&folder, &better, Existing::Replace));
    assert!(said.contains("holds something else than a plan"), "{said}");
    let file = folder.join("diary.txt");
    let said = refusal(check_place(&file, Existing::Replace));
    assert!(said.contains("is a file"), "{said}");
}

#[test]
fn a_plan_that_can_not_be_written_leaves_nothing() {
    let within = tempfile::tempdir().expect("a folder");
    let file = within.path().join("file");
    fs::write(&file, "in the way").expect("written");
    let said = refusal(write(&file.join("plan"), &plans(), Existing::Keep));
    assert!(said.contains("file"), "{said}");
    assert_eq!(names_in(within.path()), ["file"]);
}

#[test]
fn a_plan_of_another_day_names_both() {
    let within = tempfile::tempdir().expect("a folder");
    let folder = within.path().join("plan");
    write(&folder, &plans(), Existing::Keep).expect("written");
    let findings = read(&folder, &"cd".repeat(32)).expect_err("another day");
    let said = findings.defects.to_string();
    assert!(said.contains(&"ab".repeat(32)) && said.contains(&"cd".repeat(32)), "{said}");
}

#[test]
fn damaged_plans_are_named() {
    let within = tempfile::tempdir().expect("a folder");
    let folder = within.path().join("plan");
    write(&folder, &plans(), Existing::Keep).expect("written");
    let sha = "ab".repeat(32);
    let said = |name: &str, from: &str, to: &str| {
        let path = folder.join(name);
        let whole = fs::read_to_string(&path).expect("text");
        fs::write(&path, whole.replacen(from, to, 1)).expect("written");
        let said = read(&folder, &sha).expect_err(name).defects.to_string();
        fs::write(&path, whole).expect("written");
        said.replace(&folder.display().to_string(), "PLAN")
    };
    let all = [
        said("plan.json", "\"verdict\": \"refused\"", "\"verdict\": \"maybe\""),
        said("plan.json", "\"sector-occupancy\"", "\"sector-mood\""),
        said("plan.json", "2031-03-04T06:10:00.000Z", "06:10"),
        said("plan.json", "\"must\": \"keep\"", "\"must\": \"leave\""),
        said("plan.json", "{", "["),
        said("points.csv", "372.5", "x"),
        said("loads.csv", "entries", "smiles"),
        said("losses.csv", "filed", "lost"),
        said("losses.csv", "closest_time", "closest"),
    ]
    .join("\n");
    expect![[r#"
        PLAN/plan.json: proposal "P2": "maybe" is no verdict
        PLAN/plan.json: proposal "P2": "sector-mood" is no kind of reason
        PLAN/plan.json: proposal "P1": "06:10" is not an RFC 3339 time
        PLAN/plan.json: by_hand[1]: must "leave" is not grant, refuse or keep
        PLAN/plan.json: is no plan: expected `,` or `]` at line 2 column 9
          hint: give a folder that `rimeshift plan` wrote
        PLAN/points.csv:3: column level_fl: "x" is not a number
        PLAN/loads.csv:2: column measure: "smiles" is no measure
        PLAN/losses.csv:2: column in: "lost" is not filed, planned or both
        PLAN/losses.csv: has no column closest_time
          hint: was "closest" meant to be closest_time?"#]]
    .assert_eq(&all);
}
