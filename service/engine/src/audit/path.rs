//! A flown profile: which place of the filed track is passed when, and at which level.

use super::track::Track;
use crate::geometry::geodesic::LonLat;

/// A point of a flown profile.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Knot {
    /// When, seconds of the day.
    pub(super) time_s: f64,
    /// Where: the filed time of the place.
    pub(super) filed_s: f64,
    /// At which level, feet.
    pub(super) level_ft: f64,
}

/// A flown profile over a filed track; between knots, filed time and level go linearly with time.
#[derive(Debug, Clone)]
pub(super) struct Path<'d> {
    pub(super) track: &'d Track,
    knots: Vec<Knot>,
    /// For each segment, the knot until which the level changes at the same rate, if that is 0.
    level_until: Vec<u32>,
    /// Greatest filed seconds passed in a second.
    haste: f64,
}

/// What a flight does at a time.
#[derive(Debug, Clone, Copy)]
pub(super) struct State {
    /// Where: the filed time of the place.
    pub(super) filed_s: f64,
    /// Level, feet.
    pub(super) level_ft: f64,
    /// Rate of climb, feet a second, negative in descent.
    pub(super) rate_ftps: f64,
    /// Until when that rate lasts at least.
    pub(super) until_s: f64,
}

impl<'d> Path<'d> {
    /// As filed.
    pub(super) fn filed(track: &'d Track) -> Self {
        let knots = track
            .times_s()
            .iter()
            .enumerate()
            .map(|(i, &filed_s)| {
                let leg = i.min(track.leg_count() - 1);
                let (a, b) = track.leg_levels_ft(leg);
                let level_ft = if i == leg { a } else { b };
                Knot { time_s: filed_s, filed_s, level_ft }
            })
            .collect();
        Self::new(track, knots)
    }

    /// A path through knots, at least two, of strictly increasing times.
    pub(super) fn new(track: &'d Track, knots: Vec<Knot>) -> Self {
        let mut level_until = vec![0; knots.len() - 1];
        let mut haste: f64 = 0.0;
        for i in (0..knots.len() - 1).rev() {
            let (a, b) = (knots[i], knots[i + 1]);
            haste = haste.max((b.filed_s - a.filed_s) / (b.time_s - a.time_s));
            let level_here = b.level_ft - a.level_ft == 0.0;
            let level_next = i + 2 < knots.len() && knots[i + 2].level_ft - b.level_ft == 0.0;
            level_until[i] =
                if level_here && level_next { level_until[i + 1] } else { i as u32 + 1 };
        }
        Self { track, knots, level_until, haste }
    }

    /// The same, flown later by a number of seconds.
    pub(super) fn shifted(&self, later_s: f64) -> Self {
        let mut path = self.clone();
        for knot in &mut path.knots {
            knot.time_s += later_s;
        }
        path
    }

    pub(super) fn knots(&self) -> &[Knot] {
        &self.knots
    }

    pub(super) fn start_s(&self) -> f64 {
        self.knots[0].time_s
    }

    pub(super) fn end_s(&self) -> f64 {
        self.knots[self.knots.len() - 1].time_s
    }

    /// A bound on the ground speed, m/s; rounding of chords included.
    pub(super) fn fastest_mps(&self) -> f64 {
        self.track.fastest_mps * self.haste * 1.001 + 0.01
    }

    /// A bound on the speed in the plane of longitude and latitude, degrees a second.
    pub(super) fn fastest_degps(&self) -> f64 {
        self.track.fastest_degps * self.haste * 1.001 + 1e-9
    }

    /// Lowest and highest level, feet.
    pub(super) fn level_range_ft(&self) -> (f64, f64) {
        self.knots.iter().fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), k| {
            (low.min(k.level_ft), high.max(k.level_ft))
        })
    }

    /// Lowest and highest level between two times, feet.
    pub(super) fn level_range_between_ft(&self, from_s: f64, until_s: f64) -> (f64, f64) {
        let (a, b) = (self.state(from_s).level_ft, self.state(until_s).level_ft);
        let first = self.knots.partition_point(|k| k.time_s <= from_s);
        self.knots[first..]
            .iter()
            .take_while(|k| k.time_s < until_s)
            .fold((a.min(b), a.max(b)), |(low, high), k| {
                (low.min(k.level_ft), high.max(k.level_ft))
            })
    }

    /// When a piece of the track's polyline is passed, from at the latest until at the earliest.
    pub(super) fn passes_piece_s(&self, piece: usize) -> (f64, f64) {
        let (from_filed_s, until_filed_s) = self.track.piece_times_s(piece);
        let before = self.knots.partition_point(|k| k.filed_s < from_filed_s);
        let after = self.knots.partition_point(|k| k.filed_s <= until_filed_s);
        let at = |filed_s: f64, next: usize| {
            let (a, b) = (self.knots[next - 1], self.knots[next]);
            let share = (filed_s - a.filed_s) / (b.filed_s - a.filed_s);
            a.time_s + (b.time_s - a.time_s) * share
        };
        let from_s = if before == 0 {
            self.start_s()
        } else {
            at(from_filed_s, before.min(self.knots.len() - 1))
        };
        let until_s =
            if after == self.knots.len() { self.end_s() } else { at(until_filed_s, after.max(1)) };
        (from_s, until_s)
    }

    fn segment(&self, time_s: f64) -> usize {
        let after = self.knots.partition_point(|k| k.time_s <= time_s);
        after.saturating_sub(1).min(self.knots.len() - 2)
    }

    /// What the flight does at a time of its life.
    pub(super) fn state(&self, time_s: f64) -> State {
        let i = self.segment(time_s);
        let (a, b) = (self.knots[i], self.knots[i + 1]);
        let duration_s = b.time_s - a.time_s;
        let share = ((time_s - a.time_s) / duration_s).clamp(0.0, 1.0);
        State {
            filed_s: a.filed_s + (b.filed_s - a.filed_s) * share,
            level_ft: a.level_ft + (b.level_ft - a.level_ft) * share,
            rate_ftps: (b.level_ft - a.level_ft) / duration_s,
            until_s: self.knots[self.level_until[i] as usize].time_s,
        }
    }

    /// The place on the geodesic at a time.
    pub(super) fn geodesic_place(&self, time_s: f64) -> LonLat {
        self.track.geodesic_place(self.state(time_s).filed_s)
    }

    /// How far off the filed level of the place the flight is at a time, feet.
    pub(super) fn off_level_ft(&self, time_s: f64) -> f64 {
        let state = self.state(time_s);
        (state.level_ft - self.track.level_ft(state.filed_s)).abs()
    }

    /// Whether it is at the level filed for the place throughout, to `within_ft`.
    ///
    /// Both levels are linear between knots, so their difference is greatest at a knot or an end.
    pub(super) fn keeps_filed_level(&self, from_s: f64, until_s: f64, within_ft: f64) -> bool {
        let at_knots = self
            .knots
            .iter()
            .filter(|k| from_s < k.time_s && k.time_s < until_s)
            .all(|k| (k.level_ft - self.track.level_ft(k.filed_s)).abs() <= within_ft);
        at_knots
            && self.off_level_ft(from_s) <= within_ft
            && self.off_level_ft(until_s) <= within_ft
    }
}
