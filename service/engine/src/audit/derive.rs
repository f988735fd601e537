//! A changed profile, from where its stretches lie: times of every place, step by step.
//!
//! In calm standard air a constant Mach number makes the ground speed of a level leg go as the
//! speed of sound at the level flown over that at the level filed. Where the filed profile climbs
//! or descends, and on legs without length, the filed speed stays.

use super::isa::sound_ratio;
use super::path::{Knot, Path};
use super::stretches::Placed;
use super::track::Track;
use crate::units::to_millisecond;

/// Most level that a step of a transition passes at one ground speed, feet.
const STEP_FT: f64 = 1000.0;

/// One move along the track: how long it takes, where and at which level it ends.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Move {
    pub(super) duration_s: f64,
    pub(super) filed_s: f64,
    pub(super) level_ft: f64,
}

/// Which way along the track a transition is followed.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Way {
    Forward,
    Backward,
}

/// Filed seconds passed in a second on a leg at a level.
pub(super) fn haste(track: &Track, leg: usize, level_ft: f64) -> f64 {
    let (from_ft, to_ft) = track.leg_levels_ft(leg);
    if from_ft == to_ft && track.leg_length_m(leg) > 0.0 {
        sound_ratio(level_ft, from_ft)
    } else {
        1.0
    }
}

/// A climb or descent at a steady rate, in steps of 1 000 ft from the level left and a last one of
/// what remains, each flown with the ground speed of its middle level; where a leg ends inside a
/// step, the step is divided there and each part has its own middle level.
///
/// Gives the filed time of its start, and its moves in the order of flight; `None` where the track
/// ends before it. Backward, it is followed from its end to its start.
pub(super) fn transition(
    track: &Track,
    at_filed_s: f64,
    levels_ft: (f64, f64),
    rate_fpm: f64,
    way: Way,
) -> Option<(f64, Vec<Move>)> {
    let (from_ft, to_ft) = levels_ft;
    let rate_ftps = rate_fpm / 60.0;
    let total_ft = (to_ft - from_ft).abs();
    let steps = (total_ft / STEP_FT - 1e-9).ceil().max(0.0) as u32;
    // Steps are counted in the order of flight, also where they are followed against it.
    let border_ft = |passed: u32| {
        let flown_ft = match way {
            Way::Forward => f64::from(passed) * STEP_FT,
            Way::Backward => total_ft - f64::from(steps - passed) * STEP_FT,
        };
        if passed == steps { to_ft } else { from_ft + (to_ft - from_ft).signum() * flown_ft }
    };
    let mut moves = Vec::new();
    let mut filed_s = at_filed_s;
    let mut leg = match way {
        Way::Forward => track.leg_at(at_filed_s),
        Way::Backward => leg_before(track, at_filed_s),
    };
    for step in 0..steps {
        let start_ft = if step == 0 { from_ft } else { border_ft(step) };
        let (mut level_ft, end_ft) = (start_ft, border_ft(step + 1));
        loop {
            let left_s = (end_ft - level_ft).abs() / rate_ftps;
            let passed = haste(track, leg, (level_ft + end_ft) / 2.0) * left_s;
            let (leg_from_s, leg_until_s) = track.leg_times_s(leg);
            let room_s = match way {
                Way::Forward => leg_until_s - filed_s,
                Way::Backward => filed_s - leg_from_s,
            };
            if passed <= room_s {
                filed_s += if way == Way::Forward { passed } else { -passed };
                moves.push(Move { duration_s: left_s, filed_s, level_ft: end_ft });
                break;
            }
            // The part up to the leg's end: its middle level and its duration hang together.
            let climb_ftps = (end_ft - level_ft) / left_s;
            let mut duration_s = room_s;
            for _ in 0..20 {
                duration_s = room_s / haste(track, leg, level_ft + climb_ftps * duration_s / 2.0);
            }
            level_ft += climb_ftps * duration_s;
            filed_s = if way == Way::Forward { leg_until_s } else { leg_from_s };
            if duration_s > 0.0 {
                moves.push(Move { duration_s, filed_s, level_ft });
            }
            match way {
                Way::Forward if leg + 1 < track.leg_count() => leg += 1,
                Way::Backward if leg > 0 => leg -= 1,
                _ => return None,
            }
        }
    }
    Some(match way {
        Way::Forward => (at_filed_s, moves),
        Way::Backward => (filed_s, reversed(at_filed_s, from_ft, &moves)),
    })
}

/// The leg that ends at or holds a filed time.
pub(super) fn leg_before(track: &Track, filed_s: f64) -> usize {
    let leg = track.leg_at(filed_s);
    if leg > 0 && filed_s <= track.leg_times_s(leg).0 { leg - 1 } else { leg }
}

