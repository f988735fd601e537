//! How long counting takes: a day of 17 000 flights over 450 sectors in three layers.

#![expect(clippy::print_stdout, reason = "a bench tells what it does")]

mod support;

use std::hint::black_box;
use std::sync::Arc;

use rayon::prelude::*;
use rimeshift_engine::day::Day;
use rimeshift_engine::ids::{FlightId, IdVec};
use rimeshift_engine::load::{DayLoads, FlightLoad, PlannedLoads, SectorIndex, Which};
use rimeshift_engine::path::{Path, Track};
use support::{Sectors, changes, day, measure, measure_each, measure_on_threads};

fn all_loads(index: &SectorIndex, day: &Day, tracks: &[Track]) -> Vec<FlightLoad> {
    let flights = day.flights.as_slice();
    let pairs = tracks.par_iter().zip(flights);
    pairs.map(|(track, flight)| index.flight_load(&Path::filed(track), flight, day)).collect()
}

fn main() {
    let day = day(Sectors::Lattice);
    let flights = day.flights.as_slice();
    let tracks: Vec<Track> = flights.par_iter().map(|f| Track::new(&f.profile)).collect();
    let index = SectorIndex::new(&day);
    let loads = all_loads(&index, &day, &tracks);
    let visits: usize = loads.iter().map(|load| load.visits.len()).sum();
    println!("{visits} visits, {} sectors", day.sectors.len());

    measure("index the sectors", 5, || SectorIndex::new(black_box(&day)));
    measure_on_threads("visits of the day", 5, || all_loads(&index, &day, &tracks));
    measure_on_threads("count the day", 5, || DayLoads::new(&day, &loads));
    measure_on_threads("visits and counts", 5, || {
        DayLoads::new(&day, &all_loads(&index, &day, &tracks))
    });
    measure_each("visits of one flight", flights.len(), |at| {
        black_box(index.flight_load(&Path::filed(&tracks[at]), &flights[at], &day));
    });

    let tracks: IdVec<FlightId, Track> = tracks.into();
    let changes = changes(&day, &tracks, 8000);
    println!("{} versions", changes.len());
    let path = |at: usize| Path::changed(&tracks[changes[at].0], &changes[at].1);
    let whole = |at: usize| index.flight_load(&path(at), &day.flights[changes[at].0], &day);
    let told = |at: usize| {
        let flight = changes[at].0;
        index.changed_load(&path(at), &day.flights[flight], &day, &loads[flight.0 as usize])
    };
    measure_each("visits of one version, cut whole", changes.len(), |at| {
        black_box(whole(at));
    });
    measure_each("visits of one version, told from the filed ones", changes.len(), |at| {
        black_box(told(at));
    });
    let filed = Arc::new(DayLoads::new(&day, &loads));
    let contribution = |at: usize| {
        let before = &loads[changes[at].0.0 as usize];
        filed.differences(&day, before, &told(at), Which::Binding)
    };
    measure_on_threads("contributions of all versions", 3, || {
        (0..changes.len()).into_par_iter().map(contribution).collect::<Vec<_>>()
    });
    let mut planned = PlannedLoads::new(Arc::clone(&filed));
    (0..changes.len()).step_by(24).for_each(|at| {
        let before = &loads[changes[at].0.0 as usize];
        planned.apply(&filed.differences(&day, before, &told(at), Which::All));
    });
    let lists: Vec<_> = (0..1000).map(contribution).collect();
    measure_each("what one more change breaks", lists.len(), |at| {
        black_box(planned.violations(&lists[at]));
    });
    measure("rows of a report", 3, || planned.load_counts());
}
