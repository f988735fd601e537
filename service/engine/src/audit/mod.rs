//! Is a plan what it claims to be?
//!
//! A slow, independent judge of a plan. It shares no code with what makes plans: it knows the day
//! ([`crate::day`]), the words of the answer ([`crate::answer`]), the WGS 84 geodesic and whether a
//! point is inside a polygon; all else it works out for itself, in another way. A mistake in the
//! engine's fast paths is therefore found here, unless it was made twice.
//!
//! What it judges, and how:
//! 1. **Decisions**: each proposal has one, which fits it; granted options keep the rules of level
//!    changes; `invalid` is said exactly where every option breaks one.
//! 2. **Profiles**: each moved flight's profile is derived anew from the options granted, in
//!    standard air and calm, at constant Mach number; written points are compared with it, never
//!    trusted.
//! 3. **Separation**: every pair with a moved flight that comes near is followed in time, by looks
//!    between which nothing can happen; ends of losses are bisected. No loss may be new.
//! 4. **Load**: crossings of sectors are found by looks and bisection, too; all counts are made
//!    anew, filed and planned, and no limited one may be worse than the larger of limit and filed.
//! 5. **Limits and figures**: those of the policy and of the senders; net benefits, fuel, arrival
//!    shifts, planned times, objective, bound and gap.
//! 6. **Maximality**: every option left out is tried alone against the finished plan.
//!
//! Borderline cases go to the plan: a fault reported is one for certain, by the tolerances of
//! `tolerances.rs`, each with its reason. What was judged is counted; what was not is said.
//!
//! Method of looks: if a quantity is `d` away from where anything changes, and can't change faster
//! than `v`, the next look is due after `d / v` (sphere tracing: J. C. Hart, The Visual Computer
//! 12, 1996, from memory).

mod by_hand;
mod claim;
mod decisions;
mod derive;
mod figures;
mod isa;
mod levels;
mod limits;
mod load;
mod maximal;
mod neighbours;
mod path;
mod report;
mod restricted;
mod separation;
mod stretches;
mod tolerances;
mod track;
mod visits;
mod world;
mod worth;
mod written;

#[cfg(test)]
mod tests;

pub use claim::{ClaimedDecision, ClaimedReason, ClaimedStretch, PlanUnderAudit, ReasonKind};
pub use report::{AuditReport, Checked, Figure, Finding, NotJudged, WrittenFault};

use rayon::prelude::*;

use self::load::Compared;
use self::tolerances::Lean;
use self::world::{Delays, Losses, World};
use crate::day::{Day, SeparationRule};
use crate::ids::{FlightId, Id};

/// Longest step between two sampled shifts of a flight, seconds.
const SHIFT_STEP_S: f64 = 5.0;
/// Most sampled shifts.
const MOST_SHIFTS: f64 = 96.0;

/// Judges a plan of a day.
#[must_use]
pub fn audit(day: &Day, plan: &PlanUnderAudit) -> AuditReport {
    let mut report = AuditReport::default();
    let tracks = world::tracks(day);
    let decided = decisions::match_decisions(day, plan, &mut report.findings);
    let combined = decisions::combined(day, &tracks, &decided.grants, &mut report.findings);
    let paths = combined.iter().map(|(&id, one)| (id, one.path.clone())).collect();
    let by_hand = plan.by_hand.clone().unwrap_or_else(|| day.decisions.clone());
    let world = World::new(day, &tracks, decided.grants.clone(), paths, by_hand);
    tracing::debug!("audit: days flown");

    decisions::judge_forbidden_places(&world, &mut report.findings);
    let (findings, derived) = decisions::judge_validity(&world, &decided);
    report.findings.extend(findings);
    report.checked.decisions = plan.decisions.len() as u64;
    report.checked.moved_flights = world.grants.len() as u64;
    report.checked.options_derived =
        derived + world.grants.values().map(|g| g.len() as u64).sum::<u64>();
    report.checked.visits = world.filed.iter().map(|f| f.raw.len() as u64).sum();

    judge_separation(&world, &mut report);
    tracing::debug!("audit: separation judged");
    judge_load(&world, &mut report);
    report.findings.extend(limits::judge_limits(&world));
    report.findings.extend(by_hand::judge_by_hand(&world));
    let AuditReport { findings, checked, not_judged } = &mut report;
    figures::judge_figures(&world, plan, &decided, &combined, (findings, not_judged, checked));
    if let Some(written) = &plan.written {
        checked.written_points = written::judge_written(&world, written, findings);
    }
    tracing::debug!("audit: load and figures judged");
    findings.extend(maximal::judge_reasons(&world, &decided));
    if day.policy.min_grant_rate_per_operator.is_some() {
        not_judged.push(NotJudged::GrantRate);
    }
    if day.policy.separation == SeparationRule::Nominal
        && day.policy.max_share_per_operator.is_none()
    {
        let (more, tried) = maximal::judge_maximality(&world, &decided);
        findings.extend(more);
        checked.options_tried = tried;
    } else {
        not_judged.push(NotJudged::Maximality);
    }
    report
}

