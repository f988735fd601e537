//! Net benefits and fuel, from given figures and the user's fuel tables.

use super::path::Path;
use super::tolerances::{FUEL_KG, FUEL_RELATIVE};
use crate::day::{Alternative, Day, Flight, FuelFlow, FuelTable, ObjectiveRule, Policy};
use crate::units::{METRES_PER_NM, SECONDS_PER_MINUTE};

/// Kilograms of CO2 from a kilogram of kerosene (ICAO, 3.16).
const CO2_PER_FUEL: f64 = 3.16;
/// Area of the Earth, m² (from memory; of a sphere of 6 371 km).
const EARTH_M2: f64 = 5.101e14;
/// Seconds in a Julian year.
const YEAR_S: f64 = 3.15576e7;

/// A net benefit and the size of the terms that it is the difference of.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Net {
    pub(super) value: f64,
    pub(super) size: f64,
}

/// Contrail kilometres that an option avoids.
pub(super) fn contrail_km(alternative: &Alternative) -> f64 {
    alternative.contrail_km_avoided.unwrap_or(0.0)
}

/// Net benefit of an option that takes so much extra fuel.
pub(super) fn net(policy: &Policy, alternative: &Alternative, extra_fuel_kg: f64) -> Net {
    let km = contrail_km(alternative);
    let (gain, cost) = match policy.objective {
        ObjectiveRule::NetForcing => {
            let given_j = alternative.ef_avoided_j;
            let avoided_j = given_j.unwrap_or(km * 1000.0 * policy.contrail_night_j_per_m);
            let per_fuel_kg_j = CO2_PER_FUEL * policy.co2_agwp() * EARTH_M2 * YEAR_S;
            (policy.contrail_erf_ratio * avoided_j, extra_fuel_kg * per_fuel_kg_j)
        }
        ObjectiveRule::Weights => {
            (policy.contrail_km_weight * km, policy.fuel_kg_weight * extra_fuel_kg)
        }
    };
    Net {
        value: alternative.priority * (gain - cost),
        size: alternative.priority.abs() * (gain.abs() + cost.abs()),
    }
}

/// Where an option's extra fuel comes from.
#[derive(Debug, Clone, Copy)]
pub(super) enum FuelSource<'d> {
    /// As given, kg; 0 where nothing is known.
    Given(f64),
    /// From the user's table.
    Table(&'d FuelTable),
    /// Several tables fit equally well.
    Unclear,
}

/// The source for an option of a flight.
pub(super) fn fuel_source<'d>(
    day: &'d Day,
    flight: &Flight,
    alternative: &Alternative,
) -> FuelSource<'d> {
    if let Some(kg) = alternative.extra_fuel_kg {
        return FuelSource::Given(kg);
    }
    let tables: Vec<&FuelTable> =
        day.fuel.iter().filter(|t| t.aircraft == flight.aircraft && !t.rows.is_empty()).collect();
    // How far a table's mass is from the flight's; only masses can be near.
    let distance = |table: &FuelTable| match (flight.mass_kg, table.mass_kg) {
        (Some(own), Some(of)) => (own - of).abs(),
        (None, None) => 0.0,
        _ => f64::INFINITY,
    };
    let nearest = tables.iter().map(|t| distance(t)).fold(f64::INFINITY, f64::min);
    let mut best = tables.iter().filter(|t| distance(t).total_cmp(&nearest).is_eq());
    match (best.next(), best.next()) {
        (None, _) => FuelSource::Given(0.0),
        (Some(table), None) => FuelSource::Table(table),
        (Some(_), Some(_)) => FuelSource::Unclear,
    }
}

/// Fuel of a flown profile by a table: its flow at the level passed, over the whole profile.
pub(super) fn fuel_kg(path: &Path<'_>, table: &FuelTable) -> f64 {
    let track = path.track;
    let mut total_kg = 0.0;
    for ends in path.knots().windows(2) {
        let (a, b) = (ends[0], ends[1]);
        let duration_s = b.time_s - a.time_s;
        let leg = track.leg_at(f64::midpoint(a.filed_s, b.filed_s));
        let (leg_from_s, leg_until_s) = track.leg_times_s(leg);
        let length_m =
            track.leg_length_m(leg) * (b.filed_s - a.filed_s) / (leg_until_s - leg_from_s);
        let speed_mps = length_m / duration_s;
        // The flow is linear between rows: the trapezium is exact between their levels.
        let mut levels = vec![a.level_ft, b.level_ft];
        let (low, high) = (a.level_ft.min(b.level_ft), a.level_ft.max(b.level_ft));
        levels.extend(table.rows.iter().map(|r| r.level_ft).filter(|l| low < *l && *l < high));
        levels.sort_by(f64::total_cmp);
        for part in levels.windows(2) {
            let share = if high > low { (part[1] - part[0]) / (high - low) } else { 1.0 };
            let flow = f64::midpoint(
                flow_kgps(table, part[0], speed_mps),
                flow_kgps(table, part[1], speed_mps),
            );
            total_kg += flow * duration_s * share;
        }
    }
    total_kg
}

/// Fuel flow at a level, kg/s: linear between a table's rows and held outside them.
fn flow_kgps(table: &FuelTable, level_ft: f64, speed_mps: f64) -> f64 {
    let of = |flow: FuelFlow| match flow {
        FuelFlow::KgPerMin(kg) => kg / SECONDS_PER_MINUTE,
        FuelFlow::KgPerNm(kg) => kg * speed_mps / METRES_PER_NM,
    };
    let rows = &table.rows;
    let above = rows.partition_point(|row| row.level_ft <= level_ft);
    let below = rows[above.saturating_sub(1)];
    let Some(next) = rows.get(above).filter(|_| above > 0) else { return of(below.flow) };
    let share = (level_ft - below.level_ft) / (next.level_ft - below.level_ft);
    of(below.flow) + (of(next.flow) - of(below.flow)) * share
}

/// How far two sums of the same fuel may differ, kg.
pub(super) fn fuel_tolerance_kg(source: FuelSource<'_>, kg: f64) -> f64 {
    match source {
        FuelSource::Given(_) => kg.abs() * super::tolerances::RELATIVE + 1e-9,
        FuelSource::Table(_) | FuelSource::Unclear => kg.abs() * FUEL_RELATIVE + FUEL_KG,
    }
}
