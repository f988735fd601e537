//! Plans kept under a day, made here or sent, so that changes can be asked about beside them and
//! an audit can judge them.

use std::collections::BTreeMap;
use std::sync::Arc;

use rimeshift_engine::answer::{LossIn, Plan, PlanLoss, Stopped, Verdict};
use rimeshift_engine::audit::{ClaimedDecision, PlanUnderAudit};
use rimeshift_engine::change::change_levels;
use rimeshift_engine::day::{Day, HandDecision, Policy, Stretch};
use rimeshift_engine::ids::FlightId;
use rimeshift_engine::plan::{PlanState, Unmet};
use rimeshift_engine::traffic::Traffic;
use tokio::sync::OnceCell;

use crate::compute::{Compute, Work};
use crate::days::Ready;
use crate::error::ServiceError;
use crate::names::PlanName;

/// A plan that is kept.
#[derive(Debug)]
pub(crate) struct KeptPlan {
    /// Its name.
    pub(crate) name: PlanName,
    /// The policy by which it was made and is judged.
    pub(crate) policy: Policy,
    /// What it says of itself.
    pub(crate) record: PlanRecord,
    /// What an audit judges.
    pub(crate) claim: PlanUnderAudit,
    /// The day as it makes it, worked out when first asked about.
    state: OnceCell<Arc<PlanState>>,
}

/// What a plan says of itself.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct PlanRecord {
    /// Version of the program that made it.
    pub(crate) program_version: String,
    /// Seed of its search.
    pub(crate) seed: u64,
    /// Why its search stopped.
    pub(crate) stopped: Stopped,
    /// A proven upper bound on any plan's objective.
    pub(crate) bound: Option<f64>,
    /// The gap of the best plan of its search.
    pub(crate) gap: Option<f64>,
    /// 1 is the best of its search.
    pub(crate) rank: u32,
    /// Sum of the net benefits.
    pub(crate) objective: f64,
    /// Expected new losses.
    pub(crate) expected_new_losses: f64,
    /// Its rows, counted.
    pub(crate) counts: Counts,
    /// What was decided by hand beside the day's own decisions.
    pub(crate) by_hand: ByHand,
}

/// Decisions by hand of a search, beside the day's own.
#[derive(Debug, Clone, PartialEq, Default)]
pub(crate) struct ByHand {
    /// The decisions.
    pub(crate) decisions: Vec<HandDecision>,
    /// What was to become of those that can't be met.
    pub(crate) unmet_are: Unmet,
    /// Those that were planned around, the day's own included.
    pub(crate) unmet: Vec<HandDecision>,
}

impl ByHand {
    /// All that a plan of the day must keep.
    pub(crate) fn in_force(&self, day: &Day) -> Vec<HandDecision> {
        let mut all = day.decisions.clone();
        all.extend(&self.decisions);
        all.retain(|decision| !self.unmet.contains(decision));
        all.sort_unstable();
        all.dedup();
        all
    }
}

/// How many rows a plan has.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub(crate) struct Counts {
    pub(crate) granted: usize,
    pub(crate) amended: usize,
    pub(crate) refused: usize,
    pub(crate) invalid: usize,
    pub(crate) moved_flights: usize,
    pub(crate) removed_losses: usize,
    pub(crate) new_losses: usize,
}

impl Counts {
    /// Of verdicts, and of the flights that granted decisions move.
    pub(crate) fn of_decisions(decisions: &[ClaimedDecision]) -> Self {
        let mut counts = Self::default();
        for decision in decisions {
            match decision.verdict {
                Verdict::Granted => counts.granted += 1,
                Verdict::Amended => counts.amended += 1,
                Verdict::Refused => counts.refused += 1,
                Verdict::Invalid => counts.invalid += 1,
            }
        }
        counts.moved_flights = stretches_by_flight(decisions).len();
        counts
    }

    /// Of a plan made here.
    pub(crate) fn of_plan(plan: &Plan, decisions: &[ClaimedDecision], same_loss_s: f64) -> Self {
        Self {
            removed_losses: removed_losses(&plan.losses, same_loss_s),
            new_losses: plan.losses.iter().filter(|loss| loss.new).count(),
            ..Self::of_decisions(decisions)
        }
    }
}

