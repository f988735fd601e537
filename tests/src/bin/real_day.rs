//! `real-day`: turns one weekday of a published timetable into a day folder, or into an extract.

use std::{path::PathBuf, process::ExitCode};

use clap::Parser;
use rimeshift_tests::real_day::{self, Options, PointsFormat, Source};

/// Turns one weekday of a published timetable into a day folder.
///
/// Departures and airports are real; routes, levels, sectors, limits and proposals are modelled.
#[derive(Debug, Parser)]
#[command(name = "real-day")]
struct Args {
    /// The timetable: us2001 or nyc2013.
    #[arg(long)]
    source: Source,
    /// Date by the clock of each origin, YYYY-MM-DD [default: that of the extract].
    #[arg(long)]
    date: Option<String>,
    /// Table of flights, CSV or Parquet [default: the extract in this repository].
    #[arg(long)]
    flights: Option<PathBuf>,
    /// Table of airports, CSV [default: the extract in this repository].
    #[arg(long)]
    airports: Option<PathBuf>,
    /// Folder to write.
    #[arg(long)]
    out: PathBuf,
    /// Number of proposals, one a flight.
    #[arg(long, default_value_t = 1000)]
    proposals: usize,
    /// Most options of a proposal [default: 3 for us2001, 1 for nyc2013].
    #[arg(long)]
    options: Option<usize>,
    /// Seed of everything that is drawn.
    #[arg(long, default_value_t = 1)]
    seed: u64,
    /// Write the points as Parquet.
    #[arg(long)]
    parquet: bool,
    /// Write an extract of the date's rows instead of a day.
    #[arg(long)]
    extract: bool,
}

#[expect(clippy::print_stdout, clippy::print_stderr, reason = "a program for the terminal")]
fn main() -> ExitCode {
    let args = Args::parse();
    let options = Options {
        date: args.date.unwrap_or_else(|| args.source.extract_date().to_owned()),
        flights: args.flights,
        airports: args.airports,
        proposals: args.proposals,
        options: args.options.unwrap_or(Options::of(args.source).options),
        seed: args.seed,
        points: if args.parquet { PointsFormat::Parquet } else { PointsFormat::Csv },
    };
    let done = if args.extract {
        args.source.extract(&options, &args.out).map(|()| String::new())
    } else {
        real_day::write_day(args.source, &options, &args.out).map(|summary| summary.to_string())
    };
    match done {
        Ok(text) => {
            print!("{text}");
            ExitCode::SUCCESS
        }
        Err(message) => {
            eprintln!("{message}");
            ExitCode::FAILURE
        }
    }
}
