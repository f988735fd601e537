//! Shapes and motion on the WGS 84 ellipsoid.
//!
//! A filed leg is a geodesic. It is cut into pieces of at most 10 NM flown in equal times; between
//! the cuts a flight moves along a straight chord of the ellipsoid for distances, and along a
//! straight line in longitude and latitude for what lies inside a polygon.

pub mod geodesic;
pub mod motion;
pub mod polygon;
