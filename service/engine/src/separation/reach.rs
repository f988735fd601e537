//! Where a leg is, coarsely: the cells of the index that it reaches into, and a ball around it.

use super::leg::Leg;
use super::minima::vertical_reach_ft;
use crate::geometry::motion::dot;

/// Side of a cell of earth-centred space, metres: about twice the length of a leg, so that most
/// legs reach into two or three.
const CELL_M: f64 = 128_000.0;
/// Height of a slot of levels, feet: around each multiple of it.
const SLOT_FT: f64 = 1000.0;
/// Half of the vertical minimum of 1 000 ft.
const HALF_FT: f64 = 500.0;
/// What is left of the vertical minimum of 2 000 ft beside a flight that has only 1 000 ft itself.
const WIDE_FT: f64 = 1500.0;
/// What is added to the box of a leg, so that rounding hides nothing, metres.
const ROUNDING_M: f64 = 1.0;

/// Lowest and highest level that a leg blocks, feet, both excluded: those of two legs that may lose
/// separation overlap.
pub(super) fn blocked_ft(leg: &Leg) -> (f64, f64) {
    let (low_ft, high_ft) = leg.level_range_ft();
    let wide = vertical_reach_ft(high_ft, leg.rvsm) > SLOT_FT;
    let beyond_ft = if wide { WIDE_FT } else { HALF_FT };
    (low_ft - beyond_ft, high_ft + beyond_ft)
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
    pub(super) fn of(leg: &Leg, widest_m: f32) -> Self {
        let margin_m = f64::from(widest_m) / 2.0 + f64::from(leg.stray_m) + ROUNDING_M;
        let end_m = leg.end_m();
        let cell = |x: f64| floor(x / CELL_M);
        let (low_ft, high_ft) = blocked_ft(leg);
        let border = |level_ft: f64| (level_ft - HALF_FT) / SLOT_FT;
        Self {
            low: std::array::from_fn(|k| cell(leg.place_m[k].min(end_m[k]) - margin_m)),
            high: std::array::from_fn(|k| cell(leg.place_m[k].max(end_m[k]) + margin_m)),
            slots: (floor(border(low_ft)), -floor(-border(high_ft)) - 1),
        }
    }

    /// Whether a cell and slot are the first ones that two legs share, so that each pair is met
    /// in one place only.
    pub(super) fn first_shared(&self, other: &Self, cell: [i32; 3], slot: i32) -> bool {
        slot == self.slots.0.max(other.slots.0)
            && (0..3).all(|k| cell[k] == self.low[k].max(other.low[k]))
    }
}

/// The whole number below. (The library's is a call where the processor's own instruction may not
/// be assumed, and was a fortieth of an index's making.)
fn floor(x: f64) -> i32 {
    let towards_zero = x as i32;
    towards_zero - i32::from(x < f64::from(towards_zero))
}

/// Unit of places and of radii in a packed ball, metres.
const PLACE_M: f64 = 4.0;
const RADIUS_M: f64 = 256.0;
/// What packing may move a ball's middle, and rounding the test of two, metres.
const PACKING_M: f64 = 8.0;
/// Radius of a ball that could not be packed: it meets any.
const UNKNOWN: u8 = u8::MAX;

/// A ball around a leg, from the middle of a cell.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Ball {
    middle: [f32; 3],
    radius: f32,
}

impl Ball {
    /// In eight bytes, so that a list is read in sequence: three places of 16 bits and a radius of
    /// 8 bits above 8 bits left free.
    pub(super) fn packed(leg: &Leg, cell: [i32; 3]) -> u64 {
        let half_s = leg.lasts_s() / 2.0;
        let length_m = dot(leg.velocity_mps, leg.velocity_mps).sqrt() * half_s;
        let radius = (length_m + f64::from(leg.stray_m) + PACKING_M) / RADIUS_M;
        let middle: [f64; 3] = std::array::from_fn(|k| {
            let centre_m = (f64::from(cell[k]) + 0.5) * CELL_M;
            (leg.place_m[k] + leg.velocity_mps[k] * half_s - centre_m) / PLACE_M
        });
        let fits = radius < 250.0 && middle.iter().all(|x| x.abs() < 32_000.0);
        let [x, y, z] = middle.map(|x| u64::from(x as i16 as u16));
        let radius = if fits { radius as u8 + 1 } else { UNKNOWN };
        x << 48 | y << 32 | z << 16 | u64::from(radius) << 8
    }

    pub(super) fn unpacked(packed: u64) -> Self {
        let place = |shift: u32| f32::from((packed >> shift) as u16 as i16);
        let radius = (packed >> 8) as u8;
        let per_place = (RADIUS_M / PLACE_M) as f32;
        let radius = if radius == UNKNOWN { f32::INFINITY } else { f32::from(radius) * per_place };
        Self { middle: [place(48), place(32), place(16)], radius }
    }

    /// The same ball with a horizontal minimum around it.
    pub(super) fn widened(self, widest_m: f32) -> Self {
        Self { radius: self.radius + widest_m / PLACE_M as f32, ..self }
    }

    /// Whether two balls of one cell meet.
    pub(super) fn meets(&self, other: &Self) -> bool {
        let apart: [f32; 3] = std::array::from_fn(|k| self.middle[k] - other.middle[k]);
        let reach = self.radius + other.radius;
        apart[0] * apart[0] + apart[1] * apart[1] + apart[2] * apart[2] < reach * reach
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_whole_number_below() {
        for x in [-2.0, -1.5, -1e-9, 0.0, 0.3, 1.0, 7.999] {
            assert_eq!(f64::from(floor(x)), x.floor(), "{x}");
        }
    }

    #[test]
    fn a_level_flight_reaches_into_one_slot_and_balls_keep_their_place() {
        let leg = Leg {
            owner: 0,
            piece: 0,
            from_s: 0.0,
            until_s: 200.0,
            place_m: [6_378_137.0, -30_000.0, 0.0],
            velocity_mps: [0.0, 230.0, 0.0],
            level_ft: 35_000.0,
            climb_ftps: 0.0,
            chord_m: 9260.0,
            stray_m: 0.0,
            rvsm: true,
        };
        let reach = Reach::of(&leg, 9260.0);
        assert_eq!(reach.slots, (34, 34));
        let climbs = Reach::of(&Leg { climb_ftps: 10.0, ..leg }, 9260.0);
        assert_eq!(climbs.slots, (34, 36));
        let wide = Reach::of(&Leg { rvsm: false, ..leg }, 9260.0);
        assert_eq!(wide.slots, (33, 35));
        let beside = |m: f64| Leg { place_m: [6_378_137.0, -30_000.0, m], ..leg };
        let ball = |leg: &Leg| Ball::unpacked(Ball::packed(leg, reach.low));
        let ours = ball(&leg).widened(9260.0);
        assert!(ours.meets(&ball(&beside(46_000.0 + 9260.0 - 1.0))));
        assert!(!ours.meets(&ball(&beside(46_000.0 + 9260.0 + 600.0))));
        // Out of range: anything may be near.
        assert!(ours.meets(&ball(&beside(900_000.0))));
    }
}
