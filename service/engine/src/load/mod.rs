//! How much traffic each sector and airport has, and how much more it may take.
//!
//! # Method
//! A [`SectorIndex`] finds when a version of a flight is inside which sector, by cutting each piece
//! of its path at the crossings of floors, ceilings and polygon edges; the result, with climbs,
//! descents, take-off and landing, is its [`FlightLoad`]. A *series* is one measure at one place; a
//! [`Cell`] is one window or minute of a series. [`DayLoads`] counts the filed day, cell by cell.
//! A change of a flight is a sparse list of signed differences of cells
//! ([`DayLoads::differences`]); [`PlannedLoads`] adds such lists to the filed counts and says what
//! one more would break.
//!
//! 60-minute windows start at every multiple of the policy's `entry_step_min`, and occupancy is
//! counted at whole minutes (overlapping hourly slices every 20 minutes: Regulation (EU) 2019/317,
//! annex I, 3). The rule that a plan may not be worse than the larger of the limit and the filed
//! day stands in one place, `allowed`. A lasting overload is a rule over a run of occupancy cells,
//! `lasting`.
//!
//! # Adding a kind of capacity
//! 1. The limit: a field of [`SectorLimits`](crate::day::SectorLimits) or
//!    [`AirportLimits`](crate::day::AirportLimits), with its column in files and its field on the
//!    wire.
//! 2. What it is called in answers: a kind of [`LoadMeasure`](crate::answer::LoadMeasure).
//! 3. One file here that implements [`Measure`]: its places, its clock, its limit, and which
//!    windows or minutes a flight adds to. Then a line in [`MEASURES`].
//! 4. A naive recount in the audit.
//!
//! Counting, differences, the search, refusals and reports follow from these.

mod airports;
mod allowed;
mod background;
mod cells;
mod day_loads;
mod entries;
mod flight_load;
mod index;
mod lasting;
mod level_changes;
mod measure;
mod occupancy;
mod piece;
mod planned;
mod report;
mod restricted;
mod runs;

#[cfg(test)]
mod recount;
#[cfg(test)]
mod sampling;

pub use cells::{Cell, Clock, Times};
pub use day_loads::{DayLoads, Difference, Which};
pub use flight_load::{FlightLoad, LevelChange, Visit};
pub use index::SectorIndex;
pub use lasting::LastingRule;
pub use measure::{MEASURES, Measure, Places};
pub use planned::PlannedLoads;
pub use restricted::RestrictionIndex;
