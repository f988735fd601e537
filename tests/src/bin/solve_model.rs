//! `solve-model FILE…` solves instances of the plan search kept as JSON (plain or gzipped) and prints
//! for each what was found, proven and presolved, and when, as one line of JSON. The format is
//! described in `tests/data/search-models/README.md`.

use std::io::Write;
use std::path::{Path, PathBuf};
use std::process::ExitCode;
use std::sync::Mutex;
use std::time::Instant;

use clap::Parser;
use rimeshift_engine::search::{Progress, Solution, SolveOptions, Watch, solve};
use rimeshift_tests::search_model::{model_of, read};
use serde_json::json;

type Failure = Box<dyn std::error::Error + Send + Sync>;

/// Solve instances of the plan search and print objective, bound, gap, seconds and phases as JSON.
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
    /// Print seconds and objective of every better plan, too.
    #[arg(long)]
    plans: bool,
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

/// What was known at some second.
type News = (f64, Progress);

fn run(file: &Path, args: &Args) -> Result<(), Failure> {
    let instance = read(file).map_err(|error| format!("{}: {error}", file.display()))?;
    let model = model_of(&instance);
    let mut options = SolveOptions { seed: args.seed, gap: args.gap, ..SolveOptions::default() };
    options.work = args.work.unwrap_or(options.work);
    let mut shortest: Option<(f64, Solution, Vec<News>)> = None;
    for _ in 0..args.repeat.max(1) {
        let start = Instant::now();
        let stop = || args.seconds.is_some_and(|seconds| start.elapsed().as_secs_f64() > seconds);
        let told = Mutex::new(Vec::new());
        let progress = |progress| {
            if let Ok(mut told) = told.lock() {
                told.push((start.elapsed().as_secs_f64(), progress));
            }
        };
        let watch = Watch { stop: &stop, progress: &progress };
        let found = solve(&model, &options, watch)
            .map_err(|defect| format!("{}: {defect}", file.display()))?;
        let seconds = start.elapsed().as_secs_f64();
        if shortest.as_ref().is_none_or(|shortest| seconds < shortest.0) {
            shortest = Some((seconds, found, told.into_inner().unwrap_or_default()));
        }
    }
    let Some((seconds, solution, told)) = shortest else { return Ok(()) };
    if args.verbose {
        for (at_s, news) in &told {
            writeln!(std::io::stderr(), "{at_s:9.4} s {news:?}")?;
        }
    }
    let within = |gap: f64| {
        let near = |news: &&News| {
            (solution.objective - news.1.objective) as f64 <= gap * solution.objective as f64
        };
        told.iter().find(near).map(|news| news.0)
    };
    let presolved = solution.presolved;
    let mut line = json!({
        "instance": instance.name,
        "objective": solution.objective,
        "bound": solution.bound,
        "gap": solution.gap(),
        "seconds": seconds,
        "phases": {
            "first_plan_s": told.first().map(|news| news.0),
            "within_0.5_percent_s": within(0.005),
            "best_plan_s": within(0.0),
        },
        "stopped": format!("{:?}", solution.stopped).to_lowercase(),
        "work": solution.work,
        "feasible": model.violations(&solution.choices).is_empty(),
        "presolve": {
            "groups": presolved.groups,
            "groups_settled": presolved.groups_settled,
            "candidates": presolved.candidates,
            "candidates_ruled_out": presolved.candidates_ruled_out,
            "rows": presolved.rows,
            "rows_dropped": presolved.rows_dropped,
        },
        "parts": presolved.components,
        "largest_part": presolved.largest_component,
    });
    if args.plans {
        let mut plans: Vec<(f64, i64)> =
            told.iter().map(|news| (news.0, news.1.objective)).collect();
        plans.push((seconds, solution.objective));
        plans.dedup_by_key(|plan| plan.1);
        line["plans"] = json!(plans);
    }
    writeln!(std::io::stdout(), "{line}")?;
    Ok(())
}
