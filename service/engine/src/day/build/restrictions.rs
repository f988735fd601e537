//! Restrictions.

use super::super::parts::RestrictionParts;
use super::super::restriction::Restriction;
use super::Build;

impl Build {
    /// Restrictions by name, then by start; their order in the input does not matter otherwise.
    pub(super) fn restrictions(&mut self, parts: Vec<RestrictionParts>) -> Vec<Restriction> {
        let mut restrictions = Vec::with_capacity(parts.len());
        for (i, parts) in parts.into_iter().enumerate() {
            if parts.restriction.is_empty() {
                self.defects.push(
                    || format!("restrictions[{i}].restriction"),
                    "is blank",
                    "give a name, by which answers tell it",
                );
            }
            self.check_period("restrictions", i, parts.from_s, parts.until_s);
            let path = format!("restrictions[{i}]");
            let volumes = self.volumes(&path, "restriction", parts.volumes);
            let mut levels_allowed_ft = parts.levels_allowed_ft;
            for level_ft in &levels_allowed_ft {
                self.check_level(|| format!("{path}.levels_allowed_ft"), *level_ft);
            }
            levels_allowed_ft.sort_by(f64::total_cmp);
            restrictions.push(Restriction {
                name: parts.restriction,
                volumes,
                from_s: parts.from_s,
                until_s: parts.until_s,
                levels_allowed_ft,
                departure: parts.departure.filter(|code| !code.is_empty()),
                destination: parts.destination.filter(|code| !code.is_empty()),
            });
        }
        restrictions.sort_by(|a, b| {
            a.name
                .cmp(&b.name)
                .then(a.from_s.total_cmp(&b.from_s))
                .then(a.until_s.total_cmp(&b.until_s))
        });
        restrictions
    }
}
