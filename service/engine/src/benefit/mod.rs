//! What a level change is worth: contrail forcing avoided less the forcing of the extra CO2.
//!
//! While a day has no weather, a proposal's own figures say what it avoids; its extra fuel is given
//! too, or comes from the user's cruise fuel rows, or is nothing.

mod fuel;

pub use fuel::extra_fuel_kg;

use crate::change::Change;
use crate::day::{Alternative, Day, Flight, ObjectiveRule, Policy};

/// CO2 from burning a kilogram of kerosene, kg (common practice, no source).
const CO2_PER_FUEL: f64 = 3.16;
/// Surface of the Earth, m².
const EARTH_SURFACE_M2: f64 = 5.101e14;
/// Length of a year, s.
const YEAR_S: f64 = 3.155_76e7;
const METRES_PER_KM: f64 = 1000.0;

/// What one alternative brings and costs.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Figures {
    /// Its net benefit times its priority, in the unit of the objective (J, or points).
    pub net_benefit: f64,
    /// Contrail kilometres avoided.
    pub contrail_km_avoided: f64,
    /// Instantaneous contrail forcing avoided, J.
    pub ef_avoided_j: f64,
    /// Extra fuel, kg.
    pub extra_fuel_kg: f64,
}

/// The figures of an alternative, flown as `change`.
#[must_use]
pub fn figures(day: &Day, flight: &Flight, alternative: &Alternative, change: &Change) -> Figures {
    let policy = &day.policy;
    let contrail_km_avoided = alternative.contrail_km_avoided.unwrap_or(0.0);
    let ef_avoided_j = alternative
        .ef_avoided_j
        .unwrap_or(contrail_km_avoided * METRES_PER_KM * policy.contrail_night_j_per_m);
    let extra_fuel_kg =
        alternative.extra_fuel_kg.unwrap_or_else(|| extra_fuel_kg(day, flight, &change.changed));
    let worth = match policy.objective {
        ObjectiveRule::NetForcing => {
            policy.contrail_erf_ratio * ef_avoided_j - fuel_forcing_j(policy, extra_fuel_kg)
        }
        ObjectiveRule::Weights => {
            policy.contrail_km_weight * contrail_km_avoided - policy.fuel_kg_weight * extra_fuel_kg
        }
    };
    Figures {
        net_benefit: worth * alternative.priority,
        contrail_km_avoided,
        ef_avoided_j,
        extra_fuel_kg,
    }
}

/// Energy forcing of the CO2 from burning fuel, J, over the policy's horizon.
#[must_use]
pub fn fuel_forcing_j(policy: &Policy, fuel_kg: f64) -> f64 {
    fuel_kg * CO2_PER_FUEL * policy.co2_agwp() * EARTH_SURFACE_M2 * YEAR_S
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Worked example: 1e8 J/m over 100 km, or 1e13 J, is the forcing of 6.94 t of CO2 or 2.20 t of
    /// fuel at 100 years (1.4407e9 J per kg of CO2, from AR6's AGWP of 8.95e-14, from memory), and
    /// with a forcing ratio of 0.42 the break-even fuel is 922 kg.
    #[test]
    fn a_hundred_kilometres_are_worth_two_tonnes_of_fuel() {
        let policy = Policy::default();
        let per_kg_co2 = fuel_forcing_j(&policy, 1.0) / CO2_PER_FUEL;
        assert!((per_kg_co2 / 1.4407e9 - 1.0).abs() < 1e-4, "{per_kg_co2}");
        let break_even_kg = 1e13 / fuel_forcing_j(&policy, 1.0);
        assert!((break_even_kg - 2196.0).abs() < 1.0, "{break_even_kg}");
        assert!((0.42 * break_even_kg - 922.0).abs() < 1.0);
        let twenty = Policy { co2_horizon_years: 20.0, ..Policy::default() };
        assert!(
            (fuel_forcing_j(&twenty, 1.0) / fuel_forcing_j(&policy, 1.0) - 2.43 / 8.95).abs()
                < 1e-9
        );
    }
}
