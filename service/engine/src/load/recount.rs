//! Counts, limits and what a plan breaks, against a naive recount by the definitions.

use std::sync::Arc;

use proptest::prelude::*;

use super::day_loads::{DayLoads, Difference, Which};
use super::flight_load::{FlightLoad, LevelChange, Visit};
use super::planned::PlannedLoads;
use crate::answer::{LoadMeasure, Overload, Place};
use crate::day::{
    AirportCapacityParts, AirportParts, CapacityParts, Date, Day, DayParts, Sector, SectorParts,
    VolumeParts, period_at, smallest_limit,
};
use crate::ids::{AirportId, SectorId};

const DATE: Date = Date { year: 2031, month: 3, day: 4 };
/// Minutes that hold all traffic of these tests.
const MINUTES: std::ops::Range<i32> = -200..400;
const TOLERANCE: f64 = 1e-9;

/// A day without flights: sectors and one airport, with these capacity rows.
fn day_of(sectors: &[Vec<CapacityParts>], step_min: f64, lasting_min: f64) -> Day {
    let mut parts = DayParts::empty(DATE, "recounted");
    parts.policy.entry_step_min = step_min;
    parts.policy.lasting_min = lasting_min;
    for (i, rows) in sectors.iter().enumerate() {
        let sector = format!("S{i}");
        let ring = vec![[0.0, 0.0], [1.0, 0.0], [1.0, 1.0], [0.0, 1.0], [0.0, 0.0]];
        let volumes = vec![VolumeParts { rings: vec![ring], floor_ft: 0.0, ceiling_ft: 60_000.0 }];
        let row = |row: &CapacityParts| CapacityParts { sector: sector.clone(), ..row.clone() };
        parts.capacities.extend(rows.iter().map(row));
        parts.sectors.push(SectorParts { sector, volumes, ..SectorParts::default() });
    }
    let airport = "XAAA".to_owned();
    parts.airport_capacities.push(AirportCapacityParts {
        airport: airport.clone(),
        from_s: 0.0,
        until_s: 7200.0,
        arrivals_per_hour: Some(1.5),
        departures_per_hour: Some(0.0),
    });
    parts.airports.push(AirportParts { airport, ..AirportParts::default() });
    Day::build(parts).unwrap().day
}

/// The count of one measure at a place in the window from, or at the minute, `at_min`.
fn recount(
    day: &Day,
    loads: &[FlightLoad],
    place: Place,
    measure: LoadMeasure,
    at_min: i32,
) -> f64 {
    let from_s = f64::from(at_min) * 60.0;
    let in_window = |time_s: f64| from_s <= time_s && time_s < from_s + 3600.0;
    let count = |load: &FlightLoad| match (measure, place) {
        (LoadMeasure::Entries, Place::Sector(s)) => load
            .visits
            .iter()
            .filter(|v| v.sector == s && in_window(v.in_s) && day.sectors[s].is_open(v.in_s))
            .count(),
        (LoadMeasure::Occupancy, Place::Sector(s)) if day.sectors[s].is_open(from_s) => load
            .visits
            .iter()
            .filter(|v| v.sector == s && v.in_s <= from_s && from_s < v.out_s)
            .count(),
        (LoadMeasure::LevelChanges, Place::Sector(s)) => load
            .level_changes
            .iter()
            .filter(|c| c.sector == s && in_window(c.begin_s) && day.sectors[s].is_open(c.begin_s))
            .count(),
        (LoadMeasure::Arrivals, Place::Airport(a)) => {
            load.arrival.iter().filter(|(at, time_s)| *at == a && in_window(*time_s)).count()
        }
        (LoadMeasure::Departures, Place::Airport(a)) => {
            load.departure.iter().filter(|(at, time_s)| *at == a && in_window(*time_s)).count()
        }
        _ => 0,
    };
    loads.iter().map(count).sum::<usize>() as f64
}

/// The limit of the same.
fn limit_of(day: &Day, place: Place, measure: LoadMeasure, at_min: i32) -> Option<f64> {
    let (from_s, until_s) = (f64::from(at_min) * 60.0, f64::from(at_min) * 60.0 + 3600.0);
    match place {
        Place::Sector(s) => {
            let open = &day.sectors[s].open;
            match measure {
                LoadMeasure::Entries => {
                    smallest_limit(open, from_s, until_s, |l| l.entries_per_hour)
                }
                LoadMeasure::LevelChanges => {
                    smallest_limit(open, from_s, until_s, |l| l.level_changes_per_hour)
                }
                _ => period_at(open, from_s)?.limits.occupancy_limit,
            }
        }
        Place::Airport(a) => {
            let periods = &day.airports[a].periods;
            smallest_limit(periods, from_s, until_s, |l| match measure {
                LoadMeasure::Arrivals => l.arrivals_per_hour,
                _ => l.departures_per_hour,
            })
        }
    }
}

