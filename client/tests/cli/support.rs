//! Day folders as one text, and runs of the program.

use std::fs;
use std::path::{Path, PathBuf};
use std::process::{Command, Output};
use tempfile::TempDir;

/// A small day: `=== NAME` begins a file. Three flights cross one sector westward; one proposal
/// asks for a level that is free, another for one where a flight is in the way.
pub(crate) const DAY: &str = r#"
=== day.toml
date = "2031-03-04"
region = "Nowhere"
=== sectors.geojson
{"type": "FeatureCollection", "features": [
 {"type": "Feature", "properties": {"sector": "NORTH", "floor_fl": 245, "ceiling_fl": 660},
  "geometry": {"type": "Polygon",
   "coordinates": [[[-10, 49], [10, 49], [10, 52], [-10, 52], [-10, 49]]]}}]}
=== capacity.csv
sector,from,until,entries_per_hour
NORTH,2031-03-04T00:00:00Z,2031-03-05T00:00:00Z,30
=== aircraft.csv
aircraft,ceiling_fl
MJET,410
=== flights.csv
flight,departure,destination,aircraft
AAA1,XAAA,XBBB,MJET
BBB2,XAAA,XBBB,MJET
CCC3,XAAA,XBBB,MJET
=== points.csv
flight,time,lon,lat,level_fl
AAA1,2031-03-04T06:00:00Z,8,50,360
AAA1,2031-03-04T07:00:00Z,-4,50,360
BBB2,2031-03-04T06:00:00Z,8,50.01,380
BBB2,2031-03-04T07:00:00Z,-4,50.01,380
CCC3,2031-03-04T06:00:00Z,8,51,360
CCC3,2031-03-04T07:00:00Z,-4,51,360
=== proposals.csv
proposal,flight,level_fl,from_time,until_time,contrail_km_avoided,extra_fuel_kg
P1,AAA1,380,2031-03-04T06:10:00Z,2031-03-04T06:50:00Z,100,20
P2,CCC3,340,2031-03-04T06:10:00Z,2031-03-04T06:50:00Z,100,20
"#;

fn files_of(text: &str) -> impl Iterator<Item = (&str, &str)> {
    text.split("=== ").filter_map(|part| part.split_once('\n')).filter(|(name, _)| !name.is_empty())
}

/// A day folder, [`DAY`] with the files of `changes` in place of its own.
pub(crate) fn day_with(changes: &str) -> TempDir {
    let folder = TempDir::new().expect("a temporary folder");
    for (name, content) in files_of(DAY).chain(files_of(changes)) {
        fs::write(folder.path().join(name), content).expect("a file written");
    }
    folder
}

/// What a run said.
#[derive(Debug)]
pub(crate) struct Run {
    pub(crate) code: Option<i32>,
    pub(crate) out: String,
    pub(crate) err: String,
}

/// The program, with the arguments given.
pub(crate) fn program(args: &[&str]) -> Command {
    let mut command = Command::new(env!("CARGO_BIN_EXE_rimeshift"));
    command.args(args).env_remove("RUST_LOG").env_remove("NO_COLOR");
    command
}

/// Runs the program.
pub(crate) fn run(args: &[&str]) -> Run {
    told(program(args).output().expect("the program runs"))
}

/// What a finished run said.
pub(crate) fn told(output: Output) -> Run {
    Run {
        code: output.status.code(),
        out: String::from_utf8(output.stdout).expect("UTF-8"),
        err: String::from_utf8(output.stderr).expect("UTF-8"),
    }
}

/// A path as an argument.
pub(crate) fn arg(path: &Path) -> &str {
    path.to_str().expect("a path of UTF-8")
}

/// The files of a folder with their bytes, by name.
pub(crate) fn bytes_in(folder: &Path) -> Vec<(String, Vec<u8>)> {
    let mut files: Vec<PathBuf> = fs::read_dir(folder)
        .expect("a folder")
        .map(|entry| entry.expect("a file").path())
        .collect();
    files.sort();
    files
        .into_iter()
        .map(|path| {
            let name = path.file_name().expect("a name").to_string_lossy().into_owned();
            (name, fs::read(path).expect("a file"))
        })
        .collect()
}
