//! A flight of a built day.

use super::profile::Profile;
use crate::ids::{AirportId, ClassId};

/// A flight with its filed profile.
#[derive(Debug, Clone, PartialEq)]
pub struct Flight {
    /// Unique name.
    pub name: String,
    /// Call sign, if any.
    pub callsign: Option<String>,
    /// Operator, if any.
    pub operator: Option<String>,
    /// Departure airport code.
    pub departure: String,
    /// Destination airport code.
    pub destination: String,
    /// The counted airport whose departures include this flight.
    pub departs_from: Option<AirportId>,
    /// The counted airport whose arrivals include this flight.
    pub arrives_at: Option<AirportId>,
    /// Its aircraft code, as given.
    pub aircraft: String,
    /// Its aircraft class; `None` where no class has its code.
    pub class: Option<ClassId>,
    /// Cruise Mach number given, only compared with the profile.
    pub mach: Option<f64>,
    /// Mass given, kg.
    pub mass_kg: Option<f64>,
    /// Whether it is approved for RVSM.
    pub rvsm: bool,
    /// Whether it may be changed.
    pub movable: bool,
    /// What was filed.
    pub profile: Profile,
}
