//! The 250 proposals: what ice asks for, with some made so that every kind of answer occurs.

use rand::{RngExt, seq::SliceRandom};
use rand_pcg::Pcg64;

use crate::{
    flight::{CruiseRun, Flight},
    ice::IceRegion,
    levels, profile,
    proposals::{self, Alternative, Crossing, Proposal, Stretch},
    region::{RESTRICTION, Sector},
};

/// Number of proposals.
pub const WANTED: usize = 250;
/// Shortest time in ice that makes a flight ask, seconds.
const LEAST_S: f64 = 240.0;

/// Makes the proposals, in order of flight.
pub fn invent(
    rng: &mut Pcg64,
    flights: &[Flight],
    ice: &[IceRegion],
    sectors: &[Sector],
) -> Vec<Proposal> {
    let mut used = vec![false; flights.len()];
    let mut proposals = invalid(flights, sectors, &mut used);
    let mut special = deep(flights, &mut used);
    special.extend(costly(flights, ice, &mut used));
    special.extend(in_two_steps(flights, &mut used));
    special.retain(|p| !enters_kept_levels(&flights[p.flight], p, sectors));
    proposals.extend(special);
    let mut order: Vec<usize> = (0..flights.len()).filter(|i| !used[*i]).collect();
    order.shuffle(rng);
    // Stable: those that arrive at the edge of a window first, else in drawn order.
    order.sort_by_key(|i| !arrives_at_edge(&flights[*i]));
    for index in order {
        if proposals.len() >= WANTED {
            break;
        }
        let flight = &flights[index];
        if flight.movable {
            let room = WANTED - proposals.len();
            let asked = from_ice(rng, index, flight, ice);
            let known = |p: &Proposal| !enters_kept_levels(flight, p, sectors);
            proposals.extend(asked.into_iter().filter(known).take(room));
        }
    }
    // Stable: proposals of one flight stay in the order made.
    proposals.sort_by_key(|p| p.flight);
    proposals
}

/// Airports whose arrivals come close to their limit.
const BUSY: [&str; 2] = ["XKEL", "XVAR"];
/// Start of each window of arrivals, seconds after the last.
const STEP_S: f64 = 1200.0;
/// How close to a window's edge counts, seconds.
const EDGE_S: f64 = 4.0;

fn arrives_at_edge(flight: &Flight) -> bool {
    let after_s = flight.end_s().rem_euclid(STEP_S);
    BUSY.contains(&flight.destination.as_str()) && after_s.min(STEP_S - after_s) <= EDGE_S
}

/// Moves some flights to busy airports in time so that the change that they will ask for would
/// bring them over the edge of a window: the gain or loss of a level change is a few seconds, so
/// that by chance hardly any would.
pub fn arrive_at_edges(flights: &mut [Flight], ice: &[IceRegion], wanted: usize) {
    let mut moved = 0;
    for flight in flights.iter_mut() {
        let hour = flight.end_s() / 3600.0;
        let in_wave = (7.0..10.5).contains(&hour) || (16.5..20.0).contains(&hour);
        if moved == wanted || !in_wave || !BUSY.contains(&flight.destination.as_str()) {
            continue;
        }
        let Some(crossing) = proposals::crossings(flight, ice, 600.0).into_iter().next() else {
            continue;
        };
        // Above the tropopause (FL 361) speed does not change with level.
        let asked = proposals::options(flight, ice, &crossing, 1);
        let Some(stretch) = asked.first().and_then(|a| a.stretches.first()) else { continue };
        let filed_fl = crossing.run.level_fl;
        if filed_fl > 360 || !flight.movable {
            continue;
        }
        // A lower level is faster: from just after an edge to before it. A higher one is slower.
        let aim_s = if stretch.level_fl < filed_fl { EDGE_S - 1.0 } else { 1.0 - EDGE_S };
        let edge_s = (flight.end_s() / STEP_S).round() * STEP_S;
        let shift_s = edge_s + aim_s - flight.end_s();
        for point in &mut flight.points {
            point.time_s += shift_s;
        }
        moved += 1;
    }
}

/// Whether any option is off its filed level where levels must stay as filed: those who ask know
/// these sectors and leave them alone.
fn enters_kept_levels(flight: &Flight, proposal: &Proposal, sectors: &[Sector]) -> bool {
    let kept: Vec<&Sector> = sectors.iter().filter(|s| s.no_changes).collect();
    let stretches = proposal.options.iter().flat_map(|o| &o.stretches);
    stretches.into_iter().any(|s| {
        let from_s = s.from_s.unwrap_or(flight.start_s());
        let until_s = s.until_s.map_or(flight.end_s(), |t| t + 400.0);
        let mut time_s = from_s;
        while time_s < until_s {
            let inside = profile::at_time(&flight.points, time_s).is_some_and(|(lon, lat, fl)| {
                let (low, high) = (fl.min(f64::from(s.level_fl)), fl.max(f64::from(s.level_fl)));
                kept.iter().any(|k| k.contains(lon, lat, low) || k.contains(lon, lat, high))
            });
            if inside {
                return true;
            }
            time_s += 60.0;
        }
        false
    })
}

