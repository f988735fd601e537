//! How long does it take to find every loss of separation of a large day, those of one changed
//! flight, the changed versions that exclude each other, and what changes add to the risk?

#![expect(clippy::print_stdout, reason = "a bench tells what it measures")]

mod support;

use std::sync::Arc;

use rayon::prelude::*;
use rimeshift_engine::ids::{FlightId, IdVec};
use rimeshift_engine::path::{Path, Track};
use rimeshift_engine::separation::{
    Scene, Version, clashes, expected_new_losses, filed_losses, new_losses_against_filed, survivors,
};
use support::{Sectors, changes, day, measure, measure_each, measure_on_threads};

fn main() {
    let day = day(Sectors::None);
    let tracks: Vec<Track> =
        day.flights.as_slice().par_iter().map(|f| Track::new(&f.profile)).collect();
    let tracks: Arc<IdVec<FlightId, Track>> = Arc::new(tracks.into());
    let pieces: usize = tracks.iter().map(|t| t.knots().len() - 1).sum();
    let scene = Scene::new(&day, Arc::clone(&tracks), Vec::new().into());
    let mut pairs: Vec<_> = scene.losses().iter().map(|l| (l.first, l.second)).collect();
    pairs.dedup();
    println!("{pieces} pieces of tracks, {} losses of {} pairs", scene.losses().len(), pairs.len());
    let count = survivors(&scene);
    let share = |n: u64| n as f64 / count.pairs as f64;
    println!(
        "{} legs, {:.3e} pairs of them; of these meet in a list {:.2e}, by bounds {:.2e}, as straight \
         motions {:.2e}, lose separation {:.2e}",
        count.legs,
        count.pairs as f64,
        share(count.lists_meet),
        share(count.bounds_meet),
        share(count.motions_meet),
        share(count.lose)
    );
    measure_on_threads("index and filed losses", 7, || {
        Scene::new(&day, Arc::clone(&tracks), Vec::new().into())
    });
    measure_on_threads("filed losses", 7, || filed_losses(&scene));

    measure_on_threads("make three versions of 8 000 flights", 3, || changes(&day, &tracks, 8000));
    let changes = changes(&day, &tracks, 8000);
    let versions: Vec<Version<'_>> = changes
        .iter()
        .map(|(flight, changed)| Version {
            flight: *flight,
            path: Path::changed(&tracks[*flight], changed),
            minima: &[],
        })
        .collect();
    println!("{} versions, {} clashes", versions.len(), clashes(&scene, &versions).len());
    measure_on_threads("clashes", 3, || clashes(&scene, &versions));
    measure_each("new losses of one version", 10_000, |i| {
        std::hint::black_box(new_losses_against_filed(&scene, &versions[i * 7 % versions.len()]));
    });
    // One version each of a thousand flights, spread over the day.
    let mut moved: Vec<Version<'_>> = versions.clone();
    moved.dedup_by_key(|version| version.flight);
    let step = (moved.len() / 1000).max(1);
    let moved: Vec<Version<'_>> = moved.into_iter().step_by(step).take(1000).collect();
    println!("{} moved: {} expected new losses", moved.len(), expected_new_losses(&scene, &moved));
    measure("expected new losses, 1 000 moved", 3, || expected_new_losses(&scene, &moved));
    measure_each("expected new losses of one version", 10_000, |i| {
        let version = versions[i * 7 % versions.len()];
        std::hint::black_box(expected_new_losses(&scene, &[version]));
    });
}
