//! `rimeshift demo`: checks and plans an invented day that comes with the program.

use super::by_hand::ByHandArgs;
use super::new::write_new;
use super::plan::SearchArgs;
use super::session::Session;
use super::{check, plan};
use crate::exit::{Answered, Failure};
use crate::plan_folder::{self, Existing};
use crate::report::plan::PlanReport;
use crate::screen::Form;
use std::fs;
use std::io;
use std::path::{Path, PathBuf};

/// The files of the invented day.
macro_rules! files_of_the_day {
    ($($name:literal),* $(,)?) => {
        [$(($name, include_bytes!(concat!("../../../demo-sectors/day/", $name)).as_slice())),*]
    };
}

const FILES: [(&str, &[u8]); 11] = files_of_the_day![
    "aircraft.csv",
    "airport_capacity.csv",
    "airports.csv",
    "capacity.csv",
    "day.toml",
    "flights.csv",
    "fuel.csv",
    "points.csv",
    "proposals.csv",
    "restrictions.geojson",
    "sectors.geojson",
];

/// Options of `demo`.
#[derive(Debug, clap::Args)]
pub(crate) struct DemoArgs {
    /// Keep the invented day as this folder, to look at or to change.
    #[arg(long, value_name = "DIR")]
    write: Option<PathBuf>,
    /// Write the plan to this folder.
    #[arg(long, value_name = "DIR")]
    out: Option<PathBuf>,
    #[command(flatten)]
    search: SearchArgs,
}

/// Checks and plans the invented day.
///
/// # Errors
/// When there is no answer, or it can't be written.
pub(crate) async fn run(args: &DemoArgs, session: &Session<'_>) -> Result<Answered, Failure> {
    if let Some(out) = &args.out {
        plan_folder::check_place(out, Existing::Keep)?;
    }
    let temporary =
        tempfile::tempdir().map_err(|error| Failure::writing(&std::env::temp_dir(), &error))?;
    let folder = match &args.write {
        Some(folder) => {
            write_new(folder, write_files)?;
            folder.as_path()
        }
        None => {
            write_files(temporary.path())
                .map_err(|error| Failure::writing(temporary.path(), &error))?;
            temporary.path()
        }
    };
    let day = session.load_day(folder, None).await?;
    let answered = async {
        let checked = check::check(session, &day).await?;
        let found = plan::find(session, &day, &args.search, &ByHandArgs::default()).await?;
        Ok((checked, found))
    };
    let answered = answered.await;
    session.forget(&day).await;
    let (checked, found) = answered?;
    if let Some(out) = &args.out {
        plan_folder::write(out, &found, Existing::Keep)?;
    }
    let report = PlanReport { found: &found, written_to: args.out.as_deref() };
    match session.screen.form {
        Form::Json => {
            let both = format!(
                "{{\"check\": {}, \"plan\": {}}}\n",
                checked.json().trim_end(),
                report.json().trim_end()
            );
            session.screen.answer(&both)?;
        }
        Form::Text(_) => {
            session.screen.answer("An invented day: nothing in it is real.\n\n")?;
            check::show(session, &checked)?;
            session.screen.answer("\n")?;
            plan::show(session, &report)?;
        }
    }
    Ok(Answered::Plainly)
}

fn write_files(folder: &Path) -> io::Result<()> {
    FILES.iter().try_for_each(|(name, content)| fs::write(folder.join(name), content))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_file_of_the_day_comes_with_the_program() {
        let day = Path::new(env!("CARGO_MANIFEST_DIR")).join("../demo-sectors/day");
        let mut names: Vec<_> = fs::read_dir(day)
            .expect("the day")
            .map(|entry| entry.expect("a file").file_name().into_string().expect("a name"))
            .collect();
        names.sort();
        assert_eq!(names, FILES.map(|(name, _)| name));
    }
}
