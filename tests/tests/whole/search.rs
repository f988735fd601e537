//! The plan search on models of a real day: known optima, proofs, the same bytes everywhere.

use std::path::Path;
use std::sync::atomic::{AtomicUsize, Ordering};

use rimeshift_engine::search::{Model, Progress, Solution, SolveOptions, Stopped, Watch, solve};
use rimeshift_tests::search_model::{model_of, read};

/// Optima proven by HiGHS 1.16 with its gap set to 0; see `tests/data/search-models/README.md`.
const OPTIMA: [(&str, i64); 4] = [
    ("us1000_free_s2", 2_519_596),
    ("us1000_semi_s1", 2_225_714),
    ("us3000_free_s2", 7_263_164),
    ("dense1000x8", 3_038_869),
];

fn model(name: &str) -> Model {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("data/search-models");
    model_of(&read(&folder.join(format!("{name}.json.gz"))).expect("an instance"))
}

fn on_threads(threads: usize, model: &Model, options: &SolveOptions) -> Solution {
    let pool = rayon::ThreadPoolBuilder::new().num_threads(threads).build().expect("a pool");
    pool.install(|| solve(model, options, Watch::unattended())).expect("a sound model")
}

#[test]
fn known_optima_are_reached_and_proven() {
    for (name, optimum) in OPTIMA {
        let model = model(name);
        let solution = on_threads(1, &model, &SolveOptions::default());
        assert_eq!(solution.objective, optimum, "{name}");
        assert_eq!(solution.bound, Some(optimum), "{name}");
        assert_eq!(solution.stopped, Stopped::Optimal, "{name}");
        assert_eq!(model.violations(&solution.choices), [], "{name}");
        assert_eq!(model.objective(&solution.choices), optimum, "{name}");
    }
}

/// Also where the work runs out before the proof.
#[test]
fn answers_do_not_depend_on_the_number_of_threads() {
    for (name, optimum) in OPTIMA {
        let model = model(name);
        for work in [0, 20_000, 60_000, SolveOptions::default().work] {
            let options = SolveOptions { work, ..SolveOptions::default() };
            let one = on_threads(1, &model, &options);
            assert!(one.objective <= optimum && one.bound >= Some(optimum), "{name} {work}");
            for threads in [2, 4] {
                assert_eq!(on_threads(threads, &model, &options), one, "{name} {work} {threads}");
            }
        }
    }
}

/// What is told on the way brackets the optimum and only gets better.
#[test]
fn progress_closes_in_on_the_optimum() {
    let (name, optimum) = OPTIMA[3];
    let model = model(name);
    let told = std::sync::Mutex::new(Vec::<Progress>::new());
    let progress = |news| told.lock().expect("no panic").push(news);
    let watch = Watch { stop: &|| false, progress: &progress };
    solve(&model, &SolveOptions::default(), watch).expect("a sound model");
    let told = told.into_inner().expect("no panic");
    assert!(told.len() > 2);
    for pair in told.windows(2) {
        assert!(pair[0].objective <= pair[1].objective && pair[0].bound >= pair[1].bound);
        assert!(pair[0].components_closed <= pair[1].components_closed);
    }
    assert!(told.iter().all(|news| news.objective <= optimum && optimum <= news.bound));
    let last = told.last().expect("some");
    assert_eq!((last.objective, last.bound), (optimum, optimum));
    assert_eq!(last.components_closed, last.components);
}

/// A caller who goes gets what there is, whenever that happens.
#[test]
fn a_stopped_search_returns_a_sound_plan() {
    let (name, optimum) = OPTIMA[2];
    let model = model(name);
    for patience in [0, 1, 3, 10] {
        let asked = AtomicUsize::new(0);
        let stop = || asked.fetch_add(1, Ordering::Relaxed) >= patience;
        let watch = Watch { stop: &stop, progress: &|_| () };
        let solution = solve(&model, &SolveOptions::default(), watch).expect("a sound model");
        assert_eq!(model.violations(&solution.choices), []);
        assert!(solution.objective <= optimum && solution.bound >= Some(optimum));
        assert!(solution.stopped == Stopped::Asked || solution.bound == Some(solution.objective));
    }
}
