//! Losses of separation between two flown profiles: by looking, at most a fiftieth of a second
//! apart wherever a loss may be, and bisecting its ends.
//!
//! Between looks that lie further apart nothing can happen: the two can't come within the minimum
//! sooner than their distance allows at their greatest speeds together, nor lose vertical
//! separation sooner than their rates of climb allow.

use super::path::{Path, State};
use super::stretches::RVSM_FT;
use super::tolerances::{
    LEVEL_FT, Lean, ONSET_STEP_S, PAIR_STEP_S, SEPARATION_AGAINST_M, SEPARATION_M, TIME_S,
    VERTICAL_AGAINST_FT, VERTICAL_FT,
};
use super::track::{geodesic_distance_m, ground_distance_m};
use super::visits::Visit;
use crate::day::{Day, Policy};
use crate::ids::SectorId;
use crate::units::{fl_to_ft, nm_to_m};

/// Vertical minimum, feet (ICAO Doc 4444, 5.3.2).
const VERTICAL_MIN_FT: f64 = 1000.0;
/// Vertical minimum above FL 410, and from FL 290 without RVSM approval, feet.
const WIDE_VERTICAL_MIN_FT: f64 = 2000.0;
/// Where the bisection of a loss's ends stops, seconds: metres at most, far below what the rules
/// about known losses tell apart.
const END_S: f64 = 1e-4;
/// Levels this close are the same where the plan's maker must be sure, feet.
const SAME_LEVEL_FT: f64 = 1e-6;

/// The horizontal minimum that applies to a flight over time.
#[derive(Debug, Clone)]
pub(super) struct Minima {
    /// From when, and how much, metres; by time.
    steps: Vec<(f64, f64)>,
}

impl Minima {
    /// That of the first open sector by name where the flight is, else the policy's.
    pub(super) fn new(day: &Day, raw: &[Visit]) -> Self {
        let otherwise_m = nm_to_m(day.policy.horizontal_nm);
        if day.sectors.iter().all(|s| s.horizontal_nm.is_none()) {
            return Self { steps: vec![(f64::NEG_INFINITY, otherwise_m)] };
        }
        let mut inside: Vec<(f64, f64, SectorId)> = Vec::new();
        for visit in raw {
            for period in &day.sectors[visit.sector].open {
                let from_s = visit.begin.time_s.max(period.from_s);
                let until_s = visit.end.time_s.min(period.until_s);
                if from_s < until_s {
                    inside.push((from_s, until_s, visit.sector));
                }
            }
        }
        let mut times: Vec<f64> =
            inside.iter().flat_map(|&(from, until, _)| [from, until]).collect();
        times.push(f64::NEG_INFINITY);
        times.sort_by(f64::total_cmp);
        let steps = times
            .into_iter()
            .map(|time_s| {
                let first = inside
                    .iter()
                    .filter(|&&(from, until, _)| from <= time_s && time_s < until)
                    .map(|&(_, _, sector)| sector)
                    .min();
                let own_nm = first.and_then(|sector| day.sectors[sector].horizontal_nm);
                (time_s, own_nm.map_or(otherwise_m, nm_to_m))
            })
            .collect();
        Self { steps }
    }

    /// The minimum at a time, and until when it stays.
    fn at(&self, time_s: f64) -> (f64, f64) {
        let after = self.steps.partition_point(|&(from_s, _)| from_s <= time_s);
        let metres = self.steps[after.saturating_sub(1)].1;
        (metres, self.steps.get(after).map_or(f64::INFINITY, |&(from_s, _)| from_s))
    }

    /// The largest that ever applies.
    fn largest_m(&self) -> f64 {
        self.steps.iter().fold(0.0, |most, &(_, metres)| most.max(metres))
    }

    /// The same for a profile flown later by a number of seconds.
    pub(super) fn shifted(&self, later_s: f64) -> Self {
        Self { steps: self.steps.iter().map(|&(from_s, m)| (from_s + later_s, m)).collect() }
    }
}

/// The largest horizontal minimum that a day knows, metres.
pub(super) fn largest_minimum_m(day: &Day) -> f64 {
    let own = day.sectors.iter().filter_map(|s| s.horizontal_nm);
    nm_to_m(own.fold(day.policy.horizontal_nm, f64::max))
}

/// A flight as the minima see it.
#[derive(Clone, Copy)]
pub(super) struct Craft<'w, 'd> {
    pub(super) path: &'w Path<'d>,
    pub(super) minima: &'w Minima,
    pub(super) rvsm: bool,
}

/// An interval in which two flights are too close.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Spell {
    pub(super) from_s: f64,
    pub(super) until_s: f64,
    pub(super) closest_s: f64,
    pub(super) horizontal_m: f64,
    pub(super) vertical_ft: f64,
}

/// Two flights side by side.
pub(super) struct Pair<'w, 'd> {
    a: Craft<'w, 'd>,
    b: Craft<'w, 'd>,
    floor_ft: f64,
    lean: Lean,
    speed_mps: f64,
    widest_m: f64,
    tallest_ft: f64,
}