/// What one flight asks for: one proposal for all its crossings or one each; now and then the
/// second choice first, or a second proposal that overlaps the first.
fn from_ice(rng: &mut Pcg64, index: usize, flight: &Flight, ice: &[IceRegion]) -> Vec<Proposal> {
    let mut asked = Vec::new();
    for crossing in proposals::crossings(flight, ice, LEAST_S) {
        let most = rng.random_range(1..4);
        let mut options = proposals::options(flight, ice, &crossing, most);
        if options.len() > 1 && rng.random_bool(0.12) {
            options.swap(0, 1);
        }
        if options.len() > 1 && rng.random_bool(0.1) {
            let rival = options.remove(1);
            asked.push(Proposal { flight: index, options: vec![rival] });
        }
        if !options.is_empty() {
            asked.push(Proposal { flight: index, options });
        }
    }
    if let [first, second] = asked.as_slice()
        && rng.random_bool(0.5)
        && let Some(both) = joined(first, second)
    {
        return vec![Proposal { flight: index, options: vec![both] }];
    }
    if rng.random_bool(0.06) {
        for alternative in asked.iter_mut().flat_map(|p| &mut p.options) {
            alternative.priority = Some(2.0);
        }
    }
    asked
}

/// One option with the first options of two proposals, if the second begins well after the first.
fn joined(first: &Proposal, second: &Proposal) -> Option<Alternative> {
    let (a, b) = (first.options.first()?, second.options.first()?);
    let end_s = a.stretches.last()?.until_s?;
    let begin_s = b.stretches.first()?.from_s?;
    (begin_s > end_s + 360.0).then(|| Alternative {
        stretches: a.stretches.iter().chain(&b.stretches).cloned().collect(),
        max_extra_fuel_kg: None,
        priority: None,
    })
}

/// The longest cruise run, if it lasts at least so many seconds.
fn long_run(flight: &Flight, least_s: f64) -> Option<CruiseRun> {
    let runs = flight.cruise_runs(250.0);
    let longest = runs
        .into_iter()
        .max_by(|a, b| (a.until_s - a.from_s).total_cmp(&(b.until_s - b.from_s)))?;
    (longest.until_s - longest.from_s >= least_s).then_some(longest)
}

fn single(flight: usize, stretch: Stretch) -> Proposal {
    let stretches = vec![stretch];
    let options = vec![Alternative { stretches, max_extra_fuel_kg: None, priority: None }];
    Proposal { flight, options }
}

fn asking(level_fl: u32, from_s: Option<f64>, until_s: Option<f64>) -> Stretch {
    let (contrail_km, extra_fuel_kg) = (Some(80.0), Some(60.0));
    Stretch { level_fl, from_s, until_s, contrail_km, extra_fuel_kg }
}

/// Takes the first unused flights for which `make` makes a proposal.
fn take(
    flights: &[Flight],
    used: &mut [bool],
    wanted: usize,
    make: impl Fn(usize, &Flight) -> Option<Proposal>,
) -> Vec<Proposal> {
    let mut taken = Vec::new();
    // From the morning on, where there is most to choose from.
    for (index, flight) in flights.iter().enumerate().skip(150) {
        if taken.len() == wanted {
            break;
        }
        if !used[index]
            && let Some(proposal) = make(index, flight)
        {
            used[index] = true;
            taken.push(proposal);
        }
    }
    taken
}

/// The middle third of a run.
fn middle(run: &CruiseRun) -> (f64, f64) {
    let third_s = ((run.until_s - run.from_s) / 3.0).floor();
    (run.from_s + third_s, run.until_s - third_s)
}

fn neighbour(flight: &Flight, run: &CruiseRun, steps: i32) -> Option<u32> {
    let track = flight.tracks_deg(run.from_s, run.until_s).first().copied()?;
    levels::stepped(run.level_fl, steps, track)
        .filter(|fl| *fl >= 250 && flight.suits(*fl, run.from_s, run.until_s))
}

