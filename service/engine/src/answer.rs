//! What the engine answers, as plain public data. Words for people are made elsewhere.

use crate::day::HandDecision;
use crate::ids::{AirportId, FlightId, ProposalId, RestrictionId, SectorId};

/// An interval in which two flights are closer than their minima allow.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Loss {
    /// The flight with the smaller id (first by name).
    pub first: FlightId,
    /// The other flight.
    pub second: FlightId,
    /// Start, seconds of the day.
    pub from_s: f64,
    /// End, seconds of the day.
    pub until_s: f64,
    /// Earliest time of the closest horizontal distance within the interval.
    pub closest_s: f64,
    /// That distance, metres.
    pub horizontal_m: f64,
    /// Vertical distance at that time, feet.
    pub vertical_ft: f64,
    /// The open sector, first by name, in which the first flight then is.
    pub sector: Option<SectorId>,
}

/// In which version of the day a loss occurs.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum LossIn {
    /// In the filed day, and the plan has moved one of the flights.
    Filed,
    /// In the planned day, in which one of the flights is moved.
    Planned,
    /// In both: neither flight is moved.
    Both,
}

/// A loss with its place in a plan.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct PlanLoss {
    /// The loss.
    pub loss: Loss,
    /// In which version of the day.
    pub version: LossIn,
    /// Whether it is a new loss (never true of a filed one).
    pub new: bool,
}

/// Where traffic is counted.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Place {
    /// A sector.
    Sector(SectorId),
    /// An airport.
    Airport(AirportId),
}

/// What is counted there.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum LoadMeasure {
    /// Visits that begin in the 60-minute window.
    Entries,
    /// Flights inside at a whole minute; in load rows, the greatest minute of a slice.
    Occupancy,
    /// Whole minutes of overload that lasted longer than the policy allows.
    Lasting,
    /// Climbs and descents begun inside in the 60-minute window.
    LevelChanges,
    /// Arrivals in the 60-minute window.
    Arrivals,
    /// Departures in the 60-minute window; shown, never binding.
    Departures,
}

/// One count, filed and planned, beside its limit.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct LoadCount {
    /// Where.
    pub place: Place,
    /// What is counted.
    pub measure: LoadMeasure,
    /// Start of the window or slice, seconds of the day.
    pub window_start_s: f64,
    /// Count of the filed day.
    pub filed: f64,
    /// Count of the planned day.
    pub planned: f64,
    /// The limit in force; `None` where there is none.
    pub limit: Option<f64>,
}

/// Which rule a level change breaks.
#[derive(Debug, Clone, PartialEq)]
pub enum Rule {
    /// The flight is marked not movable.
    NotMovable,
    /// The flight has no cruise leg.
    NoCruise,
    /// The position at `from_time` is not on a cruise leg.
    FromNotInCruise,
    /// The position at `until_time` is not on a cruise leg.
    UntilNotInCruise,
    /// A time lies outside the filed profile.
    OutsideFlight,
    /// The stretch ends before it begins.
    EndsBeforeItBegins,
    /// `from_time` is blank and the flight's first point is in cruise.
    BeginsInCruise,
    /// `until_time` is blank and the flight's last point is in cruise.
    EndsInCruise,
    /// The new level is never passed by the filed climb (lower level, from the climb).
    NotPassedInClimb,
    /// The new level is never passed by the filed descent (lower level, until the descent).
    NotPassedInDescent,
    /// There is no room to reach the level before the return begins.
    NoRoomToReach,
    /// The return would end after the filed profile has left cruise.
    NoRoomToReturn,
    /// Two stretches of one option overlap.
    StretchesOverlap,
    /// Above the ceiling of the aircraft.
    AboveCeiling {
        /// The ceiling, feet.
        ceiling_ft: f64,
    },
    /// Below the cruise floor.
    BelowFloor {
        /// The floor, feet.
        floor_ft: f64,
    },
    /// The new level is the filed one.
    SameLevel,
    /// Not a level of the direction of flight on a leg between the two positions.
    WrongDirection {
        /// True track where the leg is joined, degrees.
        track_deg: f64,
    },
    /// Not approved for RVSM, and the level is in FL 290 to 410.
    NotRvsm,
    /// Off its filed level inside a sector marked `no_changes`.
    NoChangesSector {
        /// The sector.
        sector: SectorId,
        /// When it is first so, seconds of the day.
        time_s: f64,
    },
    /// Inside a restriction in force, at a place where the filed profile is not.
    Restriction {
        /// The restriction.
        restriction: RestrictionId,
        /// When it is first so, seconds of the day.
        time_s: f64,
    },
}

