//! The figures of a plan, recomputed.

use std::collections::BTreeMap;

use super::claim::{ClaimedDecision, PlanUnderAudit};
use super::decisions::Decided;
use super::report::{Checked, Figure, Finding, NotJudged};
use super::tolerances::{Lean, QUANTUM, RELATIVE, TIME_S};
use super::world::{Combined, Grant, World, combine};
use super::worth::{FuelSource, contrail_km, fuel_kg, fuel_source, fuel_tolerance_kg, net};
use crate::answer::Verdict;
use crate::day::SeparationRule;
use crate::ids::{FlightId, Id, ProposalId};

/// What a figure is off by at most.
struct Figures<'f> {
    findings: &'f mut Vec<Finding>,
    checked: u64,
}

impl Figures<'_> {
    fn see(
        &mut self,
        figure: Figure,
        proposal: Option<ProposalId>,
        claimed: Option<f64>,
        found: f64,
        allowed: f64,
    ) {
        self.checked += 1;
        // Not-a-number is a fault, too.
        if !claimed.is_some_and(|value| (value - found).abs() <= allowed) {
            self.findings.push(Finding::WrongFigure { figure, proposal, claimed, found });
        }
    }
}

/// Extra fuel of each grant of a flight, in the order of grants: as given, or its marginal share
/// by the table, in order of first start, then of proposal. `None` where the table is unclear.
pub(super) fn extra_fuel_kg<'d>(
    world: &World<'d>,
    flight: FlightId,
    grants: &[Grant<'d>],
) -> Vec<Option<f64>> {
    let mut order: Vec<usize> = (0..grants.len()).collect();
    let start_s = |i: usize| {
        let first = grants[i].alternative.stretches.first();
        first.and_then(|s| s.from_s).unwrap_or(f64::NEG_INFINITY)
    };
    order.sort_by(|&i, &j| {
        start_s(i).total_cmp(&start_s(j)).then(grants[i].proposal.cmp(&grants[j].proposal))
    });
    let mut fuel = vec![None; grants.len()];
    for (rank, &i) in order.iter().enumerate() {
        let own = &world.day.flights[flight];
        fuel[i] = match fuel_source(world.day, own, grants[i].alternative) {
            FuelSource::Given(kg) => Some(kg),
            FuelSource::Unclear => None,
            FuelSource::Table(table) => {
                let so_far_kg = |count: usize| {
                    let part: Vec<Grant<'d>> = order[..count].iter().map(|&k| grants[k]).collect();
                    let one =
                        combine(world.day, world.tracks, flight, &part, Lean::ForPlan).ok()?;
                    Some(fuel_kg(&one.path, table))
                };
                so_far_kg(rank + 1).zip(so_far_kg(rank)).map(|(with, without)| with - without)
            }
        };
    }
    fuel
}

