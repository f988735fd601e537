//! The International Standard Atmosphere, ICAO Doc 7488 (ISO 2533), up to 20 km.

use crate::units::METRES_PER_FOOT;

/// Temperature at sea level, K.
const SEA_LEVEL_TEMPERATURE_K: f64 = 288.15;
/// Pressure at sea level, Pa.
const SEA_LEVEL_PRESSURE_PA: f64 = 101_325.0;
/// Fall of temperature with height below the tropopause, K/m.
const LAPSE_RATE_K_PER_M: f64 = 0.0065;
/// Height of the tropopause, m.
const TROPOPAUSE_M: f64 = 11_000.0;
/// Temperature above the tropopause, K.
const TROPOPAUSE_TEMPERATURE_K: f64 = 216.65;
/// Standard gravity, m/s².
const GRAVITY_MPS2: f64 = 9.806_65;
/// Specific gas constant of air, J/(kg K).
pub const GAS_CONSTANT_J_PER_KG_K: f64 = 287.052_87;
/// Ratio of specific heats of air.
pub const HEAT_CAPACITY_RATIO: f64 = 1.4;

/// Temperature at a pressure altitude, K.
#[must_use]
pub fn temperature_k(level_ft: f64) -> f64 {
    let height_m = level_ft * METRES_PER_FOOT;
    if height_m < TROPOPAUSE_M {
        SEA_LEVEL_TEMPERATURE_K - LAPSE_RATE_K_PER_M * height_m
    } else {
        TROPOPAUSE_TEMPERATURE_K
    }
}

/// Pressure at a pressure altitude, Pa.
#[must_use]
pub fn pressure_pa(level_ft: f64) -> f64 {
    let height_m = level_ft * METRES_PER_FOOT;
    let exponent = GRAVITY_MPS2 / (GAS_CONSTANT_J_PER_KG_K * LAPSE_RATE_K_PER_M);
    let below = |h: f64| {
        let ratio = 1.0 - LAPSE_RATE_K_PER_M * h / SEA_LEVEL_TEMPERATURE_K;
        SEA_LEVEL_PRESSURE_PA * ratio.powf(exponent)
    };
    if height_m < TROPOPAUSE_M {
        below(height_m)
    } else {
        let scale_m = GAS_CONSTANT_J_PER_KG_K * TROPOPAUSE_TEMPERATURE_K / GRAVITY_MPS2;
        below(TROPOPAUSE_M) * (-(height_m - TROPOPAUSE_M) / scale_m).exp()
    }
}

/// Speed of sound in air of a temperature, m/s.
#[must_use]
pub fn speed_of_sound_mps(temperature_k: f64) -> f64 {
    (HEAT_CAPACITY_RATIO * GAS_CONSTANT_J_PER_KG_K * temperature_k).sqrt()
}

/// Speed of sound at a pressure altitude in ISA, m/s.
#[must_use]
pub fn speed_of_sound_at_mps(level_ft: f64) -> f64 {
    speed_of_sound_mps(temperature_k(level_ft))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::units::mps_to_kt;

    /// ICAO Doc 7488 (ISO 2533), solved from its formulas in double precision.
    #[test]
    fn the_standard_s_values() {
        for (fl, t_k, p_hpa, a_kt) in [
            (245.0, 239.6106, 384.286, 603.197),
            (290.0, 230.6952, 314.850, 591.869),
            (310.0, 226.7328, 287.447, 586.764),
            (330.0, 222.7704, 262.007, 581.615),
            (350.0, 218.8080, 238.423, 576.419),
            (370.0, 216.65, 216.627, 573.569),
            (410.0, 216.65, 178.738, 573.569),
            (430.0, 216.65, 162.357, 573.569),
        ] {
            let level_ft = fl * 100.0;
            assert!((temperature_k(level_ft) - t_k).abs() < 1e-4, "T at FL {fl}");
            assert!((pressure_pa(level_ft) / 100.0 - p_hpa).abs() < 1e-3, "p at FL {fl}");
            assert!((mps_to_kt(speed_of_sound_at_mps(level_ft)) - a_kt).abs() < 1e-3, "a, FL {fl}");
        }
    }
}
