//! Where a stretch lies on the filed track, or which rule it breaks.

use super::derive::{Move, Way, leg_before, transition};
use super::levels::leg_forbids;
use super::tolerances::{Lean, TIME_S};
use super::track::Track;
use crate::answer::Rule;
use crate::day::{Alternative, Day, Flight, Stretch};
use crate::units::fl_to_ft;

/// RVSM airspace, feet, both included (ICAO Doc 9574: FL 290 to FL 410).
pub(super) const RVSM_FT: (f64, f64) = (29_000.0, 41_000.0);
/// Vertical rate of an aircraft that no class names, ft/min (common practice, no source).
const DEFAULT_RATE_FPM: f64 = 1000.0;

/// A stretch with its places; times are filed times of places.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Placed {
    /// The new level, feet.
    pub(super) level_ft: f64,
    /// Where the profile starts to leave its filed level.
    pub(super) from_filed_s: f64,
    /// The filed level there, feet.
    pub(super) from_level_ft: f64,
    /// The transition to the new level.
    pub(super) reach: Vec<Move>,
    /// Where it starts to return.
    pub(super) until_filed_s: f64,
    /// The transition back.
    pub(super) back: Vec<Move>,
}

impl Placed {
    /// Where the new level is reached.
    fn reached_filed_s(&self) -> f64 {
        self.reach.last().map_or(self.from_filed_s, |step| step.filed_s)
    }

    /// Where the return ends.
    pub(super) fn end_filed_s(&self) -> f64 {
        self.back.last().map_or(self.until_filed_s, |step| step.filed_s)
    }
}

/// What the rules ask about a flight.
pub(super) struct Ground<'d> {
    pub(super) day: &'d Day,
    pub(super) flight: &'d Flight,
    pub(super) track: &'d Track,
    pub(super) lean: Lean,
}

