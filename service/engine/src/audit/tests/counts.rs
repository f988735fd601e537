//! Counts that a plan makes worse, one kind at a time.

use super::support::*;
use crate::answer::{LoadMeasure, Place};
use crate::audit::{Finding, audit};
use crate::day::{AirportCapacityParts, AirportParts, CapacityParts, DayParts};
use crate::ids::{AirportId, SectorId};

/// A cruises at FL 350 over a sector LOW (FL 245 to 340), which proposal P makes it enter.
fn over_a_low_sector() -> DayParts {
    let mut parts = simple();
    parts.flights[0] = flight("A", &[(0.0, 0.0, 0.0, 350.0), (120.0, 14.0, 0.0, 350.0)]);
    let (mut low, capacity) = sector("LOW", -5.0, 20.0);
    low.volumes[0].ceiling_ft = 34_000.0;
    parts.sectors = vec![low];
    parts.capacities = vec![capacity];
    // Two flights of its own, out of A's way: from minute 0, and from minute 50 to 70.
    parts.flights.push(flight("B", &[(0.0, 0.0, 2.0, 300.0), (120.0, 14.0, 2.0, 300.0)]));
    parts.flights.push(flight("C", &[(50.0, 6.0, -2.0, 300.0), (70.0, 8.0, -2.0, 300.0)]));
    parts
}

fn with(limit: impl Fn(&mut CapacityParts)) -> Vec<Finding> {
    let mut parts = over_a_low_sector();
    limit(&mut parts.capacities[0]);
    findings(&build(parts), &[(0, 1)])
}

fn assert_overload(found: &[Finding], measure: LoadMeasure, count: f64, from_until: (f64, f64)) {
    let [Finding::Overload { place, measure: m, from_s, until_s, count: c, .. }] = found else {
        panic!("{found:?}");
    };
    assert_eq!((*place, *m, *c), (Place::Sector(SectorId(0)), measure, count));
    assert_eq!((*from_s, *until_s), from_until);
}

#[test]
fn entries() {
    // B enters at minute 0, A about a minute after minute 20, C at minute 50.
    assert_eq!(with(|c| c.entries_per_hour = Some(3.0)), vec![]);
    let found = with(|c| c.entries_per_hour = Some(1.0));
    // A and B in window -00:20, all three in 00:00, A and C in 00:20.
    assert_overload(&found, LoadMeasure::Entries, 3.0, (-1200.0, 4800.0));
}

#[test]
fn a_count_may_stay_as_bad_as_filed() {
    // Filed already above this limit everywhere; A adds none where it was not before.
    let mut parts = over_a_low_sector();
    parts.flights[0] = flight("A", &[(0.0, 0.0, 0.0, 320.0), (120.0, 14.0, 0.0, 320.0)]);
    parts.proposals[0].alternatives[0].stretches = vec![stretch(Some(20.0), Some(100.0), 310.0)];
    parts.capacities[0].entries_per_hour = Some(0.0);
    parts.capacities[0].occupancy_limit = Some(0.0);
    assert_eq!(findings(&build(parts), &[(0, 1)]), vec![]);
}

#[test]
fn occupancy() {
    assert_eq!(with(|c| c.occupancy_limit = Some(3.0)), vec![]);
    // Three inside from minute 50 until 70 (not included), while C is there.
    let found = with(|c| c.occupancy_limit = Some(2.0));
    assert_overload(&found, LoadMeasure::Occupancy, 3.0, (3000.0, 4200.0));
}

#[test]
fn lasting_overload() {
    // Above 2 from minute 50 to 69: lasting ten minutes from minute 60 on.
    let found = with(|c| c.occupancy_lasting = Some(2.0));
    assert_overload(&found, LoadMeasure::Lasting, 3.0, (3600.0, 4200.0));
    let mut parts = over_a_low_sector();
    parts.capacities[0].occupancy_lasting = Some(2.0);
    parts.policy.lasting_min = 20.0;
    assert_eq!(findings(&build(parts), &[(0, 1)]), vec![]);
}

