//! The model of Rimeshift and every answer that it gives.
//!
//! The engine takes plain data ([`day::DayParts`]), builds an immutable [`day::Day`] and answers
//! questions about it. It reads no file, clock, environment or network; the same day, policy, seed
//! and work budget give the same answer whatever the number of threads.

pub mod air;
pub mod answer;
pub mod ask;
pub mod audit;
pub mod benefit;
pub mod change;
pub mod check;
pub mod day;
#[cfg(test)]
mod fixture;
pub mod geometry;
pub mod ids;
pub mod load;
pub mod path;
pub mod plan;
pub mod search;
pub mod separation;
pub mod traffic;
pub mod units;