impl Ground<'_> {
    /// The places of an option's stretches, one by one.
    ///
    /// # Errors
    /// A rule that one of them breaks.
    pub(super) fn place_option(&self, alternative: &Alternative) -> Result<Vec<Placed>, Rule> {
        let placed =
            alternative.stretches.iter().map(|s| self.place(s)).collect::<Result<Vec<_>, _>>()?;
        self.order(&placed).ok_or(Rule::StretchesOverlap)?;
        Ok(placed)
    }

    /// The order of stretches along the track, if each begins after the return before it.
    pub(super) fn order(&self, placed: &[Placed]) -> Option<Vec<usize>> {
        let mut order: Vec<usize> = (0..placed.len()).collect();
        let key = |i: usize| (placed[i].from_filed_s, placed[i].end_filed_s());
        order.sort_by(|&i, &j| {
            key(i).0.total_cmp(&key(j).0).then(key(i).1.total_cmp(&key(j).1)).then(i.cmp(&j))
        });
        let allowed_s = self.lean.allow(TIME_S);
        let apart = order.windows(2).all(|w| key(w[1]).0 >= key(w[0]).1 - allowed_s);
        apart.then_some(order)
    }

    fn place(&self, stretch: &Stretch) -> Result<Placed, Rule> {
        self.keeps_flight_rules(stretch.level_ft)?;
        let (from_filed_s, from_level_ft) = self.begin(stretch)?;
        let reach = if self.begins_at_level(stretch) {
            Vec::new()
        } else {
            self.fly(from_filed_s, (from_level_ft, stretch.level_ft), Way::Forward)
                .ok_or(Rule::NoRoomToReach)?
                .1
        };
        let (until_filed_s, back) = self.end(stretch, from_filed_s)?;
        let level_ft = stretch.level_ft;
        let placed = Placed { level_ft, from_filed_s, from_level_ft, reach, until_filed_s, back };
        if placed.reached_filed_s() > until_filed_s + self.lean.allow(TIME_S) {
            return Err(Rule::NoRoomToReach);
        }
        self.keeps_direction(&placed)?;
        Ok(placed)
    }

    fn floor_ft(&self) -> f64 {
        fl_to_ft(self.day.policy.cruise_floor_fl)
    }

    fn fly(&self, at_filed_s: f64, levels_ft: (f64, f64), way: Way) -> Option<(f64, Vec<Move>)> {
        // Followed backward, a climb is a descent.
        let climbs = (levels_ft.1 > levels_ft.0) == (way == Way::Forward);
        let rate_fpm = match self.day.class_of(self.flight) {
            None => DEFAULT_RATE_FPM,
            Some(class) if climbs => class.climb_fpm,
            Some(class) => class.descent_fpm,
        };
        transition(self.track, at_filed_s, levels_ft, rate_fpm, way)
    }

    fn keeps_flight_rules(&self, level_ft: f64) -> Result<(), Rule> {
        if !self.flight.movable {
            return Err(Rule::NotMovable);
        }
        if self.flight.profile.cruise().is_none() {
            return Err(Rule::NoCruise);
        }
        let ceiling_ft = self.day.class_of(self.flight).and_then(|class| class.ceiling_ft);
        if let Some(ceiling_ft) = ceiling_ft.filter(|&ceiling_ft| level_ft > ceiling_ft) {
            return Err(Rule::AboveCeiling { ceiling_ft });
        }
        if level_ft < self.floor_ft() {
            return Err(Rule::BelowFloor { floor_ft: self.floor_ft() });
        }
        if !self.flight.rvsm && (RVSM_FT.0..=RVSM_FT.1).contains(&level_ft) {
            return Err(Rule::NotRvsm);
        }
        Ok(())
    }

    /// Filed time and level of the top of climb.
    fn top_of_climb(&self) -> Result<(f64, f64), Rule> {
        let cruise = self.flight.profile.cruise().ok_or(Rule::NoCruise)?;
        let filed_s = self.track.times_s()[cruise.top_of_climb];
        Ok((filed_s, self.track.level_ft(filed_s)))
    }

    /// Filed time and level of the top of descent.
    fn top_of_descent(&self) -> Result<(f64, f64), Rule> {
        let cruise = self.flight.profile.cruise().ok_or(Rule::NoCruise)?;
        let filed_s = self.track.times_s()[cruise.top_of_descent];
        Ok((filed_s, self.track.leg_levels_ft(leg_before(self.track, filed_s)).1))
    }

    /// Whether the filed climb itself reaches the level.
    fn begins_at_level(&self, stretch: &Stretch) -> bool {
        stretch.from_s.is_none()
            && self.top_of_climb().is_ok_and(|(_, top_ft)| stretch.level_ft < top_ft)
    }

    fn is_outside(&self, filed_s: f64) -> bool {
        filed_s < self.track.start_s() || filed_s > self.track.end_s()
    }

    /// Where a stretch begins, and the filed level there.
    fn begin(&self, stretch: &Stretch) -> Result<(f64, f64), Rule> {
        let (track, level_ft) = (self.track, stretch.level_ft);
        if let Some(from_s) = stretch.from_s {
            if self.is_outside(from_s) {
                return Err(Rule::OutsideFlight);
            }
            let leg = track.leg_at(from_s);
            if !track.is_cruise(leg) {
                return Err(Rule::FromNotInCruise);
            }
            let filed_ft = track.leg_levels_ft(leg).0;
            return if level_ft - filed_ft == 0.0 {
                Err(Rule::SameLevel)
            } else {
                Ok((from_s, filed_ft))
            };
        }
        if track.is_cruise(0) {
            return Err(Rule::BeginsInCruise);
        }
        let (top_s, top_ft) = self.top_of_climb()?;
        if level_ft - top_ft == 0.0 {
            return Err(Rule::SameLevel);
        }
        if level_ft > top_ft {
            return Ok((top_s, top_ft));
        }
        // The first time that the filed climb passes the level upward.
        let leg = (0..track.leg_at(top_s)).find(|&leg| {
            let (a, b) = track.leg_levels_ft(leg);
            a < b && a <= level_ft && level_ft <= b
        });
        leg.map(|leg| (self.passing_s(leg, level_ft), level_ft)).ok_or(Rule::NotPassedInClimb)
    }

    /// When a sloping leg passes a level.
    fn passing_s(&self, leg: usize, level_ft: f64) -> f64 {
        let ((from_s, until_s), (a, b)) =
            (self.track.leg_times_s(leg), self.track.leg_levels_ft(leg));
        from_s + (until_s - from_s) * ((level_ft - a) / (b - a)).clamp(0.0, 1.0)
    }

    /// Where a stretch begins to return, and the return.
    fn end(&self, stretch: &Stretch, from_filed_s: f64) -> Result<(f64, Vec<Move>), Rule> {
        match stretch.until_s {
            Some(until_s) => self.end_at(until_s, stretch.level_ft, from_filed_s),
            None => self.end_in_descent(stretch.level_ft),
        }
    }

    fn end_at(
        &self,
        until_s: f64,
        level_ft: f64,
        from_filed_s: f64,
    ) -> Result<(f64, Vec<Move>), Rule> {
        let track = self.track;
        if self.is_outside(until_s) {
            return Err(Rule::OutsideFlight);
        }
        if until_s < from_filed_s {
            return Err(Rule::EndsBeforeItBegins);
        }
        // A point between a cruise leg and another counts as cruise.
        let (before, after) = (leg_before(track, until_s), track.leg_at(until_s));
        let leg = if track.is_cruise(after) { after } else { before };
        if !track.is_cruise(leg) {
            return Err(Rule::UntilNotInCruise);
        }
        let (_, back) = self
            .fly(until_s, (level_ft, track.leg_levels_ft(leg).1), Way::Forward)
            .ok_or(Rule::NoRoomToReturn)?;
        let last_cruise = (leg..track.leg_count()).take_while(|&leg| track.is_cruise(leg)).last();
        let cruise_until_s = track.leg_times_s(last_cruise.unwrap_or(leg)).1;
        let end_s = back.last().map_or(until_s, |step| step.filed_s);
        if end_s > cruise_until_s + self.lean.allow(TIME_S) && !back.is_empty() {
            return Err(Rule::NoRoomToReturn);
        }
        Ok((until_s, back))
    }

    fn end_in_descent(&self, level_ft: f64) -> Result<(f64, Vec<Move>), Rule> {
        let track = self.track;
        if track.is_cruise(track.leg_count() - 1) {
            return Err(Rule::EndsInCruise);
        }
        let (top_s, top_ft) = self.top_of_descent()?;
        if level_ft < top_ft {
            // The first time that the filed descent passes the level downward.
            let leg = (track.leg_at(top_s)..track.leg_count()).find(|&leg| {
                let (a, b) = track.leg_levels_ft(leg);
                a > b && a >= level_ft && level_ft >= b
            });
            return leg
                .map(|leg| (self.passing_s(leg, level_ft), Vec::new()))
                .ok_or(Rule::NotPassedInDescent);
        }
        let (until_s, back) =
            self.fly(top_s, (top_ft, level_ft), Way::Backward).ok_or(Rule::NoRoomToReturn)?;
        let first = track.leg_at(until_s).min(leg_before(track, top_s));
        if (first..=leg_before(track, top_s)).any(|leg| !track.is_cruise(leg)) {
            return Err(Rule::NoRoomToReturn);
        }
        Ok((until_s, back))
    }

    /// The level must be one of the direction of flight on the cruise legs between both places.
    fn keeps_direction(&self, placed: &Placed) -> Result<(), Rule> {
        let track = self.track;
        let (from_s, until_s) = (placed.from_filed_s, placed.until_filed_s);
        for leg in track.leg_at(from_s)..track.leg_count() {
            let (leg_from_s, leg_until_s) = track.leg_times_s(leg);
            if leg_from_s >= until_s {
                break;
            }
            let joined_s = leg_from_s.max(from_s);
            let is_between = joined_s < leg_until_s.min(until_s);
            // A leg without length has no track.
            if !is_between || !track.is_cruise(leg) || track.leg_length_m(leg) == 0.0 {
                continue;
            }
            let track_deg = track.track_deg(leg, joined_s);
            let filed_ft = track.leg_levels_ft(leg).0;
            if leg_forbids(&self.day.policy, track_deg, filed_ft, placed.level_ft, self.lean) {
                return Err(Rule::WrongDirection { track_deg });
            }
        }
        Ok(())
    }
}
