//! Level changes: asked about, planned, kept, sent back and audited.

use rimeshift_proto::v1;
use rimeshift_proto::v1::find_plans_response::Content;
use rimeshift_proto::v1::plan_service_client::PlanServiceClient;
use tonic::transport::Channel;
use tonic::{Code, Status};
use tonic_types::StatusExt;

use crate::support::{at, eastbound, header, load, proposal, service, small, small_day};

const DAY: &str = "days/day";

/// A day on which P1 would bring F1 into a loss with F0, which flies 10 s behind it above.
pub(crate) async fn contested_day(channel: &Channel) -> v1::Day {
    let mut rows = small_day();
    rows.flights.push(eastbound("F0", 10.0, 50.0, 35_000.0));
    load(channel, header("day"), vec![rows]).await.unwrap().day.unwrap()
}

fn change(flight: &str, level_ft: f64, from_s: i64) -> v1::Change {
    let option = proposal("", flight, level_ft, from_s).options.remove(0);
    v1::Change { flight: flight.to_owned(), stretches: option.stretches, figures: option.figures }
}

async fn ask(
    client: &mut PlanServiceClient<Channel>,
    plan: &str,
    change: v1::Change,
) -> Result<v1::ChangeAnswer, Status> {
    let request = v1::AskChangeRequest { day: DAY.into(), plan: plan.into(), change: Some(change) };
    Ok(client.ask_change(request).await?.into_inner().answer.unwrap())
}

/// Everything that a search sends.
#[derive(Debug, Default, PartialEq)]
pub(crate) struct Found {
    pub(crate) origin: v1::PlanOrigin,
    pub(crate) plans: Vec<(v1::Plan, v1::PlanRows)>,
}

pub(crate) async fn find(
    client: &mut PlanServiceClient<Channel>,
    request: v1::FindPlansRequest,
) -> Result<Found, Status> {
    let mut stream = client.find_plans(request).await?.into_inner();
    let mut found = Found::default();
    while let Some(message) = stream.message().await? {
        match message.content.unwrap() {
            Content::Progress(_) => assert!(found.plans.is_empty()),
            Content::Origin(origin) => found.origin = origin,
            Content::Plan(plan) => found.plans.push((plan, v1::PlanRows::default())),
            Content::LimitPrices(_) => {}
            Content::Rows(rows) => {
                let (_, all) = found.plans.last_mut().unwrap();
                all.decisions.extend(rows.decisions);
                all.moved_points.extend(rows.moved_points);
                all.loads.extend(rows.loads);
                all.losses.extend(rows.losses);
            }
        }
    }
    Ok(found)
}

pub(crate) fn request(plan_id: &str) -> v1::FindPlansRequest {
    v1::FindPlansRequest { parent: DAY.into(), plan_id: plan_id.into(), ..Default::default() }
}

#[tokio::test]
async fn one_change_is_answered_yes_no_or_invalid() {
    let channel = service(small()).await;
    contested_day(&channel).await;
    let mut client = PlanServiceClient::new(channel);
    let yes = ask(&mut client, "", change("F3", 37_000.0, 1800)).await.unwrap();
    assert_eq!(yes.verdict(), v1::ChangeVerdict::Yes);
    assert_eq!(yes.contrail_km_avoided, 100.0);
    assert!(yes.stretches[0].planned_from.is_some());
    // Slower above, it is alone in EAST, where ten may be, at the minutes that it adds.
    assert_eq!(yes.least_slack, Some(9.0));

    let no = ask(&mut client, "", change("F1", 35_000.0, 0)).await.unwrap();
    assert_eq!(no.verdict(), v1::ChangeVerdict::No);
    let [constraint] = no.constraints.as_slice() else { panic!("{:?}", no.constraints) };
    let Some(v1::constraint::Kind::Separation(loss)) = &constraint.kind else {
        panic!("{constraint:?}")
    };
    assert_eq!(loss.other_flight, "F0");
    assert!(loss.horizontal_nm < 5.0);

    let invalid = ask(&mut client, "", change("F1", 36_000.0, 0)).await.unwrap();
    assert_eq!(invalid.verdict(), v1::ChangeVerdict::Invalid);
    assert_eq!(invalid.broken_rule.unwrap().rule(), v1::ChangeRule::WrongDirection);
}

