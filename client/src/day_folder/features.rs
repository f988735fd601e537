//! RFC 7946 FeatureCollections of polygons, feature by feature.

use crate::tables::findings::{Defects, Findings, Problem, nearest, shown};
use crate::tables::time::parse_utc;
use crate::tables::whole_file::read_text;
use geojson::{Feature, GeometryValue, JsonObject, JsonValue, PolygonType};
use jiff::Timestamp;
use rimeshift_proto::v1::Ring;
use std::collections::BTreeSet;
use std::fmt;
use std::path::Path;

/// What the features of a file are.
#[derive(Debug)]
pub(super) struct Kind {
    /// What one of them is, which is also the property that names it.
    pub(super) name: &'static str,
    /// The properties that are read.
    pub(super) properties: &'static [&'static str],
}

/// A feature as an error names it.
#[derive(Debug, Clone, Copy)]
pub(super) struct Place<'a> {
    pub(super) file: &'a str,
    /// From 1.
    pub(super) feature: usize,
    pub(super) kind: &'a Kind,
    /// What the feature says it is called.
    pub(super) name: Option<&'a str>,
}

impl fmt::Display for Place<'_> {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}: feature {}", self.file, self.feature)?;
        match self.name {
            Some(name) => write!(f, " ({} {})", self.kind.name, shown(name)),
            None => Ok(()),
        }
    }
}

/// Reads a file of features, each sound one by `each`. Properties that are not read are one warning.
pub(super) fn read(
    path: &Path,
    file: &str,
    kind: &Kind,
    findings: &mut Findings,
    each: &mut dyn FnMut(&Feature, Place<'_>, &mut Defects),
) {
    let Some(text) = read_text(path, file, &mut findings.defects) else { return };
    let features = match features_of(&text, kind) {
        Ok(features) => features,
        Err(problem) => return findings.defects.add_problem(file, problem),
    };
    let mut unused = BTreeSet::new();
    for (index, feature) in features.into_iter().enumerate() {
        let place = Place { file, feature: index + 1, kind, name: None };
        match serde_json::from_value::<Feature>(feature) {
            Ok(feature) => {
                each(&feature, place, &mut findings.defects);
                let properties = feature.properties.iter().flat_map(JsonObject::keys);
                unused.extend(
                    properties.filter(|key| !kind.properties.contains(&key.as_str())).cloned(),
                );
            }
            Err(error) => findings.defects.add(place, format!("is no GeoJSON feature: {error}")),
        }
    }
    if !unused.is_empty() {
        let names: Vec<String> = unused.into_iter().collect();
        findings
            .warnings
            .push(format!("{file}: properties that are not used: {}", names.join(", ")));
    }
}

/// The features of a FeatureCollection, each still as plain JSON so that one that is wrong does not
/// hide the others.
fn features_of(text: &str, kind: &Kind) -> Result<Vec<JsonValue>, Problem> {
    let hint = format!("{}s are a FeatureCollection of RFC 7946", kind.name);
    let hint = hint.as_str();
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

/// Reads properties, each absence or wrong type a defect.
#[derive(Debug)]
pub(super) struct Properties<'a, 'd> {
    properties: Option<&'a JsonObject>,
    pub(super) place: Place<'a>,
    defects: &'d mut Defects,
    sound: bool,
}

impl<'a, 'd> Properties<'a, 'd> {
    /// The properties of a feature, whose name is read first.
    pub(super) fn of(
        feature: &'a Feature,
        place: Place<'a>,
        defects: &'d mut Defects,
    ) -> Properties<'a, 'd> {
        let properties = feature.properties.as_ref();
        let mut reader = Properties { properties, place, defects, sound: true };
        reader.place.name = reader.required(place.kind.name, JsonValue::as_str, "text");
        reader
    }

    /// The place with the feature's name, and whether nothing that was read so far is wrong.
    pub(super) fn finish(self) -> (Place<'a>, bool) {
        (self.place, self.sound)
    }

    /// A property that must be there; `None` where it is not, or is wrong.
    pub(super) fn required<T>(
        &mut self,
        property: &str,
        read: impl Fn(&'a JsonValue) -> Option<T>,
        expected: &str,
    ) -> Option<T> {
        if self.get(property).is_none() {
            let problem = "is missing";
            let keys = self.properties.into_iter().flat_map(JsonObject::keys).map(String::as_str);
            let unknown = keys.filter(|key| !self.place.kind.properties.contains(key));
            let hint = nearest(property, unknown)
                .map(|near| format!("was {near:?} meant to be {property}?"));
            self.reject(property, Problem { text: problem.to_owned(), hint });
            return None;
        }
        self.optional(property, read, expected)
    }

    /// A property that may be missing.
    pub(super) fn optional<T>(
        &mut self,
        property: &str,
        read: impl Fn(&'a JsonValue) -> Option<T>,
        expected: &str,
    ) -> Option<T> {
        let value = self.get(property)?;
        let read = read(value);
        if read.is_none() {
            let text = format!("{} is not {expected}", shown_json(value));
            self.reject(property, Problem::new(text));
        }
        read
    }

    /// A time that must be there.
    pub(super) fn time(&mut self, property: &str) -> Option<Timestamp> {
        let text = self.required(property, JsonValue::as_str, "a time as text")?;
        parse_utc(text.as_bytes()).map_err(|problem| self.reject(property, problem)).ok()
    }

    fn get(&self, property: &str) -> Option<&'a JsonValue> {
        self.properties?.get(property).filter(|value| !value.is_null())
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
pub(super) fn polygons_of(feature: &Feature, kind: &Kind) -> Result<Vec<Vec<Ring>>, Problem> {
    match feature.geometry.as_ref().map(|geometry| &geometry.value) {
        Some(GeometryValue::Polygon { coordinates }) => Ok(vec![rings_of(coordinates)?]),
        Some(GeometryValue::MultiPolygon { coordinates }) => {
            coordinates.iter().map(rings_of).collect()
        }
        Some(other) => Err(Problem::with_hint(
            format!("has a geometry of type {}", other.type_name()),
            format!("a {} is a Polygon or a MultiPolygon", kind.name),
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
