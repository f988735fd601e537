//! How far apart two flights must be.

use crate::day::Policy;
use crate::geometry::motion::chord_m;
use crate::units::{fl_to_ft, nm_to_m};

/// Vertical minimum between flights approved for RVSM up to FL 410, feet (ICAO Doc 4444, 5.3.2).
const VERTICAL_FT: f64 = 1000.0;
/// Vertical minimum elsewhere above FL 290, feet (same source).
const WIDE_VERTICAL_FT: f64 = 2000.0;
/// Level from which the wider minimum holds for flights without RVSM approval, feet.
const RVSM_FROM_FT: f64 = 29_000.0;
/// Level above which the wider minimum holds for all, feet.
const RVSM_UNTIL_FT: f64 = 41_000.0;

/// Vertical distances are sums of a few rounded terms: exactly at the minimum is separated.
const VERTICAL_ROUNDING_FT: f64 = 1e-6;
/// Places on chords are right to a few millimetres along the track: exactly at the minimum is
/// separated.
const HORIZONTAL_ROUNDING_M: f64 = 0.02;

/// What a search for losses tests against: the minimum, or a little more or less.
///
/// Within half a metre of a minimum the maker of a plan decides against a change and its judge for
/// it, so that they never disagree.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Minimum {
    /// The minimum.
    Plain,
    /// Half a metre more.
    Wider,
    /// Half a metre less.
    Narrower,
}

impl Minimum {
    /// What is added to the horizontal minimum, metres.
    pub(super) fn margin_m(self) -> f64 {
        match self {
            Self::Plain => -HORIZONTAL_ROUNDING_M,
            Self::Wider => MARGIN_M,
            Self::Narrower => -MARGIN_M,
        }
    }
}

/// How near to a minimum either answer is right, metres.
pub(super) const MARGIN_M: f64 = 0.5;

/// What a coarse test adds to a chord of the plain minimum, so that no loss at the wider minimum
/// is passed over, metres.
pub(super) const FILTER_MARGIN_M: f64 = MARGIN_M + 2.0 * HORIZONTAL_ROUNDING_M;

/// Most that different depths of two flights may add to the distance between them, metres.
const DEPTHS_ADD_M: f64 = 0.2;
/// Deepest that a leg ever passes below its ends: 30 NM of the earth's curvature, metres.
const MOST_DEEP_M: f64 = 61.0;

/// A period in which a flight has a horizontal minimum of its own: that of the sector where it is.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct HorizontalMinimum {
    /// Start, seconds of the day.
    pub from_s: f64,
    /// End (not included), seconds of the day.
    pub until_s: f64,
    /// The minimum, NM.
    pub horizontal_nm: f64,
}

/// What the policy and the sectors say about separation, in metres and feet.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Rules {
    /// Horizontal minimum where no sector sets its own.
    pub(super) horizontal_m: f64,
    /// Its chord.
    pub(super) chord_m: f32,
    /// Longest chord of any minimum, with what coarse tests add.
    pub(super) widest_m: f32,
    /// How far below its ends a leg may pass.
    pub(super) deepest_m: f64,
    /// Losses are looked for at or above this level.
    pub(super) floor_ft: f64,
}

impl Rules {
    /// `own_nm` are the minima that sectors set.
    pub(super) fn new(policy: &Policy, own_nm: impl Iterator<Item = f64>) -> Self {
        let horizontal_m = nm_to_m(policy.horizontal_nm);
        let own_m = own_nm.map(nm_to_m);
        let (least_m, most_m) = own_m.fold((horizontal_m, horizontal_m), |(least, most), own| {
            (least.min(own), most.max(own))
        });
        let widest_m = limit_chord_m(most_m, Minimum::Plain) + FILTER_MARGIN_M;
        Self {
            horizontal_m,
            chord_m: limit_chord_m(horizontal_m, Minimum::Plain) as f32,
            widest_m: (widest_m as f32).next_up(),
            deepest_m: (2.0 * DEPTHS_ADD_M * least_m).sqrt().min(MOST_DEEP_M),
            floor_ft: fl_to_ft(policy.separation_floor_fl),
        }
    }

    /// The horizontal minimum of one flight at a time, metres along the surface.
    pub(super) fn horizontal_m_at(&self, own: &[HorizontalMinimum], time_s: f64) -> f64 {
        own.iter()
            .find(|m| m.from_s <= time_s && time_s < m.until_s)
            .map_or(self.horizontal_m, |m| nm_to_m(m.horizontal_nm))
    }

    /// The largest horizontal minimum of one flight in a closed interval, metres.
    pub(super) fn largest_m(&self, own: &[HorizontalMinimum], from_s: f64, until_s: f64) -> f64 {
        let met = own.iter().filter(|m| m.from_s <= until_s && from_s < m.until_s);
        met.map(|m| nm_to_m(m.horizontal_nm)).fold(self.horizontal_m, f64::max)
    }
}

/// The chord below which a minimum is lost; never, where nothing is left of it.
pub(super) fn limit_chord_m(horizontal_m: f64, minimum: Minimum) -> f64 {
    chord_m((horizontal_m + minimum.margin_m()).max(0.0))
}

/// The vertical distance below which the minimum is lost, at two levels.
pub(super) fn limit_vertical_ft(levels_ft: [f64; 2], rvsm: [bool; 2]) -> f64 {
    let highest_ft = levels_ft[0].max(levels_ft[1]);
    let approved = rvsm[0] && rvsm[1];
    let wide = highest_ft > RVSM_UNTIL_FT || (!approved && highest_ft >= RVSM_FROM_FT);
    (if wide { WIDE_VERTICAL_FT } else { VERTICAL_FT }) - VERTICAL_ROUNDING_FT
}

/// Levels at which the vertical minimum changes, feet.
pub(super) const VERTICAL_STEPS_FT: [f64; 2] = [RVSM_FROM_FT, RVSM_UNTIL_FT];

/// The largest vertical minimum that a flight below a level may have with any other that is near
/// enough for it to matter; of two flights, the larger one holds.
pub(super) fn vertical_reach_ft(highest_ft: f64, rvsm: bool) -> f64 {
    // Without approval the wider minimum holds already where the other flight is at FL 290.
    let wide =
        highest_ft > RVSM_UNTIL_FT || (!rvsm && highest_ft > RVSM_FROM_FT - WIDE_VERTICAL_FT);
    if wide { WIDE_VERTICAL_FT } else { VERTICAL_FT }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// ICAO Doc 4444, 5.3.2: 1 000 ft below FL 290 and within RVSM airspace, 2 000 ft elsewhere.
    #[test]
    fn vertical_minima() {
        for (a, b, rvsm, expected) in [
            (28_000.0, 28_500.0, [false, false], 1000.0),
            (28_000.0, 29_000.0, [false, true], 2000.0),
            (29_000.0, 30_000.0, [true, true], 1000.0),
            (40_000.0, 41_000.0, [true, true], 1000.0),
            (41_000.0, 43_000.0, [true, true], 2000.0),
            (29_000.0, 30_000.0, [true, false], 2000.0),
        ] {
            assert!((limit_vertical_ft([a, b], rvsm) - expected).abs() < 1e-5, "{a} {b} {rvsm:?}");
            let reach = vertical_reach_ft(a, rvsm[0]).max(vertical_reach_ft(b, rvsm[1]));
            assert!(reach >= expected, "{a} {b} {rvsm:?}");
        }
    }
}
