//! How long does it take to find and prove the best plan of a model, and how much less do later
//! questions about it take: what a refused option costs, the next best plan, a limit on what may
//! change?
//!
//! Models of a real day; see `tests/data/search-models/README.md`. Others, unpacked or not, are named
//! in the environment variable `SEARCH_MODELS`, separated by colons. Ratios are to the first search of
//! the same run.

#![expect(clippy::print_stdout, reason = "a bench tells what it measures")]
#![expect(clippy::expect_used, reason = "a bench fails by panicking")]
#![expect(
    clippy::disallowed_types,
    clippy::disallowed_methods,
    reason = "a bench reads models and a clock, the engine does not"
)]

use std::hint::black_box;
use std::path::{Path, PathBuf};
use std::time::{Duration, Instant};

use criterion::{BenchmarkId, Criterion, criterion_group, criterion_main};
use rimeshift_engine::search::{
    Choice, Model, RankOptions, Row, Search, Solution, SolveOptions, Watch, choice, rank, solve,
};
use search_model::{model_of, read};

#[expect(unreachable_pub, reason = "it is public where it lives")]
#[path = "../../../tests/src/search_model.rs"]
mod search_model;

fn models() -> Vec<(String, Model)> {
    let data = Path::new(env!("CARGO_MANIFEST_DIR")).join("../../tests/data/search-models");
    let names = ["us1000_semi_s1", "us1000_free_s2", "dense1000x8", "us3000_free_s2"];
    let mut files: Vec<PathBuf> =
        names.iter().map(|name| data.join(format!("{name}.json.gz"))).collect();
    if let Ok(more) = std::env::var("SEARCH_MODELS") {
        files.extend(std::env::split_paths(&more));
    }
    let instance = |file: &PathBuf| read(file).expect("an instance of the plan search");
    files.iter().map(instance).map(|it| (it.name.clone(), model_of(&it))).collect()
}

/// Options that the best plan leaves aside, spread over the flights.
fn refused(model: &Model, best: &Solution) -> Vec<Choice> {
    let all = (0u32..).zip(&model.groups).flat_map(|(group, of)| {
        (0..of.candidates.len() as u32).map(move |candidate| choice(group, candidate))
    });
    let refused = all.filter(|choice| best.choices[choice.group as usize] != choice.candidate);
    let refused: Vec<Choice> = refused.collect();
    let step = (refused.len() / 100).max(1);
    refused.into_iter().step_by(step).collect()
}

/// At most this share of the flights that the best plan moves may be moved.
fn fewer_moved(model: &Model, best: &Solution, share: f64) -> Row {
    let moved = best.choices.iter().filter(|&&candidate| candidate != 0).count();
    let terms = (0u32..).zip(&model.groups).flat_map(|(group, of)| {
        (1..of.candidates.len() as u32).map(move |candidate| (choice(group, candidate), 1))
    });
    Row { slack: (moved as f64 * share) as i64, terms: terms.collect() }
}

fn mean(of: &[Duration]) -> Duration {
    of.iter().sum::<Duration>() / of.len().max(1) as u32
}

/// One thread throughout.
fn searches(criterion: &mut Criterion) {
    rayon::ThreadPoolBuilder::new().num_threads(1).build_global().expect("the first pool");
    for (name, model) in &models() {
        tell_ratios(name, model);
        bench_one(criterion, name, model);
    }
}

fn timed<T>(run: impl FnOnce() -> T) -> (Duration, T) {
    let start = Instant::now();
    let found = run();
    (start.elapsed(), found)
}

fn tell_ratios(name: &str, model: &Model) {
    let options = SolveOptions::default();
    let watch = Watch::unattended();
    let mut search = Search::new(model).expect("a sound model");
    let firsts: Vec<Duration> =
        (0..5).map(|_| timed(|| solve(model, &options, watch).expect("a sound model")).0).collect();
    let best = search.solve(&options, watch);
    let first = mean(&firsts);
    let quick = SolveOptions { work: 0, ..options.clone() };
    let (plain, rough) = timed(|| solve(model, &quick, watch).expect("a sound model"));
    let forced: Vec<Duration> = refused(model, &best)
        .iter()
        .map(|&choice| timed(|| black_box(search.solve_forced(choice, &options, watch))).0)
        .collect();
    let two = RankOptions { plans: 2, min_difference: 1, solve: options.clone() };
    let (both, _) = timed(|| rank(model, &two, watch));
    let row = fewer_moved(model, &best, 0.9);
    let (within, _) = timed(|| black_box(search.solve_within(&[row], &options, watch)));
    let ratio = |of: Duration| of.as_secs_f64() / first.as_secs_f64();
    println!(
        "{name}: first search {first:?}; a plan without search {:.2} of that, {:.3} % below the best; \
         what a refused option costs {:.3} (worst of {}: {:.3}); next plan {:.3}; a tenth fewer moved \
         {:.3}",
        ratio(plain),
        100.0 * (best.objective - rough.objective) as f64 / best.objective as f64,
        ratio(mean(&forced)),
        forced.len(),
        ratio(forced.iter().copied().max().unwrap_or_default()),
        ratio(both) - 1.0,
        ratio(within),
    );
}

fn bench_one(criterion: &mut Criterion, name: &str, model: &Model) {
    let options = SolveOptions::default();
    let watch = Watch::unattended();
    let mut group = criterion.benchmark_group("search");
    group.sample_size(10);
    group.bench_function(BenchmarkId::new("best and proof", name), |bencher| {
        bencher.iter(|| solve(black_box(model), &options, watch));
    });
    let mut search = Search::new(model).expect("a sound model");
    let best = search.solve(&options, watch);
    let refused = refused(model, &best);
    let mut next = 0;
    group.bench_function(BenchmarkId::new("a refused option", name), |bencher| {
        bencher.iter(|| {
            next = (next + 1) % refused.len();
            search.solve_forced(refused[next], &options, watch)
        });
    });
    group.finish();
}

criterion_group!(benches, searches);
criterion_main!(benches);