#[test]
fn level_changes() {
    // A's descent begins at FL 350, above LOW; its climb back begins inside.
    assert_eq!(with(|c| c.level_changes_per_hour = Some(1.0)), vec![]);
    let found = with(|c| c.level_changes_per_hour = Some(0.0));
    // It begins before minute 100: windows from 00:40 to 01:20.
    assert_overload(&found, LoadMeasure::LevelChanges, 1.0, (2400.0, 8400.0));
}

#[test]
fn arrivals() {
    let with_airport = |limit| {
        let mut parts = simple();
        // It lands 10 s after 02:00 as filed, and before it as planned.
        for p in &mut parts.flights[0].points {
            p.time_s += 10.0;
        }
        parts.flights[0].points[4].level_ft = 0.0;
        parts.airports.push(AirportParts {
            airport: "XBBB".to_owned(),
            lon_deg: 14.0,
            lat_deg: 0.0,
            name: None,
        });
        parts.airport_capacities.push(AirportCapacityParts {
            airport: "XBBB".to_owned(),
            from_s: 0.0,
            until_s: 3600.0 * 1.5,
            arrivals_per_hour: Some(limit),
            departures_per_hour: None,
        });
        findings(&build(parts), &[(0, 1)])
    };
    assert_eq!(with_airport(1.0), vec![]);
    // Window 01:00 is the only limited one that gets another arrival.
    let found = with_airport(0.0);
    assert!(
        matches!(
            found[..],
            [Finding::Overload {
                place: Place::Airport(AirportId(0)),
                measure: LoadMeasure::Arrivals,
                from_s: 3600.0,
                filed: 0.0,
                count: 1.0,
                ..
            }]
        ),
        "{found:?}"
    );
}

#[test]
fn closed_sectors_are_not_counted() {
    let closed = |c: &mut CapacityParts| {
        c.entries_per_hour = Some(0.0);
        c.occupancy_limit = Some(0.0);
        // Opens at minute 101, after A has left and while only B is inside.
        c.from_s = 101.0 * 60.0 + 30.0;
    };
    assert_eq!(with(closed), vec![]);
}

#[test]
fn short_visits_and_near_ones() {
    // A dips into LOW twice for a few minutes, a few minutes apart.
    let dips = |change: fn(&mut DayParts)| {
        let mut parts = over_a_low_sector();
        parts.proposals[0].alternatives[0].stretches =
            vec![stretch(Some(22.0), Some(26.0), 330.0), stretch(Some(30.0), Some(34.0), 330.0)];
        parts.capacities[0].entries_per_hour = Some(1.0);
        change(&mut parts);
        findings(&build(parts), &[(0, 1)])
    };
    let worst = |found: Vec<Finding>| match found[..] {
        [Finding::Overload { count, .. }] => count,
        [] => 0.0,
        _ => panic!("{found:?}"),
    };
    assert_eq!(worst(dips(|_| ())), 4.0);
    assert_eq!(worst(dips(|p| p.policy.rejoin_s = 600.0)), 3.0);
    assert_eq!(worst(dips(|p| p.policy.min_visit_s = 600.0)), 0.0);
}

#[test]
fn counts_are_reported() {
    let mut parts = over_a_low_sector();
    parts.capacities[0].entries_per_hour = Some(9.0);
    parts.capacities[0].occupancy_limit = Some(9.0);
    let day = build(parts);
    let report = audit(&day, &plan(&day, &[(0, 1)]));
    assert_sound(&report);
    // B from window -00:40 to 00:00, C from 00:00 to 00:40, A from -00:20 to 00:20: five windows.
    assert_eq!(report.checked.windows, 5);
    // B is inside from minute 0 to 119.
    assert_eq!(report.checked.minutes, 120);
    assert_eq!(report.checked.visits, 2);
}
