//! `solve-model FILE…` solves instances of the plan search kept as JSON (plain or gzipped) and prints
//! for each its objective, bound, gap, seconds and work as one line of JSON. The format is described
//! in `tests/data/search-models/README.md`.

use std::fs::File;
use std::io::{BufReader, Read, Write};
use std::path::{Path, PathBuf};
use std::process::ExitCode;
use std::time::Instant;

use clap::Parser;
use rimeshift_engine::search::{SolveOptions, Watch, solve};
use rimeshift_tests::search_model::{Instance, model_of};

type Failure = Box<dyn std::error::Error + Send + Sync>;

/// Solve instances of the plan search and print objective, bound, gap and seconds as JSON.
#[derive(Debug, Parser)]
#[command(name = "solve-model")]
struct Args {
    /// Instances: .json or .json.gz.
    #[arg(required = true)]
    files: Vec<PathBuf>,
    /// Most work, in units of about one touched term.
    #[arg(long)]
    work: Option<u64>,
    /// Gap at which to stop.
    #[arg(long, default_value_t = 0.0)]
    gap: f64,
    /// Stop after so many seconds.
    #[arg(long)]
    seconds: Option<f64>,
    /// Seed of the search.
    #[arg(long, default_value_t = 0)]
    seed: u64,
    /// Most threads; all processors if not given.
    #[arg(long)]
    threads: Option<usize>,
    /// Solve so many times and print the shortest time.
    #[arg(long, default_value_t = 1)]
    repeat: u32,
    /// Tell of every step on standard error.
    #[arg(long)]
    verbose: bool,
}

fn main() -> ExitCode {
    let args = Args::parse();
    let pool = rayon::ThreadPoolBuilder::new().num_threads(args.threads.unwrap_or(0)).build();
    let outcome = match pool {
        Ok(pool) => pool.install(|| args.files.iter().try_for_each(|file| run(file, &args))),
        Err(error) => Err(error.into()),
    };
    match outcome {
        Ok(()) => ExitCode::SUCCESS,
        Err(error) => {
            let _ = writeln!(std::io::stderr(), "error: {error}");
            ExitCode::FAILURE
        }
    }
}

fn run(file: &Path, args: &Args) -> Result<(), Failure> {
    let instance = read(file).map_err(|error| format!("{}: {error}", file.display()))?;
    let model = model_of(&instance);
    let mut options = SolveOptions { seed: args.seed, gap: args.gap, ..SolveOptions::default() };
    options.work = args.work.unwrap_or(options.work);
    let mut shortest_s = f64::INFINITY;
    let mut solution = None;
    for _ in 0..args.repeat.max(1) {
        let start = Instant::now();
        let stop = || args.seconds.is_some_and(|seconds| start.elapsed().as_secs_f64() > seconds);
        let progress = |progress| {
            if args.verbose {
                let elapsed_s = start.elapsed().as_secs_f64();
                let _ = writeln!(std::io::stderr(), "{elapsed_s:9.4} s {progress:?}");
            }
        };
        let watch = Watch { stop: &stop, progress: &progress };
        let found = solve(&model, &options, watch)
            .map_err(|defect| format!("{}: {defect}", file.display()))?;
        shortest_s = shortest_s.min(start.elapsed().as_secs_f64());
        solution = Some(found);
    }
    let Some(solution) = solution else { return Ok(()) };
    let line = serde_json::json!({
        "instance": instance.name,
        "objective": solution.objective,
        "bound": solution.bound,
        "gap": solution.gap(),
        "seconds": shortest_s,
        "stopped": format!("{:?}", solution.stopped),
        "work": solution.work,
        "feasible": model.violations(&solution.choices).is_empty(),
        "presolved": format!("{:?}", solution.presolved),
    });
    writeln!(std::io::stdout(), "{line}")?;
    Ok(())
}

fn read(file: &Path) -> Result<Instance, Failure> {
    let mut reader = BufReader::new(File::open(file)?);
    let mut text = Vec::new();
    if file.extension().is_some_and(|extension| extension == "gz") {
        flate2::read::GzDecoder::new(reader).read_to_end(&mut text)?;
    } else {
        reader.read_to_end(&mut text)?;
    }
    Ok(serde_json::from_slice(&text)?)
}
