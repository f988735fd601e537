//! Where a leg is, coarsely: a ball around it, the levels that it blocks, and the cells of the
//! index that it reaches into.

use super::leg::Leg;
use super::minima::vertical_reach_ft;
use crate::geometry::motion::dot;

/// Coordinates are rounded to f32, to half a metre and less on the ellipsoid.
const ROUNDING_M: f32 = 1.0;
/// Side of a cell of earth-centred space, metres: about twice the length of a leg, so that most
/// legs reach into two or three.
const CELL_M: f64 = 100_000.0;
/// Height of a slot of levels, feet: around each multiple of it.
const SLOT_FT: f64 = 1000.0;
/// Half of the vertical minimum of 1 000 ft.
const HALF_FT: f64 = 500.0;
/// What is left of the vertical minimum of 2 000 ft beside a flight that has only 1 000 ft itself.
const WIDE_FT: f64 = 1500.0;

/// A ball around a leg, when it is there, and the levels that it blocks: those of two legs that
/// may lose separation overlap. Rounded outwards.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Bounds {
    middle_m: [f32; 3],
    radius_m: f32,
    low_ft: f32,
    high_ft: f32,
    pub(super) from_s: f32,
    pub(super) until_s: f32,
}

impl Bounds {
    pub(super) fn of(leg: &Leg) -> Self {
        let half_s = leg.lasts_s() / 2.0;
        let length_m = dot(leg.velocity_mps, leg.velocity_mps).sqrt() * half_s;
        let (low_ft, high_ft) = leg.level_range_ft();
        let blocks_ft =
            if vertical_reach_ft(high_ft, leg.rvsm) > SLOT_FT { WIDE_FT } else { HALF_FT };
        Self {
            middle_m: std::array::from_fn(|k| {
                (leg.place_m[k] + leg.velocity_mps[k] * half_s) as f32
            }),
            radius_m: length_m as f32 + leg.stray_m + ROUNDING_M,
            low_ft: rounded_down(low_ft - blocks_ft),
            high_ft: rounded_up(high_ft + blocks_ft),
            from_s: rounded_down(leg.from_s),
            until_s: rounded_up(leg.until_s),
        }
    }

    /// Whether versions on the two legs may come closer than their minima at any times, the
    /// horizontal one being at most `widest_m`.
    pub(super) fn meets(&self, other: &Self, widest_m: f32) -> bool {
        let apart: [f32; 3] = std::array::from_fn(|k| self.middle_m[k] - other.middle_m[k]);
        let reach_m = self.radius_m + other.radius_m + widest_m;
        let squared = apart[0] * apart[0] + apart[1] * apart[1] + apart[2] * apart[2];
        // Without short cuts: hardly any pair meets, and no branch inside is easy to foresee.
        (squared < reach_m * reach_m)
            & (self.low_ft < other.high_ft)
            & (other.low_ft < self.high_ft)
    }
}

/// The cells of space and slots of levels that a leg reaches into; those of two legs that may lose
/// separation share one. Ranges are closed.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Reach {
    pub(super) low: [i32; 3],
    pub(super) high: [i32; 3],
    pub(super) slots: (i32, i32),
}

impl Reach {
    /// The reach of a leg, where no horizontal minimum is larger than `widest_m`.
    pub(super) fn of(leg: &Leg, bounds: &Bounds, widest_m: f32) -> Self {
        let margin_m = f64::from(widest_m / 2.0 + leg.stray_m + ROUNDING_M);
        let end_m = leg.end_m();
        let cell = |x: f64| (x / CELL_M).floor() as i32;
        Self {
            low: std::array::from_fn(|k| cell(leg.place_m[k].min(end_m[k]) - margin_m)),
            high: std::array::from_fn(|k| cell(leg.place_m[k].max(end_m[k]) + margin_m)),
            slots: bounds.slots(),
        }
    }

    /// Whether a cell and slot are the first ones that two legs share, so that each pair is met
    /// in one place only.
    pub(super) fn first_shared(&self, other: &Self, cell: [i32; 3], slot: i32) -> bool {
        slot == self.slots.0.max(other.slots.0)
            && (0..3).all(|k| cell[k] == self.low[k].max(other.low[k]))
    }
}

impl Bounds {
    /// Slots that the open interval of levels reaches into.
    fn slots(&self) -> (i32, i32) {
        let border = |level_ft: f32| (f64::from(level_ft) - HALF_FT) / SLOT_FT;
        (border(self.low_ft).floor() as i32, border(self.high_ft).ceil() as i32 - 1)
    }
}

/// Whole numbers stay as they are, so that flights exactly at the vertical minimum are told apart
/// here already.
fn rounded_down(x: f64) -> f32 {
    let near = x as f32;
    if f64::from(near) > x { near.next_down() } else { near }
}

fn rounded_up(x: f64) -> f32 {
    -rounded_down(-x)
}
