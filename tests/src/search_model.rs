//! Instances of the plan search kept as JSON: the format of `tests/data/search-models`.

use std::fs::File;
use std::io::{self, BufReader, Read};
use std::path::Path;

use rimeshift_engine::search::{Choice, Clash, Cost, Group, Model, Row, choice};
use serde::Deserialize;

/// One instance, as it stands in its file.
#[derive(Debug, Clone, Deserialize)]
pub struct Instance {
    /// What it is called.
    #[serde(default)]
    pub name: String,
    /// For each flight the positions of its options.
    pub flights: Vec<Vec<u32>>,
    /// Value of each option; staying as filed is worth 0.
    pub weight: Vec<i64>,
    /// Pairs of options that exclude each other.
    pub edges: Vec<(u32, u32)>,
    /// (option, flight): the option is excluded while that flight stays as filed.
    #[serde(default)]
    pub edges_filed: Vec<(u32, u32)>,
    /// Sums that are limited.
    pub rows: Vec<InstanceRow>,
}

/// The sum of the deltas of the chosen options may not exceed the slack.
#[derive(Debug, Clone, Deserialize)]
pub struct InstanceRow {
    /// Room left when every flight stays as filed.
    pub slack: i64,
    /// (option, delta).
    pub coef: Vec<(u32, i32)>,
}

/// Reads an instance, gzipped if the name ends in `.gz`.
///
/// # Errors
/// The file can't be read, or does not hold an instance.
pub fn read(file: &Path) -> io::Result<Instance> {
    let mut reader = BufReader::new(File::open(file)?);
    let mut text = Vec::new();
    if file.extension().is_some_and(|extension| extension == "gz") {
        flate2::read::GzDecoder::new(reader).read_to_end(&mut text)?;
    } else {
        reader.read_to_end(&mut text)?;
    }
    let instance: Instance = serde_json::from_slice(&text)?;
    match instance.fault() {
        Some(fault) => Err(io::Error::new(io::ErrorKind::InvalidData, fault)),
        None => Ok(instance),
    }
}

impl Instance {
    /// The first option or flight named that does not exist.
    fn fault(&self) -> Option<String> {
        let is_option = |&option: &u32| (option as usize) < self.weight.len();
        let is_flight = |&flight: &u32| (flight as usize) < self.flights.len();
        let ends = self.edges.iter().flat_map(|(a, b)| [a, b]);
        let mut options = (self.flights.iter().flatten())
            .chain(ends)
            .chain(self.edges_filed.iter().map(|(option, _)| option))
            .chain(self.rows.iter().flat_map(|row| row.coef.iter().map(|(option, _)| option)));
        if let Some(option) = options.find(|option| !is_option(option)) {
            return Some(format!("there is no option {option}"));
        }
        let mut flights = self.edges_filed.iter().map(|(_, flight)| flight);
        flights
            .find(|flight| !is_flight(flight))
            .map(|flight| format!("there is no flight {flight}"))
    }
}

/// The instance as the search takes it. Options that no flight has are left out.
#[must_use]
pub fn model_of(instance: &Instance) -> Model {
    let mut choice_of: Vec<Option<Choice>> = vec![None; instance.weight.len()];
    let mut groups = Vec::new();
    for (flight, options) in (0u32..).zip(&instance.flights) {
        let mut values = vec![0];
        for (candidate, &option) in (1u32..).zip(options) {
            values.push(instance.weight[option as usize]);
            choice_of[option as usize] = Some(choice(flight, candidate));
        }
        groups.push(Group::of(&values));
    }
    let clash = |a: Option<Choice>, b| Some(Clash { a: a?, b: b?, cost: Cost::Hard });
    let of = |option: u32| choice_of[option as usize];
    let among = instance.edges.iter().map(|&(a, b)| clash(of(a), of(b)));
    let filed =
        instance.edges_filed.iter().map(|&(a, flight)| clash(of(a), Some(choice(flight, 0))));
    let clashes = among.chain(filed).flatten();
    let clashes = clashes.filter(|clash| clash.a.group != clash.b.group).collect();
    let terms = |row: &InstanceRow| {
        row.coef.iter().filter_map(|&(option, delta)| Some((of(option)?, delta))).collect()
    };
    let rows =
        instance.rows.iter().map(|row| Row { slack: row.slack, terms: terms(row) }).collect();
    Model { groups, clashes, rows, any_ofs: Vec::new() }
}