/// One constraint that keeps an alternative out, with its numbers.
#[derive(Debug, Clone, PartialEq)]
pub enum Constraint {
    /// A count over its limit.
    Load {
        /// Where.
        place: Place,
        /// What is counted.
        measure: LoadMeasure,
        /// Start of the run of windows or minutes.
        from_s: f64,
        /// End of the run (last window's end, or last minute + 60 s).
        until_s: f64,
        /// Greatest count in the run with the change added.
        count: f64,
        /// The limit in force there. Where the filed count is larger, that was allowed.
        limit: f64,
    },
    /// A new loss.
    Separation {
        /// The other flight.
        other: FlightId,
        /// Earliest time of the closest distance.
        time_s: f64,
        /// That distance, metres.
        horizontal_m: f64,
        /// Vertical distance then, feet.
        vertical_ft: f64,
    },
    /// The probability of a loss is too large.
    SeparationRisk {
        /// The other flight.
        other: FlightId,
        /// Probability in the planned day.
        probability: f64,
        /// Largest probability allowed.
        limit: f64,
    },
    /// It excludes, or is excluded by, another grant of the same flight.
    OwnChange,
    /// Its extra fuel is over what its sender accepts.
    FuelLimit {
        /// Extra fuel, kg.
        extra_fuel_kg: f64,
        /// The limit, kg.
        limit_kg: f64,
    },
    /// A limit of the policy is reached.
    PlanLimit {
        /// The policy key.
        key: &'static str,
        /// The value with the change added.
        count: f64,
        /// The limit.
        limit: f64,
    },
    /// Another alternative of the same proposal is better for the plan.
    BetterOption {
        /// The number of the one taken.
        taken: u32,
    },
    /// Its net benefit is not positive.
    NotWorthIt,
    /// It was decided so by hand.
    ByHand,
    /// It breaks a rule of level changes.
    Invalid(Rule),
}

/// Why an alternative was not taken.
#[derive(Debug, Clone, PartialEq)]
pub struct Reason {
    /// The alternative's number.
    pub option: u32,
    /// What keeps it out.
    pub constraint: Constraint,
}

/// What became of a proposal.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Verdict {
    /// As asked.
    Granted,
    /// With another of its options.
    Amended,
    /// Not in this plan.
    Refused,
    /// Every option breaks a rule.
    Invalid,
}

/// A stretch of a decision.
#[derive(Debug, Clone, PartialEq)]
pub struct PlannedStretch {
    /// The level, feet.
    pub level_ft: f64,
    /// As proposed: filed time of the start; `None`: from the climb.
    pub from_s: Option<f64>,
    /// As proposed: filed time of the return; `None`: until the descent.
    pub until_s: Option<f64>,
    /// When the planned profile starts to leave its filed level.
    pub planned_from_s: Option<f64>,
    /// When the planned profile starts to return.
    pub planned_until_s: Option<f64>,
    /// The filed fix nearest to the start, if fixes are named.
    pub near_fix: Option<String>,
}

/// What would make room for a refused proposal.
#[derive(Debug, Clone, PartialEq)]
pub struct Exchange {
    /// Grants that would have to go.
    pub drops: Vec<ProposalId>,
    /// Sum of their net benefits, in the unit of the objective.
    pub objective_lost: f64,
    /// Whether it is proven to be the cheapest.
    pub proven: bool,
}

