//! What a plan claims: the side of the judge on which the plan stands.

use crate::answer::{
    Constraint, Decision, Exchange, LoadMeasure, MovedProfile, Plan, Reason, Verdict,
};
use crate::day::HandDecision;
use crate::ids::{FlightId, ProposalId};

/// A plan as it is handed out or read from its files; nothing in it is believed.
#[derive(Debug, Clone, PartialEq)]
pub struct PlanUnderAudit {
    /// Sum of the net benefits.
    pub objective: f64,
    /// Upper bound on any plan's objective, if one is claimed.
    pub bound: Option<f64>,
    /// (bound − objective) / max(|bound|, 1e-9), if claimed.
    pub gap: Option<f64>,
    /// The verdicts.
    pub decisions: Vec<ClaimedDecision>,
    /// The new profiles as written, where they are judged too.
    pub written: Option<Vec<MovedProfile>>,
    /// The decisions by hand that it was made under; `None`: those of the day.
    pub by_hand: Option<Vec<HandDecision>>,
}

/// The verdict on one proposal, as claimed.
#[derive(Debug, Clone, PartialEq)]
pub struct ClaimedDecision {
    /// The proposal.
    pub proposal: ProposalId,
    /// Its flight.
    pub flight: FlightId,
    /// What became of it.
    pub verdict: Verdict,
    /// Number of the option taken.
    pub option: Option<u32>,
    /// The stretches taken; those as asked where none is.
    pub stretches: Vec<ClaimedStretch>,
    /// Its share of the objective.
    pub net_benefit: f64,
    /// Contrail kilometres avoided.
    pub contrail_km_avoided: f64,
    /// Extra fuel, kg.
    pub extra_fuel_kg: f64,
    /// Shift of the flight's arrival by all its grants, seconds.
    pub arrival_shift_s: f64,
    /// Why it was not taken as asked.
    pub reasons: Vec<ClaimedReason>,
    /// What would make room for it.
    pub exchange: Option<Exchange>,
}

/// A stretch, as claimed; times in seconds of the day.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ClaimedStretch {
    /// The level, feet.
    pub level_ft: f64,
    /// Filed time of the start; `None`: from the climb.
    pub from_s: Option<f64>,
    /// Filed time of the return; `None`: until the descent.
    pub until_s: Option<f64>,
    /// When the planned profile starts to leave its filed level.
    pub planned_from_s: Option<f64>,
    /// When it starts to return.
    pub planned_until_s: Option<f64>,
}

/// A reason, as claimed.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct ClaimedReason {
    /// The option that it keeps out; `None` means the one as asked.
    pub option: Option<u32>,
    /// Its kind.
    pub kind: ReasonKind,
}

/// The kinds of reasons.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum ReasonKind {
    /// A count over its limit.
    Load(LoadMeasure),
    /// A new loss of separation.
    Separation,
    /// Too large a probability of a loss.
    SeparationRisk,
    /// Another grant of the same flight.
    OwnChange,
    /// More extra fuel than its sender accepts.
    FuelLimit,
    /// A limit of the policy.
    PlanLimit,
    /// Another option of the same proposal is better.
    BetterOption,
    /// Its net benefit is not positive.
    NotWorthIt,
    /// Decided by hand.
    ByHand,
    /// It breaks a rule of level changes.
    Invalid,
}

impl PlanUnderAudit {
    /// A plan of the engine, with its written profiles, and the bound if it is the best one.
    #[must_use]
    pub fn of(plan: &Plan, bound: Option<f64>) -> Self {
        Self {
            objective: plan.objective,
            bound,
            gap: None,
            decisions: plan.decisions.iter().map(ClaimedDecision::from).collect(),
            written: Some(plan.moved.clone()),
            by_hand: None,
        }
    }
}

impl From<&Decision> for ClaimedDecision {
    fn from(decision: &Decision) -> Self {
        Self {
            proposal: decision.proposal,
            flight: decision.flight,
            verdict: decision.verdict,
            option: decision.option,
            stretches: decision
                .stretches
                .iter()
                .map(|s| ClaimedStretch {
                    level_ft: s.level_ft,
                    from_s: s.from_s,
                    until_s: s.until_s,
                    planned_from_s: s.planned_from_s,
                    planned_until_s: s.planned_until_s,
                })
                .collect(),
            net_benefit: decision.net_benefit,
            contrail_km_avoided: decision.contrail_km_avoided,
            extra_fuel_kg: decision.extra_fuel_kg,
            arrival_shift_s: decision.arrival_shift_s,
            reasons: decision.reasons.iter().map(ClaimedReason::from).collect(),
            exchange: decision.exchange.clone(),
        }
    }
}

impl From<&Reason> for ClaimedReason {
    fn from(reason: &Reason) -> Self {
        let kind = match &reason.constraint {
            Constraint::Load { measure, .. } => ReasonKind::Load(*measure),
            Constraint::Separation { .. } => ReasonKind::Separation,
            Constraint::SeparationRisk { .. } => ReasonKind::SeparationRisk,
            Constraint::OwnChange => ReasonKind::OwnChange,
            Constraint::FuelLimit { .. } => ReasonKind::FuelLimit,
            Constraint::PlanLimit { .. } => ReasonKind::PlanLimit,
            Constraint::BetterOption { .. } => ReasonKind::BetterOption,
            Constraint::NotWorthIt => ReasonKind::NotWorthIt,
            Constraint::ByHand => ReasonKind::ByHand,
            Constraint::Invalid(_) => ReasonKind::Invalid,
        };
        Self { option: Some(reason.option), kind }
    }
}
