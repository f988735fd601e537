//! How exactly the judge judges, each with its reason.

use crate::units::METRES_PER_FOOT;

/// Which way a borderline case falls.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Lean {
    /// What the plan holds is judged in its favour: a fault reported is a fault for certain.
    ForPlan,
    /// What the plan leaves out is called possible only where it is possible for certain.
    AgainstPlan,
}

impl Lean {
    /// The other way.
    pub(super) fn opposite(self) -> Self {
        match self {
            Self::ForPlan => Self::AgainstPlan,
            Self::AgainstPlan => Self::ForPlan,
        }
    }

    /// An allowance that helps the plan, or the same against it.
    pub(super) fn allow(self, allowance: f64) -> f64 {
        match self {
            Self::ForPlan => allowance,
            Self::AgainstPlan => -allowance,
        }
    }
}

/// Within this distance of a minimum the plan is right either way, metres.
pub(super) const SEPARATION_M: f64 = 0.5;
/// A plan's maker decides against a change within 0.5 m of a minimum, and its distances may be
/// wrong by another 0.5 m, metres.
pub(super) const SEPARATION_AGAINST_M: f64 = 1.0;
/// [`SEPARATION_M`] as a difference of level, feet.
pub(super) const VERTICAL_FT: f64 = SEPARATION_M / METRES_PER_FOOT;
/// [`SEPARATION_AGAINST_M`] as a difference of level, feet.
pub(super) const VERTICAL_AGAINST_FT: f64 = SEPARATION_AGAINST_M / METRES_PER_FOOT;
/// Step between two looks at a pair that is too close, seconds: losses with a shorter time between
/// them may be taken for one.
pub(super) const PAIR_STEP_S: f64 = 0.25;
/// Shortest step between two looks at a pair that may come too close, seconds: no loss that lasts
/// longer is overlooked. Climbing and descending flights cross each other's minima in a tenth of a
/// second, and by such a loss as filed one in the plan may be known.
pub(super) const ONSET_STEP_S: f64 = 0.02;
/// Shortest step between two looks at a flight beside a sector's edge, seconds: no visit that
/// lasts longer is overlooked.
pub(super) const EDGE_STEP_S: f64 = 0.05;
/// Where the bisection of a crossing stops, seconds; far below [`EDGE_S`].
pub(super) const BISECTION_S: f64 = 1e-6;
/// A count is left undecided where a crossing lies this close to its edge, seconds: times are
/// whole milliseconds.
pub(super) const EDGE_S: f64 = 1e-3;
/// Two times that were each rounded to a millisecond, after sums in another order, seconds.
pub(super) const TIME_S: f64 = 2e-3;
/// A written place may be off by this much, metres.
pub(super) const PLACE_M: f64 = 0.5;
/// A written level may be off by this much, feet; also what counts as off the filed level.
pub(super) const LEVEL_FT: f64 = 0.5;
/// Sums of floating-point numbers in another order, relative.
pub(super) const RELATIVE: f64 = 1e-9;
/// Comparisons of counts with limits that may be fractions.
pub(super) const COUNT: f64 = 1e-9;
/// Net benefits may be rounded to a common quantum, relative to the sum of their sizes.
pub(super) const QUANTUM: f64 = 1e-11;
/// Fuel summed by another rule for the middle of a step, relative.
pub(super) const FUEL_RELATIVE: f64 = 1e-3;
/// The same for amounts near zero, kilograms.
pub(super) const FUEL_KG: f64 = 0.05;
/// Tracks this close to a boundary between directions belong to either, degrees.
pub(super) const TRACK_DEG: f64 = 1e-7;
