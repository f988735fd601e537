//! Small days on the equator, where geodesics are straight in longitude and times are closed
//! forms, and plans of them that claim what the judge itself derives.

use crate::answer::{MovedProfile, ProfilePoint, Verdict};
use crate::audit::path::Path;
use crate::audit::tolerances::Lean;
use crate::audit::world::{Grant, combine, tracks};
use crate::audit::worth::{contrail_km, net};
use crate::audit::{AuditReport, Finding};
use crate::audit::{
    ClaimedDecision, ClaimedReason, ClaimedStretch, PlanUnderAudit, ReasonKind, audit,
};
use crate::day::*;
use crate::ids::{FlightId, Id, ProposalId};

/// A flight through points (minutes, longitude, latitude, flight level).
pub(super) fn flight(name: &str, points: &[(f64, f64, f64, f64)]) -> FlightParts {
    FlightParts {
        flight: name.to_owned(),
        departure: "XAAA".to_owned(),
        destination: "XBBB".to_owned(),
        aircraft: "ANY".to_owned(),
        rvsm: true,
        movable: true,
        points: points
            .iter()
            .map(|&(minutes, lon_deg, lat_deg, fl)| PointParts {
                time_s: minutes * 60.0,
                lon_deg,
                lat_deg,
                level_ft: fl * 100.0,
                fix: None,
            })
            .collect(),
        ..FlightParts::default()
    }
}

/// Eastward along a parallel at 8 degrees an hour: climb, cruise from minute 10 to 110, descent.
pub(super) fn eastward(name: &str, lat_deg: f64, fl: f64) -> FlightParts {
    flight(
        name,
        &[
            (0.0, 0.0, lat_deg, 100.0),
            (10.0, 1.0, lat_deg, fl),
            (60.0, 7.0, lat_deg, fl),
            (110.0, 13.0, lat_deg, fl),
            (120.0, 14.0, lat_deg, 50.0),
        ],
    )
}

/// A sector over a box, FL 245 to 460, open all day, without limits.
pub(super) fn sector(name: &str, west: f64, east: f64) -> (SectorParts, CapacityParts) {
    let ring = vec![[west, -5.0], [east, -5.0], [east, 5.0], [west, 5.0], [west, -5.0]];
    let volume = VolumeParts { rings: vec![ring], floor_ft: 24_500.0, ceiling_ft: 46_000.0 };
    let parts =
        SectorParts { sector: name.to_owned(), volumes: vec![volume], ..SectorParts::default() };
    let capacity = CapacityParts {
        sector: name.to_owned(),
        from_s: -86_400.0,
        until_s: 2.0 * 86_400.0,
        ..CapacityParts::default()
    };
    (parts, capacity)
}

/// A stretch, minutes and flight level.
pub(super) fn stretch(from: Option<f64>, until: Option<f64>, fl: f64) -> StretchParts {
    StretchParts {
        level_ft: fl * 100.0,
        from_s: from.map(|m| m * 60.0),
        until_s: until.map(|m| m * 60.0),
    }
}

/// An option that avoids 100 km of contrail.
pub(super) fn option(option: u32, stretches: Vec<StretchParts>) -> AlternativeParts {
    AlternativeParts {
        option,
        stretches,
        contrail_km_avoided: Some(100.0),
        ef_avoided_j: None,
        extra_fuel_kg: Some(50.0),
        max_extra_fuel_kg: None,
        priority: 1.0,
    }
}

/// A proposal of options numbered from 1.
pub(super) fn proposal(
    name: &str,
    flight: &str,
    alternatives: Vec<AlternativeParts>,
) -> ProposalParts {
    ProposalParts { proposal: name.to_owned(), flight: flight.to_owned(), alternatives }
}

pub(super) fn parts() -> DayParts {
    let mut parts = DayParts::empty(Date { year: 2031, month: 3, day: 4 }, "Equator");
    parts.policy.level_direction = LevelDirection::Free;
    for (sector, capacity) in [sector("EAST", 7.0, 20.0), sector("WEST", -5.0, 7.0)] {
        parts.sectors.push(sector);
        parts.capacities.push(capacity);
    }
    parts
}

/// One flight A at FL 350 and one proposal P: FL 330 from minute 20 to 100.
pub(super) fn simple() -> DayParts {
    let mut parts = parts();
    parts.flights.push(eastward("A", 0.0, 350.0));
    let as_asked = option(1, vec![stretch(Some(20.0), Some(100.0), 330.0)]);
    parts.proposals.push(proposal("P", "A", vec![as_asked]));
    parts
}

pub(super) fn build(parts: DayParts) -> Day {
    Day::build(parts).unwrap().day
}

