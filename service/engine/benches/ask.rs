//! "May this flight change level now?" to the engine alone: the whole answer, and its parts.

mod support;

use std::hint::black_box;

use rimeshift_engine::ask::{Question, ask};
use rimeshift_engine::benefit::figures;
use rimeshift_engine::change::change_levels;
use rimeshift_engine::day::Alternative;
use rimeshift_engine::ids::FlightId;
use rimeshift_engine::plan::PlanState;
use rimeshift_engine::separation::{expected_new_losses, new_losses_against_filed};
use rimeshift_engine::traffic::Traffic;
use support::{Sectors, day, measure_each, stretches};

fn main() {
    let traffic = Traffic::new(day(Sectors::Lattice));
    let flights = traffic.day.flights.len();
    let questions: Vec<Question> = (0..flights)
        .filter_map(|i| {
            let flight = FlightId((i * 37 % flights) as u32);
            let stretches = stretches(&traffic.day, flight);
            let valid = |stretch: &&_| {
                let track = &traffic.tracks[flight];
                change_levels(&traffic.day, traffic.flight(flight), track, &[**stretch]).is_ok()
            };
            let stretch = *stretches.iter().find(valid)?;
            let option = Alternative {
                option: 1,
                stretches: vec![stretch],
                contrail_km_avoided: None,
                ef_avoided_j: None,
                extra_fuel_kg: None,
                max_extra_fuel_kg: None,
                priority: 1.0,
            };
            Some(Question { flight, option })
        })
        .take(8000)
        .collect();
    let filed = PlanState::filed(&traffic);
    let count = questions.len();
    measure_each("ask against the filed day", count, |i| {
        black_box(ask(&traffic, &filed, &questions[i]));
    });
    let change = |i: usize| {
        let q = &questions[i];
        let (flight, track) = (traffic.flight(q.flight), &traffic.tracks[q.flight]);
        change_levels(&traffic.day, flight, track, &q.option.stretches)
            .unwrap_or_else(|rule| unreachable!("chosen to be valid: {rule:?}"))
    };
    measure_each("  the changed profile", count, |i| {
        black_box(change(i));
    });
    let changes: Vec<_> = (0..count).map(change).collect();
    measure_each("  its figures", count, |i| {
        let q = &questions[i];
        black_box(figures(&traffic.day, traffic.flight(q.flight), &q.option, &changes[i]));
    });
    measure_each("  differences of counts", count, |i| {
        black_box(filed.differences(&traffic, questions[i].flight, &changes[i].changed));
    });
    measure_each("  new losses", count, |i| {
        let (flight, changed) = (questions[i].flight, &changes[i].changed);
        let minima = traffic.minima(flight, changed);
        let version = traffic.version(flight, changed, &minima);
        black_box(new_losses_against_filed(&traffic.scene, &version));
    });
    measure_each("  expected new losses", count, |i| {
        let (flight, changed) = (questions[i].flight, &changes[i].changed);
        let minima = traffic.minima(flight, changed);
        let version = traffic.version(flight, changed, &minima);
        black_box(expected_new_losses(&traffic.scene, &[version]));
    });
    for moved in [100, 500] {
        // Moved flights from the end of the list, questions from its start.
        let last = questions.iter().zip(&changes).rev().take(moved);
        let state = PlanState::new(&traffic, last.map(|(q, c)| (q.flight, c.clone())));
        measure_each(&format!("ask against a plan of {moved} moved flights"), 4000, |i| {
            black_box(ask(&traffic, &state, &questions[i]));
        });
    }
}