/// Moves followed backward, turned into moves forward.
fn reversed(filed_s: f64, level_ft: f64, moves: &[Move]) -> Vec<Move> {
    let mut ends = vec![(filed_s, level_ft)];
    ends.extend(moves.iter().map(|m| (m.filed_s, m.level_ft)));
    (0..moves.len())
        .rev()
        .map(|i| Move { duration_s: moves[i].duration_s, filed_s: ends[i].0, level_ft: ends[i].1 })
        .collect()
}

/// A changed profile, and when each of its stretches begins and ends.
#[derive(Debug, Clone)]
pub(super) struct Derived<'d> {
    pub(super) path: Path<'d>,
    /// For each stretch, when the profile starts to leave its filed level, and to return to it.
    pub(super) planned_s: Vec<(f64, f64)>,
}

/// The profile with stretches in the order of their places, which must not overlap.
pub(super) fn derive<'d>(track: &'d Track, placed: &[&Placed]) -> Derived<'d> {
    let mut flown = Flown::begin(track);
    let mut planned_s = Vec::with_capacity(placed.len());
    for stretch in placed {
        flown.as_filed_until(stretch.from_filed_s, stretch.from_level_ft);
        let from_s = flown.time_s;
        for &step in &stretch.reach {
            flown.make(step);
        }
        flown.hold_until(stretch.until_filed_s, stretch.level_ft);
        planned_s.push((to_millisecond(from_s), to_millisecond(flown.time_s)));
        for &step in &stretch.back {
            flown.make(step);
        }
    }
    flown.as_filed_until(track.end_s(), track.level_ft(track.end_s()));
    Derived { path: Path::new(track, written(&flown.knots)), planned_s }
}

/// A profile under way.
struct Flown<'d> {
    track: &'d Track,
    knots: Vec<Knot>,
    time_s: f64,
    filed_s: f64,
}

impl<'d> Flown<'d> {
    fn begin(track: &'d Track) -> Self {
        let start_s = track.start_s();
        let level_ft = track.level_ft(start_s);
        let first = Knot { time_s: start_s, filed_s: start_s, level_ft };
        Self { track, knots: vec![first], time_s: start_s, filed_s: start_s }
    }

    fn make(&mut self, step: Move) {
        self.time_s += step.duration_s;
        self.filed_s = step.filed_s;
        let (time_s, filed_s, level_ft) = (self.time_s, self.filed_s, step.level_ft);
        self.knots.push(Knot { time_s, filed_s, level_ft });
    }

    /// Filed points strictly ahead, before a filed time.
    fn points_before(&self, until_filed_s: f64) -> Vec<f64> {
        let times = self.track.times_s();
        let first = times.partition_point(|&t| t <= self.filed_s);
        times[first..].iter().copied().take_while(|&t| t < until_filed_s).collect()
    }

    fn as_filed_until(&mut self, until_filed_s: f64, level_ft: f64) {
        for filed_s in self.points_before(until_filed_s) {
            let duration_s = filed_s - self.filed_s;
            self.make(Move { duration_s, filed_s, level_ft: self.track.level_ft(filed_s) });
        }
        let duration_s = (until_filed_s - self.filed_s).max(0.0);
        self.make(Move { duration_s, filed_s: until_filed_s, level_ft });
    }

    fn hold_until(&mut self, until_filed_s: f64, level_ft: f64) {
        let mut ends = self.points_before(until_filed_s);
        ends.push(until_filed_s);
        for filed_s in ends {
            let leg = self.track.leg_at(self.filed_s);
            let duration_s = (filed_s - self.filed_s).max(0.0) / haste(self.track, leg, level_ft);
            self.make(Move { duration_s, filed_s, level_ft });
        }
    }
}

/// Knots as they are written: times in whole milliseconds, and a knot that would fall on its
/// predecessor's time left out (the last one replaces its predecessor).
fn written(knots: &[Knot]) -> Vec<Knot> {
    let mut kept: Vec<Knot> = Vec::with_capacity(knots.len());
    for (i, &knot) in knots.iter().enumerate() {
        let knot = Knot { time_s: to_millisecond(knot.time_s), ..knot };
        let falls = kept.last().is_some_and(|last| knot.time_s <= last.time_s);
        if !falls {
            kept.push(knot);
        } else if i + 1 == knots.len() && kept.len() > 1 {
            kept.pop();
            kept.push(Knot { time_s: knot.time_s.max(kept[kept.len() - 1].time_s + 1e-3), ..knot });
        }
    }
    kept
}