/// What a look at a pair shows.
#[derive(Clone, Copy)]
struct Look {
    lost: bool,
    horizontal_m: f64,
    vertical_ft: f64,
    /// For how long what it shows can't change.
    quiet_s: f64,
}

impl<'w, 'd> Pair<'w, 'd> {
    pub(super) fn new(policy: &Policy, a: Craft<'w, 'd>, b: Craft<'w, 'd>, lean: Lean) -> Self {
        let highest_ft = a.path.level_range_ft().1.max(b.path.level_range_ft().1);
        let wide = !a.rvsm || !b.rvsm || highest_ft > RVSM_FT.1;
        Self {
            a,
            b,
            floor_ft: fl_to_ft(policy.separation_floor_fl),
            lean,
            speed_mps: a.path.fastest_mps() + b.path.fastest_mps(),
            widest_m: a.minima.largest_m().max(b.minima.largest_m()) + SEPARATION_AGAINST_M,
            tallest_ft: if wide { WIDE_VERTICAL_MIN_FT } else { VERTICAL_MIN_FT }
                + VERTICAL_AGAINST_FT,
        }
    }

    /// When both exist.
    pub(super) fn life_s(&self) -> (f64, f64) {
        let (a, b) = (self.a.path, self.b.path);
        (a.start_s().max(b.start_s()), a.end_s().min(b.end_s()))
    }

    /// The intervals of too little distance between two times at which both exist.
    pub(super) fn spells(&self, from_s: f64, until_s: f64) -> Vec<Spell> {
        let (born_s, gone_s) = self.life_s();
        let (mut time_s, until_s) = (from_s.max(born_s), until_s.min(gone_s));
        let mut spells = Vec::new();
        if time_s > until_s {
            return spells;
        }
        let mut look = self.look(time_s);
        let mut begun_s = look.lost.then_some(time_s);
        while time_s < until_s {
            let shortest_s = if look.lost { PAIR_STEP_S } else { ONSET_STEP_S };
            let next_s = (time_s + look.quiet_s.max(shortest_s)).min(until_s);
            let next = self.look(next_s);
            if next.lost != look.lost {
                let change_s = self.bisect(time_s, next_s, look.lost);
                match begun_s.take() {
                    Some(begun_s) => spells.push(self.spell(begun_s, change_s)),
                    None => begun_s = Some(change_s),
                }
            }
            (time_s, look) = (next_s, next);
        }
        if let Some(begun_s) = begun_s {
            spells.push(self.spell(begun_s, until_s));
        }
        spells
    }

    fn bisect(&self, mut from_s: f64, mut until_s: f64, lost: bool) -> f64 {
        while until_s - from_s > END_S {
            let middle_s = f64::midpoint(from_s, until_s);
            if self.look(middle_s).lost == lost {
                from_s = middle_s;
            } else {
                until_s = middle_s;
            }
        }
        // The end that lies inside the loss.
        if lost { from_s } else { until_s }
    }

    fn vertical_min_ft(&self, a_ft: f64, b_ft: f64) -> f64 {
        let unapproved = (!self.a.rvsm || !self.b.rvsm) && a_ft.max(b_ft) >= RVSM_FT.0;
        if a_ft.max(b_ft) > RVSM_FT.1 || unapproved {
            WIDE_VERTICAL_MIN_FT
        } else {
            VERTICAL_MIN_FT
        }
    }

    fn look(&self, time_s: f64) -> Look {
        let (a, b) = (self.a.path.state(time_s), self.b.path.state(time_s));
        let horizontal_m = ground_distance_m(
            self.a.path.track.centred_m(a.filed_s),
            self.b.path.track.centred_m(b.filed_s),
        );
        let vertical_ft = (a.level_ft - b.level_ft).abs();
        let (a_min_m, a_until_s) = self.a.minima.at(time_s);
        let (b_min_m, b_until_s) = self.b.minima.at(time_s);
        let horizontal_min_m = a_min_m.max(b_min_m);
        let vertical_min_ft = self.vertical_min_ft(a.level_ft, b.level_ft);
        let both_level = a.rate_ftps == 0.0 && b.rate_ftps == 0.0;
        let (clear, apart) = match self.lean {
            Lean::ForPlan => (
                horizontal_m >= horizontal_min_m - SEPARATION_M,
                vertical_ft >= vertical_min_ft - VERTICAL_FT,
            ),
            // Levels held are exact, so exactly at the minimum is no borderline case.
            Lean::AgainstPlan => (
                horizontal_m >= horizontal_min_m + SEPARATION_AGAINST_M,
                vertical_ft
                    >= vertical_min_ft
                        + if both_level { -SAME_LEVEL_FT } else { VERTICAL_AGAINST_FT },
            ),
        };
        let high = a.level_ft >= self.floor_ft && b.level_ft >= self.floor_ft;
        let lost = high && !clear && !apart;
        let steady_s = a.until_s.min(b.until_s) - time_s;
        let quiet_s = if lost {
            if both_level {
                let leave_s = (horizontal_min_m - SEPARATION_M - horizontal_m) / self.speed_mps;
                leave_s.min(steady_s).min(a_until_s.min(b_until_s) - time_s)
            } else {
                0.0
            }
        } else {
            let reach_s = (horizontal_m - self.widest_m) / self.speed_mps;
            let levels_s = if both_level {
                // Nothing changes vertically; only a pair that is apart so stays safe.
                if apart || !high { steady_s } else { 0.0 }
            } else {
                self.levels_quiet_s(a, b, vertical_ft).min(steady_s)
            };
            reach_s.max(levels_s)
        };
        Look { lost, horizontal_m, vertical_ft, quiet_s }
    }

