//! Traffic known only as counts.

use super::super::background::{Background, Flow};
use super::super::parts::{BackgroundParts, FlowParts};
use super::super::sector::Sector;
use super::{Build, LARGEST_LIMIT};
use crate::ids::SectorId;

impl Build {
    pub(super) fn background(
        &mut self,
        parts: Vec<BackgroundParts>,
        sectors: &[Sector],
    ) -> Vec<Background> {
        let mut background = Vec::with_capacity(parts.len());
        for (i, row) in parts.into_iter().enumerate() {
            let path = |field: &str| format!("background[{i}].{field}");
            let sector = self.sector_named("background", i, "sector", &row.sector, sectors);
            self.check_period("background", i, row.from_s, row.until_s);
            self.optional(|| path("aircraft"), Some(row.aircraft), 0.0..=LARGEST_LIMIT);
            let entries = self.optional(|| path("entries"), row.entries, 0.0..=LARGEST_LIMIT);
            if let Some(level_ft) = row.level_ft {
                self.check_level(|| path("level_ft"), level_ft);
            }
            background.extend(sector.map(|sector| Background {
                sector,
                from_s: row.from_s,
                until_s: row.until_s,
                aircraft: row.aircraft,
                level_ft: row.level_ft,
                entries,
            }));
        }
        background.sort_by(|a, b| {
            let key = |r: &Background| [r.from_s, r.until_s, r.aircraft];
            let level = |r: &Background| r.level_ft.unwrap_or(f64::NEG_INFINITY);
            let entries = |r: &Background| r.entries.unwrap_or(-1.0);
            a.sector
                .cmp(&b.sector)
                .then_with(|| in_order(&key(a), &key(b)))
                .then_with(|| in_order(&[level(a), entries(a)], &[level(b), entries(b)]))
        });
        background
    }

    pub(super) fn flows(&mut self, parts: Vec<FlowParts>, sectors: &[Sector]) -> Vec<Flow> {
        let mut flows = Vec::with_capacity(parts.len());
        for (i, row) in parts.into_iter().enumerate() {
            let path = |field: &str| format!("flows[{i}].{field}");
            let from = self.sector_named("flows", i, "from_sector", &row.from_sector, sectors);
            let to = self.sector_named("flows", i, "to_sector", &row.to_sector, sectors);
            self.check_period("flows", i, row.from_s, row.until_s);
            self.optional(|| path("aircraft"), Some(row.aircraft), 0.0..=LARGEST_LIMIT);
            self.check_level(|| path("from_level_ft"), row.from_level_ft);
            self.check_level(|| path("to_level_ft"), row.to_level_ft);
            if let (Some(from), Some(to)) = (from, to) {
                flows.push(Flow {
                    from: (from, row.from_level_ft),
                    to: (to, row.to_level_ft),
                    from_s: row.from_s,
                    until_s: row.until_s,
                    aircraft: row.aircraft,
                });
            }
        }
        flows.sort_by(|a, b| {
            let key = |f: &Flow| [f.from.1, f.to.1, f.from_s, f.until_s, f.aircraft];
            (a.from.0, a.to.0).cmp(&(b.from.0, b.to.0)).then_with(|| in_order(&key(a), &key(b)))
        });
        flows
    }

    fn sector_named(
        &mut self,
        table: &str,
        i: usize,
        field: &str,
        name: &str,
        sectors: &[Sector],
    ) -> Option<SectorId> {
        let found = sectors.binary_search_by(|s| s.name.as_str().cmp(name));
        if found.is_err() {
            self.unknown_name(table, i, field, "sector", name);
        }
        found.ok().map(|at| SectorId(at as u32))
    }
}

fn in_order(a: &[f64], b: &[f64]) -> std::cmp::Ordering {
    a.iter()
        .zip(b)
        .map(|(a, b)| a.total_cmp(b))
        .find(|order| order.is_ne())
        .unwrap_or(std::cmp::Ordering::Equal)
}
