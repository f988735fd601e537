//! `sectors.geojson`: an RFC 7946 FeatureCollection; the features with one `sector` are its union.

use crate::tables::findings::{Defects, Findings, Problem, nearest, shown};
use crate::tables::rows::feet;
use crate::tables::whole_file::read_text;
use geojson::{Feature, GeometryValue, JsonObject, JsonValue, PolygonType};
use rimeshift_proto::v1::{Ring, Sector, Volume};
use std::collections::{BTreeSet, HashMap};
use std::fmt;
use std::path::Path;

/// The properties that are read.
const PROPERTIES: [&str; 6] =
    ["sector", "floor_fl", "ceiling_fl", "name", "horizontal_nm", "no_changes"];

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
        let place = Place { file: &self.shown, feature, sector: Some(name) };
        Some(match property {
            Some(property) => format!("{place}: property {property}"),
            None => place.to_string(),
        })
    }
}

/// A feature as an error names it.
#[derive(Clone, Copy)]
struct Place<'a> {
    file: &'a str,
    feature: usize,
    sector: Option<&'a str>,
}

impl fmt::Display for Place<'_> {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}: feature {}", self.file, self.feature)?;
        match self.sector {
            Some(sector) => write!(f, " (sector {})", shown(sector)),
            None => Ok(()),
        }
    }
}

/// Reads the sectors of a day.
pub(super) fn read(path: &Path, shown: &str, findings: &mut Findings) -> Sectors {
    let mut sectors = Sectors { shown: shown.to_owned(), ..Sectors::default() };
    let Some(text) = read_text(path, shown, &mut findings.defects) else { return sectors };
    let features = match features_of(&text) {
        Ok(features) => features,
        Err(problem) => {
            findings.defects.add_problem(shown, problem);
            return sectors;
        }
    };
    let mut by_name = HashMap::new();
    let mut unused = BTreeSet::new();
    for (index, feature) in features.into_iter().enumerate() {
        let place = Place { file: shown, feature: index + 1, sector: None };
        match serde_json::from_value::<Feature>(feature) {
            Ok(feature) => {
                add_feature(&feature, place, &mut sectors, &mut by_name, &mut findings.defects);
                let properties = feature.properties.iter().flat_map(JsonObject::keys);
                unused
                    .extend(properties.filter(|key| !PROPERTIES.contains(&key.as_str())).cloned());
            }
            Err(error) => findings.defects.add(place, format!("is no GeoJSON feature: {error}")),
        }
    }
    if !unused.is_empty() {
        let names: Vec<String> = unused.into_iter().collect();
        findings
            .warnings
            .push(format!("{shown}: properties that are not used: {}", names.join(", ")));
    }
    sectors
}

/// The features of a FeatureCollection, each still as plain JSON so that one that is wrong does not
/// hide the others.
fn features_of(text: &str) -> Result<Vec<JsonValue>, Problem> {
    let hint = "sectors are a FeatureCollection of RFC 7946";
    let value: JsonValue = serde_json::from_str(text)
        .map_err(|error| Problem::with_hint(format!("is not JSON: {error}"), hint))?;
    let JsonValue::Object(mut collection) = value else {
        return Err(Problem::with_hint("is no GeoJSON object", hint));
    };
    match collection.get("type").and_then(JsonValue::as_str) {
        Some("FeatureCollection") => {}
        Some(other) => return Err(Problem::with_hint(format!("is a {}", shown(other)), hint)),
        None => return Err(Problem::with_hint("has no type", hint)),
    }
    match collection.remove("features") {
        Some(JsonValue::Array(features)) => Ok(features),
        _ => Err(Problem::with_hint("has no list of features", hint)),
    }
}

