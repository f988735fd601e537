//! Extra fuel of a change from the user's own cruise fuel rows.

use crate::day::{Day, Flight, FuelFlow, FuelRow, FuelTable};
use crate::path::Changed;
use crate::units::{SECONDS_PER_MINUTE, m_to_nm};

/// Fuel of the changed flight less that of the filed one, kg; 0 where no row has its aircraft.
#[must_use]
pub fn extra_fuel_kg(day: &Day, flight: &Flight, changed: &Changed) -> f64 {
    let Some(table) = table_of(day, flight) else { return 0.0 };
    let mut extra_kg = 0.0;
    for w in changed.knots.windows(2) {
        let (a, b) = (&w[0], &w[1]);
        let distance_m =
            (0..3).map(|k| (a.position_m[k] - b.position_m[k]).powi(2)).sum::<f64>().sqrt();
        let filed_ft = |filed_s| flight.profile.level_ft_at(filed_s);
        extra_kg += burnt_kg(table, a.level_ft, b.level_ft, b.time_s - a.time_s, distance_m);
        extra_kg -= burnt_kg(
            table,
            filed_ft(a.filed_s),
            filed_ft(b.filed_s),
            b.filed_s - a.filed_s,
            distance_m,
        );
    }
    extra_kg
}

/// The rows of a flight's aircraft whose mass is nearest to the flight's, the lighter of two as
/// near. A flight without a mass takes the rows without one, else those of the middle mass.
fn table_of<'d>(day: &'d Day, flight: &Flight) -> Option<&'d FuelTable> {
    let from = day.fuel.partition_point(|t| t.aircraft < flight.aircraft);
    let tables = &day.fuel[from..];
    let tables = &tables[..tables.partition_point(|t| t.aircraft == flight.aircraft)];
    // Sorted by mass, none first.
    match flight.mass_kg {
        None => match tables.first() {
            Some(first) if first.mass_kg.is_none() => Some(first),
            _ => tables.get(tables.len().saturating_sub(1) / 2),
        },
        Some(mass_kg) => tables.iter().min_by(|a, b| {
            let off = |t: &FuelTable| t.mass_kg.map_or(f64::INFINITY, |m| (m - mass_kg).abs());
            off(a).total_cmp(&off(b))
        }),
    }
}

/// Fuel over a piece whose level changes linearly, kg.
fn burnt_kg(table: &FuelTable, from_ft: f64, to_ft: f64, duration_s: f64, distance_m: f64) -> f64 {
    let flow = mean_flow(&table.rows, from_ft, to_ft);
    match table.rows[0].flow {
        FuelFlow::KgPerMin(_) => flow * duration_s / SECONDS_PER_MINUTE,
        FuelFlow::KgPerNm(_) => flow * m_to_nm(distance_m),
    }
}

fn flow_of(row: &FuelRow) -> f64 {
    let (FuelFlow::KgPerMin(flow) | FuelFlow::KgPerNm(flow)) = row.flow;
    flow
}

/// Mean of the flow between two levels: linear between rows, clamped to them.
fn mean_flow(rows: &[FuelRow], from_ft: f64, to_ft: f64) -> f64 {
    let (low_ft, high_ft) = (from_ft.min(to_ft), from_ft.max(to_ft));
    if high_ft - low_ft < 1e-9 {
        return flow_at(rows, low_ft);
    }
    // The trapezium rule is exact between rows.
    let mut sum = 0.0;
    let mut from = (low_ft, flow_at(rows, low_ft));
    let inner = rows.iter().filter(|r| low_ft < r.level_ft && r.level_ft < high_ft);
    for to in inner
        .map(|row| (row.level_ft, flow_of(row)))
        .chain(std::iter::once((high_ft, flow_at(rows, high_ft))))
    {
        sum += 0.5 * (from.1 + to.1) * (to.0 - from.0);
        from = to;
    }
    sum / (high_ft - low_ft)
}

fn flow_at(rows: &[FuelRow], level_ft: f64) -> f64 {
    let above = rows.partition_point(|r| r.level_ft <= level_ft);
    if above == 0 {
        return flow_of(&rows[0]);
    }
    let low = &rows[above - 1];
    let Some(high) = rows.get(above) else { return flow_of(low) };
    let share = (level_ft - low.level_ft) / (high.level_ft - low.level_ft);
    flow_of(low) + share * (flow_of(high) - flow_of(low))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn rows(flows: &[(f64, f64)]) -> Vec<FuelRow> {
        flows
            .iter()
            .map(|&(level_ft, kg)| FuelRow { level_ft, flow: FuelFlow::KgPerMin(kg) })
            .collect()
    }

    #[test]
    fn flow_is_linear_between_rows_and_clamped_to_them() {
        let rows = rows(&[(30_000.0, 60.0), (34_000.0, 40.0), (38_000.0, 30.0)]);
        for (level_ft, kg) in [
            (20_000.0, 60.0),
            (30_000.0, 60.0),
            (33_000.0, 45.0),
            (36_000.0, 35.0),
            (45_000.0, 30.0),
        ] {
            assert!((flow_at(&rows, level_ft) - kg).abs() < 1e-12);
        }
        // Half the way at a mean of 42.5, half at 37.5.
        assert!((mean_flow(&rows, 36_000.0, 33_000.0) - (42.5 + 2.0 * 37.5) / 3.0).abs() < 1e-12);
    }
}
