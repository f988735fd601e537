//! One report of each command, in words and in JSON.

use super::ask::AskReport;
use super::audit::AuditReport;
use super::check::CheckReport;
use super::plan::PlanReport;
use super::policy::PolicyReport;
use crate::plan_folder::tests::plans;
use crate::screen::Layout;
use expect_test::{Expect, expect};
use rimeshift_proto::v1::constraint::Kind;
use rimeshift_proto::v1::*;

/// Compares a report for people with what it should be.
fn check(text: &str, expected: Expect) {
    assert!(!text.lines().any(|line| line.ends_with(' ')), "blanks at the end of a line");
    expected.assert_eq(text);
}

/// JSON is compared by its keys: the values are the service's.
fn keys(json: &str) -> String {
    let value: serde_json::Value = serde_json::from_str(json).expect("JSON");
    let object = value.as_object().expect("an object");
    object.keys().map(String::as_str).collect::<Vec<_>>().join(" ")
}

fn day() -> Day {
    plans().day
}

fn time(seconds: i64) -> Option<prost_types::Timestamp> {
    // 00:00 UTC of 2031-03-04 and so many seconds.
    Some(prost_types::Timestamp { seconds: 1_930_348_800 + seconds, nanos: 0 })
}

fn sector(name: &str) -> Option<Place> {
    Some(Place { place: Some(place::Place::Sector(name.to_owned())) })
}