/// Adds the volumes of one feature to its sector.
fn add_feature(
    feature: &Feature,
    place: Place<'_>,
    sectors: &mut Sectors,
    by_name: &mut HashMap<String, usize>,
    defects: &mut Defects,
) {
    let empty = JsonObject::new();
    let properties = feature.properties.as_ref().unwrap_or(&empty);
    let mut reader = Properties { properties, place, defects, sound: true };
    let name = reader.required("sector", JsonValue::as_str, "text");
    reader.place.sector = name;
    let floor = reader.required("floor_fl", JsonValue::as_f64, "a number");
    let ceiling = reader.required("ceiling_fl", JsonValue::as_f64, "a number");
    let title = reader.optional("name", JsonValue::as_str, "text");
    let horizontal_nm = reader.optional("horizontal_nm", JsonValue::as_f64, "a number");
    let no_changes = reader.optional("no_changes", JsonValue::as_bool, "true or false");
    let (place, sound) = (reader.place, reader.sound);
    let polygons = match polygons_of(feature) {
        Ok(polygons) => polygons,
        Err(problem) => return defects.add_problem(place, problem),
    };
    let (Some(name), Some(floor), Some(ceiling), true) = (name, floor, ceiling, sound) else {
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

/// Reads properties, each absence or wrong type a defect.
struct Properties<'a, 'd> {
    properties: &'a JsonObject,
    place: Place<'a>,
    defects: &'d mut Defects,
    sound: bool,
}

impl<'a> Properties<'a, '_> {
    fn required<T>(
        &mut self,
        property: &str,
        read: impl Fn(&'a JsonValue) -> Option<T>,
        expected: &str,
    ) -> Option<T> {
        if matches!(self.properties.get(property), None | Some(JsonValue::Null)) {
            let problem = "is missing";
            let keys = self.properties.keys().map(String::as_str);
            let unknown = keys.filter(|key| !PROPERTIES.contains(key));
            let hint = nearest(property, unknown)
                .map(|near| format!("was {near:?} meant to be {property}?"));
            self.reject(property, Problem { text: problem.to_owned(), hint });
            return None;
        }
        self.optional(property, read, expected)
    }

    fn optional<T>(
        &mut self,
        property: &str,
        read: impl Fn(&'a JsonValue) -> Option<T>,
        expected: &str,
    ) -> Option<T> {
        match self.properties.get(property) {
            None | Some(JsonValue::Null) => None,
            Some(value) => {
                let read = read(value);
                if read.is_none() {
                    let text = format!("{} is not {expected}", shown_json(value));
                    self.reject(property, Problem::new(text));
                }
                read
            }
        }
    }

    fn reject(&mut self, property: &str, problem: Problem) {
        self.sound = false;
        self.defects.add_problem(format_args!("{}: property {property}", self.place), problem);
    }
}

fn shown_json(value: &JsonValue) -> String {
    match value {
        JsonValue::String(text) => shown(text),
        other => other.to_string().chars().take(60).collect(),
    }
}

/// The polygons of a feature, each as its rings.
fn polygons_of(feature: &Feature) -> Result<Vec<Vec<Ring>>, Problem> {
    match feature.geometry.as_ref().map(|geometry| &geometry.value) {
        Some(GeometryValue::Polygon { coordinates }) => Ok(vec![rings_of(coordinates)?]),
        Some(GeometryValue::MultiPolygon { coordinates }) => {
            coordinates.iter().map(rings_of).collect()
        }
        Some(other) => Err(Problem::with_hint(
            format!("has a geometry of type {}", other.type_name()),
            "a sector is a Polygon or a MultiPolygon",
        )),
        None => Err(Problem::new("has no geometry")),
    }
}

fn rings_of(polygon: &PolygonType) -> Result<Vec<Ring>, Problem> {
    polygon
        .iter()
        .map(|positions| {
            let mut ring = Ring::default();
            for position in positions {
                let &[lon_deg, lat_deg, ..] = position.as_slice() else {
                    return Err(Problem::new("has a position without two coordinates"));
                };
                ring.lon_deg.push(lon_deg);
                ring.lat_deg.push(lat_deg);
            }
            Ok(ring)
        })
        .collect()
}
