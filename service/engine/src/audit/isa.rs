//! The speed of sound in the standard atmosphere, written down once more so that the judge does
//! not inherit a mistake from the engine's own.

use crate::units::METRES_PER_FOOT;

/// Temperature of the standard atmosphere at a pressure altitude, kelvin (ISO 2533, ICAO Doc
/// 7488: 288.15 K, falling 6.5 K/km to 11 km; 216.65 K to 20 km; then rising 1 K/km).
pub(super) fn temperature_k(level_ft: f64) -> f64 {
    let altitude_m = level_ft * METRES_PER_FOOT;
    if altitude_m < 11_000.0 {
        288.15 - 0.0065 * altitude_m
    } else if altitude_m < 20_000.0 {
        216.65
    } else {
        216.65 + 0.001 * (altitude_m - 20_000.0)
    }
}

/// Speed of sound at one level over that at another: at one Mach number in calm air, the ratio of
/// the ground speeds.
pub(super) fn sound_ratio(level_ft: f64, over_level_ft: f64) -> f64 {
    // a = sqrt(gamma R T), gamma and R the same at both.
    (temperature_k(level_ft) / temperature_k(over_level_ft)).sqrt()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn temperatures_of_the_standard() {
        // ISO 2533, table: 0 m, 5 000 m, 11 000 m, 20 000 m.
        for (m, kelvin) in [(0.0, 288.15), (5000.0, 255.65), (11_000.0, 216.65), (20_000.0, 216.65)]
        {
            assert!((temperature_k(m / METRES_PER_FOOT) - kelvin).abs() < 1e-9, "{m}");
        }
    }

    #[test]
    fn two_thousand_feet_lower_save_half_a_minute_an_hour() {
        // Closed form: T(FL 330) = 222.77 K, T(FL 350) = 218.81 K.
        let minutes = 60.0 * (1.0 - 1.0 / sound_ratio(33_000.0, 35_000.0));
        assert!((minutes - 0.536).abs() < 0.003, "{minutes}");
    }
}