/// The verdict on one proposal.
#[derive(Debug, Clone, PartialEq)]
pub struct Decision {
    /// The proposal.
    pub proposal: ProposalId,
    /// Its flight.
    pub flight: FlightId,
    /// What became of it.
    pub verdict: Verdict,
    /// Number of the alternative taken.
    pub option: Option<u32>,
    /// The stretches taken; those as asked where none is.
    pub stretches: Vec<PlannedStretch>,
    /// Its share of the objective.
    pub net_benefit: f64,
    /// Contrail kilometres avoided.
    pub contrail_km_avoided: f64,
    /// Extra fuel, kg.
    pub extra_fuel_kg: f64,
    /// Shift of the flight's arrival by all its grants, seconds, late positive.
    pub arrival_shift_s: f64,
    /// Why it was not taken as asked.
    pub reasons: Vec<Reason>,
    /// What would make room for it.
    pub exchange: Option<Exchange>,
}

/// A point of a new profile, as written.
#[derive(Debug, Clone, PartialEq)]
pub struct ProfilePoint {
    /// Time, seconds of the day, a whole number of milliseconds.
    pub time_s: f64,
    /// Longitude, degrees.
    pub lon_deg: f64,
    /// Latitude, degrees.
    pub lat_deg: f64,
    /// Level, feet.
    pub level_ft: f64,
    /// Name of the filed point there, if it has one.
    pub fix: Option<String>,
}

/// The new profile of a moved flight.
#[derive(Debug, Clone, PartialEq)]
pub struct MovedProfile {
    /// The flight.
    pub flight: FlightId,
    /// Its whole new profile.
    pub points: Vec<ProfilePoint>,
}

/// One plan.
#[derive(Debug, Clone, PartialEq)]
pub struct Plan {
    /// Sum of the net benefits of what it grants.
    pub objective: f64,
    /// Expected new losses under the policy's time errors.
    pub expected_new_losses: f64,
    /// One decision per proposal, in the order of proposals.
    pub decisions: Vec<Decision>,
    /// New profiles of the flights it moves, in the order of flights.
    pub moved: Vec<MovedProfile>,
    /// Counts wherever there is traffic.
    pub loads: Vec<LoadCount>,
    /// Losses of the filed and of the planned day.
    pub losses: Vec<PlanLoss>,
}

/// Why a search stopped.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Stopped {
    /// Nothing better exists.
    Optimal,
    /// Within the gap that was asked for.
    Gap,
    /// The work budget is spent.
    Work,
    /// The deadline has passed.
    Time,
    /// The caller has gone.
    Cancelled,
}

/// Plans, best first, and how good the best one is.
#[derive(Debug, Clone, PartialEq)]
pub struct Plans {
    /// Best first; never empty.
    pub plans: Vec<Plan>,
    /// A proven upper bound on the objective of any feasible plan.
    pub bound: Option<f64>,
    /// Why the search stopped.
    pub stopped: Stopped,
    /// Decisions by hand that can't be met and were planned around.
    pub unmet: Vec<HandDecision>,
    /// What the limits that bind cost the best plan, dearest first.
    pub limit_prices: Vec<LimitPrice>,
}

/// What one more in a window or at a minute, or one more of what a key of the policy limits, would
/// gain.
#[derive(Debug, Clone, PartialEq)]
pub struct LimitPrice {
    /// Where; `None` where the policy sets the limit.
    pub place: Option<Place>,
    /// The key of the policy that sets the limit.
    pub policy_key: Option<&'static str>,
    /// What is counted there.
    pub measure: Option<LoadMeasure>,
    /// Start of the window, or the minute, seconds of the day.
    pub from_s: f64,
    /// Its end, seconds of the day.
    pub until_s: f64,
    /// The gain, about, in the unit of the objective: the price behind the bound.
    pub estimate: f64,
    /// The gain, found by searching again with the limit raised by one.
    pub exact: Option<f64>,
}

/// What plans buy for how much of something.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct TradeOff {
    /// The best plan, then those under ever smaller limits.
    pub points: Vec<TradeOffPoint>,
}

/// The best plan found under a limit.
#[derive(Debug, Clone, PartialEq)]
pub struct TradeOffPoint {
    /// The limit.
    pub limit: TradeOffLimit,
    /// Flights moved.
    pub moved_flights: u32,
    /// Contrail kilometres avoided.
    pub contrail_km_avoided: f64,
    /// Extra fuel, kg.
    pub extra_fuel_kg: f64,
    /// Sum of the net benefits.
    pub objective: f64,
    /// No plan under this limit is worth more: proven.
    pub bound: Option<f64>,
}

