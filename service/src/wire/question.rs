//! A level change asked about, to the engine's question.

use rimeshift_engine::ask::Question;
use rimeshift_engine::day::{Alternative, Stretch};
use rimeshift_proto::v1;

use super::fields::Fields;
use super::rows::alternative;
use crate::days::Ready;
use crate::error::ServiceError;
use crate::plans::sort_by_start;

/// Plausible levels, feet: FL -20 to 660.
const LEVELS_FT: std::ops::RangeInclusive<f64> = -2000.0..=66_000.0;

/// The question, or everything that is wrong with it. Ranges are those of a proposal's option.
pub(crate) fn question(
    ready: &Ready,
    change: Option<v1::Change>,
) -> Result<Question, ServiceError> {
    let change =
        change.ok_or_else(|| ServiceError::bad_field("change", "is missing", "give a change"))?;
    let mut fields = Fields::default();
    let flight = ready.day().find_flight(&change.flight);
    if flight.is_none() {
        let problem = format!("`{}` is no flight of this day", change.flight);
        fields.push(|| "change.flight".to_owned(), problem, "name one of the day's flights");
    }
    let path = || "change".to_owned();
    let parts = alternative(ready.clock, path, 1, change.stretches, change.figures, &mut fields);
    if parts.stretches.is_empty() {
        fields.push(|| "change.stretches".to_owned(), "is empty", "give at least one stretch");
    }
    for (s, stretch) in parts.stretches.iter().enumerate() {
        if !LEVELS_FT.contains(&stretch.level_ft) {
            fields.push(
                || format!("change.stretches[{s}].level_ft"),
                format!("`{}` ft is no plausible level", stretch.level_ft),
                "-2000 to 66000 ft",
            );
        }
    }
    for (field, value, range) in [
        ("contrail_km_avoided", parts.contrail_km_avoided, -1e6..=1e6),
        ("ef_avoided_j", parts.ef_avoided_j, -1e18..=1e18),
        ("extra_fuel_kg", parts.extra_fuel_kg, -1e7..=1e7),
        ("max_extra_fuel_kg", parts.max_extra_fuel_kg, -1e7..=1e7),
        ("priority", Some(parts.priority), 0.0..=1e6),
    ] {
        if value.is_some_and(|v| !range.contains(&v)) {
            fields.push(
                || format!("change.figures.{field}"),
                format!("`{}` is out of range", value.unwrap_or_default()),
                format!("a number from {} to {}", range.start(), range.end()),
            );
        }
    }
    let (Some(flight), true) = (flight, fields.is_empty()) else {
        return Err(ServiceError::bad_fields(fields.into_defects()));
    };
    let stretches = parts.stretches.iter();
    let mut stretches: Vec<Stretch> = stretches
        .map(|s| Stretch { level_ft: s.level_ft, from_s: s.from_s, until_s: s.until_s })
        .collect();
    sort_by_start(&mut stretches);
    let option = Alternative {
        option: parts.option,
        stretches,
        contrail_km_avoided: parts.contrail_km_avoided,
        ef_avoided_j: parts.ef_avoided_j,
        extra_fuel_kg: parts.extra_fuel_kg,
        max_extra_fuel_kg: parts.max_extra_fuel_kg,
        priority: parts.priority,
    };
    Ok(Question { flight, option })
}
