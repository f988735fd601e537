//! The main job on a real day of 17 000 flights, from the command to the files, as a user runs it:
//! reading and checking the day, and planning 1 000 proposals. Beside them, in the same run, what
//! any program must do: to read the bytes of the folder's files. The ratios are printed at the end.
//!
//! Departures and airports are real, the rest is modelled (sources and licence:
//! `tests/data/real-days`).

#![expect(clippy::expect_used, reason = "a bench fails by panicking")]
#![expect(clippy::print_stdout, reason = "a bench speaks on the terminal")]

use std::fs;
use std::hint::black_box;
use std::path::Path;
use std::process::{Command, Stdio};
use std::time::{Duration, Instant};

use criterion::{Criterion, criterion_group, criterion_main};
use rimeshift_tests::real_day::{Options, Source, write_day};

/// Runs the program and waits for its end.
fn rimeshift(arguments: &[&str]) {
    let status = Command::new(env!("CARGO_BIN_EXE_rimeshift"))
        .args(arguments)
        .stdout(Stdio::null())
        .status()
        .expect("the program runs");
    assert!(status.success(), "{arguments:?}");
}

fn read_bytes(folder: &Path) -> usize {
    let files = fs::read_dir(folder).expect("a folder").flatten();
    files.map(|file| fs::read(file.path()).expect("a file").len()).sum()
}

fn timed(job: impl FnOnce()) -> Duration {
    let began = Instant::now();
    job();
    began.elapsed()
}

fn real_day(c: &mut Criterion) {
    let folder = tempfile::tempdir().expect("a folder");
    let (day, plan) = (folder.path().join("day"), folder.path().join("plan"));
    write_day(Source::Us2001, &Options::of(Source::Us2001), &day).expect("a day");
    let (day_text, plan_text) = (day.to_str().expect("a path"), plan.to_str().expect("a path"));
    let check = || rimeshift(&["check", day_text]);
    let plan = || rimeshift(&["plan", day_text, "--out", plan_text, "--replace"]);
    let mut group = c.benchmark_group("real day");
    group.sample_size(10).warm_up_time(Duration::from_secs(1));
    group.bench_function("bytes read", |b| b.iter(|| black_box(read_bytes(&day))));
    group.bench_function("check", |b| b.iter(check));
    group.bench_function("plan", |b| b.iter(plan));
    group.finish();
    let bytes = timed(|| {
        black_box(read_bytes(&day));
    });
    let ratio = |took: Duration| took.as_secs_f64() / bytes.as_secs_f64();
    let (check, plan) = (timed(check), timed(plan));
    println!(
        "{} bytes read in {bytes:?}; check takes {check:?}, {:.0} times as long, plan {plan:?}, {:.0} times",
        read_bytes(&day),
        ratio(check),
        ratio(plan)
    );
}

criterion_group!(benches, real_day);
criterion_main!(benches);