#[tokio::test]
async fn bad_questions_are_told_what_is_bad() {
    let channel = service(small()).await;
    contested_day(&channel).await;
    let mut client = PlanServiceClient::new(channel);
    let mut odd = change("F9", f64::NAN, 0);
    odd.figures = Some(v1::OptionFigures { priority: Some(-1.0), ..Default::default() });
    let status = ask(&mut client, "", odd).await.unwrap_err();
    let details = status.get_error_details();
    let fields = details.bad_request().unwrap().field_violations.iter();
    let fields: Vec<_> = fields.map(|v| v.field.as_str()).collect();
    assert_eq!(
        fields,
        ["change.flight", "change.stretches[0].level_ft", "change.figures.priority"]
    );
    for (plan, code) in [
        ("days/other/plans/a", Code::InvalidArgument),
        ("days/day/plans/none", Code::NotFound),
        ("none", Code::InvalidArgument),
    ] {
        let status = ask(&mut client, plan, change("F1", 35_000.0, 0)).await.unwrap_err();
        assert_eq!(status.code(), code, "{plan}");
    }
    let nothing = v1::AskChangeRequest { day: DAY.into(), ..Default::default() };
    assert_eq!(client.ask_change(nothing).await.unwrap_err().code(), Code::InvalidArgument);
}

#[tokio::test]
async fn a_stream_of_questions_is_answered_in_order_and_survives_bad_ones() {
    let channel = service(small()).await;
    contested_day(&channel).await;
    let mut client = PlanServiceClient::new(channel);
    let question = |tag: &str, flight: &str| v1::AskChangesRequest {
        tag: tag.into(),
        day: DAY.into(),
        plan: String::new(),
        change: Some(change(flight, 37_000.0, 1800)),
    };
    let questions = vec![question("a", "F3"), question("b", "F9"), question("c", "F3")];
    let mut stream = client.ask_changes(tokio_stream::iter(questions)).await.unwrap().into_inner();
    let mut seen = Vec::new();
    while let Some(answer) = stream.message().await.unwrap() {
        use v1::ask_changes_response::Outcome;
        seen.push(match answer.outcome.unwrap() {
            Outcome::Answer(known) => (answer.tag, i32::from(known.verdict())),
            Outcome::Error(error) => {
                assert_eq!(error.fields[0].path, "change.flight");
                (answer.tag, -error.code)
            }
        });
    }
    let yes = i32::from(v1::ChangeVerdict::Yes);
    let invalid_argument = -i32::from(Code::InvalidArgument);
    assert_eq!(seen, [("a".into(), yes), ("b".into(), invalid_argument), ("c".into(), yes)]);
}

#[tokio::test]
async fn the_best_plan_is_found_kept_and_passes_its_audit() {
    let channel = service(small()).await;
    let day = contested_day(&channel).await;
    let mut client = PlanServiceClient::new(channel);
    let found = find(&mut client, request("night")).await.unwrap();
    assert_eq!(found.origin.day_sha256, day.day_sha256);
    assert_eq!(found.origin.stopped(), v1::Stopped::Optimal);
    assert_eq!(found.origin.gap, Some(0.0));
    assert_eq!(found.origin.policy, day.policy);
    let [(plan, rows)] = found.plans.as_slice() else { panic!("one plan") };
    assert_eq!(plan.name, "days/day/plans/night");
    let counts = plan.counts.unwrap();
    assert_eq!((counts.granted, counts.refused, counts.moved_flights), (2, 1, 2));
    let verdicts: Vec<_> =
        rows.decisions.iter().map(|d| (d.proposal.as_str(), d.verdict())).collect();
    use v1::Verdict::{Granted, Refused};
    assert_eq!(verdicts, [("P1", Refused), ("P2", Granted), ("P3", Granted)]);
    let reason = rows.decisions[0].reasons[0].constraint.as_ref().unwrap();
    assert!(matches!(reason.kind, Some(v1::constraint::Kind::Separation(_))), "{reason:?}");
    let moved: Vec<_> = rows.moved_points.iter().map(|m| m.flight.as_str()).collect();
    assert_eq!(moved, ["F2", "F3"]);

    let name = || plan.name.clone();
    let got = client.get_plan(v1::GetPlanRequest { name: name() }).await.unwrap().into_inner();
    let expected = v1::Plan { origin: Some(found.origin.clone()), ..plan.clone() };
    assert_eq!(got.plan, Some(expected));
    let audit = client.audit_plan(v1::AuditPlanRequest { name: name() }).await.unwrap();
    let audit = audit.into_inner();
    assert_eq!(audit.findings, []);
    assert_eq!(audit.checked.unwrap().moved_flights, 2);

    // Beside the plan, F2 may not take what it has been granted a second time.
    let beside = ask(&mut client, &plan.name, change("F2", 35_000.0, 900)).await.unwrap();
    let own = v1::constraint::Kind::OwnChange(v1::OwnChangeConstraint {});
    assert_eq!(beside.constraints, [v1::Constraint { kind: Some(own) }]);

    let again = find(&mut client, request("night")).await.unwrap_err();
    assert_eq!(again.code(), Code::AlreadyExists);
    client.delete_plan(v1::DeletePlanRequest { name: name() }).await.unwrap();
    let gone = client.get_plan(v1::GetPlanRequest { name: name() }).await.unwrap_err();
    assert_eq!(gone.code(), Code::NotFound);
}

