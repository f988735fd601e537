//! From a filed profile and stretches to the new profile, or the rule that is broken.
//!
//! A stretch marks two places along the filed track by their filed times. At the first the aircraft
//! starts to leave its filed level, at the second it starts to return. The ground track stays, the
//! Mach number stays: in standard air the ground speed of level flight goes as the speed of sound
//! at the level. Wherever the filed profile climbs or descends the ground speed stays as filed. All
//! later places are passed earlier or later by the time gained or lost; no speed control absorbs
//! it.
//!
//! Every step works in *filed time*, the coordinate along the track: `flown` turns it into new
//! times, `rules` judges, `make` puts one stretch after the other, `levels` knows the
//! cruising levels by direction.

mod flown;
mod levels;
mod make;
mod rules;
#[cfg(test)]
mod tests;
mod written;

pub use levels::{allows_level, nears_direction_boundary};
pub use make::{Change, StretchTimes, change_levels};
pub use written::written_points;