fn lasting_limit(sector: &Sector, minute: i32) -> Option<f64> {
    period_at(&sector.open, f64::from(minute) * 60.0)?.limits.occupancy_lasting
}

fn lasts(day: &Day, loads: &[FlightLoad], s: SectorId, minute: i32) -> bool {
    let before = day.policy.lasting_min as i32;
    (minute - before..=minute).all(|m| {
        let count = recount(day, loads, Place::Sector(s), LoadMeasure::Occupancy, m);
        lasting_limit(&day.sectors[s], m).is_some_and(|limit| count > limit + TOLERANCE)
    })
}

/// Every place and measure, with the minutes at which its windows or itself are counted.
fn all_counts(day: &Day) -> Vec<(Place, LoadMeasure, Vec<i32>)> {
    use LoadMeasure::{Arrivals, Departures, Entries, LevelChanges, Occupancy};
    let step = day.policy.entry_step_min as i32;
    let starts = || MINUTES.filter(|m| m.rem_euclid(step) == 0).collect::<Vec<_>>();
    let mut all = Vec::new();
    for sector in day.sectors.ids().map(Place::Sector) {
        all.push((sector, Entries, starts()));
        all.push((sector, Occupancy, MINUTES.collect()));
        all.push((sector, LevelChanges, starts()));
    }
    for airport in day.airports.ids().map(Place::Airport) {
        all.push((airport, Arrivals, starts()));
        all.push((airport, Departures, starts()));
    }
    all
}

/// What a planned day breaks that the filed day does not excuse: place, measure, minute.
fn breaks(day: &Day, filed: &[FlightLoad], plan: &[FlightLoad]) -> Vec<(Place, LoadMeasure, i32)> {
    let mut found = Vec::new();
    for (place, measure, minutes) in all_counts(day) {
        for at in minutes.into_iter().filter(|_| measure != LoadMeasure::Departures) {
            let Some(limit) = limit_of(day, place, measure, at) else { continue };
            let most = limit.max(recount(day, filed, place, measure, at));
            if recount(day, plan, place, measure, at) > most + TOLERANCE {
                found.push((place, measure, at));
            }
        }
    }
    for s in day.sectors.ids() {
        let count = |loads: &[FlightLoad], m| {
            recount(day, loads, Place::Sector(s), LoadMeasure::Occupancy, m)
        };
        for m in MINUTES {
            let excused = lasts(day, filed, s, m) && count(plan, m) <= count(filed, m);
            if lasts(day, plan, s, m) && !excused {
                found.push((Place::Sector(s), LoadMeasure::Lasting, m));
            }
        }
    }
    found
}

/// The windows or minutes of runs, spelt out.
fn spelt_out(day: &Day, runs: &[Overload]) -> Vec<(Place, LoadMeasure, i32)> {
    let step = day.policy.entry_step_min as i32;
    let mut all = Vec::new();
    for run in runs {
        let (from, until) = ((run.from_s / 60.0) as i32, (run.until_s / 60.0) as i32);
        match run.measure {
            LoadMeasure::Occupancy | LoadMeasure::Lasting => {
                all.extend((from..until).map(|m| (run.place, run.measure, m)));
            }
            _ => {
                let starts = (from..=until - 60).step_by(step as usize);
                all.extend(starts.map(|m| (run.place, run.measure, m)));
            }
        }
    }
    all
}

fn sorted<T: Ord>(mut items: Vec<T>) -> Vec<T> {
    items.sort();
    items
}

prop_compose! {
    fn limit()(limit in prop::option::weighted(0.7, 0_u32..7)) -> Option<f64> {
        limit.map(|halves| 0.5 * f64::from(halves))
    }
}

prop_compose! {
    /// One to three periods, some adjoining, some with a gap.
    fn capacity()(
        rows in prop::collection::vec(
            (-40_i32..40, 5_i32..120, limit(), limit(), limit(), limit()), 1..4),
    ) -> Vec<CapacityParts> {
        let mut until_s = -2400.0;
        rows.into_iter().map(|(gap, lasts, entries, occupancy, lasting, changes)| {
            // Borders off the minute now and then.
            let from_s = until_s + 37.0 * f64::from(gap.max(0));
            until_s = from_s + 50.0 * f64::from(lasts);
            CapacityParts {
                from_s,
                until_s,
                entries_per_hour: entries,
                occupancy_limit: occupancy,
                occupancy_lasting: lasting,
                level_changes_per_hour: changes,
                ..CapacityParts::default()
            }
        }).collect()
    }
}

