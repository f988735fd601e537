//! `rimeshift new`: a commented day folder to begin from.

use crate::exit::{Answered, Failure};
use crate::screen::{Form, Screen};
use crate::tables::findings::Problem;
use std::fs;
use std::io;
use std::path::{Path, PathBuf};

macro_rules! template {
    ($($name:literal),* $(,)?) => {
        [$(($name, include_str!(concat!("template/", $name)))),*]
    };
}

const FILES: [(&str, &str); 7] = template![
    "capacity.csv",
    "columns.txt",
    "day.toml",
    "flights.csv",
    "points.csv",
    "proposals.csv",
    "sectors.geojson",
];

/// Options of `new`.
#[derive(Debug, clap::Args)]
pub(crate) struct NewArgs {
    /// The folder to make; it must not be there yet, or be empty.
    folder: PathBuf,
}

/// Writes the template.
///
/// # Errors
/// When something is there, or the disk takes no more.
pub(crate) fn run(args: &NewArgs, screen: &Screen) -> Result<Answered, Failure> {
    let folder = args.folder.as_path();
    write_new(folder, |folder| {
        FILES.iter().try_for_each(|(name, content)| fs::write(folder.join(name), content))
    })?;
    let shown = folder.display().to_string();
    screen.answer(&match screen.form {
        Form::Json => format!("{}\n", serde_json::json!({ "folder": shown })),
        Form::Text(_) => format!(
            "A day with two invented flights is written to {shown}.\n\
             day.toml says what can be set, columns.txt what the tables hold; `rimeshift check \
             {shown}` reads it.\n"
        ),
    })?;
    Ok(Answered::Plainly)
}

/// Writes files that come with the program to a folder that is not there yet, or is empty.
///
/// # Errors
/// When something is there, or the disk takes no more.
pub(super) fn write_new(
    folder: &Path,
    write: impl FnOnce(&Path) -> io::Result<()>,
) -> Result<(), Failure> {
    let is_free = match fs::read_dir(folder) {
        Ok(mut entries) => entries.next().is_none(),
        Err(error) => error.kind() == io::ErrorKind::NotFound,
    };
    if !is_free {
        let problem =
            Problem::with_hint("is there already", "give a folder that does not exist yet");
        return Err(Failure::input(folder.display(), problem));
    }
    fs::create_dir_all(folder)
        .and_then(|()| write(folder))
        .map_err(|error| Failure::writing(folder, &error))
}
