//! Plans with decisions by hand, of the day and of the request.

use rimeshift_proto::v1;
use rimeshift_proto::v1::hand_decision::About;
use rimeshift_proto::v1::plan_service_client::PlanServiceClient;
use tonic::transport::Channel;
use tonic::{Code, Status};
use tonic_types::StatusExt;

use crate::plans::{Found, contested_day, find, request};
use crate::support::{header, load, service, small, small_day};

fn grant(proposal: &str, option: Option<u32>) -> v1::HandDecision {
    let about = Some(About::Proposal(proposal.to_owned()));
    v1::HandDecision { about, must: v1::Must::Grant.into(), option }
}

fn refuse(proposal: &str) -> v1::HandDecision {
    v1::HandDecision { must: v1::Must::Refuse.into(), ..grant(proposal, None) }
}

fn keep(flight: &str) -> v1::HandDecision {
    let about = Some(About::Flight(flight.to_owned()));
    v1::HandDecision { about, must: v1::Must::Keep.into(), option: None }
}

async fn find_with(
    client: &mut PlanServiceClient<Channel>,
    decisions: Vec<v1::HandDecision>,
) -> Result<Found, Status> {
    find(client, v1::FindPlansRequest { decisions, ..request("") }).await
}

fn verdict(found: &Found, proposal: &str) -> v1::Verdict {
    let (_, rows) = &found.plans[0];
    rows.decisions.iter().find(|d| d.proposal == proposal).unwrap().verdict()
}

async fn audit(client: &mut PlanServiceClient<Channel>, plan: &str) -> Vec<v1::Finding> {
    let request = v1::AuditPlanRequest { name: plan.to_owned() };
    client.audit_plan(request).await.unwrap().into_inner().findings
}

#[tokio::test]
async fn decisions_of_a_request_are_kept_told_and_audited() {
    let channel = service(small()).await;
    contested_day(&channel).await;
    let mut client = PlanServiceClient::new(channel);
    let free = find(&mut client, request("free")).await.unwrap();
    assert_eq!(verdict(&free, "P2"), v1::Verdict::Granted);
    assert_eq!(verdict(&free, "P3"), v1::Verdict::Granted);

    let decisions = vec![refuse("P2"), keep("F3")];
    let request = v1::FindPlansRequest { decisions, ..request("decided") };
    let decided = find(&mut client, request).await.unwrap();
    assert_eq!(verdict(&decided, "P2"), v1::Verdict::Refused);
    assert_eq!(verdict(&decided, "P3"), v1::Verdict::Refused);
    assert_eq!(decided.origin.decisions, [refuse("P2"), keep("F3")]);
    assert!(!decided.origin.around_decisions);
    assert_eq!(audit(&mut client, "days/day/plans/decided").await, []);

    // A plan without them is not what was decided; nor does it hold as one made freely.
    for (id, origin, rows) in [
        ("undecided", &decided.origin, &free.plans[0]),
        ("unsaid", &free.origin, &decided.plans[0]),
    ] {
        let header = v1::LoadPlanHeader {
            parent: "days/day".into(),
            plan_id: id.into(),
            plan: Some(v1::Plan { origin: Some(origin.clone()), ..rows.0.clone() }),
            ..Default::default()
        };
        use v1::load_plan_request::Content;
        let messages = [Content::Header(header), Content::Rows(rows.1.clone())]
            .map(|content| v1::LoadPlanRequest { content: Some(content) });
        let loaded = client.load_plan(tokio_stream::iter(messages)).await.unwrap();
        let name = loaded.into_inner().plan.unwrap().name;
        assert_ne!(audit(&mut client, &name).await, [], "{id}");
    }
}

#[tokio::test]
async fn a_decision_that_cannot_be_met_is_told_or_planned_around() {
    let channel = service(small()).await;
    contested_day(&channel).await;
    let mut client = PlanServiceClient::new(channel);
    let status = find_with(&mut client, vec![grant("P1", None)]).await.unwrap_err();
    assert_eq!(status.code(), Code::FailedPrecondition, "{status}");
    let details = status.get_error_details();
    let [violation] = details.precondition_failure().unwrap().violations.as_slice() else {
        panic!("{details:?}")
    };
    assert_eq!(violation.subject, "grant proposal `P1`");
    let breaks = "option 1: a loss of separation with flight `F0`";
    assert!(violation.description.contains(breaks), "{}", violation.description);

    let request = v1::FindPlansRequest {
        decisions: vec![grant("P1", None), refuse("P2")],
        around_decisions: true,
        ..request("around")
    };
    let around = find(&mut client, request).await.unwrap();
    assert!(around.origin.around_decisions);
    assert_eq!(around.origin.unmet, [grant("P1", None)]);
    assert_eq!(verdict(&around, "P1"), v1::Verdict::Refused);
    assert_eq!(verdict(&around, "P2"), v1::Verdict::Refused);
    assert_eq!(audit(&mut client, "days/day/plans/around").await, []);
}

#[tokio::test]
async fn decisions_that_contradict_each_other_or_the_day_are_named() {
    let channel = service(small()).await;
    let own = vec![refuse("P1"), keep("F2")];
    let rows = v1::DayRows { decisions: own, ..small_day() };
    load(&channel, header("day"), vec![rows]).await.unwrap();
    let mut client = PlanServiceClient::new(channel);
    for (decisions, field, problem) in [
        (
            vec![keep("F3"), grant("P1", Some(1))],
            "decisions[1].must",
            "the day's own decision to refuse proposal `P1`",
        ),
        (
            vec![grant("P2", None)],
            "decisions[0].must",
            "the day's own decision to keep flight `F2` as filed",
        ),
        (vec![refuse("P3"), grant("P3", None)], "decisions[0].must", "contradicts decisions[1]"),
        (vec![keep("F3"), grant("P3", None)], "decisions[1].must", "contradicts decisions[0]"),
        (vec![grant("P9", None)], "decisions[0].proposal", "`P9` is no proposal of this day"),
        (vec![grant("P3", Some(7))], "decisions[0].option", "has no option 7"),
        (vec![v1::HandDecision::default()], "decisions[0].about", "is missing"),
    ] {
        let status = find_with(&mut client, decisions).await.unwrap_err();
        assert_eq!(status.code(), Code::InvalidArgument, "{status}");
        let details = status.get_error_details();
        let first = &details.bad_request().unwrap().field_violations[0];
        assert_eq!(first.field, field);
        assert!(first.description.contains(problem), "{}", first.description);
    }
    // What agrees with the day may be said again.
    find_with(&mut client, vec![refuse("P1"), refuse("P2"), keep("F2")]).await.unwrap();
}
