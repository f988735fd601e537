//! A day as it comes in: plain public data, by names, nothing checked yet.
//!
//! Times are seconds from 00:00 UTC of the day's date, levels are feet of pressure altitude,
//! positions are WGS 84 degrees. [`Day::build`](super::Day::build) turns this into a
//! [`Day`](super::Day) or lists everything that is wrong with it.

use super::policy::Policy;

/// A civil date (proleptic Gregorian calendar, UTC).
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub struct Date {
    /// Year, e.g. 2031.
    pub year: i32,
    /// Month, 1 to 12.
    pub month: u8,
    /// Day of the month, 1 to 31.
    pub day: u8,
}

/// Everything a day is made of.
#[derive(Debug, Clone, PartialEq)]
pub struct DayParts {
    /// The date whose 00:00 UTC is second 0.
    pub date: Date,
    /// A name for the region, shown in reports.
    pub region: String,
    /// The rules by which the day is judged.
    pub policy: Policy,
    /// Sectors, each with its volumes.
    pub sectors: Vec<SectorParts>,
    /// Capacity rows: when a sector is open, and its limits then.
    pub capacities: Vec<CapacityParts>,
    /// Airports whose arrivals and departures are counted.
    pub airports: Vec<AirportParts>,
    /// Airport capacity rows.
    pub airport_capacities: Vec<AirportCapacityParts>,
    /// The user's aircraft classes; an empty list means the built-in ones.
    pub aircraft: Vec<AircraftParts>,
    /// The user's cruise fuel rows.
    pub fuel: Vec<FuelParts>,
    /// Flights with their filed points.
    pub flights: Vec<FlightParts>,
    /// Proposed level changes.
    pub proposals: Vec<ProposalParts>,
    /// Volumes that changed profiles must keep out of.
    pub restrictions: Vec<RestrictionParts>,
    /// Traffic known only as counts.
    pub background: Vec<BackgroundParts>,
    /// What of that traffic moves from where to where.
    pub flows: Vec<FlowParts>,
    /// What was decided by hand.
    pub decisions: Vec<DecisionParts>,
}

impl DayParts {
    /// A day without content.
    #[must_use]
    pub fn empty(date: Date, region: &str) -> Self {
        Self {
            date,
            region: region.to_owned(),
            policy: Policy::default(),
            sectors: Vec::new(),
            capacities: Vec::new(),
            airports: Vec::new(),
            airport_capacities: Vec::new(),
            aircraft: Vec::new(),
            fuel: Vec::new(),
            flights: Vec::new(),
            proposals: Vec::new(),
            restrictions: Vec::new(),
            background: Vec::new(),
            flows: Vec::new(),
            decisions: Vec::new(),
        }
    }
}

/// One sector: the union of its volumes.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct SectorParts {
    /// Unique name.
    pub sector: String,
    /// A longer name for people, if any.
    pub name: Option<String>,
    /// At least one volume.
    pub volumes: Vec<VolumeParts>,
    /// The sector's own horizontal minimum, NM.
    pub horizontal_nm: Option<f64>,
    /// Whether a flight may not be off its filed level here.
    pub no_changes: bool,
}

/// One polygon with a floor and a ceiling.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct VolumeParts {
    /// Rings of `[lon, lat]` in degrees, each closed (first point = last point); the first is the
    /// outer boundary, others are holes. Edges are straight in lon/lat (RFC 7946).
    pub rings: Vec<Vec<[f64; 2]>>,
    /// Lowest level inside, feet.
    pub floor_ft: f64,
    /// Lowest level above, feet.
    pub ceiling_ft: f64,
}

/// A period in which a sector is open, and its limits then. A blank limit is no limit.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct CapacityParts {
    /// The sector's name.
    pub sector: String,
    /// Start, seconds of the day.
    pub from_s: f64,
    /// End (not included), seconds of the day.
    pub until_s: f64,
    /// Most entries in a 60-minute window.
    pub entries_per_hour: Option<f64>,
    /// Most flights inside at any whole minute.
    pub occupancy_limit: Option<f64>,
    /// Most flights inside for longer than the policy's `lasting_min`.
    pub occupancy_lasting: Option<f64>,
    /// Most climbs and descents begun inside in a 60-minute window.
    pub level_changes_per_hour: Option<f64>,
}

/// An airport.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct AirportParts {
    /// Unique code.
    pub airport: String,
    /// Longitude, degrees.
    pub lon_deg: f64,
    /// Latitude, degrees.
    pub lat_deg: f64,
    /// A longer name for people, if any.
    pub name: Option<String>,
}

/// A period with an airport's limits. A blank limit is no limit.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct AirportCapacityParts {
    /// The airport's code.
    pub airport: String,
    /// Start, seconds of the day.
    pub from_s: f64,
    /// End (not included), seconds of the day.
    pub until_s: f64,
    /// Most arrivals in a 60-minute window.
    pub arrivals_per_hour: Option<f64>,
    /// Most departures in a 60-minute window; shown, never binding.
    pub departures_per_hour: Option<f64>,
}

/// A class of aircraft.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct AircraftParts {
    /// Unique code, as flights name it.
    pub aircraft: String,
    /// Highest level it may be moved to, feet.
    pub ceiling_ft: Option<f64>,
    /// Climb rate of a level change, feet per minute.
    pub climb_fpm: Option<f64>,
    /// Descent rate of a level change, feet per minute (positive).
    pub descent_fpm: Option<f64>,
    /// Multiplies contrail energy forcing; 1 where absent.
    pub contrail_factor: Option<f64>,
}