/// Two flights that both ask for a level at which only one of them has room.
#[tokio::test]
async fn several_plans_are_ranked_and_kept_by_rank() {
    let channel = service(small()).await;
    let mut rows = small_day();
    rows.flights.push(eastbound("G1", 10.0, 50.0, 37_000.0));
    let mut second = proposal("Q1", "G1", 35_000.0, 0);
    second.options[0].figures.as_mut().unwrap().contrail_km_avoided = Some(90.0);
    rows.proposals = vec![proposal("P1", "F1", 35_000.0, 0), second];
    load(&channel, header("day"), vec![rows]).await.unwrap();
    let mut client = PlanServiceClient::new(channel);
    let two = v1::FindPlansRequest { plans: Some(2), ..request("p") };
    let found = find(&mut client, two.clone()).await.unwrap();
    let granted = |rows: &v1::PlanRows| {
        let granted = |d: &&v1::Decision| d.verdict() == v1::Verdict::Granted;
        rows.decisions.iter().filter(granted).map(|d| d.proposal.clone()).collect::<Vec<_>>()
    };
    let seen: Vec<_> = found.plans.iter().map(|(p, rows)| (p.rank, granted(rows))).collect();
    assert_eq!(seen, [(1, vec!["P1".to_owned()]), (2, vec!["Q1".to_owned()])]);

    let listed = v1::ListPlansRequest { parent: DAY.into(), page_size: 1, ..Default::default() };
    let page = client.list_plans(listed.clone()).await.unwrap().into_inner();
    let names = |plans: &[v1::Plan]| plans.iter().map(|p| p.name.clone()).collect::<Vec<_>>();
    assert_eq!(names(&page.plans), ["days/day/plans/p"]);
    let next = v1::ListPlansRequest { page_token: page.next_page_token, ..listed };
    let page = client.list_plans(next).await.unwrap().into_inner();
    assert_eq!(names(&page.plans), ["days/day/plans/p-2"]);
    assert_eq!(page.next_page_token, "");

    let again = v1::FindPlansRequest { allow_replace: true, ..two };
    assert_eq!(find(&mut client, again).await.unwrap(), found);
}