fn visit() -> impl Strategy<Value = Visit> {
    (0_u32..2, -60_i32..120, 1_i32..40, 0_i32..60).prop_map(|(sector, from, lasts, seconds)| {
        let in_s = f64::from(from) * 60.0 + f64::from(seconds / 20) * 20.0;
        Visit { sector: SectorId(sector), in_s, out_s: in_s + 30.0 * f64::from(lasts) }
    })
}

fn flight_load() -> impl Strategy<Value = FlightLoad> {
    let visits = prop::collection::vec(visit(), 0..4);
    let changes = prop::collection::vec((0_u32..2, -60_i32..120), 0..2);
    let time = prop::option::of(-60_i32..120);
    (visits, changes, time.clone(), time).prop_map(|(visits, changes, arrival, departure)| {
        let at = |minute: i32| (AirportId(0), f64::from(minute) * 60.0);
        FlightLoad {
            visits,
            level_changes: changes
                .into_iter()
                .map(|(sector, minute)| LevelChange {
                    sector: SectorId(sector),
                    begin_s: f64::from(minute) * 60.0,
                })
                .collect(),
            arrival: arrival.map(at),
            departure: departure.map(at),
        }
    })
}

#[derive(Debug, Clone)]
struct Case {
    day: Day,
    filed: Vec<FlightLoad>,
    /// Other versions of the first flights, with the same departure.
    changed: Vec<FlightLoad>,
}

fn case() -> impl Strategy<Value = Case> {
    let rows = prop::collection::vec(capacity(), 2..=2);
    let filed = prop::collection::vec(flight_load(), 3..10);
    let changed = prop::collection::vec(flight_load(), 3..=3);
    let step = prop_oneof![Just(20.0), Just(7.0), Just(60.0)];
    (rows, filed, changed, step, 1_u32..4).prop_map(|(rows, filed, mut changed, step, lasting)| {
        let day = day_of(&rows, step, f64::from(lasting));
        for (version, filed) in changed.iter_mut().zip(&filed) {
            version.departure = filed.departure;
        }
        Case { day, filed, changed }
    })
}

impl Case {
    /// The day in which the flights whose bit is set are changed.
    fn with(&self, bits: u32) -> Vec<FlightLoad> {
        let chosen = |i: usize| bits & (1 << i) != 0 && i < self.changed.len();
        let versions = self.filed.iter().enumerate();
        versions.map(|(i, f)| if chosen(i) { &self.changed[i] } else { f }.clone()).collect()
    }

    fn differences(&self, loads: &DayLoads, which: Which) -> Vec<Vec<Difference>> {
        let pairs = self.filed.iter().zip(&self.changed);
        pairs.map(|(filed, changed)| loads.differences(&self.day, filed, changed, which)).collect()
    }
}

