//! What the judge found, as data, and how much was judged.

use super::claim::ReasonKind;
use crate::answer::{LoadMeasure, Place, Rule, Verdict};
use crate::day::HandDecision;
use crate::ids::{FlightId, ProposalId};

/// The outcome of an audit.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct AuditReport {
    /// Every fault, in the order of the checks.
    pub findings: Vec<Finding>,
    /// How much was judged.
    pub checked: Checked,
    /// What was not judged.
    pub not_judged: Vec<NotJudged>,
}

impl AuditReport {
    /// Whether no fault was found.
    #[must_use]
    pub fn passed(&self) -> bool {
        self.findings.is_empty()
    }
}

/// How much was judged.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct Checked {
    /// Decisions compared with the proposals of the day.
    pub decisions: u64,
    /// Options whose profile was derived anew.
    pub options_derived: u64,
    /// Flights moved by the plan.
    pub moved_flights: u64,
    /// Pairs of flights, one of them moved, that came near each other and were followed.
    pub pairs_followed: u64,
    /// Losses of separation with a moved flight, known ones included.
    pub losses: u64,
    /// Visits of sectors found in the filed day.
    pub visits: u64,
    /// Limited windows with traffic.
    pub windows: u64,
    /// Limited minutes with traffic.
    pub minutes: u64,
    /// Windows and minutes left undecided: a crossing lies within 1 ms of an edge and decides.
    pub undecided_counts: u64,
    /// Figures recomputed.
    pub figures: u64,
    /// Written points compared with derived profiles.
    pub written_points: u64,
    /// Options left out that were tried alone against the finished plan.
    pub options_tried: u64,
}

/// Something that this judge does not judge.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum NotJudged {
    /// Losses of separation: the policy decides by probability or by price.
    Separation,
    /// Losses under time errors were looked for at sampled shifts only.
    ShiftsBetweenSamples,
    /// The objective: expected losses have a price.
    Objective,
    /// Whether anything could be added: needs a rule that is not judged.
    Maximality,
    /// `min_grant_rate_per_operator`, which the always feasible empty plan may break.
    GrantRate,
    /// Extra fuel of options where several fuel tables fit equally well.
    Fuel,
}

/// A figure that the judge recomputes.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Figure {
    /// Share of the objective.
    NetBenefit,
    /// Contrail kilometres avoided.
    ContrailKm,
    /// Extra fuel, kg.
    ExtraFuel,
    /// Arrival shift, seconds.
    ArrivalShift,
    /// When a stretch begins in the planned profile, seconds of the day.
    PlannedFrom,
    /// When a stretch starts to return, seconds of the day.
    PlannedUntil,
    /// The objective.
    Objective,
    /// Net benefits that an exchange would lose.
    ObjectiveLost,
    /// The gap.
    Gap,
}

