//! How time and memory grow with the day: invented days of the whole world, from 10 000 to 100 000
//! flights, loaded (indexes built, losses found) and checked.

#![expect(clippy::print_stdout, clippy::disallowed_types, reason = "a bench measures and tells")]

mod support;

use std::time::Instant;

use rimeshift_engine::check::check;
use rimeshift_engine::traffic::Traffic;
use support::{Sectors, day_of, invented, memory_bytes};

const REGION: [f64; 4] = [-180.0, -50.0, 180.0, 70.0];

fn main() {
    let mut before: Option<(f64, f64)> = None;
    for flights in [10_000, 30_000, 100_000] {
        let at_start = memory_bytes();
        let day = day_of(invented(flights, 3000, REGION, 12), Sectors::Lattice);
        let legs: usize = day.flights.iter().map(|f| f.profile.leg_count()).sum();
        let start = Instant::now();
        let traffic = Traffic::new(day);
        let loaded_s = start.elapsed().as_secs_f64();
        let found = check(&traffic);
        let all_s = start.elapsed().as_secs_f64();
        let bytes = memory_bytes() - at_start;
        println!(
            "{flights} flights, {legs} legs, {} losses: indexes in {loaded_s:.2} s, with the check \
             {all_s:.2} s; {:.0} MB, {:.0} bytes a leg",
            found.losses.len(),
            bytes / 1e6,
            bytes / legs as f64
        );
        let size = legs as f64;
        if let Some((size_before, time_before)) = before {
            let power = (all_s / time_before).ln() / (size / size_before).ln();
            println!("  time grows as the number of legs to the power {power:.2}");
        }
        before = Some((size, all_s));
    }
}
