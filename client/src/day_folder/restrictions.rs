//! `restrictions.geojson`: volumes that changed profiles must keep out of; each feature is one.

use super::features::{self, Kind, Place, Properties, polygons_of};
use crate::tables::findings::{Defects, Findings};
use crate::tables::rows::{feet, wire_time};
use geojson::{Feature, JsonValue};
use rimeshift_proto::v1::{Restriction, Volume};
use std::path::Path;

const KIND: Kind = Kind {
    name: "restriction",
    properties: &[
        "restriction",
        "floor_fl",
        "ceiling_fl",
        "from",
        "until",
        "levels_allowed",
        "departure",
        "destination",
    ],
};

/// The restrictions of a day, with the feature (from 1) of each.
#[derive(Debug, Default)]
pub(super) struct Restrictions {
    pub(super) rows: Vec<Restriction>,
    features: Vec<usize>,
    shown: String,
}

impl Restrictions {
    /// How an error names a restriction, or a property of it.
    pub(super) fn place(&self, index: usize, property: Option<&str>) -> Option<String> {
        let feature = *self.features.get(index)?;
        let name = Some(self.rows.get(index)?.restriction.as_str());
        let place = Place { file: &self.shown, feature, kind: &KIND, name };
        Some(match property {
            Some(property) => format!("{place}: property {property}"),
            None => place.to_string(),
        })
    }
}

/// Reads the restrictions of a day.
pub(super) fn read(path: &Path, shown: &str, findings: &mut Findings) -> Restrictions {
    let mut restrictions = Restrictions { shown: shown.to_owned(), ..Restrictions::default() };
    features::read(path, shown, &KIND, findings, &mut |feature, place, defects| {
        if let Some(restriction) = restriction_of(feature, place, defects) {
            restrictions.rows.push(restriction);
            restrictions.features.push(place.feature);
        }
    });
    restrictions
}

/// The restriction of one feature; `None` where something is wrong with it.
fn restriction_of(
    feature: &Feature,
    place: Place<'_>,
    defects: &mut Defects,
) -> Option<Restriction> {
    let mut reader = Properties::of(feature, place, defects);
    let floor = reader.required("floor_fl", JsonValue::as_f64, "a number");
    let ceiling = reader.required("ceiling_fl", JsonValue::as_f64, "a number");
    let from = reader.time("from");
    let until = reader.time("until");
    let levels = reader.optional("levels_allowed", levels_of, "a list of flight levels");
    let departure = reader.optional("departure", JsonValue::as_str, "text");
    let destination = reader.optional("destination", JsonValue::as_str, "text");
    let (place, sound) = reader.finish();
    let polygons = polygons_of(feature, &KIND)
        .map_err(|problem| defects.add_problem(place, problem))
        .ok()
        .filter(|_| sound)?;
    let (floor_ft, ceiling_ft) = (feet(floor?), feet(ceiling?));
    Some(Restriction {
        restriction: place.name?.to_owned(),
        volumes: polygons.into_iter().map(|rings| Volume { rings, floor_ft, ceiling_ft }).collect(),
        from: Some(wire_time(from?)),
        until: Some(wire_time(until?)),
        levels_allowed_ft: levels.unwrap_or_default().into_iter().map(feet).collect(),
        departure: departure.map(str::to_owned),
        destination: destination.map(str::to_owned),
    })
}

fn levels_of(value: &JsonValue) -> Option<Vec<f64>> {
    value.as_array()?.iter().map(JsonValue::as_f64).collect()
}