#[tokio::test]
async fn a_plan_is_made_under_another_policy_and_judged_by_it() {
    let channel = service(small()).await;
    contested_day(&channel).await;
    let mut client = PlanServiceClient::new(channel);
    let number = |key: &str, n: f64| v1::PolicySetting {
        key: key.into(),
        value: Some(v1::PolicyValue { kind: Some(v1::policy_value::Kind::Number(n)) }),
    };
    let strict =
        v1::FindPlansRequest { policy: vec![number("max_moved_flights", 1.0)], ..request("one") };
    let found = find(&mut client, strict).await.unwrap();
    assert_eq!(found.plans[0].0.counts.unwrap().moved_flights, 1);
    let setting = found.origin.policy.iter().find(|s| s.key == "max_moved_flights").unwrap();
    assert_eq!(*setting, number("max_moved_flights", 1.0));
    let name = "days/day/plans/one".to_owned();
    let audit = client.audit_plan(v1::AuditPlanRequest { name: name.clone() }).await.unwrap();
    assert_eq!(audit.into_inner().findings, []);
    let granted = found.plans[0].1.moved_points[0].flight.clone();
    let (other, from_s) = if granted == "F2" { ("F3", 1800) } else { ("F2", 900) };
    let beside = ask(&mut client, &name, change(other, 37_000.0, from_s)).await.unwrap();
    let Some(v1::constraint::Kind::PlanLimit(limit)) = &beside.constraints[0].kind else {
        panic!("{beside:?}")
    };
    assert_eq!(limit.key, "max_moved_flights");

    let loading =
        v1::FindPlansRequest { policy: vec![number("cruise_floor_fl", 250.0)], ..request("no") };
    let refused = find(&mut client, loading).await.unwrap_err();
    let details = refused.get_error_details();
    let fields = &details.bad_request().unwrap().field_violations;
    assert_eq!(fields[0].field, "policy.cruise_floor_fl");
}

#[tokio::test]
async fn bad_searches_are_told_what_is_bad() {
    let channel = service(small()).await;
    contested_day(&channel).await;
    let mut client = PlanServiceClient::new(channel);
    let odd = v1::FindPlansRequest {
        plans: Some(0),
        work: Some(0),
        gap: Some(f64::NAN),
        max_time: Some(prost_types::Duration { seconds: -1, nanos: 0 }),
        ..request("")
    };
    let status = find(&mut client, odd).await.unwrap_err();
    let details = status.get_error_details();
    let fields = details.bad_request().unwrap().field_violations.iter();
    let fields: Vec<_> = fields.map(|v| v.field.as_str()).collect();
    assert_eq!(fields, ["plans", "work", "gap", "max_time"]);
    let long = find(&mut client, request(&"a".repeat(61))).await.unwrap_err();
    assert_eq!(long.code(), Code::InvalidArgument);
}

#[tokio::test]
async fn a_search_out_of_time_says_so_and_gives_a_plan() {
    let channel = service(small()).await;
    contested_day(&channel).await;
    let mut client = PlanServiceClient::new(channel);
    let hasty = v1::FindPlansRequest {
        max_time: Some(prost_types::Duration { seconds: 0, nanos: 1 }),
        ..request("")
    };
    let found = find(&mut client, hasty).await.unwrap();
    let told = found.origin.stopped();
    // A search that ends before it first looks at the clock has found the optimum.
    assert!(matches!(told, v1::Stopped::Time | v1::Stopped::Optimal), "{told:?}");
    assert_eq!(found.plans.len(), 1);
}

async fn send_plan(
    client: &mut PlanServiceClient<Channel>,
    plan_id: &str,
    plan: v1::Plan,
    rows: Vec<v1::PlanRows>,
) -> Result<v1::Plan, Status> {
    use v1::load_plan_request::Content;
    let header = v1::LoadPlanHeader {
        parent: DAY.into(),
        plan_id: plan_id.into(),
        allow_replace: false,
        plan: Some(plan),
    };
    let header = v1::LoadPlanRequest { content: Some(Content::Header(header)) };
    let rows = rows.into_iter().map(|r| v1::LoadPlanRequest { content: Some(Content::Rows(r)) });
    let messages: Vec<_> = std::iter::once(header).chain(rows).collect();
    let sent = client.load_plan(tokio_stream::iter(messages)).await?;
    Ok(sent.into_inner().plan.unwrap())
}

async fn findings(
    client: &mut PlanServiceClient<Channel>,
    plan: &v1::Plan,
) -> Vec<v1::FindingKind> {
    let request = v1::AuditPlanRequest { name: plan.name.clone() };
    let audit = client.audit_plan(request).await.unwrap().into_inner();
    assert_eq!(audit.finding_count as usize, audit.findings.len());
    assert!(audit.findings.iter().all(|f| !f.message.is_empty()));
    audit.findings.iter().map(v1::Finding::kind).collect()
}

