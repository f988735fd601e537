//! Proposals of a built day.

use crate::ids::FlightId;

/// A proposal: one flight, and the alternatives of which at most one is taken.
#[derive(Debug, Clone, PartialEq)]
pub struct Proposal {
    /// Unique name.
    pub name: String,
    /// The flight it would change.
    pub flight: FlightId,
    /// Alternatives by rising number; the first is number 1, as asked.
    pub alternatives: Vec<Alternative>,
}

/// One alternative of a proposal.
#[derive(Debug, Clone, PartialEq)]
pub struct Alternative {
    /// Its number.
    pub option: u32,
    /// Its stretches in order of their start (from the climb first); at least one.
    pub stretches: Vec<Stretch>,
    /// Contrail kilometres avoided, if given.
    pub contrail_km_avoided: Option<f64>,
    /// Instantaneous contrail forcing avoided, J, if given.
    pub ef_avoided_j: Option<f64>,
    /// Extra fuel, kg, if given.
    pub extra_fuel_kg: Option<f64>,
    /// Most extra fuel accepted, kg.
    pub max_extra_fuel_kg: Option<f64>,
    /// Multiplies its net benefit.
    pub priority: f64,
}

/// Where along the track, and to which level.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Stretch {
    /// The new level, feet.
    pub level_ft: f64,
    /// Filed time of the place where it starts to leave its level; `None`: from the climb.
    pub from_s: Option<f64>,
    /// Filed time of the place where it starts to return; `None`: until the descent.
    pub until_s: Option<f64>,
}
