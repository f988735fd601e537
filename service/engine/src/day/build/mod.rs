//! From parts to a day: every defect is found, named by its path, and listed.

mod counts;
mod decisions;
mod flights;
mod places;
mod proposals;
mod restrictions;
mod tables;

use super::Day;
use super::defect::{Defect, Defects, Warning};
use super::parts::DayParts;

/// A day and what was odd about its parts.
#[derive(Debug, Clone, PartialEq)]
pub struct Built {
    /// The day.
    pub day: Day,
    /// What was odd, and what is done about it.
    pub warnings: Vec<Warning>,
}

impl Day {
    /// Checks parts and makes a day of them.
    ///
    /// # Errors
    /// Everything that is wrong, up to [`MOST_DEFECTS`](super::MOST_DEFECTS) entries.
    pub fn build(parts: DayParts) -> Result<Built, Vec<Defect>> {
        let mut build = Build::default();
        let policy = parts.policy;
        for (key, error) in policy.contradictions() {
            build.defects.push(|| format!("policy.{key}"), error.problem, error.hint);
        }
        let sectors = build.sectors(parts.sectors, &parts.capacities);
        let airports = build.airports(parts.airports, &parts.airport_capacities);
        let classes = build.classes(parts.aircraft);
        let fuel = build.fuel(&parts.fuel);
        let names = flights::Names { airports: &airports, classes: &classes };
        let (flights, snapped_levels) = build.flights(parts.flights, &names, &policy);
        let proposals = build.proposals(parts.proposals, &flights);
        let restrictions = build.restrictions(parts.restrictions);
        let background = build.background(parts.background, &sectors);
        let flows = build.flows(parts.flows, &sectors);
        let decisions = build.decisions(&parts.decisions, &flights, &proposals);
        if !build.defects.is_empty() {
            return Err(build.defects.into_vec());
        }
        build.warn_of_overlaps(&sectors);
        let day = Day {
            date: parts.date,
            region: parts.region,
            policy,
            sectors: sectors.into(),
            airports: airports.into(),
            classes: classes.into(),
            fuel,
            flights: flights.into(),
            proposals: proposals.into(),
            restrictions: restrictions.into(),
            background,
            flows,
            decisions,
            snapped_levels,
        };
        Ok(Built { day, warnings: build.warnings })
    }
}

/// What has been found so far.
#[derive(Default)]
struct Build {
    defects: Defects,
    warnings: Vec<Warning>,
}

impl Build {
    fn warn(&mut self, path: String, message: String) {
        self.warnings.push(Warning { path, message });
    }

    /// Sorts entries by name, keeping their place in the input; a blank or repeated name is a
    /// defect.
    fn sort_by_name<T>(
        &mut self,
        table: &str,
        field: &str,
        items: Vec<T>,
        name_of: impl Fn(&T) -> &str,
    ) -> Vec<(usize, T)> {
        let mut items: Vec<(usize, T)> = items.into_iter().enumerate().collect();
        for (i, item) in &items {
            if name_of(item).is_empty() {
                self.defects.push(|| format!("{table}[{i}].{field}"), "is blank", "give a name");
            }
        }
        items.sort_by(|a, b| name_of(&a.1).cmp(name_of(&b.1)).then(a.0.cmp(&b.0)));
        for w in items.windows(2) {
            let name = name_of(&w[1].1);
            if name_of(&w[0].1) == name && !name.is_empty() {
                self.defects.push(
                    || format!("{table}[{}].{field}", w[1].0),
                    format!("`{name}` is there twice"),
                    format!("names must be unique; the first is {table}[{}]", w[0].0),
                );
            }
        }
        items
    }

    /// A figure that may be absent must be finite and in range where it is present.
    fn optional(
        &mut self,
        path: impl FnOnce() -> String,
        value: Option<f64>,
        range: std::ops::RangeInclusive<f64>,
    ) -> Option<f64> {
        if let Some(v) = value
            && !range.contains(&v)
        {
            let hint = if range.end().is_finite() {
                format!("a number from {} to {}, or blank", range.start(), range.end())
            } else {
                format!("a finite number from {}, or blank", range.start())
            };
            self.defects.push(path, format!("`{v}` is out of range"), hint);
            return None;
        }
        value
    }
}

/// Largest capacity, so that counts stay exact.
const LARGEST_LIMIT: f64 = 1e9;
