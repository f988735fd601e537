//! Level changes that the ice asks for.
//!
//! A flight that stays in ice at its filed level for some minutes asks for the next level of its
//! direction below or above over that stretch, wide enough to be there before the ice and to leave
//! after it. Alternatives are the other levels nearby and shorter stretches, best first. Where the
//! stretch would begin before the top of climb or end after the top of descent, the time is left
//! blank: from the climb, until the descent.

use crate::{
    flight::{CruiseRun, Flight},
    ice::{self, IceRegion},
    levels, profile,
};

/// One stretch of an option.
#[derive(Debug, Clone, PartialEq)]
pub struct Stretch {
    /// New level.
    pub level_fl: u32,
    /// When the aircraft starts to leave its filed level; none: from the climb.
    pub from_s: Option<f64>,
    /// When it starts to return; none: until the descent.
    pub until_s: Option<f64>,
    /// Contrail avoided in kilometres.
    pub contrail_km: Option<f64>,
    /// Fuel added in kilograms.
    pub extra_fuel_kg: Option<f64>,
}

/// One way to grant a proposal.
#[derive(Debug, Clone, PartialEq)]
pub struct Alternative {
    /// What is asked, in time order.
    pub stretches: Vec<Stretch>,
    /// Largest extra fuel that the operator accepts, in kilograms.
    pub max_extra_fuel_kg: Option<f64>,
    /// Weight of the proposal.
    pub priority: Option<f64>,
}

/// A proposal: what one flight asks for.
#[derive(Debug, Clone)]
pub struct Proposal {
    /// Index of the flight.
    pub flight: usize,
    /// Option 1, 2, ….
    pub options: Vec<Alternative>,
}

/// A part of a cruise run that is in ice at the filed level.
#[derive(Debug, Clone, Copy)]
pub struct Crossing {
    /// The run.
    pub run: CruiseRun,
    /// First second in ice.
    pub from_s: f64,
    /// Last second in ice.
    pub until_s: f64,
}

const SAMPLE_S: f64 = 20.0;
/// Ice with a gap shorter than this is one crossing.
const JOIN_S: f64 = 240.0;

/// Crossings of a flight that last at least `least_s`, at levels between FL 250 and its ceiling.
#[must_use]
pub fn crossings(flight: &Flight, ice: &[IceRegion], least_s: f64) -> Vec<Crossing> {
    let mut found: Vec<Crossing> = Vec::new();
    for run in flight.cruise_runs(250.0) {
        let near: Vec<IceRegion> = ice
            .iter()
            .filter(|r| {
                let level = f64::from(run.level_fl);
                r.base_fl <= level
                    && level < r.top_fl
                    && r.from_s < run.until_s
                    && run.from_s < r.until_s
            })
            .copied()
            .collect();
        if near.is_empty() {
            continue;
        }
        let mut time_s = run.from_s;
        let mut here: Vec<Crossing> = Vec::new();
        while time_s < run.until_s {
            if let Some((lon, lat, level)) = profile::at_time(&flight.points, time_s)
                && ice::any_contains(&near, time_s, lon, lat, level)
            {
                match here.last_mut() {
                    Some(c) if time_s - c.until_s <= JOIN_S => c.until_s = time_s,
                    _ => here.push(Crossing { run, from_s: time_s, until_s: time_s }),
                }
            }
            time_s += SAMPLE_S;
        }
        found.extend(here.into_iter().filter(|c| c.until_s - c.from_s >= least_s));
    }
    found
}

/// Seconds that a change between two levels takes.
fn transition_s(flight: &Flight, from_fl: u32, to_fl: u32) -> f64 {
    f64::from(from_fl.abs_diff(to_fl)) * 100.0 / flight.change_fpm * 60.0
}

/// The stretch that keeps a flight at another level through a crossing.
///
/// None if the level does not suit the flight or the stretch does not fit into the run.
#[must_use]
pub fn stretch(flight: &Flight, crossing: &Crossing, level_fl: u32) -> Option<Stretch> {
    let run = crossing.run;
    if level_fl == run.level_fl || level_fl < 250 || level_fl > flight.ceiling_fl {
        return None;
    }
    let change_s = transition_s(flight, run.level_fl, level_fl);
    let from_climb = run.first > 0 && crossing.from_s - change_s - 60.0 < run.from_s;
    let to_descent =
        run.last + 1 < flight.points.len() && crossing.until_s + change_s + 90.0 > run.until_s;
    // Blank times are for the first and the last run only.
    let runs = flight.cruise_runs(245.0);
    let is_first = runs.first().is_some_and(|r| r.first == run.first);
    let is_last = runs.last().is_some_and(|r| r.last == run.last);
    let from_s = (!(from_climb && is_first))
        .then(|| minute(crossing.from_s - change_s - 30.0).max(run.from_s + 5.0));
    let until_s = (!(to_descent && is_last))
        .then(|| (minute(crossing.until_s + 60.0)).min((run.until_s - change_s - 30.0).floor()));
    let begins_s = from_s.unwrap_or(run.from_s);
    let ends_s = until_s.unwrap_or(run.until_s);
    if ends_s - begins_s < change_s + 120.0 || !flight.suits(level_fl, begins_s, ends_s) {
        return None;
    }
    let minutes = (ends_s - begins_s) / 60.0;
    let fuel_kg = extra_fuel_kg(flight.cruise_kg_per_min, run.level_fl, level_fl, minutes);
    Some(Stretch { level_fl, from_s, until_s, contrail_km: None, extra_fuel_kg: Some(fuel_kg) })
}