    /// How long climbs and descents keep a pair vertically apart or below the floor, at least.
    fn levels_quiet_s(&self, a: State, b: State, vertical_ft: f64) -> f64 {
        let gap_ft = vertical_ft - self.tallest_ft;
        let closing_ftps = (a.rate_ftps - b.rate_ftps).abs();
        let apart_s = if gap_ft <= 0.0 {
            0.0
        } else if closing_ftps > 0.0 {
            gap_ft / closing_ftps
        } else {
            f64::INFINITY
        };
        let below = |state: State| {
            let under_ft = self.floor_ft - state.level_ft;
            if under_ft <= 0.0 {
                0.0
            } else if state.rate_ftps > 0.0 {
                under_ft / state.rate_ftps
            } else {
                f64::INFINITY
            }
        };
        apart_s.max(below(a)).max(below(b))
    }

    /// A spell with its closest horizontal distance: every stretch in which it can be smaller than
    /// the least seen so far is looked at.
    fn spell(&self, from_s: f64, until_s: f64) -> Spell {
        let mut closest = (from_s, self.look(from_s));
        let mut time_s = from_s;
        let mut look = closest.1;
        while time_s < until_s {
            let spare_s = (look.horizontal_m - closest.1.horizontal_m) / self.speed_mps;
            time_s = (time_s + spare_s.max(PAIR_STEP_S)).min(until_s);
            look = self.look(time_s);
            if look.horizontal_m < closest.1.horizontal_m {
                closest = (time_s, look);
            }
        }
        let (mut low_s, mut high_s) =
            ((closest.0 - PAIR_STEP_S).max(from_s), (closest.0 + PAIR_STEP_S).min(until_s));
        while high_s - low_s > END_S {
            let third_s = (high_s - low_s) / 3.0;
            let (x, y) = (low_s + third_s, high_s - third_s);
            if self.look(x).horizontal_m <= self.look(y).horizontal_m {
                high_s = y;
            } else {
                low_s = x;
            }
        }
        let middle_s = f64::midpoint(low_s, high_s);
        let refined = self.look(middle_s);
        if refined.horizontal_m < closest.1.horizontal_m {
            closest = (middle_s, refined);
        }
        Spell {
            from_s,
            until_s,
            closest_s: closest.0,
            horizontal_m: closest.1.horizontal_m,
            vertical_ft: closest.1.vertical_ft,
        }
    }

    /// Whether true geodesics, too, say that a spell's closest distance is below the minimum.
    pub(super) fn is_confirmed(&self, spell: &Spell) -> bool {
        let time_s = spell.closest_s;
        let geodesic_m = geodesic_distance_m(
            self.a.path.geodesic_place(time_s),
            self.b.path.geodesic_place(time_s),
        );
        let minimum_m = self.a.minima.at(time_s).0.max(self.b.minima.at(time_s).0);
        geodesic_m < minimum_m - SEPARATION_M
    }
}

/// Whether a loss of the planned day is one that the filed day holds too.
///
/// Throughout it both flights are at the level they filed for the place, and one filed loss of the
/// pair is near in time, and its closest distance is not larger by more than the margin.
pub(super) fn is_known(
    policy: &Policy,
    planned: &Spell,
    paths: [&Path<'_>; 2],
    filed: impl FnOnce() -> Vec<Spell>,
    lean: Lean,
) -> bool {
    let within_ft = match lean {
        Lean::ForPlan => LEVEL_FT,
        Lean::AgainstPlan => SAME_LEVEL_FT,
    };
    let keeps =
        |path: &Path<'_>| path.keeps_filed_level(planned.from_s, planned.until_s, within_ft);
    let allowed_s = policy.same_loss_s + lean.allow(TIME_S + END_S);
    let margin_m = nm_to_m(policy.known_loss_margin_nm) + lean.allow(SEPARATION_AGAINST_M);
    paths.into_iter().all(keeps)
        && filed().iter().any(|loss| {
            let gap_s = (planned.from_s - loss.until_s).max(loss.from_s - planned.until_s).max(0.0);
            gap_s <= allowed_s && planned.horizontal_m >= loss.horizontal_m - margin_m
        })
}
