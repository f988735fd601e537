//! How fast a flight moves in still standard air.
//!
//! International Standard Atmosphere (ICAO Doc 7488, ISO 2533): temperature falls by 6.5 K per
//! kilometre to 11 km and is constant above, to 20 km.

const FT_M: f64 = 0.3048;
const SEA_LEVEL_K: f64 = 288.15;
const TROPOPAUSE_K: f64 = 216.65;

/// ISA temperature at a pressure altitude in feet, in kelvin.
#[must_use]
pub fn temperature_k(level_ft: f64) -> f64 {
    (SEA_LEVEL_K - 0.0065 * level_ft * FT_M).max(TROPOPAUSE_K)
}

/// Speed of sound at a pressure altitude in feet, in knots.
#[must_use]
pub fn speed_of_sound_kt(level_ft: f64) -> f64 {
    (1.4 * 287.052_87 * temperature_k(level_ft)).sqrt() * 3600.0 / 1852.0
}

/// Air density at a pressure altitude in feet, as a share of that at sea level.
#[must_use]
pub fn density_ratio(level_ft: f64) -> f64 {
    let theta = temperature_k(level_ft) / SEA_LEVEL_K;
    let troposphere = theta.powf(4.255_88);
    let above_m = (level_ft * FT_M - 11_000.0).max(0.0);
    troposphere * (-above_m * 9.806_65 / (287.052_87 * TROPOPAUSE_K)).exp()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn standard_atmosphere() {
        // Solved from ICAO Doc 7488's formulas in double precision.
        for (fl, sound_kt) in [(245.0, 603.197), (330.0, 581.615), (370.0, 573.569)] {
            assert!((speed_of_sound_kt(fl * 100.0) - sound_kt).abs() < 0.01, "FL {fl}");
        }
        // p = 226.320 hPa and T = 216.65 K at 11 km give 0.29707 (ICAO Doc 7488, from memory).
        assert!((density_ratio(11_000.0 / FT_M) - 0.29707).abs() < 1e-4);
    }
}