/// Proposals that each break one rule.
fn invalid(flights: &[Flight], sectors: &[Sector], used: &mut [bool]) -> Vec<Proposal> {
    let mut made = Vec::new();
    // A level against the direction of flight.
    made.extend(take(flights, used, 2, |i, f| {
        let run = long_run(f, 1500.0).filter(|_| f.movable && f.rvsm)?;
        let (from, until) = middle(&run);
        Some(single(i, asking(run.level_fl - 10, Some(from), Some(until))))
    }));
    // Above the ceiling, by however many steps of the direction that takes.
    made.extend(take(flights, used, 1, |i, f| {
        let run = long_run(f, 1500.0).filter(|_| f.movable && f.rvsm)?;
        let (from, until) = middle(&run);
        let over = (1..5).filter_map(|n| neighbour(f, &run, n)).find(|fl| *fl > f.ceiling_fl)?;
        Some(single(i, asking(over, Some(from), Some(until))))
    }));
    // Below the cruise floor.
    made.extend(take(flights, used, 1, |i, f| {
        let run = long_run(f, 1500.0).filter(|r| f.movable && r.level_fl < 300)?;
        let (from, until) = middle(&run);
        let below = if run.level_fl % 20 == 0 { 240 } else { 230 };
        Some(single(i, asking(below, Some(from), Some(until))))
    }));
    // The level that is filed there.
    made.extend(take(flights, used, 1, |i, f| {
        let run = long_run(f, 1500.0).filter(|_| f.movable)?;
        let (from, until) = middle(&run);
        Some(single(i, asking(run.level_fl, Some(from), Some(until))))
    }));
    // Into the RVSM band without approval.
    made.extend(take(flights, used, 2, |i, f| {
        let run = long_run(f, 900.0).filter(|r| f.movable && !f.rvsm && r.level_fl < 290)?;
        let (from, until) = middle(&run);
        let level_fl = (1..3).filter_map(|n| neighbour(f, &run, n)).find(|fl| *fl >= 290)?;
        Some(single(i, asking(level_fl, Some(from), Some(until))))
    }));
    // A flight that may not be moved.
    made.extend(take(flights, used, 1, |i, f| {
        let run = long_run(f, 1200.0).filter(|_| !f.movable)?;
        let (from, until) = middle(&run);
        Some(single(i, asking(neighbour(f, &run, -1)?, Some(from), Some(until))))
    }));
    // A flight without a cruise leg.
    made.extend(take(flights, used, 1, |i, f| {
        let middle_s = (f.start_s() + f.end_s()) / 2.0;
        f.cruise_runs(245.0)
            .is_empty()
            .then(|| single(i, asking(250, Some(middle_s), Some(middle_s + 600.0))))
    }));
    made.extend(misplaced(flights, used));
    made.extend(forbidden_air(flights, sectors, used));
    made
}

/// Stretches whose ends lie where they may not.
fn misplaced(flights: &[Flight], used: &mut [bool]) -> Vec<Proposal> {
    let mut made = Vec::new();
    let mut add = |make: &dyn Fn(&Flight, CruiseRun, u32) -> Option<Stretch>| {
        made.extend(take(flights, used, 1, |i, f| {
            let run = long_run(f, 1500.0).filter(|_| f.movable && f.rvsm)?;
            let level_fl = neighbour(f, &run, -1)?;
            make(f, run, level_fl).map(|s| single(i, s))
        }));
    };
    let climbs = |f: &Flight, run: &CruiseRun| run.first > 0 && f.points[0].level_fl < 100.0;
    // Begins in the climb, by a given time.
    add(&|f, run, fl| {
        climbs(f, &run).then(|| asking(fl, Some(run.from_s - 120.0), Some(middle(&run).1)))
    });
    // Ends in the descent, by a given time.
    add(&|f, run, fl| {
        (run.last + 1 < f.points.len())
            .then(|| asking(fl, Some(middle(&run).0), Some(run.until_s + 120.0)))
    });
    // Too short to reach the level.
    add(&|_, run, fl| {
        let (from, _) = middle(&run);
        Some(asking(fl, Some(from), Some(from + 60.0)))
    });
    // Returns too late for the top of descent.
    add(&|f, run, fl| {
        (run.last + 1 < f.points.len())
            .then(|| asking(fl, Some(middle(&run).0), Some(run.until_s - 30.0)))
    });
    // From the climb, but the flight begins in cruise.
    add(&|_, run, fl| (run.first == 0).then(|| asking(fl, None, Some(middle(&run).1))));
    // Until the descent, but the flight ends in cruise.
    add(&|f, run, fl| {
        (run.last + 1 == f.points.len()).then(|| asking(fl, Some(middle(&run).0), None))
    });
    made
}