/// What is limited at a point of a trade-off.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum TradeOffLimit {
    /// Nothing beyond the day's own rules.
    None,
    /// At most so many flights are moved.
    MovedFlights(u32),
    /// At most so much extra fuel, kg.
    ExtraFuelKg(f64),
}

impl Plans {
    /// (bound − objective) / max(|bound|, 1e-9) of the best plan, where a bound is proven.
    #[must_use]
    pub fn gap(&self) -> Option<f64> {
        let objective = self.plans.first()?.objective;
        self.bound.map(|bound| (bound - objective).max(0.0) / bound.abs().max(1e-9))
    }
}

/// The answer to "may this flight change level?".
#[derive(Debug, Clone, PartialEq)]
pub struct AskAnswer {
    /// Whether the change breaks nothing.
    pub verdict: AskVerdict,
    /// Net benefit, in the unit of the objective.
    pub net_benefit: f64,
    /// Contrail kilometres avoided.
    pub contrail_km_avoided: f64,
    /// Extra fuel, kg.
    pub extra_fuel_kg: f64,
    /// Shift of the arrival, seconds, late positive.
    pub arrival_shift_s: f64,
    /// Expected new losses of this change.
    pub expected_new_losses: f64,
    /// Least room left over the windows and minutes that it adds to; `None` where none is limited.
    pub least_slack: Option<f64>,
    /// The stretches with their planned times.
    pub stretches: Vec<PlannedStretch>,
}

/// The verdict on one change.
#[derive(Debug, Clone, PartialEq)]
pub enum AskVerdict {
    /// It breaks nothing.
    Yes,
    /// Everything that blocks it.
    No(Vec<Constraint>),
    /// The rule that it breaks.
    Invalid(Rule),
}

/// What a filed day holds.
#[derive(Debug, Clone, PartialEq)]
pub struct DayCheck {
    /// Filed counts wherever there is traffic (`planned` equals `filed`).
    pub loads: Vec<LoadCount>,
    /// Counts above their limit, one a run of windows or minutes.
    pub overloads: Vec<Overload>,
    /// Filed losses.
    pub losses: Vec<Loss>,
    /// Flights that can't be changed, by reason.
    pub unchangeable: Unchangeable,
    /// Flights whose track is within 10 degrees of the boundary between directions in cruise.
    pub near_direction_boundary: u32,
    /// Proposals, and how many of them have no valid option.
    pub proposals: u32,
    /// Proposals every option of which breaks a rule, with the rule of the first option.
    pub invalid_proposals: Vec<(ProposalId, Rule)>,
    /// Flights with a level snapped at loading.
    pub snapped_levels: u32,
}

/// A run of consecutive windows or minutes in which a count is above its limit.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Overload {
    /// Where.
    pub place: Place,
    /// What is counted.
    pub measure: LoadMeasure,
    /// Start of the run.
    pub from_s: f64,
    /// End of the run.
    pub until_s: f64,
    /// Greatest count.
    pub count: f64,
    /// The limit there.
    pub limit: f64,
}

/// Flights that can't be changed, by reason.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct Unchangeable {
    /// Marked not movable.
    pub not_movable: u32,
    /// Without a cruise leg.
    pub no_cruise: u32,
}

/// Why a plan leaves a proposal out, and what it would take to let it in.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Why {
    /// Whether the plan grants it, with one of its options.
    pub granted: bool,
    /// What keeps each option out that is not taken, when it alone is added.
    pub reasons: Vec<Reason>,
    /// Limits that would let the option as asked in, each raised by one; empty where something else
    /// is in the way, or one would not do.
    pub relax: Vec<Constraint>,
    /// By how much the objective falls in the best plan found that grants it; `None`: no plan does.
    pub loss: Option<f64>,
    /// Proven: it falls at least by this.
    pub least_loss: Option<f64>,
    /// Proposals granted here that this best plan does not grant.
    pub goes: Vec<ProposalId>,
    /// Proposals that it grants instead, this one among them.
    pub comes: Vec<ProposalId>,
}