#[tokio::test]
async fn a_plan_that_is_sent_back_is_the_plan_that_was_found() {
    let channel = service(small()).await;
    contested_day(&channel).await;
    let mut client = PlanServiceClient::new(channel);
    let mut found = find(&mut client, request("")).await.unwrap();
    let (plan, rows) = found.plans.remove(0);
    assert_eq!(plan.name, "");
    let plan = v1::Plan { origin: Some(found.origin), ..plan };
    let sent = send_plan(&mut client, "sent", plan.clone(), vec![rows.clone()]).await.unwrap();
    assert_eq!(sent.name, "days/day/plans/sent");
    assert_eq!(sent.origin, plan.origin);
    assert_eq!(sent.objective, plan.objective);
    assert_eq!(findings(&mut client, &sent).await, []);

    // Grant what was refused: the audit objects, and so it does to a wrong objective.
    let mut wrong = rows.clone();
    let granted = &mut wrong.decisions[0];
    granted.verdict = v1::Verdict::Granted.into();
    granted.option = Some(1);
    let sent = send_plan(&mut client, "wrong", plan.clone(), vec![wrong]).await.unwrap();
    assert!(findings(&mut client, &sent).await.contains(&v1::FindingKind::Separation));
    let better = v1::Plan { objective: plan.objective * 2.0, ..plan.clone() };
    let sent = send_plan(&mut client, "better", better, vec![rows.clone()]).await.unwrap();
    assert!(findings(&mut client, &sent).await.contains(&v1::FindingKind::Figure));

    // A change beside the plan that can't be flown.
    let mut unflyable = rows.clone();
    let stretch = unflyable.decisions[1].stretches[0].stretch.as_mut().unwrap();
    stretch.level_ft = 36_000.0;
    send_plan(&mut client, "unflyable", plan.clone(), vec![unflyable]).await.unwrap();
    let asked = ask(&mut client, "days/day/plans/unflyable", change("F3", 37_000.0, 1800)).await;
    assert_eq!(asked.unwrap_err().code(), Code::FailedPrecondition);

    let other = v1::PlanOrigin { day_sha256: "0".repeat(64), ..plan.origin.clone().unwrap() };
    let other = v1::Plan { origin: Some(other), ..plan };
    let status = send_plan(&mut client, "other", other, vec![rows]).await.unwrap_err();
    assert_eq!(status.code(), Code::FailedPrecondition);
    assert!(status.get_error_details().precondition_failure().is_some());
}

#[tokio::test]
async fn bad_rows_of_a_plan_are_named() {
    let channel = service(small()).await;
    let day = contested_day(&channel).await;
    let mut client = PlanServiceClient::new(channel);
    let origin = v1::PlanOrigin {
        day_sha256: day.day_sha256,
        stopped: v1::Stopped::Optimal.into(),
        ..Default::default()
    };
    let plan = v1::Plan { origin: Some(origin), ..Default::default() };
    let decision = v1::Decision {
        proposal: "P9".into(),
        flight: "F1".into(),
        net_benefit: f64::NAN,
        stretches: vec![v1::PlannedStretch::default()],
        reasons: vec![v1::Reason::default()],
        ..Default::default()
    };
    let points = v1::Points {
        epoch: at(0),
        seconds_after_epoch: vec![f64::NAN],
        lon_deg: vec![0.0],
        lat_deg: vec![0.0],
        level_ft: vec![0.0],
        fix: vec![],
    };
    let moved = v1::FlightPoints { flight: "F1".into(), points: Some(points) };
    let rows =
        v1::PlanRows { decisions: vec![decision], moved_points: vec![moved], ..Default::default() };
    let status = send_plan(&mut client, "bad", plan, vec![rows]).await.unwrap_err();
    let details = status.get_error_details();
    let fields = details.bad_request().unwrap().field_violations.iter();
    let fields: Vec<_> = fields.map(|v| v.field.as_str()).collect();
    assert_eq!(
        fields,
        [
            "decisions[0].verdict",
            "decisions[0].net_benefit",
            "decisions[0].proposal",
            "decisions[0].stretches[0].stretch",
            "decisions[0].reasons[0].constraint",
            "moved_points[0].points[0]",
        ]
    );
}