fn judge_load(world: &World<'_>, report: &mut AuditReport) {
    let mut compared = Compared::default();
    for excess in world.loads.excesses(&mut compared) {
        report.findings.push(Finding::Overload {
            place: excess.place,
            measure: excess.measure,
            from_s: excess.from_s,
            until_s: excess.until_s,
            count: excess.count,
            filed: excess.filed,
            limit: excess.limit,
        });
    }
    report.checked.windows = compared.windows;
    report.checked.minutes = compared.minutes;
    report.checked.undecided_counts = compared.undecided;
}

/// The relative shifts at which losses count.
fn shifts_s(day: &Day) -> Vec<f64> {
    if day.policy.separation != SeparationRule::Buffered || day.policy.buffer_s == 0.0 {
        return vec![0.0];
    }
    let most_s = 2.0 * day.policy.buffer_s;
    let steps = (most_s / SHIFT_STEP_S).ceil().min(MOST_SHIFTS / 2.0);
    let each = (0..=steps as u32).map(|k| most_s * f64::from(k) / steps);
    // 0 once, then each both ways.
    each.flat_map(|s| if s == 0.0 { vec![0.0] } else { vec![-s, s] }).collect()
}

fn judge_separation(world: &World<'_>, report: &mut AuditReport) {
    match world.day.policy.separation {
        SeparationRule::Risk | SeparationRule::Priced => {
            report.not_judged.push(NotJudged::Separation);
            return;
        }
        SeparationRule::Buffered => report.not_judged.push(NotJudged::ShiftsBetweenSamples),
        SeparationRule::Nominal => {}
    }
    let sampled_s = shifts_s(world.day);
    let moved: Vec<FlightId> = world.planned.keys().copied().collect();
    for &later_s in &sampled_s {
        let delays = Delays { later_s, sampled_s: &sampled_s };
        let all: Vec<(FlightId, Losses)> = moved
            .par_iter()
            .map(|&flight| {
                let flown = world.current(flight);
                // A pair of two moved flights is followed once.
                let once = |other: FlightId| {
                    !world.planned.contains_key(&other) || flight.index() < other.index()
                };
                (flight, world.losses(flight, flown, true, delays, Lean::ForPlan, once))
            })
            .collect();
        for (flight, losses) in all {
            report.checked.pairs_followed += losses.pairs;
            report.checked.losses += losses.losses;
            report.findings.extend(losses.new.iter().map(|loss| {
                let (first, second) = (flight.min(loss.other), flight.max(loss.other));
                Finding::NewLoss {
                    first,
                    second,
                    // The moved flight was delayed; seen from the first, the second is early.
                    shift_s: if first == flight { -later_s } else { later_s },
                    from_s: loss.spell.from_s,
                    until_s: loss.spell.until_s,
                    closest_s: loss.spell.closest_s,
                    horizontal_m: loss.spell.horizontal_m,
                    vertical_ft: loss.spell.vertical_ft,
                }
            }));
        }
    }
}