/// A day in which nothing is changed.
fn filed_loads(day: &Day, filed: &[FlightLoad]) -> PlannedLoads {
    PlannedLoads::new(Arc::new(DayLoads::new(day, filed)))
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(120))]

    #[test]
    fn filed_and_planned_counts_are_those_of_a_recount(case in case(), bits in 0_u32..8) {
        let loads = Arc::new(DayLoads::new(&case.day, &case.filed));
        let mut planned = PlannedLoads::new(Arc::clone(&loads));
        for (i, differences) in case.differences(&loads, Which::All).iter().enumerate() {
            prop_assert!(differences.windows(2).all(|w| w[0].0 < w[1].0));
            prop_assert!(differences.iter().all(|d| d.1 != 0));
            if bits & (1 << i) != 0 {
                planned.apply(differences);
            }
        }
        let plan = case.with(bits);
        let step = case.day.policy.entry_step_min as i32;
        let mut rows = planned.load_counts().into_iter();
        for (place, measure, minutes) in all_counts(&case.day) {
            let count = |flights: &[FlightLoad], m| recount(&case.day, flights, place, measure, m);
            for start in minutes.into_iter().filter(|m| m.rem_euclid(step) == 0) {
                let slice = if measure == LoadMeasure::Occupancy { start..start + step } else { start..start + 1 };
                let greatest = |flights: &[FlightLoad]| {
                    slice.clone().map(|m| count(flights, m)).fold(0.0, f64::max)
                };
                let (filed, after) = (greatest(&case.filed), greatest(&plan));
                if filed == 0.0 && after == 0.0 {
                    continue;
                }
                let row = rows.next().expect("a row for every window with traffic");
                prop_assert_eq!((row.place, row.measure), (place, measure));
                prop_assert_eq!(row.window_start_s, f64::from(start) * 60.0);
                prop_assert_eq!((row.filed, row.planned), (filed, after));
                let limits = slice.clone().filter_map(|m| limit_of(&case.day, place, measure, m));
                prop_assert_eq!(row.limit, limits.min_by(f64::total_cmp));
            }
        }
        prop_assert!(rows.next().is_none());
    }

    #[test]
    fn one_more_change_breaks_what_a_recount_finds(case in case(), bits in 0_u32..8, one in 0_usize..3) {
        let bits = bits & !(1 << one);
        let before = case.with(bits);
        // Only feasible plans are added to.
        prop_assume!(breaks(&case.day, &case.filed, &before).is_empty());
        let loads = Arc::new(DayLoads::new(&case.day, &case.filed));
        let mut planned = PlannedLoads::new(Arc::clone(&loads));
        let differences = case.differences(&loads, Which::Binding);
        for (i, differences) in differences.iter().enumerate().filter(|(i, _)| bits & (1 << i) != 0) {
            let _ = i;
            planned.apply(differences);
        }
        let found = planned.violations(&differences[one]);
        let expected = breaks(&case.day, &case.filed, &case.with(bits | (1 << one)));
        prop_assert_eq!(sorted(spelt_out(&case.day, &found)), sorted(expected));
        let least = planned.least_slack(&differences[one]);
        prop_assert_eq!(least.is_some_and(|slack| slack < -TOLERANCE), !found.is_empty());
        let copy = planned.clone();
        planned.apply(&differences[one]);
        planned.undo(&differences[one]);
        prop_assert_eq!(copy.load_counts(), planned.load_counts());
    }

    #[test]
    fn rows_and_lasting_rules_allow_exactly_what_a_recount_allows(case in case()) {
        let loads = Arc::new(DayLoads::new(&case.day, &case.filed));
        let differences = case.differences(&loads, Which::Binding);
        let mut most_added: std::collections::BTreeMap<_, i64> = Default::default();
        for &(cell, amount) in differences.iter().flatten() {
            *most_added.entry(cell).or_default() += i64::from(amount.max(0));
        }
        let most_added: Vec<_> = most_added.into_iter().collect();
        let rules = loads.lasting_rules_touching(&most_added);
        for bits in 0..8_u32 {
            let sum = |cell| -> i64 {
                let chosen = differences.iter().enumerate().filter(|(i, _)| bits & (1 << i) != 0);
                let deltas = chosen.flat_map(|(_, d)| d.iter().filter(|d| d.0 == cell));
                deltas.map(|d| i64::from(d.1)).sum()
            };
            let rows_hold = most_added
                .iter()
                .all(|&(cell, _)| loads.slack(cell).is_none_or(|slack| sum(cell) <= slack));
            let rules_hold = rules
                .iter()
                .all(|rule| rule.alternatives.iter().any(|&(cell, slack)| sum(cell) <= slack));
            let broken = breaks(&case.day, &case.filed, &case.with(bits));
            prop_assert_eq!(rows_hold && rules_hold, broken.is_empty(), "{:?}", broken);
        }
        for rule in &rules {
            prop_assert_eq!(loads.lasting_rule(rule.minute), Some(rule.clone()));
        }
    }

    #[test]
    fn filed_overloads_are_those_of_a_recount(case in case()) {
        let found = filed_loads(&case.day, &case.filed).overloads();
        let mut expected = Vec::new();
        for (place, measure, minutes) in all_counts(&case.day) {
            for at in minutes {
                let count = recount(&case.day, &case.filed, place, measure, at);
                let limit = limit_of(&case.day, place, measure, at);
                if limit.is_some_and(|limit| count > limit + TOLERANCE) {
                    expected.push((place, measure, at));
                }
            }
        }
        for s in case.day.sectors.ids() {
            let minutes = MINUTES.filter(|&m| lasts(&case.day, &case.filed, s, m));
            expected.extend(minutes.map(|m| (Place::Sector(s), LoadMeasure::Lasting, m)));
        }
        prop_assert_eq!(sorted(spelt_out(&case.day, &found)), sorted(expected));
    }
}

fn stay(sector: u32, from_min: f64, until_min: f64) -> FlightLoad {
    let (in_s, out_s) = (from_min * 60.0, until_min * 60.0);
    FlightLoad {
        visits: vec![Visit { sector: SectorId(sector), in_s, out_s }],
        ..FlightLoad::default()
    }
}

