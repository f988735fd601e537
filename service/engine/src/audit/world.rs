//! The day as filed and as planned, derived and recounted by the judge itself.

use std::collections::BTreeMap;

use rayon::prelude::*;

use super::derive::{Derived, derive};
use super::load::{Counts, Loads, Traffic};
use super::neighbours::Neighbours;
use super::path::Path;
use super::restricted::entered;
use super::separation::{Craft, Minima, Pair, Spell, is_known, largest_minimum_m};
use super::stretches::{Ground, Placed};
use super::tolerances::{LEVEL_FT, Lean, TIME_S};
use super::track::Track;
use super::visits::{AsFiled, SectorMap, Visit};
use crate::answer::Rule;
use crate::day::{Alternative, Day, HandDecision};
use crate::ids::{FlightId, Id, ProposalId};
use crate::units::fl_to_ft;

/// An option taken, or tried.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Grant<'d> {
    pub(super) proposal: ProposalId,
    pub(super) alternative: &'d Alternative,
}

/// A flown profile with all that is counted of it.
#[derive(Debug)]
pub(super) struct Flown<'d> {
    pub(super) path: Path<'d>,
    pub(super) raw: Vec<Visit>,
    pub(super) minima: Minima,
    pub(super) traffic: Traffic,
}

/// A flight's grants as one profile.
#[derive(Debug)]
pub(super) struct Combined<'d> {
    pub(super) path: Path<'d>,
    /// For each grant and each of its stretches: planned begin and return, seconds of the day.
    pub(super) planned_s: Vec<Vec<(f64, f64)>>,
}

/// Why grants make no profile.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Broken {
    /// One of them breaks a rule by itself.
    Rule(ProposalId, Rule),
    /// They exclude each other.
    OwnChange,
}

/// A new loss that a moved flight has.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct NewLoss {
    pub(super) other: FlightId,
    pub(super) spell: Spell,
}

/// What following a flight's neighbours showed.
#[derive(Debug, Clone, Default)]
pub(super) struct Losses {
    pub(super) new: Vec<NewLoss>,
    pub(super) pairs: u64,
    pub(super) losses: u64,
}

/// The filed and the planned day.
pub(super) struct World<'d> {
    pub(super) day: &'d Day,
    pub(super) tracks: &'d [Track],
    pub(super) map: SectorMap<'d>,
    pub(super) filed: Vec<Flown<'d>>,
    /// The moved flights.
    pub(super) planned: BTreeMap<FlightId, Flown<'d>>,
    pub(super) grants: BTreeMap<FlightId, Vec<Grant<'d>>>,
    pub(super) loads: Loads<'d>,
    /// The decisions by hand that the plan is made under.
    pub(super) by_hand: Vec<HandDecision>,
    neighbours: Neighbours,
}

/// The tracks of all flights.
pub(super) fn tracks(day: &Day) -> Vec<Track> {
    let floor_ft = fl_to_ft(day.policy.cruise_floor_fl);
    day.flights.as_slice().par_iter().map(|f| Track::new(&f.profile, floor_ft)).collect()
}

impl<'d> World<'d> {
    /// The filed day, and the planned one with `paths` for the moved flights.
    pub(super) fn new(
        day: &'d Day,
        tracks: &'d [Track],
        grants: BTreeMap<FlightId, Vec<Grant<'d>>>,
        paths: BTreeMap<FlightId, Path<'d>>,
        by_hand: Vec<HandDecision>,
    ) -> Self {
        let map = SectorMap::new(day);
        let filed: Vec<Flown<'d>> = tracks
            .par_iter()
            .enumerate()
            .map(|(i, track)| {
                fly(day, &map, FlightId::from_index(i), Path::filed(track), AsFiled::Yes)
            })
            .collect();
        let planned: BTreeMap<FlightId, Flown<'d>> = paths
            .into_par_iter()
            .map(|(id, path)| (id, fly(day, &map, id, path, AsFiled::No)))
            .collect::<Vec<_>>()
            .into_iter()
            .collect();
        let mut counts = Counts::default();
        for flown in &filed {
            counts.add(day, &flown.traffic);
        }
        let mut planned_counts = counts.clone();
        for (id, flown) in &planned {
            planned_counts.remove(day, &filed[id.index()].traffic);
            planned_counts.add(day, &flown.traffic);
        }
        let loads = Loads::new(day, counts, planned_counts);
        let current: Vec<&Path<'d>> = filed
            .iter()
            .enumerate()
            .map(|(i, flown)| {
                planned.get(&FlightId::from_index(i)).map_or(&flown.path, |f| &f.path)
            })
            .collect();
        let fastest_mps = current.iter().map(|p| p.fastest_mps()).fold(0.0, f64::max);
        let floor_ft = fl_to_ft(day.policy.separation_floor_fl);
        let neighbours = Neighbours::new(&current, largest_minimum_m(day), fastest_mps, floor_ft);
        Self { day, tracks, map, filed, planned, grants, loads, by_hand, neighbours }
    }

