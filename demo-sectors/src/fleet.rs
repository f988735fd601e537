//! Invented aircraft classes, with rules of thumb for how they fly.

use crate::{profile::Performance, tables::Table};

/// An invented aircraft class.
#[derive(Debug, Clone, Copy)]
pub struct Class {
    /// Code.
    pub aircraft: &'static str,
    /// How it flies.
    pub performance: Performance,
    /// Ceiling in FL.
    pub ceiling_fl: u32,
    /// Cruise fuel, kilograms a minute.
    pub kg_per_min: f64,
    /// Usual mass in kilograms.
    pub mass_kg: f64,
    /// Climb and descent rate for level changes, feet per minute.
    pub rates_fpm: (u32, u32),
    /// Share in contrail forcing.
    pub contrail_factor: f64,
}

const fn class(
    aircraft: &'static str,
    (mach, rate_share): (f64, f64),
    ceiling_fl: u32,
    (kg_per_min, mass_kg): (f64, f64),
    rates_fpm: (u32, u32),
    contrail_factor: f64,
) -> Class {
    let performance = Performance { mach, rate_share };
    Class { aircraft, performance, ceiling_fl, kg_per_min, mass_kg, rates_fpm, contrail_factor }
}

/// Medium jet, regional jet, heavy jet, business jet, older jet, turboprop.
pub const CLASSES: [Class; 6] = [
    class("MJET", (0.78, 1.0), 410, (40.0, 66_000.0), (1000, 1000), 1.0),
    class("RJET", (0.76, 0.95), 390, (27.0, 40_000.0), (1000, 1000), 0.8),
    class("HJET", (0.83, 0.85), 430, (104.0, 205_000.0), (800, 1000), 1.5),
    class("BJET", (0.80, 1.3), 470, (13.5, 16_000.0), (1500, 1500), 0.5),
    class("OJET", (0.74, 0.8), 370, (46.0, 58_000.0), (700, 1000), 1.1),
    class("TPRO", (0.45, 0.6), 250, (10.5, 21_000.0), (600, 1000), 0.6),
];

/// The aircraft table.
#[must_use]
pub fn aircraft_table() -> Table {
    let mut table = Table::with_columns(&[
        "aircraft",
        "ceiling_fl",
        "climb_fpm",
        "descent_fpm",
        "contrail_factor",
    ]);
    for c in CLASSES {
        table.push(vec![
            c.aircraft.to_owned(),
            c.ceiling_fl.to_string(),
            c.rates_fpm.0.to_string(),
            c.rates_fpm.1.to_string(),
            c.contrail_factor.to_string(),
        ]);
    }
    table
}