/// Cruise fuel at one level.
#[derive(Debug, Clone, PartialEq)]
pub struct FuelParts {
    /// The aircraft code.
    pub aircraft: String,
    /// Level, feet.
    pub level_ft: f64,
    /// The fuel flow there.
    pub flow: FuelFlow,
    /// Aircraft mass for which it holds, kg.
    pub mass_kg: Option<f64>,
}

/// A fuel flow, by time or by ground distance.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum FuelFlow {
    /// Kilograms per minute.
    KgPerMin(f64),
    /// Kilograms per nautical mile over ground.
    KgPerNm(f64),
}

/// A flight with its filed points.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct FlightParts {
    /// Unique name.
    pub flight: String,
    /// Departure airport code.
    pub departure: String,
    /// Destination airport code.
    pub destination: String,
    /// Aircraft code.
    pub aircraft: String,
    /// Call sign, if any.
    pub callsign: Option<String>,
    /// Operator, if any.
    pub operator: Option<String>,
    /// Cruise Mach number, only compared with the profile.
    pub mach: Option<f64>,
    /// Mass, kg.
    pub mass_kg: Option<f64>,
    /// Whether the flight is approved for RVSM.
    pub rvsm: bool,
    /// Whether the flight may be changed at all.
    pub movable: bool,
    /// Filed points in time order.
    pub points: Vec<PointParts>,
}

/// One point of a profile.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct PointParts {
    /// Time, seconds of the day.
    pub time_s: f64,
    /// Longitude, degrees.
    pub lon_deg: f64,
    /// Latitude, degrees.
    pub lat_deg: f64,
    /// Level, feet.
    pub level_ft: f64,
    /// Name of the place, if any.
    pub fix: Option<String>,
}

/// A proposal: one flight, and the alternatives of which at most one is taken.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct ProposalParts {
    /// Unique name.
    pub proposal: String,
    /// The flight's name.
    pub flight: String,
    /// Alternatives; one of them has number 1, "as asked".
    pub alternatives: Vec<AlternativeParts>,
}

/// One alternative of a proposal (an `option` in files and reports).
#[derive(Debug, Clone, PartialEq)]
pub struct AlternativeParts {
    /// Its number: 1 is what was asked, higher ones are acceptable too.
    pub option: u32,
    /// Its stretches, at least one.
    pub stretches: Vec<StretchParts>,
    /// Contrail kilometres avoided, if given.
    pub contrail_km_avoided: Option<f64>,
    /// Instantaneous contrail energy forcing avoided, joules, if given.
    pub ef_avoided_j: Option<f64>,
    /// Extra fuel, kg, if given.
    pub extra_fuel_kg: Option<f64>,
    /// Most extra fuel its sender accepts, kg.
    pub max_extra_fuel_kg: Option<f64>,
    /// Multiplies the net benefit.
    pub priority: f64,
}

/// One stretch at another level.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct StretchParts {
    /// The new level, feet.
    pub level_ft: f64,
    /// Filed time at which the aircraft starts to leave its level; `None`: from the climb.
    pub from_s: Option<f64>,
    /// Filed time at which it starts to return; `None`: until the descent.
    pub until_s: Option<f64>,
}

/// Volumes that a changed profile must keep out of in a period.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct RestrictionParts {
    /// A name, as answers tell it; several restrictions may share one.
    pub restriction: String,
    /// At least one volume.
    pub volumes: Vec<VolumeParts>,
    /// Start, seconds of the day.
    pub from_s: f64,
    /// End (not included), seconds of the day.
    pub until_s: f64,
    /// Levels that stay allowed where they are held, feet.
    pub levels_allowed_ft: Vec<f64>,
    /// Only flights from this airport, if given.
    pub departure: Option<String>,
    /// Only flights to this airport, if given.
    pub destination: Option<String>,
}

/// Traffic of a sector that is known only as counts.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct BackgroundParts {
    /// The sector's name.
    pub sector: String,
    /// Start, seconds of the day.
    pub from_s: f64,
    /// End (not included), seconds of the day.
    pub until_s: f64,
    /// How many aircraft are inside throughout; may be a fraction.
    pub aircraft: f64,
    /// Their level, feet, if known.
    pub level_ft: Option<f64>,
    /// How many of them enter, spread evenly over the period.
    pub entries: Option<f64>,
}

/// Traffic known only as counts that moves from one sector and level to another.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct FlowParts {
    /// Sector left.
    pub from_sector: String,
    /// Level left, feet.
    pub from_level_ft: f64,
    /// Sector entered.
    pub to_sector: String,
    /// Level entered, feet.
    pub to_level_ft: f64,
    /// Start, seconds of the day.
    pub from_s: f64,
    /// End (not included), seconds of the day.
    pub until_s: f64,
    /// How many aircraft do so in the period; may be a fraction.
    pub aircraft: f64,
}

/// What is decided by hand about a proposal or a flight.
#[derive(Debug, Clone, PartialEq)]
pub struct DecisionParts {
    /// The proposal or the flight.
    pub about: DecisionAbout,
    /// What must become of it.
    pub must: Must,
}

/// What a decision by hand is about.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum DecisionAbout {
    /// A proposal, by name.
    Proposal(String),
    /// A flight, by name.
    Flight(String),
}

/// What was decided by hand.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Must {
    /// A proposal is to be granted, with this option or with any.
    Grant {
        /// The option's number.
        option: Option<u32>,
    },
    /// A proposal is to be refused.
    Refuse,
    /// A flight is to fly as filed.
    Keep,
}
