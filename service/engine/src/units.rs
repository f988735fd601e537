//! Exact unit conversions, and the only place where their factors are written.

/// Metres in one nautical mile, exact (International Hydrographic Conference, 1929).
pub const METRES_PER_NM: f64 = 1852.0;
/// Metres in one foot, exact (international foot, 1959).
pub const METRES_PER_FOOT: f64 = 0.3048;
/// Seconds in one hour.
pub const SECONDS_PER_HOUR: f64 = 3600.0;
/// Seconds in one minute.
pub const SECONDS_PER_MINUTE: f64 = 60.0;
/// Seconds in one civil day.
pub const SECONDS_PER_DAY: f64 = 86_400.0;
/// Feet in one flight level.
pub const FEET_PER_FL: f64 = 100.0;

/// Nautical miles to metres.
#[must_use]
pub fn nm_to_m(nm: f64) -> f64 {
    nm * METRES_PER_NM
}

/// Metres to nautical miles.
#[must_use]
pub fn m_to_nm(m: f64) -> f64 {
    m / METRES_PER_NM
}

/// Metres per second to knots.
#[must_use]
pub fn mps_to_kt(mps: f64) -> f64 {
    mps * SECONDS_PER_HOUR / METRES_PER_NM
}

/// Knots to metres per second.
#[must_use]
pub fn kt_to_mps(kt: f64) -> f64 {
    kt * METRES_PER_NM / SECONDS_PER_HOUR
}

/// Flight level (hundreds of feet) to feet.
#[must_use]
pub fn fl_to_ft(fl: f64) -> f64 {
    fl * FEET_PER_FL
}

/// Feet to flight level (hundreds of feet).
#[must_use]
pub fn ft_to_fl(ft: f64) -> f64 {
    ft / FEET_PER_FL
}

/// A time rounded to the nearest millisecond, the resolution of written profiles.
#[must_use]
pub fn to_millisecond(time_s: f64) -> f64 {
    (time_s * 1000.0).round() / 1000.0
}