    /// A flight as the finished plan flies it.
    pub(super) fn current(&self, flight: FlightId) -> &Flown<'d> {
        self.planned.get(&flight).unwrap_or(&self.filed[flight.index()])
    }

    /// A profile of a flight with all that is counted of it.
    pub(super) fn fly(&self, flight: FlightId, path: Path<'d>) -> Flown<'d> {
        fly(self.day, &self.map, flight, path, AsFiled::No)
    }

    fn craft<'w>(&self, flight: FlightId, flown: &'w Flown<'d>) -> Craft<'w, 'd> {
        let rvsm = self.day.flights[flight].rvsm;
        Craft { path: &flown.path, minima: &flown.minima, rvsm }
    }

    /// New losses of a flight flown so, against all others as the finished plan flies them.
    ///
    /// `later_s` delays it beyond its plan; known is then every loss of a pair that the filed day
    /// loses under any of the same sampled delays.
    pub(super) fn losses(
        &self,
        flight: FlightId,
        flown: &Flown<'d>,
        is_moved: bool,
        delays: Delays<'_>,
        lean: Lean,
        counts_pair: impl Fn(FlightId) -> bool,
    ) -> Losses {
        let delayed;
        let own = if delays.later_s == 0.0 {
            flown
        } else {
            delayed = Flown {
                path: flown.path.shifted(delays.later_s),
                minima: flown.minima.shifted(delays.later_s),
                raw: Vec::new(),
                traffic: Traffic::default(),
            };
            &delayed
        };
        let mut found = Losses::default();
        let craft = self.craft(flight, own);
        for near in self.neighbours.near(&own.path, flight) {
            let involves_moved = is_moved || self.planned.contains_key(&near.flight);
            if !involves_moved || !counts_pair(near.flight) {
                continue;
            }
            let other = self.current(near.flight);
            let others = self.craft(near.flight, other);
            let pair = Pair::new(&self.day.policy, craft, others, lean);
            found.pairs += 1;
            for spell in pair.spells(near.from_s, near.until_s) {
                if lean == Lean::ForPlan && !pair.is_confirmed(&spell) {
                    continue;
                }
                found.losses += 1;
                let paths = [&own.path, &other.path];
                let filed = || self.filed_spells(flight, near.flight, delays, lean.opposite());
                // Under time errors a pair that the filed day loses, too, is none of the plan's.
                let is_known = if delays.later_s == 0.0 {
                    is_known(&self.day.policy, &spell, paths, filed, lean)
                } else {
                    !filed().is_empty()
                };
                if !is_known {
                    found.new.push(NewLoss { other: near.flight, spell });
                }
            }
        }
        found
    }

    /// Losses of a pair in the filed day, under each sampled delay of the first.
    fn filed_spells(&self, a: FlightId, b: FlightId, delays: Delays<'_>, lean: Lean) -> Vec<Spell> {
        let (filed_a, filed_b) = (&self.filed[a.index()], &self.filed[b.index()]);
        let mut spells = Vec::new();
        for &later_s in delays.sampled_s {
            let path = filed_a.path.shifted(later_s);
            let minima = filed_a.minima.shifted(later_s);
            let rvsm = self.day.flights[a].rvsm;
            let craft = Craft { path: &path, minima: &minima, rvsm };
            let pair = Pair::new(&self.day.policy, craft, self.craft(b, filed_b), lean);
            let (from_s, until_s) = pair.life_s();
            spells.extend(pair.spells(from_s, until_s));
        }
        spells
    }

    /// Where a profile of a flight may not be: off its filed level inside a sector that forbids
    /// changes, or inside a restriction.
    pub(super) fn forbidden_change(
        &self,
        flight: FlightId,
        flown: &Flown<'d>,
        lean: Lean,
    ) -> Option<Rule> {
        self.off_level_where_forbidden(flown, lean).or_else(|| {
            let filed = &self.filed[flight.index()].path;
            entered(self.day, &self.day.flights[flight], filed, &flown.path, lean)
        })
    }

    fn off_level_where_forbidden(&self, flown: &Flown<'d>, lean: Lean) -> Option<Rule> {
        let allowed_ft = match lean {
            Lean::ForPlan => LEVEL_FT,
            Lean::AgainstPlan => 1e-6,
        };
        let margin_s = lean.allow(TIME_S);
        flown
            .raw
            .iter()
            .filter(|visit| self.day.sectors[visit.sector].no_changes)
            .filter_map(|visit| {
                let from_s = (visit.begin.time_s + margin_s).max(flown.path.start_s());
                let until_s = (visit.end.time_s - margin_s).min(flown.path.end_s());
                let keeps =
                    from_s > until_s || flown.path.keeps_filed_level(from_s, until_s, allowed_ft);
                (!keeps).then_some(Rule::NoChangesSector { sector: visit.sector, time_s: from_s })
            })
            .next()
    }
}