/// Stretches through the restriction and through a sector where levels stay as filed.
fn forbidden_air(flights: &[Flight], sectors: &[Sector], used: &mut [bool]) -> Vec<Proposal> {
    let (e, floor_fl, ceiling_fl, from_s, until_s) = RESTRICTION;
    let mut made = Vec::new();
    let mut add = |wanted, is_there: &dyn Fn(f64, f64, f64, f64) -> bool| {
        made.extend(take(flights, used, wanted, |i, f| {
            let run = long_run(f, 1500.0).filter(|_| f.movable && f.rvsm)?;
            let level_fl = neighbour(f, &run, -1)?;
            let mut time_s = run.from_s + 600.0;
            while time_s < run.until_s - 900.0 {
                let (lon, lat, _) = profile::at_time(&f.points, time_s)?;
                if is_there(time_s, lon, lat, f64::from(level_fl)) {
                    let s = asking(level_fl, Some(time_s - 400.0), Some(time_s + 400.0));
                    return Some(single(i, s));
                }
                time_s += 60.0;
            }
            None
        }));
    };
    add(2, &|t, lon, lat, fl| {
        (from_s..until_s).contains(&t)
            && (floor_fl..ceiling_fl).contains(&fl)
            && (e.west_deg..e.east_deg).contains(&lon)
            && (e.south_deg..e.north_deg).contains(&lat)
    });
    // From the middle layer down: at its filed level the flight is not in the sector.
    add(2, &|_, lon, lat, fl| {
        let mut kept = sectors.iter().filter(|s| s.no_changes);
        kept.any(|s| s.contains(lon, lat, fl) && !s.contains(lon, lat, fl + 20.0))
    });
    made
}

/// Ten long descents by 6 000 ft, whose gain of time is more than the day's policy allows.
fn deep(flights: &[Flight], used: &mut [bool]) -> Vec<Proposal> {
    take(flights, used, 10, |i, f| {
        let run = long_run(f, 3300.0).filter(|r| f.movable && f.rvsm && r.level_fl < 390)?;
        let level_fl = neighbour(f, &run, -3)?;
        let (from, until) = (run.from_s + 60.0, run.until_s - 600.0);
        let stretch = Stretch {
            contrail_km: Some(410.0),
            extra_fuel_kg: Some((f.cruise_kg_per_min * 4.5).round()),
            ..asking(level_fl, Some(from), Some(until))
        };
        Some(single(i, stretch))
    })
}

/// Eight that burn more than their operator accepts, and eight that burn more than they are worth.
fn costly(flights: &[Flight], ice: &[IceRegion], used: &mut [bool]) -> Vec<Proposal> {
    let options = |f: &Flight| {
        let crossing = proposals::crossings(f, ice, LEAST_S).into_iter().next()?;
        let options = proposals::options(f, ice, &crossing, 2);
        (f.movable && !options.is_empty()).then_some(options)
    };
    let mut made = take(flights, used, 8, |i, f| {
        let mut options = options(f)?;
        if i % 2 == 0 {
            options.truncate(1);
        }
        let first = options.first_mut()?;
        let fuel_kg: f64 = first.stretches.iter().filter_map(|s| s.extra_fuel_kg).sum();
        first.max_extra_fuel_kg = Some((fuel_kg * 0.6).floor());
        Some(Proposal { flight: i, options })
    });
    made.extend(take(flights, used, 8, |i, f| {
        let mut options = options(f)?;
        options.truncate(1);
        for s in options.iter_mut().flat_map(|o| &mut o.stretches) {
            s.contrail_km = Some(1.5);
            s.extra_fuel_kg = s.extra_fuel_kg.map(|kg| kg.max(150.0) * 2.0);
        }
        Some(Proposal { flight: i, options })
    }));
    made
}

/// Six options with two stretches: lower in the first half of the cruise, higher in the second.
fn in_two_steps(flights: &[Flight], used: &mut [bool]) -> Vec<Proposal> {
    take(flights, used, 6, |i, f| {
        let run = long_run(f, 3000.0).filter(|_| f.movable && f.rvsm)?;
        let half_s = ((run.from_s + run.until_s) / 2.0).floor();
        let part = |from_s: f64, until_s: f64| Crossing { run, from_s, until_s };
        let above = neighbour(f, &run, 1)?;
        let below = neighbour(f, &run, -1)?;
        let mut first = proposals::stretch(f, &part(run.from_s + 400.0, half_s - 300.0), below)?;
        let mut second = proposals::stretch(f, &part(half_s + 300.0, run.until_s - 400.0), above)?;
        first.contrail_km = Some(150.0);
        second.contrail_km = Some(120.0);
        let stretches = vec![first, second];
        let options = vec![Alternative { stretches, max_extra_fuel_kg: None, priority: None }];
        Some(Proposal { flight: i, options })
    })
}