/// Filed losses without a planned one of the same pair that is at most `same_loss_s` apart.
fn removed_losses(losses: &[PlanLoss], same_loss_s: f64) -> usize {
    let mut planned: BTreeMap<(FlightId, FlightId), Vec<&PlanLoss>> = BTreeMap::new();
    for loss in losses.iter().filter(|l| l.version == LossIn::Planned) {
        planned.entry((loss.loss.first, loss.loss.second)).or_default().push(loss);
    }
    let remains = |filed: &&PlanLoss| {
        let pair = (filed.loss.first, filed.loss.second);
        planned.get(&pair).into_iter().flatten().any(|planned| {
            let gap_s = (planned.loss.from_s - filed.loss.until_s)
                .max(filed.loss.from_s - planned.loss.until_s);
            gap_s <= same_loss_s
        })
    };
    let filed = losses.iter().filter(|l| l.version == LossIn::Filed);
    filed.filter(|loss| !remains(loss)).count()
}

impl KeptPlan {
    /// A plan to be kept.
    pub(crate) fn new(
        name: PlanName,
        policy: Policy,
        record: PlanRecord,
        claim: PlanUnderAudit,
    ) -> Self {
        Self { name, policy, record, claim, state: OnceCell::new() }
    }

    /// The day as this plan makes it; `ready` is the day under the plan's policy.
    pub(crate) async fn state(
        self: &Arc<Self>,
        ready: &Arc<Ready>,
        compute: &Compute,
    ) -> Result<Arc<PlanState>, ServiceError> {
        let (plan, ready) = (Arc::clone(self), Arc::clone(ready));
        let make = || async move {
            let made = move |_: &_| planned_day(&ready.traffic, &plan).map(Arc::new);
            compute.run(Work::Ask, None, made).await?
        };
        self.state.get_or_try_init(make).await.cloned()
    }
}

/// The stretches that granted decisions give each flight, from the climb first, then by start.
fn stretches_by_flight(decisions: &[ClaimedDecision]) -> BTreeMap<FlightId, Vec<Stretch>> {
    let mut by_flight: BTreeMap<FlightId, Vec<Stretch>> = BTreeMap::new();
    for decision in decisions {
        if matches!(decision.verdict, Verdict::Granted | Verdict::Amended) {
            let stretches = by_flight.entry(decision.flight).or_default();
            stretches.extend(decision.stretches.iter().map(|s| Stretch {
                level_ft: s.level_ft,
                from_s: s.from_s,
                until_s: s.until_s,
            }));
        }
    }
    for stretches in by_flight.values_mut() {
        sort_by_start(stretches);
    }
    by_flight
}

/// Sorts stretches as the engine takes them: from the climb first, then by start.
pub(crate) fn sort_by_start(stretches: &mut [Stretch]) {
    let start_s = |s: &Stretch| s.from_s.unwrap_or(f64::NEG_INFINITY);
    stretches.sort_by(|a, b| start_s(a).total_cmp(&start_s(b)));
}

fn planned_day(traffic: &Traffic, plan: &KeptPlan) -> Result<PlanState, ServiceError> {
    let mut changes = Vec::new();
    for (id, stretches) in stretches_by_flight(&plan.claim.decisions) {
        // Ids of a plan are of its own day.
        let Some(track) = traffic.tracks.get(id) else { continue };
        let flight = traffic.flight(id);
        let change = change_levels(&traffic.day, flight, track, &stretches);
        let change = change.map_err(|_| ServiceError::Precondition {
            subject: plan.name.to_string(),
            problem: format!(
                "its grants of flight `{}` can't be flown; AuditPlan says more",
                flight.name
            ),
        })?;
        changes.push((id, change));
    }
    Ok(PlanState::new(traffic, changes))
}

#[cfg(test)]
mod tests {
    use super::*;
    use rimeshift_engine::answer::Loss;

    fn loss(version: LossIn, second: u32, from_s: f64) -> PlanLoss {
        let loss = Loss {
            first: FlightId(0),
            second: FlightId(second),
            from_s,
            until_s: from_s + 10.0,
            closest_s: from_s,
            horizontal_m: 0.0,
            vertical_ft: 0.0,
            sector: None,
        };
        PlanLoss { loss, version, new: false }
    }

    #[test]
    fn a_filed_loss_is_removed_unless_a_planned_one_of_its_pair_is_near() {
        let losses = [
            loss(LossIn::Both, 1, 0.0),
            loss(LossIn::Filed, 2, 0.0),
            loss(LossIn::Filed, 3, 0.0),
            loss(LossIn::Planned, 3, 100.0),
            loss(LossIn::Filed, 4, 0.0),
            loss(LossIn::Planned, 4, 131.0),
        ];
        // 2 has none; 3's is 90 s apart; 4's is 121 s apart.
        assert_eq!(removed_losses(&losses, 120.0), 2);
    }
}
