//! Aircraft classes and cruise fuel rows.

use std::collections::BTreeMap;

use super::super::class::{AircraftClass, DEFAULT_RATE_FPM, FuelRow, FuelTable};
use super::super::parts::{AircraftParts, FuelFlow, FuelParts};
use super::Build;

impl Build {
    pub(super) fn classes(&mut self, parts: Vec<AircraftParts>) -> Vec<AircraftClass> {
        let parts = self.sort_by_name("aircraft", "aircraft", parts, |a| a.aircraft.as_str());
        let mut classes = Vec::with_capacity(parts.len());
        for (i, class) in parts {
            let mut figure = |field: &str, value, range| {
                self.optional(|| format!("aircraft[{i}].{field}"), value, range)
            };
            let ceiling_ft = figure("ceiling_ft", class.ceiling_ft, -2000.0..=100_000.0);
            let climb_fpm = figure("climb_fpm", class.climb_fpm, 1.0..=20_000.0);
            let descent_fpm = figure("descent_fpm", class.descent_fpm, 1.0..=20_000.0);
            let contrail_factor = figure("contrail_factor", class.contrail_factor, 0.0..=100.0);
            classes.push(AircraftClass {
                code: class.aircraft,
                ceiling_ft,
                climb_fpm: climb_fpm.unwrap_or(DEFAULT_RATE_FPM),
                descent_fpm: descent_fpm.unwrap_or(DEFAULT_RATE_FPM),
                contrail_factor: contrail_factor.unwrap_or(1.0),
            });
        }
        classes
    }

    /// Rows grouped by aircraft and mass, by rising level; all rows of a group flow by the same
    /// unit, else there is no meaning between them.
    pub(super) fn fuel(&mut self, parts: &[FuelParts]) -> Vec<FuelTable> {
        let mut groups: BTreeMap<(&str, u64), Vec<(usize, &FuelParts)>> = BTreeMap::new();
        for (i, row) in parts.iter().enumerate() {
            let path = |field: &str| format!("fuel[{i}].{field}");
            if row.aircraft.is_empty() {
                self.defects.push(|| path("aircraft"), "is blank", "name an aircraft code");
            }
            if !(-2000.0..=66_000.0).contains(&row.level_ft) {
                self.defects.push(
                    || path("level_ft"),
                    format!("`{}` is no level", row.level_ft),
                    "FL -20 to 660",
                );
            }
            let (FuelFlow::KgPerMin(flow) | FuelFlow::KgPerNm(flow)) = row.flow;
            if !(0.0..=1e5).contains(&flow) {
                self.defects.push(
                    || path("flow"),
                    format!("`{flow}` is no fuel flow"),
                    "a number from 0 to 100000",
                );
            }
            let mass_kg = self.optional(|| path("mass_kg"), row.mass_kg, 1.0..=1e7);
            // Positive numbers sort by their bits; no mass sorts first.
            let key = (row.aircraft.as_str(), mass_kg.map_or(0, f64::to_bits));
            groups.entry(key).or_default().push((i, row));
        }
        groups.into_iter().map(|((aircraft, _), rows)| self.fuel_table(aircraft, rows)).collect()
    }

    fn fuel_table(&mut self, aircraft: &str, mut rows: Vec<(usize, &FuelParts)>) -> FuelTable {
        rows.sort_by(|a, b| a.1.level_ft.total_cmp(&b.1.level_ft).then(a.0.cmp(&b.0)));
        for w in rows.windows(2) {
            let (before, row) = (w[0], w[1]);
            if before.1.level_ft >= row.1.level_ft {
                self.defects.push(
                    || format!("fuel[{}].level_ft", row.0),
                    format!("`{aircraft}` has this level twice"),
                    format!("one row a level and mass; the other is fuel[{}]", before.0),
                );
            }
            let same_unit =
                std::mem::discriminant(&before.1.flow) == std::mem::discriminant(&row.1.flow);
            if !same_unit {
                self.defects.push(
                    || format!("fuel[{}].flow", row.0),
                    format!("`{aircraft}` mixes kg_per_min and kg_per_nm"),
                    "use one of them for all levels of an aircraft and mass",
                );
            }
        }
        FuelTable {
            aircraft: aircraft.to_owned(),
            mass_kg: rows.first().and_then(|(_, row)| row.mass_kg),
            rows: rows
                .iter()
                .map(|(_, row)| FuelRow { level_ft: row.level_ft, flow: row.flow })
                .collect(),
        }
    }
}