fn minute(time_s: f64) -> f64 {
    (time_s / 60.0).floor() * 60.0
}

/// Rule of thumb (no source): 1 % of cruise fuel per 1 000 ft below the filed level and twice that
/// beyond 2 000 ft, 0.4 % above it, and 0.6 minutes' worth for each 1 000 ft climbed.
fn extra_fuel_kg(kg_per_min: f64, filed_fl: u32, level_fl: u32, minutes: f64) -> f64 {
    let off = f64::from(filed_fl.abs_diff(level_fl)) / 10.0;
    let share =
        if level_fl < filed_fl { 0.01 * off + 0.01 * (off - 2.0).max(0.0) } else { 0.004 * off };
    (kg_per_min * (minutes * share + 0.6 * off) * 10.0).round() / 10.0
}

/// Kilometres of ice met in a stretch at the filed level less those met at the new one.
#[must_use]
pub fn avoided_km(flight: &Flight, ice: &[IceRegion], crossing: &Crossing, s: &Stretch) -> f64 {
    let change_s = transition_s(flight, crossing.run.level_fl, s.level_fl);
    let from_s = s.from_s.map_or(crossing.run.from_s, |t| t + change_s);
    let until_s = s.until_s.unwrap_or(crossing.run.until_s);
    let mut time_s = from_s;
    let mut net = 0.0;
    while time_s < until_s {
        if let Some((lon, lat, filed_fl)) = profile::at_time(&flight.points, time_s) {
            let filed = ice::any_contains(ice, time_s, lon, lat, filed_fl);
            let moved = ice::any_contains(ice, time_s, lon, lat, f64::from(s.level_fl));
            net += f64::from(i8::from(filed) - i8::from(moved));
        }
        time_s += SAMPLE_S;
    }
    // About 450 kt over ground.
    net * SAMPLE_S * 0.2315
}

/// Options for a crossing, the most worthwhile first: up to `most` of them.
///
/// `ice` is empty for a crossing that no ice made; then the whole crossing counts as avoided.
#[must_use]
pub fn options(
    flight: &Flight,
    ice: &[IceRegion],
    crossing: &Crossing,
    most: usize,
) -> Vec<Alternative> {
    let Some(track) = flight.tracks_deg(crossing.from_s, crossing.until_s).first().copied() else {
        return Vec::new();
    };
    let mut rated: Vec<(f64, Alternative)> = Vec::new();
    let third_s = (crossing.until_s - crossing.from_s) / 3.0;
    let parts = [
        (0.0, 0.0, [-1, 1, -2, 2].as_slice()),
        (0.0, third_s, &[-1, 1, -2]),
        (third_s, 0.0, &[-1, 1, -2]),
        (third_s / 2.0, third_s / 2.0, &[-1, 1, -2]),
    ];
    for (cut_from_s, cut_until_s, steps) in parts {
        let part = Crossing {
            from_s: crossing.from_s + cut_from_s,
            until_s: crossing.until_s - cut_until_s,
            ..*crossing
        };
        for step in steps {
            let Some(mut s) = levels::stepped(part.run.level_fl, *step, track)
                .and_then(|level_fl| stretch(flight, &part, level_fl))
            else {
                continue;
            };
            let km = if ice.is_empty() {
                (part.until_s - part.from_s) * 0.2315
            } else {
                avoided_km(flight, ice, &part, &s)
            };
            let fuel_kg = s.extra_fuel_kg.unwrap_or(0.0);
            s.contrail_km = Some((km * 10.0).round() / 10.0);
            let alternative =
                Alternative { stretches: vec![s], max_extra_fuel_kg: None, priority: None };
            // A part that ends where the whole does, at the end of the run, may be the same.
            if rated.iter().any(|(_, known)| *known == alternative) {
                continue;
            }
            // A kilometre of contrail is worth some tens of kilograms of fuel.
            rated.push((km - fuel_kg / 80.0, alternative));
        }
    }
    rated.retain(|(worth, _)| *worth > 0.0);
    // Stable: the nearer level first among equals.
    rated.sort_by(|a, b| b.0.total_cmp(&a.0));
    rated.truncate(most);
    rated.into_iter().map(|(_, alternative)| alternative).collect()
}