/// One fault.
#[derive(Debug, Clone, PartialEq)]
pub enum Finding {
    /// A proposal without a decision.
    DecisionMissing {
        /// The proposal.
        proposal: ProposalId,
    },
    /// A proposal with several decisions.
    DecisionRepeated {
        /// The proposal.
        proposal: ProposalId,
    },
    /// A decision on a proposal that the day does not hold.
    UnknownProposal {
        /// The proposal.
        proposal: ProposalId,
    },
    /// A decision that names another flight.
    WrongFlight {
        /// The proposal.
        proposal: ProposalId,
        /// The flight named.
        claimed: FlightId,
        /// The flight that the proposal is about.
        flight: FlightId,
    },
    /// Verdict and option contradict each other.
    VerdictMismatch {
        /// The proposal.
        proposal: ProposalId,
        /// The verdict.
        verdict: Verdict,
        /// The option.
        option: Option<u32>,
    },
    /// The proposal has no such option.
    UnknownOption {
        /// The proposal.
        proposal: ProposalId,
        /// The option.
        option: u32,
    },
    /// The stretches are not those of the option.
    StretchesDiffer {
        /// The proposal.
        proposal: ProposalId,
    },
    /// A granted option breaks a rule of level changes.
    BreaksRule {
        /// The proposal.
        proposal: ProposalId,
        /// The option.
        option: u32,
        /// The rule.
        rule: Rule,
    },
    /// Grants of one flight exclude each other.
    OwnChangesOverlap {
        /// The flight.
        flight: FlightId,
    },
    /// A flight's common profile is off its filed level where no changes are allowed.
    ChangedWhereForbidden {
        /// The flight.
        flight: FlightId,
        /// The rule, with sector and time.
        rule: Rule,
    },
    /// Called invalid, but an option keeps every rule.
    NotInvalid {
        /// The proposal.
        proposal: ProposalId,
        /// An option that keeps every rule.
        option: u32,
    },
    /// Refused, but every option breaks a rule.
    ShouldBeInvalid {
        /// The proposal.
        proposal: ProposalId,
        /// The rule that the first option breaks.
        rule: Rule,
    },
    /// A new loss of separation.
    NewLoss {
        /// The flight with the smaller id.
        first: FlightId,
        /// The other flight.
        second: FlightId,
        /// By how much later the second flies than planned, seconds; 0 but under time errors.
        shift_s: f64,
        /// Start, seconds of the day.
        from_s: f64,
        /// End, seconds of the day.
        until_s: f64,
        /// Earliest time of the closest distance.
        closest_s: f64,
        /// That distance, metres.
        horizontal_m: f64,
        /// Vertical distance then, feet.
        vertical_ft: f64,
    },
    /// A run of counts that the plan makes worse than it may.
    Overload {
        /// Where.
        place: Place,
        /// What is counted.
        measure: LoadMeasure,
        /// Start of the run, seconds of the day.
        from_s: f64,
        /// End of the run, seconds of the day.
        until_s: f64,
        /// Greatest count of the run, planned.
        count: f64,
        /// The filed count there.
        filed: f64,
        /// The limit there.
        limit: f64,
    },
    /// A limit of the policy is passed.
    PolicyLimit {
        /// The policy key.
        key: &'static str,
        /// The flight, where the limit is one on flights.
        flight: Option<FlightId>,
        /// The proposal, where the limit is one on options.
        proposal: Option<ProposalId>,
        /// The value.
        value: f64,
        /// The limit.
        limit: f64,
    },
    /// What was decided by hand did not become of it.
    NotAsDecided {
        /// The decision.
        decision: HandDecision,
    },
    /// A granted option takes more extra fuel than its sender accepts.
    FuelLimit {
        /// The proposal.
        proposal: ProposalId,
        /// Extra fuel, kg.
        extra_fuel_kg: f64,
        /// The limit, kg.
        limit_kg: f64,
    },
    /// A figure is wrong.
    WrongFigure {
        /// Which.
        figure: Figure,
        /// Of which proposal; `None`: of the plan.
        proposal: Option<ProposalId>,
        /// As claimed; `None` where it is missing.
        claimed: Option<f64>,
        /// As recomputed.
        found: f64,
    },
    /// The bound lies below the objective.
    BoundBelowObjective {
        /// The bound.
        bound: f64,
        /// The objective.
        objective: f64,
    },
    /// A moved flight has no written profile.
    WrittenMissing {
        /// The flight.
        flight: FlightId,
    },
    /// A flight that is not moved has a written profile, or a flight has two.
    WrittenUnexpected {
        /// The flight.
        flight: FlightId,
    },
    /// A written profile is not the derived one; its worst place of that kind.
    WrittenOff {
        /// The flight.
        flight: FlightId,
        /// In what way.
        fault: WrittenFault,
        /// When, seconds of the day.
        time_s: f64,
        /// By how much: metres, feet or seconds.
        off: f64,
    },
    /// An option that was left out could be added alone.
    CouldAdd {
        /// The proposal.
        proposal: ProposalId,
        /// The option.
        option: u32,
        /// What the objective would gain.
        gain: f64,
    },
    /// A proposal could be switched to a better option alone.
    CouldSwitch {
        /// The proposal.
        proposal: ProposalId,
        /// The option.
        option: u32,
        /// What the objective would gain.
        gain: f64,
    },
    /// A grant of no benefit makes room for nothing.
    CouldDrop {
        /// The proposal.
        proposal: ProposalId,
        /// Its net benefit.
        net_benefit: f64,
    },
    /// No reason for leaving the option as asked aside.
    ReasonMissing {
        /// The proposal.
        proposal: ProposalId,
    },
    /// A reason that is not true.
    FalseReason {
        /// The proposal.
        proposal: ProposalId,
        /// The option.
        option: u32,
        /// The reason.
        kind: ReasonKind,
    },
    /// An exchange would drop what is not granted.
    ExchangeDropsNothing {
        /// The proposal that would come in.
        proposal: ProposalId,
        /// The proposal that is not granted.
        dropped: ProposalId,
    },
}

/// In what way a written profile is off.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum WrittenFault {
    /// Fewer than two points.
    TooFewPoints,
    /// Times that do not increase.
    TimeOrder,
    /// It begins or ends at another time, seconds.
    Ends,
    /// A place off the track or passed at another time, metres.
    Place,
    /// A level, feet.
    Level,
}
