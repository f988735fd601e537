//! Aircraft classes and the user's fuel tables.

use super::parts::FuelFlow;

/// Vertical rate of a level change where a class gives none, ft/min (common practice, no source).
pub(super) const DEFAULT_RATE_FPM: f64 = 1000.0;

/// A class of aircraft.
#[derive(Debug, Clone, PartialEq)]
pub struct AircraftClass {
    /// Its code.
    pub code: String,
    /// Highest level it may be moved to, feet; `None`: no limit.
    pub ceiling_ft: Option<f64>,
    /// Climb rate, ft/min.
    pub climb_fpm: f64,
    /// Descent rate, ft/min, positive.
    pub descent_fpm: f64,
    /// Multiplies contrail energy forcing.
    pub contrail_factor: f64,
}

impl Default for AircraftClass {
    /// What a code that no class names flies by.
    fn default() -> Self {
        Self {
            code: String::new(),
            ceiling_ft: None,
            climb_fpm: DEFAULT_RATE_FPM,
            descent_fpm: DEFAULT_RATE_FPM,
            contrail_factor: 1.0,
        }
    }
}

/// Cruise fuel of one aircraft code at one mass.
#[derive(Debug, Clone, PartialEq)]
pub struct FuelTable {
    /// The aircraft code.
    pub aircraft: String,
    /// The mass for which it holds, kg, if given.
    pub mass_kg: Option<f64>,
    /// Rows by rising level.
    pub rows: Vec<FuelRow>,
}

/// Fuel flow at one level.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct FuelRow {
    /// Level, feet.
    pub level_ft: f64,
    /// The flow there.
    pub flow: FuelFlow,
}
