//! Where a flight is at every time, filed or changed, cut fine enough to calculate with.
//!
//! A [`Track`] cuts each filed leg's geodesic into equal-time pieces of at most 10 NM. The track is
//! the same for every version of a flight: a level change alters when places are passed and at
//! which level, never where they are. Between two knots of a [`Path`] the flight moves
//! - along the straight chord of the ellipsoid, for distances to other flights (the chord differs
//!   from the geodesic by less than 0.5 m over 10 NM),
//! - along the straight line in longitude and latitude, for what lies inside a polygon,
//!
//! at constant ground speed, its level changing linearly with time.

mod changed;
mod track;

pub use changed::{Changed, Path};
pub(crate) use track::lon_step_deg;
pub use track::{Knot, LONGEST_PIECE_M, Track};
