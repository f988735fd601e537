//! From the search's choices to a plan: verdicts, figures, new profiles, loads and losses.

use rayon::prelude::*;

use super::options::Grant;
use super::problem::Problem;
use super::refusal::Chosen;
use super::state::PlanState;
use crate::answer::{
    Decision, LossIn, MovedProfile, Plan, PlanLoss, PlannedStretch, Reason, Verdict,
};
use crate::change::{Change, written_points};
use crate::day::Stretch;
use crate::geometry::geodesic::{GeodesicLeg, LonLat};
use crate::ids::{FlightId, ProposalId};
use crate::search::{Index, State, choice};
use crate::separation::{expected_new_losses, is_known, losses_of_moved};
use crate::traffic::Traffic;

/// The plan that choices make.
pub(super) fn plan_of(
    traffic: &Traffic,
    problem: &Problem,
    index: &Index,
    choices: &[u32],
) -> Plan {
    let changes = (0u32..).zip(choices).filter_map(|(group, &candidate)| {
        let combination = problem.combination(choice(group, candidate))?;
        Some((problem.asking[group as usize].flight, combination.change.clone()))
    });
    let state = PlanState::new(traffic, changes);
    let chosen = Chosen { traffic, problem, choices, state: &state };
    let proposals: Vec<ProposalId> = traffic.day.proposals.ids().collect();
    let decisions: Vec<Decision> = proposals
        .into_par_iter()
        .map_init(
            || State::new(index, choices),
            |searched, proposal| decision(&chosen, searched.as_mut(), proposal),
        )
        .collect();
    let moved = state
        .moved()
        .map(|(flight, moved)| MovedProfile {
            flight,
            points: written_points(&traffic.flight(flight).profile, &moved.change),
        })
        .collect();
    let versions = state.versions(traffic);
    Plan {
        objective: problem.quantum.amount(problem.model.objective(choices)),
        expected_new_losses: expected_new_losses(&traffic.scene, &versions),
        decisions,
        moved,
        loads: state.loads().load_counts(),
        losses: losses(traffic, &state),
    }
}

/// The decision on a proposal; `searched` is the search's state of the plan's choices.
fn decision(chosen: &Chosen<'_>, searched: Option<&mut State<'_>>, id: ProposalId) -> Decision {
    let proposal = &chosen.traffic.day.proposals[id];
    let judged = &chosen.problem.judged[id];
    let as_asked = Grant { proposal: id, alternative: 0 };
    let (_, granted) = chosen.granted(id);
    let verdict = match granted {
        Some(grant) if grant.alternative == 0 => Verdict::Granted,
        Some(_) => Verdict::Amended,
        None if judged.iter().all(|j| j.flown.is_err()) => Verdict::Invalid,
        None => Verdict::Refused,
    };
    let reasons: Vec<Reason> = match verdict {
        Verdict::Granted => Vec::new(),
        Verdict::Amended => chosen.why_not(as_asked),
        Verdict::Refused | Verdict::Invalid => (0..judged.len() as u32)
            .flat_map(|alternative| chosen.why_not(Grant { proposal: id, alternative }))
            .collect(),
    };
    let exchange = match verdict {
        Verdict::Refused => searched
            .and_then(|state| chosen.exchange(state, as_asked))
            .filter(|e| !e.drops.is_empty()),
        Verdict::Granted | Verdict::Amended | Verdict::Invalid => None,
    };
    let change = chosen.state.moved_flight(proposal.flight).map(|moved| &moved.change);
    let figures = granted.and_then(|g| judged[g.alternative as usize].figures());
    let figures = figures.unwrap_or_default();
    let shown = granted.unwrap_or(as_asked);
    Decision {
        proposal: id,
        flight: proposal.flight,
        verdict,
        option: granted.map(|g| proposal.alternatives[g.alternative as usize].option),
        stretches: planned_stretches(
            chosen.traffic,
            proposal.flight,
            &proposal.alternatives[shown.alternative as usize].stretches,
            change.filter(|_| granted.is_some()),
        ),
        net_benefit: granted
            .map_or(0.0, |g| chosen.problem.quantum.amount(chosen.problem.worth(g))),
        contrail_km_avoided: figures.contrail_km_avoided,
        extra_fuel_kg: figures.extra_fuel_kg,
        arrival_shift_s: change.filter(|_| granted.is_some()).map_or(0.0, Change::arrival_shift_s),
        reasons,
        exchange,
    }
}

