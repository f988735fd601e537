//! `sectors.geojson`: an RFC 7946 FeatureCollection; the features with one `sector` are its union.

use super::features::{self, Kind, Place, Properties, polygons_of};
use crate::tables::findings::{Defects, Findings};
use crate::tables::rows::feet;
use geojson::{Feature, JsonValue};
use rimeshift_proto::v1::{Sector, Volume};
use std::collections::HashMap;
use std::fmt;
use std::path::Path;

const KIND: Kind = Kind {
    name: "sector",
    properties: &["sector", "floor_fl", "ceiling_fl", "name", "horizontal_nm", "no_changes"],
};

/// The sectors of a day, with the feature from which each volume was read.
#[derive(Debug, Default)]
pub(super) struct Sectors {
    pub(super) rows: Vec<Sector>,
    /// For each sector, the feature (from 1) of each volume.
    features: Vec<Vec<usize>>,
    shown: String,
}

impl Sectors {
    /// How an error names a sector, by the feature of one of its volumes, or a property there.
    pub(super) fn place(
        &self,
        sector: usize,
        volume: usize,
        property: Option<&str>,
    ) -> Option<String> {
        let feature = *self.features.get(sector)?.get(volume)?;
        let name = &self.rows.get(sector)?.sector;
        let place = Place { file: &self.shown, feature, kind: &KIND, name: Some(name) };
        Some(match property {
            Some(property) => format!("{place}: property {property}"),
            None => place.to_string(),
        })
    }
}

/// Reads the sectors of a day.
pub(super) fn read(path: &Path, shown: &str, findings: &mut Findings) -> Sectors {
    let mut sectors = Sectors { shown: shown.to_owned(), ..Sectors::default() };
    let mut by_name = HashMap::new();
    features::read(path, shown, &KIND, findings, &mut |feature, place, defects| {
        add_feature(feature, place, &mut sectors, &mut by_name, defects);
    });
    sectors
}

/// Adds the volumes of one feature to its sector.
fn add_feature(
    feature: &Feature,
    place: Place<'_>,
    sectors: &mut Sectors,
    by_name: &mut HashMap<String, usize>,
    defects: &mut Defects,
) {
    let mut reader = Properties::of(feature, place, defects);
    let floor = reader.required("floor_fl", JsonValue::as_f64, "a number");
    let ceiling = reader.required("ceiling_fl", JsonValue::as_f64, "a number");
    let title = reader.optional("name", JsonValue::as_str, "text");
    let horizontal_nm = reader.optional("horizontal_nm", JsonValue::as_f64, "a number");
    let no_changes = reader.optional("no_changes", JsonValue::as_bool, "true or false");
    let (place, sound) = reader.finish();
    let polygons = match polygons_of(feature, &KIND) {
        Ok(polygons) => polygons,
        Err(problem) => return defects.add_problem(place, problem),
    };
    let (Some(name), Some(floor), Some(ceiling), true) = (place.name, floor, ceiling, sound) else {
        return;
    };
    let index = *by_name.entry(name.to_owned()).or_insert_with(|| {
        sectors.rows.push(Sector { sector: name.to_owned(), ..Sector::default() });
        sectors.features.push(Vec::new());
        sectors.rows.len() - 1
    });
    let (Some(sector), Some(features)) =
        (sectors.rows.get_mut(index), sectors.features.get_mut(index))
    else {
        return;
    };
    merge(&mut sector.horizontal_nm, horizontal_nm, |a, b| a.total_cmp(b).is_eq())
        .unwrap_or_else(|before| differs(defects, place, "horizontal_nm", before));
    merge(&mut sector.title, title.map(str::to_owned), |a, b| a == b)
        .unwrap_or_else(|before| differs(defects, place, "name", before));
    let mut stated = (!features.is_empty()).then_some(sector.no_changes);
    merge(&mut stated, Some(no_changes.unwrap_or(false)), |a, b| a == b)
        .unwrap_or_else(|before| differs(defects, place, "no_changes", before));
    sector.no_changes = stated.unwrap_or(false);
    for polygon in polygons {
        sector.volumes.push(Volume {
            rings: polygon,
            floor_ft: feet(floor),
            ceiling_ft: feet(ceiling),
        });
        features.push(place.feature);
    }
}

/// Takes what a feature says of its whole sector; the value before where the two differ.
fn merge<T: Clone>(
    of_sector: &mut Option<T>,
    of_feature: Option<T>,
    same: impl Fn(&T, &T) -> bool,
) -> Result<(), T> {
    match (of_sector.as_ref(), of_feature) {
        (_, None) => Ok(()),
        (Some(before), Some(now)) if !same(before, &now) => Err(before.clone()),
        (_, now) => {
            *of_sector = now;
            Ok(())
        }
    }
}

fn differs(defects: &mut Defects, place: Place<'_>, property: &str, before: impl fmt::Debug) {
    defects.add_with_hint(
        format_args!("{place}: property {property}"),
        format!("differs from {before:?} in an earlier feature of the sector"),
        "it stands for the whole sector: give the same in all its features",
    );
}
