//! The invented day in `demo-sectors/day`, and the pieces that it is made from.
//!
//! Nothing here is real. *Oriel Reach* is a region of about 1 000 km by 800 km drawn over open
//! ocean, with eight airports, twenty-four sectors in three layers (two more, merged, at night)
//! and 1 200 flights of five operators that do not exist. Invented regions of ice-supersaturated
//! air drift through it; flights that cross one ask for another level. Run
//!
//! ```sh
//! cargo run --release -p rimeshift-demo-sectors
//! ```
//!
//! to write the folder again: the same bytes come out, whatever the machine.
//!
//! What the day is made to show: limits of every kind close to the filed traffic, some of them
//! already broken by it; a restriction, a sector in which levels must stay as filed and one with
//! a larger horizontal minimum; flights without RVSM approval, immovable ones, some that never
//! reach the cruise floor; proposals with alternatives, with several stretches, from the climb and
//! until the descent; proposals that are wrong in one way each.
//!
//! Speeds, rates and fuel figures are rules of thumb for still standard air, made for
//! plausibility. The modules without invented names ([`atmosphere`], [`levels`], [`route`],
//! [`profile`], [`fleet`], [`flight`], [`ice`], [`proposals`], [`tally`], [`tables`]) also serve the converter
//! of real timetables in the `tests` crate.

pub mod atmosphere;
pub mod fleet;
pub mod flight;
pub mod ice;
pub mod levels;
pub mod profile;
pub mod proposals;
pub mod route;
pub mod tables;
pub mod tally;

pub mod limits;
pub mod region;
pub mod requests;
pub mod traffic;