pub(super) fn grant(day: &Day, proposal: u32, option: u32) -> Grant<'_> {
    let id = ProposalId(proposal);
    let alternative = day.proposals[id].alternatives.iter().find(|a| a.option == option).unwrap();
    Grant { proposal: id, alternative }
}

/// A plan that takes options (proposal, option) and refuses the rest, with figures as derived.
pub(super) fn plan(day: &Day, taken: &[(u32, u32)]) -> PlanUnderAudit {
    let tracks = tracks(day);
    let mut decisions: Vec<ClaimedDecision> =
        day.proposals.iter_with_id().map(|(id, p)| refusal(id, p)).collect();
    let mut written = Vec::new();
    for flight in day.flights.ids() {
        let grants: Vec<Grant<'_>> = taken
            .iter()
            .filter(|&&(p, _)| day.proposals[ProposalId(p)].flight == flight)
            .map(|&(p, o)| grant(day, p, o))
            .collect();
        if grants.is_empty() {
            continue;
        }
        let Ok(one) = combine(day, &tracks, flight, &grants, Lean::ForPlan) else {
            claim_grants(day, &grants, &mut decisions);
            continue;
        };
        claim_grants(day, &grants, &mut decisions);
        let shift_s = one.path.end_s() - day.flights[flight].profile.end_s();
        for (grant, times) in grants.iter().zip(&one.planned_s) {
            let decision = &mut decisions[grant.proposal.index()];
            decision.arrival_shift_s = shift_s;
            for (stretch, &(from_s, until_s)) in decision.stretches.iter_mut().zip(times) {
                stretch.planned_from_s = Some(from_s);
                stretch.planned_until_s = Some(until_s);
            }
        }
        written.push(points(flight, &one.path));
    }
    let objective = decisions.iter().map(|d| d.net_benefit).sum();
    PlanUnderAudit {
        objective,
        bound: None,
        gap: None,
        decisions,
        written: Some(written),
        by_hand: None,
    }
}

fn claim_grants(day: &Day, grants: &[Grant<'_>], decisions: &mut [ClaimedDecision]) {
    for grant in grants {
        let decision = &mut decisions[grant.proposal.index()];
        let number = grant.alternative.option;
        decision.verdict = if number == 1 { Verdict::Granted } else { Verdict::Amended };
        decision.option = Some(number);
        decision.stretches = grant.alternative.stretches.iter().map(as_asked).collect();
        decision.contrail_km_avoided = contrail_km(grant.alternative);
        decision.extra_fuel_kg = grant.alternative.extra_fuel_kg.unwrap_or(0.0);
        decision.net_benefit = net(&day.policy, grant.alternative, decision.extra_fuel_kg).value;
        decision.reasons.retain(|_| number != 1);
    }
}

fn as_asked(s: &Stretch) -> ClaimedStretch {
    ClaimedStretch {
        level_ft: s.level_ft,
        from_s: s.from_s,
        until_s: s.until_s,
        planned_from_s: None,
        planned_until_s: None,
    }
}

fn refusal(id: ProposalId, proposal: &Proposal) -> ClaimedDecision {
    ClaimedDecision {
        proposal: id,
        flight: proposal.flight,
        verdict: Verdict::Refused,
        option: None,
        stretches: proposal.alternatives[0].stretches.iter().map(as_asked).collect(),
        net_benefit: 0.0,
        contrail_km_avoided: 0.0,
        extra_fuel_kg: 0.0,
        arrival_shift_s: 0.0,
        reasons: vec![ClaimedReason { option: Some(1), kind: ReasonKind::Separation }],
        exchange: None,
    }
}

fn points(flight: FlightId, path: &Path<'_>) -> MovedProfile {
    let points = path
        .knots()
        .iter()
        .map(|knot| {
            let place = path.track.geodesic_place(knot.filed_s);
            ProfilePoint {
                time_s: knot.time_s,
                lon_deg: place.lon_deg,
                lat_deg: place.lat_deg,
                level_ft: knot.level_ft,
                fix: None,
            }
        })
        .collect();
    MovedProfile { flight, points }
}

/// What the judge finds in a plan that takes these options.
pub(super) fn findings(day: &Day, taken: &[(u32, u32)]) -> Vec<Finding> {
    audit(day, &plan(day, taken)).findings
}

/// What the judge finds after one change to a sound plan of [`simple`], which passes without it.
pub(super) fn after(change: impl FnOnce(&mut PlanUnderAudit)) -> Vec<Finding> {
    let day = build(simple());
    let mut plan = plan(&day, &[(0, 1)]);
    assert_sound(&audit(&day, &plan));
    change(&mut plan);
    audit(&day, &plan).findings
}

pub(super) fn assert_sound(report: &AuditReport) {
    assert!(report.passed(), "{:#?}", report.findings);
}
