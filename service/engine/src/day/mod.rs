//! A day: flights, sectors, airports, proposals and the policy, checked once and immutable after.
//!
//! [`DayParts`] is what comes in; [`Day::build`] lists every defect or gives a [`Day`] that holds
//! only finite numbers, closed rings, strictly increasing times and resolved references. Sectors,
//! airports, flights and proposals are sorted by name, so that answers do not depend on the order
//! of the input.

mod background;
mod build;
mod class;
mod defect;
mod flight;
mod hand;
mod parts;
mod policy;
mod profile;
mod proposal;
mod restriction;
mod sector;

pub use background::{Background, Flow};
pub use build::Built;
pub use class::{AircraftClass, FuelRow, FuelTable};
pub use defect::{Defect, MOST_DEFECTS, Warning};
pub use flight::Flight;
pub use hand::{HandDecision, HandSubject};
pub use parts::*;
pub use policy::{
    DirectionLevels, KEYS, LevelDirection, ObjectiveRule, Policy, PolicyError, PolicyKey,
    PolicyValue, SeparationRule,
};
pub use profile::{Cruise, Point, Profile};
pub use proposal::{Alternative, Proposal, Stretch};
pub use restriction::Restriction;
pub use sector::{
    Airport, AirportLimits, Period, Sector, SectorLimits, Volume, period_at, smallest_limit,
};

use crate::ids::{AirportId, ClassId, FlightId, IdVec, ProposalId, RestrictionId, SectorId};

/// A checked day.
#[derive(Debug, Clone, PartialEq)]
pub struct Day {
    /// The date whose 00:00 UTC is second 0.
    pub date: Date,
    /// A name for the region.
    pub region: String,
    /// The rules by which it is judged.
    pub policy: Policy,
    /// Sectors by name.
    pub sectors: IdVec<SectorId, Sector>,
    /// Counted airports by code.
    pub airports: IdVec<AirportId, Airport>,
    /// Aircraft classes by code.
    pub classes: IdVec<ClassId, AircraftClass>,
    /// The user's cruise fuel, by aircraft code.
    pub fuel: Vec<FuelTable>,
    /// Flights by name.
    pub flights: IdVec<FlightId, Flight>,
    /// Proposals by name.
    pub proposals: IdVec<ProposalId, Proposal>,
    /// Volumes that changed profiles must keep out of, by name.
    pub restrictions: IdVec<RestrictionId, Restriction>,
    /// Traffic known only as counts, by sector and time.
    pub background: Vec<Background>,
    /// What of that traffic moves from where to where.
    pub flows: Vec<Flow>,
    /// What was decided by hand.
    pub decisions: Vec<HandDecision>,
    /// How many levels were snapped at loading.
    pub snapped_levels: u32,
}

impl Day {
    /// The flight of that name.
    #[must_use]
    pub fn find_flight(&self, name: &str) -> Option<FlightId> {
        find(self.flights.as_slice(), name, |f| &f.name).map(FlightId)
    }

    /// The sector of that name.
    #[must_use]
    pub fn find_sector(&self, name: &str) -> Option<SectorId> {
        find(self.sectors.as_slice(), name, |s| &s.name).map(SectorId)
    }

    /// The airport of that code.
    #[must_use]
    pub fn find_airport(&self, code: &str) -> Option<AirportId> {
        find(self.airports.as_slice(), code, |a| &a.code).map(AirportId)
    }

    /// The proposal of that name.
    #[must_use]
    pub fn find_proposal(&self, name: &str) -> Option<ProposalId> {
        find(self.proposals.as_slice(), name, |p| &p.name).map(ProposalId)
    }

    /// The class of a flight's aircraft, if a class has its code.
    #[must_use]
    pub fn class_of(&self, flight: &Flight) -> Option<&AircraftClass> {
        flight.class.map(|id| &self.classes[id])
    }
}

/// Position of a name in entries sorted by name.
fn find<T>(sorted: &[T], name: &str, name_of: impl Fn(&T) -> &String) -> Option<u32> {
    sorted.binary_search_by(|entry| name_of(entry).as_str().cmp(name)).ok().map(|i| i as u32)
}