#[test]
fn a_check_counts_first_and_lists_then() {
    let loss = |index: usize| Loss {
        first_flight: format!("AAA{index}"),
        second_flight: "BBB2".to_owned(),
        from: time(3600),
        until: time(3660),
        closest_time: time(3621),
        horizontal_nm: 4.256,
        vertical_ft: 500.0,
        sector: "NORTH".to_owned(),
    };
    let report = CheckReport {
        day: day(),
        summary: DayCheckSummary {
            flights: 1200,
            overloads: 1,
            losses: 22,
            not_movable: 1,
            no_cruise: 3,
            near_direction_boundary: 0,
            proposals: 40,
            invalid_proposals: 1,
            snapped_levels: 0,
        },
        overloads: vec![Overload {
            place: sector("NORTH"),
            measure: LoadMeasure::Entries.into(),
            from: time(21_600),
            until: time(27_600),
            count: 33.5,
            limit: 30.0,
        }],
        losses: (0..22).map(loss).collect(),
        invalid_proposals: vec![InvalidProposal {
            proposal: "P7".to_owned(),
            broken_rule: Some(BrokenRule {
                rule: ChangeRule::WrongDirection.into(),
                track_deg: Some(91.4),
                ..BrokenRule::default()
            }),
        }],
    };
    check(
        &report.text(Layout::Plain),
        expect![[r#"
            Nowhere 2031-03-04: as filed, 1 overload and 22 losses of separation among 1200 flights.
            A day ahead, times are uncertain by minutes: losses at nominal times speak of the timetable, not of
            the day.
            No flight is moved here, so no new losses are expected.
            1 proposal breaks a rule of level changes with every option.
            1 flight is marked not movable.
            3 movable flights have no cruise and can't be changed.

            Overloads
             where  counted          when               count  limit
             NORTH  entries an hour  03-04 06:00–07:40  33.50     30

            Losses of separation at filed times
             flight  other flight  closest at        NM   ft  sector
             AAA0    BBB2          03-04 01:00:21  4.25  500  NORTH
             AAA1    BBB2          03-04 01:00:21  4.25  500  NORTH
             AAA2    BBB2          03-04 01:00:21  4.25  500  NORTH
             AAA3    BBB2          03-04 01:00:21  4.25  500  NORTH
             AAA4    BBB2          03-04 01:00:21  4.25  500  NORTH
             AAA5    BBB2          03-04 01:00:21  4.25  500  NORTH
             AAA6    BBB2          03-04 01:00:21  4.25  500  NORTH
             AAA7    BBB2          03-04 01:00:21  4.25  500  NORTH
             AAA8    BBB2          03-04 01:00:21  4.25  500  NORTH
             AAA9    BBB2          03-04 01:00:21  4.25  500  NORTH
             AAA10   BBB2          03-04 01:00:21  4.25  500  NORTH
             AAA11   BBB2          03-04 01:00:21  4.25  500  NORTH
             AAA12   BBB2          03-04 01:00:21  4.25  500  NORTH
             AAA13   BBB2          03-04 01:00:21  4.25  500  NORTH
             AAA14   BBB2          03-04 01:00:21  4.25  500  NORTH
             AAA15   BBB2          03-04 01:00:21  4.25  500  NORTH
             AAA16   BBB2          03-04 01:00:21  4.25  500  NORTH
             AAA17   BBB2          03-04 01:00:21  4.25  500  NORTH
             AAA18   BBB2          03-04 01:00:21  4.25  500  NORTH
             AAA19   BBB2          03-04 01:00:21  4.25  500  NORTH
            … and 2 more; --json lists all

            Proposals that break a rule
             proposal  why
             P7        it is no level of the direction of flight (91°)

            A planning aid: it gives no clearances and replaces no controller, no flight-plan acceptance and no
            local procedure. Minima and capacities are yours to set, under local rules and licensed practice.
            Left out: water vapour, NOx and aerosol effects, speed control, lateral changes, climb performance
            near the ceiling.
        "#]],
    );
    check(
        &keys(&report.json()),
        expect![
            "cautions date day_sha256 expected_new_losses flights invalid_proposals losses near_direction_boundary no_cruise not_movable overloads proposals region snapped_levels"
        ],
    );
}

#[test]
fn an_answer_to_a_question_names_what_blocks() {
    let mut report = AskReport {
        flight: "AAA1".to_owned(),
        level_fl: 370.0,
        beside_plan: false,
        answer: ChangeAnswer {
            verdict: ChangeVerdict::No.into(),
            constraints: vec![Constraint {
                kind: Some(Kind::Load(LoadConstraint {
                    place: sector("NORTH"),
                    measure: LoadMeasure::Lasting.into(),
                    from: time(21_600),
                    until: time(22_260),
                    count: 13.0,
                    limit: 12.0,
                })),
            }],
            net_benefit: 1.234_56e13,
            contrail_km_avoided: 120.04,
            extra_fuel_kg: 33.3,
            arrival_shift_s: -12.0,
            expected_new_losses: 0.0123,
            least_slack: Some(0.0),
            stretches: vec![PlannedStretch {
                stretch: Some(Stretch { level_ft: 37_000.0, from: time(0), until: time(60) }),
                planned_from: time(0),
                planned_until: time(62),
                near_fix: String::new(),
            }],
            broken_rule: None,
        },
    };
    check(
        &report.text(Layout::Plain),
        expect![[r#"
        no: AAA1 at FL 370, against the filed day, is blocked.

        Blocked by
          NORTH lasting occupancy 03-04 06:00–06:11: 13 where 12 is allowed

        What it would do
          leaves its level at 03-04 00:00:00, starts to return at 03-04 00:01:02
          net benefit: 1.235e13
          contrails avoided: 120.0 km; extra fuel: 33.3 kg; arrival shifted by -12.0 s
          least room left where it adds to a count: 0.0
          new losses of separation: 0; expected new losses: 0.012
        A day ahead, times are uncertain by minutes: losses at nominal times speak of the timetable, not of
        the day.

        A planning aid: it gives no clearances and replaces no controller, no flight-plan acceptance and no
        local procedure. Minima and capacities are yours to set, under local rules and licensed practice.
        Left out: water vapour, NOx and aerosol effects, speed control, lateral changes, climb performance
        near the ceiling.
    "#]],
    );
    check(
        &keys(&report.json()),
        expect![
            "arrival_shift_s beside_plan cautions contrail_km_avoided expected_new_losses extra_fuel_kg flight least_slack level_fl net_benefit reasons rule rule_time stretches verdict why"
        ],
    );
    report.answer.verdict = ChangeVerdict::Invalid.into();
    report.answer.constraints.clear();
    report.answer.broken_rule = Some(BrokenRule {
        rule: ChangeRule::NoChangesSector.into(),
        sector: Some("NORTH".to_owned()),
        time: time(22_000),
        ..BrokenRule::default()
    });
    report.beside_plan = true;
    check(
        &report.text(Layout::Plain),
        expect![[r#"
        invalid: AAA1 at FL 370, beside the plan, breaks a rule of level changes.
        it would be off its filed level in sector NORTH at 03-04 06:06:40, which is marked no_changes.

        A planning aid: it gives no clearances and replaces no controller, no flight-plan acceptance and no
        local procedure. Minima and capacities are yours to set, under local rules and licensed practice.
        Left out: water vapour, NOx and aerosol effects, speed control, lateral changes, climb performance
        near the ceiling.
    "#]],
    );
}

#[test]
fn a_plan_says_what_is_granted_and_why_the_rest_is_not() {
    let found = plans();
    let report = PlanReport { found: &found, written_to: Some(std::path::Path::new("out")) };
    check(
        &report.text(Layout::Plain),
        expect![[r#"
            Nowhere 2031-03-04: 1 of 2 proposals granted, proven to be within 4.76 % of the best.
            Net benefit 3.333e12 J (proven bound 3.500e12 J); 12.5 km of contrails avoided; -3.2 kg of extra
            fuel.
            Granted as asked 0, amended 1, refused 1, invalid 0.
            New losses of separation: 0; filed losses removed: 1; expected new losses: 0.125.
            A day ahead, times are uncertain by minutes: losses at nominal times speak of the timetable, not of
            the day.
            Decided by hand, but can't be met, and planned around: grant proposal P1 with option 2.
            Refusals by reason (one may have several): fuel-limit 1, invalid 1, not-worth-it 1, own-change 1,
            plan-limit 1, sector-occupancy 1, separation 1, separation-risk 1.

            Granted
             proposal  flight  option  level     leaves          returns         km avoided  extra kg  shift s
             P1        AAA1    2       FL 372.5  03-04 06:10:00  03-04 07:00:12        12.5      -3.2     17.0

            Refused
             proposal  flight  why not                                                                    what would make room
             P2        BBB2    NORTH occupancy 03-04 06:20–06:31: 13 where 12.50 is allowed (and 7 more)  without P1 (loses 3.000e12)

            Other plans
             rank  net benefit  granted  expected new losses
                2            0        0                0.000

            Written to out

            A planning aid: it gives no clearances and replaces no controller, no flight-plan acceptance and no
            local procedure. Minima and capacities are yours to set, under local rules and licensed practice.
            Left out: water vapour, NOx and aerosol effects, speed control, lateral changes, climb performance
            near the ceiling.
        "#]],
    );
    check(
        &keys(&report.json()),
        expect![
            "amended around_decisions bound cautions contrail_km_avoided date day_sha256 decisions expected_new_losses extra_fuel_kg gap granted invalid limit_prices new_losses objective planned_losses planned_overloads refused region removed_losses stopped unmet written_to"
        ],
    );
    assert_eq!((report.planned_overloads(), report.planned_losses()), (1, 0));
}

#[test]
fn an_audit_says_whether_the_plan_holds() {
    let mut report = AuditReport { day: day(), answer: AuditPlanResponse::default() };
    check(
        &report.text(Layout::Plain),
        expect![[r#"
        Nowhere 2031-03-04: the plan holds; the audit found nothing wrong.
        Rules, losses of separation, counts and figures were worked out anew from the day and the granted
        stretches, by code that shares none of the search's shortcuts.
        A day ahead, times are uncertain by minutes: losses at nominal times speak of the timetable, not of
        the day.

        A planning aid: it gives no clearances and replaces no controller, no flight-plan acceptance and no
        local procedure. Minima and capacities are yours to set, under local rules and licensed practice.
        Left out: water vapour, NOx and aerosol effects, speed control, lateral changes, climb performance
        near the ceiling.
    "#]],
    );
    report.answer = AuditPlanResponse {
        findings: vec![Finding {
            kind: FindingKind::Load.into(),
            message: "13 aircraft where 12 are allowed".to_owned(),
            proposal: "P1".to_owned(),
            flight: "AAA1".to_owned(),
            place: sector("NORTH"),
            time: time(21_600),
            ..Finding::default()
        }],
        finding_count: 3,
        ..AuditPlanResponse::default()
    };
    assert!(!report.holds());
    check(
        &report.text(Layout::Plain),
        expect![[r#"
        Nowhere 2031-03-04: the plan does not hold; the audit found 3 things wrong.
        Rules, losses of separation, counts and figures were worked out anew from the day and the granted
        stretches, by code that shares none of the search's shortcuts.
        A day ahead, times are uncertain by minutes: losses at nominal times speak of the timetable, not of
        the day.

        Findings
         kind  proposal  flight  what
         load  P1        AAA1    13 aircraft where 12 are allowed
        … and 2 more; --json lists all

        A planning aid: it gives no clearances and replaces no controller, no flight-plan acceptance and no
        local procedure. Minima and capacities are yours to set, under local rules and licensed practice.
        Left out: water vapour, NOx and aerosol effects, speed control, lateral changes, climb performance
        near the ceiling.
    "#]],
    );
    check(
        &keys(&report.json()),
        expect!["cautions date day_sha256 finding_count findings holds region"],
    );
}

#[test]
fn the_policy_shows_every_key() {
    let number = |value: f64| Some(PolicyValue { kind: Some(policy_value::Kind::Number(value)) });
    let report = PolicyReport {
        of_day: true,
        keys: vec![
            PolicyKey {
                key: "lasting_min".to_owned(),
                unit: "min".to_owned(),
                meaning: "how long an overload lasts".to_owned(),
                source: "ours".to_owned(),
                value: number(8.0),
                default_value: number(10.0),
            },
            PolicyKey {
                key: "max_moved_flights".to_owned(),
                meaning: "most flights moved".to_owned(),
                source: "ours".to_owned(),
                ..PolicyKey::default()
            },
        ],
    };
    check(
        &report.text(Layout::Plain),
        expect![[r#"
        2 policy keys: 1 value set by the day.

        Policy
         key                unit  value    default  meaning                     source of the default
         lasting_min        min   8        10       how long an overload lasts  ours
         max_moved_flights        not set  not set  most flights moved          ours

        A planning aid: it gives no clearances and replaces no controller, no flight-plan acceptance and no
        local procedure. Minima and capacities are yours to set, under local rules and licensed practice.
        Left out: water vapour, NOx and aerosol effects, speed control, lateral changes, climb performance
        near the ceiling.
    "#]],
    );
    check(&keys(&report.json()), expect!["cautions policy"]);
}

#[test]
fn every_value_that_the_service_may_send_has_its_word() {
    use super::names;
    let values = |word: &dyn Fn(i32) -> String| -> Vec<String> { (1..40).map(word).collect() };
    let known = |words: Vec<String>| words.into_iter().filter(|word| word != "unknown").count();
    assert_eq!(known(values(&|value| names::verdict(value).to_owned())), 4);
    assert_eq!(known(values(&|value| names::stopped(value).to_owned())), 5);
    assert_eq!(known(values(&|value| names::loss_version(value).to_owned())), 3);
    assert_eq!(known(values(&|value| names::load_column(value).to_owned())), 6);
    assert_eq!(known(values(&|value| names::finding_kind(value).to_owned())), 9);
}