/// Stretches with the times that a change, which has them among its own, gives them.
pub(crate) fn planned_stretches(
    traffic: &Traffic,
    flight: FlightId,
    stretches: &[Stretch],
    change: Option<&Change>,
) -> Vec<PlannedStretch> {
    let profile = &traffic.flight(flight).profile;
    stretches
        .iter()
        .map(|stretch| {
            let times = change.and_then(|change| change.times_of(stretch));
            let near_s = times.map(|t| t.filed_from_s).or(stretch.from_s);
            PlannedStretch {
                level_ft: stretch.level_ft,
                from_s: stretch.from_s,
                until_s: stretch.until_s,
                planned_from_s: times.map(|t| t.planned_from_s),
                planned_until_s: times.map(|t| t.planned_until_s),
                near_fix: near_s.and_then(|at_s| nearest_fix(profile, at_s)),
            }
        })
        .collect()
}

/// The name of the filed point nearest to the place that is passed at a filed time.
fn nearest_fix(profile: &crate::day::Profile, filed_s: f64) -> Option<String> {
    let points = profile.points();
    if points.iter().all(|p| p.fix.is_none()) {
        return None;
    }
    let place = |p: &crate::day::Point| LonLat { lon_deg: p.lon_deg, lat_deg: p.lat_deg };
    let leg = profile.leg_at(filed_s);
    let (a, b) = (&points[leg], &points[leg + 1]);
    let share = (filed_s - a.time_s) / (b.time_s - a.time_s);
    let here = GeodesicLeg::new(place(a), place(b)).at(share.clamp(0.0, 1.0));
    let distance_m = |p: &crate::day::Point| GeodesicLeg::new(here, place(p)).length_m;
    points
        .iter()
        .filter_map(|p| Some((distance_m(p), p.fix.as_deref()?)))
        .min_by(|a, b| a.0.total_cmp(&b.0))
        .map(|(_, fix)| fix.to_owned())
}

/// The losses of the filed day and of the planned one, by pair and time.
fn losses(traffic: &Traffic, state: &PlanState) -> Vec<PlanLoss> {
    let is_moved = |id: FlightId| state.moved_flight(id).is_some();
    let mut found: Vec<PlanLoss> = traffic
        .scene
        .losses()
        .iter()
        .map(|&loss| {
            let moved = is_moved(loss.first) || is_moved(loss.second);
            let version = if moved { LossIn::Filed } else { LossIn::Both };
            let loss = traffic.located(loss, traffic.path(loss.first, None));
            PlanLoss { loss, version, new: false }
        })
        .collect();
    let versions: Vec<_> = state.moved().map(|(id, _)| state.version(traffic, id)).collect();
    found.extend(losses_of_moved(&traffic.scene, &versions).into_iter().map(|loss| {
        let first = state.version(traffic, loss.first);
        let second = state.version(traffic, loss.second);
        let filed = traffic.scene.losses_of(loss.first, loss.second);
        let off_level_s = [first.path.off_level_s(), second.path.off_level_s()];
        let new = !is_known(&loss, filed, off_level_s, &traffic.day.policy);
        PlanLoss { loss: traffic.located(loss, first.path), version: LossIn::Planned, new }
    }));
    found.sort_by(|a, b| {
        let key = |l: &PlanLoss| (l.loss.first, l.loss.second);
        key(a)
            .cmp(&key(b))
            .then(a.loss.from_s.total_cmp(&b.loss.from_s))
            .then(a.version.cmp(&b.version))
    });
    found
}
