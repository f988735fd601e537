//! Traffic of a built day that is known only as counts.

use crate::ids::SectorId;

/// Aircraft inside a sector throughout a period, and how many enter in it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Background {
    /// The sector.
    pub sector: SectorId,
    /// Start, seconds of the day.
    pub from_s: f64,
    /// End (not included), seconds of the day.
    pub until_s: f64,
    /// How many are inside throughout; may be a fraction.
    pub aircraft: f64,
    /// Their level, feet, if known.
    pub level_ft: Option<f64>,
    /// How many enter, spread evenly over the period.
    pub entries: Option<f64>,
}

/// Aircraft that move from one sector and level to another in a period.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Flow {
    /// Sector and level left, feet.
    pub from: (SectorId, f64),
    /// Sector and level entered, feet.
    pub to: (SectorId, f64),
    /// Start, seconds of the day.
    pub from_s: f64,
    /// End (not included), seconds of the day.
    pub until_s: f64,
    /// How many do so; may be a fraction.
    pub aircraft: f64,
}