/// Delays of one flight beyond its plan.
#[derive(Debug, Clone, Copy)]
pub(super) struct Delays<'a> {
    /// The delay now looked at, seconds.
    pub(super) later_s: f64,
    /// All delays that are looked at.
    pub(super) sampled_s: &'a [f64],
}

impl Delays<'_> {
    /// As planned, nothing else.
    pub(super) const NONE: Delays<'static> = Delays { later_s: 0.0, sampled_s: &[0.0] };
}

fn fly<'d>(
    day: &Day,
    map: &SectorMap<'_>,
    flight: FlightId,
    path: Path<'d>,
    as_filed: AsFiled,
) -> Flown<'d> {
    let raw = map.visits(&path, as_filed);
    let minima = Minima::new(day, &raw);
    let traffic = Traffic::new(&day.policy, &day.flights[flight], &path, &raw, as_filed);
    Flown { path, raw, minima, traffic }
}

/// One profile of all grants of a flight.
///
/// # Errors
/// Why they make none.
pub(super) fn combine<'d>(
    day: &'d Day,
    tracks: &'d [Track],
    flight: FlightId,
    grants: &[Grant<'d>],
    lean: Lean,
) -> Result<Combined<'d>, Broken> {
    let track = &tracks[flight.index()];
    let ground = Ground { day, flight: &day.flights[flight], track, lean };
    let mut placed: Vec<Placed> = Vec::new();
    let mut origin: Vec<(usize, usize)> = Vec::new();
    for (g, grant) in grants.iter().enumerate() {
        let own = ground
            .place_option(grant.alternative)
            .map_err(|rule| Broken::Rule(grant.proposal, rule))?;
        origin.extend((0..own.len()).map(|s| (g, s)));
        placed.extend(own);
    }
    let order = ground.order(&placed).ok_or(Broken::OwnChange)?;
    let sorted: Vec<&Placed> = order.iter().map(|&i| &placed[i]).collect();
    let Derived { path, planned_s: times } = derive(track, &sorted);
    let mut planned_s: Vec<Vec<(f64, f64)>> =
        grants.iter().map(|g| vec![(0.0, 0.0); g.alternative.stretches.len()]).collect();
    for (&i, times) in order.iter().zip(times) {
        let (g, s) = origin[i];
        planned_s[g][s] = times;
    }
    Ok(Combined { path, planned_s })
}