fn open(from_min: f64, until_min: f64) -> CapacityParts {
    CapacityParts { from_s: from_min * 60.0, until_s: until_min * 60.0, ..CapacityParts::default() }
}

#[test]
fn opening_is_no_entry_and_a_flight_that_comes_at_closing_time_is_not_counted() {
    let day = day_of(&[vec![open(60.0, 120.0)]], 20.0, 10.0);
    let rows = |load: FlightLoad| {
        let rows = filed_loads(&day, &[load]).load_counts();
        let of = |measure| rows.iter().filter(|r| r.measure == measure).count();
        (of(LoadMeasure::Entries), of(LoadMeasure::Occupancy))
    };
    // Inside when the sector opens: no entry, but it is there from then on.
    assert_eq!(rows(stay(0, 50.0, 70.0)), (0, 1));
    // An entry at opening time is one, in the three windows around it.
    assert_eq!(rows(stay(0, 60.0, 70.0)), (3, 1));
    assert_eq!(rows(stay(0, 120.0, 130.0)), (0, 0));
    // Between two minutes: an entry, never an occupancy.
    assert_eq!(rows(stay(0, 119.2, 119.8)), (3, 0));
}

#[test]
fn a_lasting_overload_takes_the_minute_and_all_those_before_it() {
    let rows = CapacityParts { occupancy_lasting: Some(1.0), ..open(0.0, 300.0) };
    let day = day_of(&[vec![rows]], 20.0, 10.0);
    let filed = [stay(0, 30.0, 60.0), stay(0, 100.0, 130.0)];
    let loads = Arc::new(DayLoads::new(&day, &filed));
    let planned = PlannedLoads::new(Arc::clone(&loads));
    assert_eq!(planned.overloads(), []);
    let add = |from, until| {
        let none = FlightLoad::default();
        loads.differences(&day, &none, &stay(0, from, until), Which::Binding)
    };
    // Ten minutes of two flights are not eleven.
    assert_eq!(planned.violations(&add(40.0, 50.0)), []);
    assert_eq!(planned.least_slack(&add(40.0, 50.0)), Some(0.0));
    let broken = planned.violations(&add(40.0, 52.0));
    let run = Overload {
        place: Place::Sector(SectorId(0)),
        measure: LoadMeasure::Lasting,
        from_s: 3000.0,
        until_s: 3120.0,
        count: 2.0,
        limit: 1.0,
    };
    assert_eq!(broken, [run]);
    assert_eq!(planned.least_slack(&add(40.0, 52.0)), Some(-1.0));
}

#[test]
fn a_plan_may_keep_what_the_filed_day_exceeds() {
    let rows = CapacityParts {
        entries_per_hour: Some(1.0),
        occupancy_limit: Some(1.0),
        ..open(0.0, 300.0)
    };
    let day = day_of(&[vec![rows]], 60.0, 10.0);
    let filed = [stay(0, 60.0, 70.0), stay(0, 60.0, 70.0), FlightLoad::default()];
    let loads = Arc::new(DayLoads::new(&day, &filed));
    let mut planned = PlannedLoads::new(Arc::clone(&loads));
    let leaves = loads.differences(&day, &filed[0], &FlightLoad::default(), Which::Binding);
    let comes = loads.differences(&day, &filed[2], &stay(0, 60.0, 70.0), Which::Binding);
    let broken = planned.violations(&comes);
    assert_eq!(broken.len(), 2);
    // The filed count would be allowed, being the larger; the limit told is the one in force.
    assert_eq!((broken[0].count, broken[0].limit), (3.0, 1.0));
    assert_eq!((broken[1].from_s, broken[1].until_s), (3600.0, 4200.0));
    planned.apply(&leaves);
    assert_eq!(planned.violations(&comes), []);
    assert_eq!(planned.least_slack(&comes), Some(0.0));
}

#[test]
fn departures_are_shown_and_bind_nothing() {
    let day = day_of(&[], 60.0, 10.0);
    let departure = FlightLoad { departure: Some((AirportId(0), 0.0)), ..FlightLoad::default() };
    let loads = DayLoads::new(&day, &[]);
    let none = FlightLoad::default();
    assert_eq!(loads.differences(&day, &none, &departure, Which::Binding), []);
    let all = loads.differences(&day, &none, &departure, Which::All);
    let (cell, _) = all[0];
    assert_eq!(
        (loads.limit(cell), loads.allowed(cell), loads.slack(cell)),
        (Some(0.0), None, None)
    );
    assert_eq!(filed_loads(&day, &[departure]).overloads().len(), 1);
}