/// Compares all figures of a plan; gives how many.
pub(super) fn judge_figures(
    world: &World<'_>,
    plan: &PlanUnderAudit,
    decided: &Decided<'_, '_>,
    combined: &BTreeMap<FlightId, Combined<'_>>,
    report: (&mut Vec<Finding>, &mut Vec<NotJudged>, &mut Checked),
) {
    let (findings, not_judged, checked) = report;
    let mut figures = Figures { findings, checked: 0 };
    let sizes: f64 = decided.decisions.values().map(|d| d.net_benefit.abs()).sum();
    for (&flight, grants) in &world.grants {
        let Some(one) = combined.get(&flight) else { continue };
        let fuel = extra_fuel_kg(world, flight, grants);
        let shift_s = one.path.end_s() - world.filed[flight.index()].path.end_s();
        for (i, grant) in grants.iter().enumerate() {
            let Some(&decision) = decided.decisions.get(&grant.proposal) else { continue };
            let id = Some(grant.proposal);
            let claimed_s = Some(decision.arrival_shift_s);
            figures.see(Figure::ArrivalShift, id, claimed_s, shift_s, TIME_S);
            judge_stretch_times(&mut figures, decision, &one.planned_s[i]);
            let km = contrail_km(grant.alternative);
            let allowed = km.abs() * RELATIVE + 1e-9;
            let claimed_km = Some(decision.contrail_km_avoided);
            figures.see(Figure::ContrailKm, id, claimed_km, km, allowed);
            let source = fuel_source(world.day, &world.day.flights[flight], grant.alternative);
            match fuel[i] {
                Some(kg) => {
                    let allowed = fuel_tolerance_kg(source, kg);
                    let claimed_kg = Some(decision.extra_fuel_kg);
                    figures.see(Figure::ExtraFuel, id, claimed_kg, kg, allowed);
                }
                None => note(not_judged, NotJudged::Fuel),
            }
            // The claimed fuel was judged above; what follows from it is exact.
            let value = net(&world.day.policy, grant.alternative, decision.extra_fuel_kg);
            let allowed = value.size * RELATIVE + sizes * QUANTUM;
            figures.see(Figure::NetBenefit, id, Some(decision.net_benefit), value.value, allowed);
        }
    }
    for (&id, decision) in &decided.decisions {
        if matches!(decision.verdict, Verdict::Refused | Verdict::Invalid) {
            let claimed = Some(decision.net_benefit);
            figures.see(Figure::NetBenefit, Some(id), claimed, 0.0, 0.0);
        }
    }
    judge_exchanges(&mut figures, decided, sizes);
    judge_objective(&mut figures, world, plan, sizes, not_judged);
    checked.figures = figures.checked;
}

fn note(not_judged: &mut Vec<NotJudged>, what: NotJudged) {
    if !not_judged.contains(&what) {
        not_judged.push(what);
    }
}

fn judge_stretch_times(
    figures: &mut Figures<'_>,
    decision: &ClaimedDecision,
    planned_s: &[(f64, f64)],
) {
    let id = Some(decision.proposal);
    for (claimed, &(from_s, until_s)) in decision.stretches.iter().zip(planned_s) {
        figures.see(Figure::PlannedFrom, id, claimed.planned_from_s, from_s, TIME_S);
        figures.see(Figure::PlannedUntil, id, claimed.planned_until_s, until_s, TIME_S);
    }
}

fn judge_exchanges(figures: &mut Figures<'_>, decided: &Decided<'_, '_>, sizes: f64) {
    let taken = |id: &ProposalId| {
        decided
            .decisions
            .get(id)
            .filter(|d| matches!(d.verdict, Verdict::Granted | Verdict::Amended))
    };
    for (&proposal, decision) in &decided.decisions {
        let Some(exchange) = &decision.exchange else { continue };
        for &dropped in exchange.drops.iter().filter(|id| taken(id).is_none()) {
            figures.findings.push(Finding::ExchangeDropsNothing { proposal, dropped });
        }
        let lost: f64 = exchange.drops.iter().filter_map(taken).map(|d| d.net_benefit).sum();
        let allowed = sizes * (RELATIVE + QUANTUM);
        let claimed = Some(exchange.objective_lost);
        figures.see(Figure::ObjectiveLost, Some(proposal), claimed, lost, allowed);
    }
}

fn judge_objective(
    figures: &mut Figures<'_>,
    world: &World<'_>,
    plan: &PlanUnderAudit,
    sizes: f64,
    not_judged: &mut Vec<NotJudged>,
) {
    if world.day.policy.separation == SeparationRule::Priced {
        note(not_judged, NotJudged::Objective);
    } else {
        let sum: f64 = plan.decisions.iter().map(|d| d.net_benefit).sum();
        let allowed = sizes * (RELATIVE + QUANTUM);
        figures.see(Figure::Objective, None, Some(plan.objective), sum, allowed);
    }
    let Some(bound) = plan.bound else { return };
    figures.checked += 1;
    let allowed = (sizes + bound.abs()) * (RELATIVE + QUANTUM);
    if bound < plan.objective - allowed || bound.is_nan() {
        let objective = plan.objective;
        figures.findings.push(Finding::BoundBelowObjective { bound, objective });
    }
    if let Some(gap) = plan.gap {
        let found = (bound - plan.objective).max(0.0) / bound.abs().max(1e-9);
        figures.see(Figure::Gap, None, Some(gap), found, RELATIVE * (1.0 + found));
    }
}
