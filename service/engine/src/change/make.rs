//! A level change made: one stretch flown after the other, each judged by the rules.

use super::flown::{Flown, Mark, return_start_s};
use super::rules::{check_direction, check_level};
use crate::answer::Rule;
use crate::day::{AircraftClass, Cruise, Day, Flight, Profile, Stretch};
use crate::path::{Changed, Knot, Track};
use crate::units::{fl_to_ft, to_millisecond};

/// A valid level change of one flight.
#[derive(Debug, Clone, PartialEq)]
pub struct Change {
    /// What differs from the filed flight.
    pub changed: Changed,
    /// The stretches, by their start.
    pub stretches: Vec<Stretch>,
    /// When each of them begins and ends in the new profile.
    pub times: Vec<StretchTimes>,
    /// The places where the new profile turns: start and end of each transition, its steps, and
    /// filed points between, with times in whole milliseconds.
    pub(super) marks: Vec<Mark>,
}

/// When a stretch begins and ends.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct StretchTimes {
    /// Filed time of the place where the aircraft starts to leave its filed level.
    pub filed_from_s: f64,
    /// When the new profile is there.
    pub planned_from_s: f64,
    /// When the new profile starts to return.
    pub planned_until_s: f64,
    /// Filed time of the place where it has returned.
    pub filed_returned_s: f64,
}

impl Change {
    /// By how much the arrival moves, seconds, late positive.
    #[must_use]
    pub fn arrival_shift_s(&self) -> f64 {
        self.changed.shift_s
    }

    /// When one of its stretches begins and ends.
    #[must_use]
    pub fn times_of(&self, stretch: &Stretch) -> Option<StretchTimes> {
        let position = self.stretches.iter().position(|s| s == stretch)?;
        self.times.get(position).copied()
    }
}

/// Flies stretches, sorted by their start, on a flight's filed profile.
///
/// # Errors
/// The first rule that is broken.
pub fn change_levels(
    day: &Day,
    flight: &Flight,
    track: &Track,
    stretches: &[Stretch],
) -> Result<Change, Rule> {
    let default_class = AircraftClass::default();
    let maker = Maker {
        day,
        profile: &flight.profile,
        class: day.class_of(flight).unwrap_or(&default_class),
        cruise: flight.profile.cruise().ok_or(Rule::NoCruise)?,
    };
    if !flight.movable {
        return Err(Rule::NotMovable);
    }
    let mut marks: Vec<Mark> = Vec::new();
    let mut times = Vec::with_capacity(stretches.len());
    for stretch in stretches {
        check_level(day, flight, maker.class, stretch.level_ft)?;
        let begun = maker.begin(stretch)?;
        let mut flown = match marks.last() {
            None => Flown::start(maker.profile, begun.filed_s, begun.level_ft),
            Some(last) if begun.filed_s < last.filed_s => return Err(Rule::StretchesOverlap),
            Some(_) => {
                let mut flown = Flown { profile: maker.profile, marks: std::mem::take(&mut marks) };
                flown.follow_until(begun.filed_s);
                flown
            }
        };
        times.push(maker.fly(&mut flown, stretch, &begun)?);
        marks = flown.marks;
    }
    for mark in &mut marks {
        mark.time_s = to_millisecond(mark.time_s);
    }
    let changed = knots_of(maker.profile, track, &marks);
    for times in &mut times {
        times.planned_from_s = to_millisecond(times.planned_from_s);
        times.planned_until_s = to_millisecond(times.planned_until_s);
    }
    Ok(Change { changed, stretches: stretches.to_vec(), times, marks })
}

/// Where a stretch begins.
struct Begun {
    filed_s: f64,
    /// Filed level there.
    level_ft: f64,
    /// The filed level from which the new one must differ, feet.
    leaves_ft: f64,
}

struct Maker<'a> {
    day: &'a Day,
    profile: &'a Profile,
    class: &'a AircraftClass,
    cruise: Cruise,
}

impl Maker<'_> {
    fn point_s(&self, point: usize) -> f64 {
        self.profile.points()[point].time_s
    }

    fn is_cruise_leg(&self, leg: usize) -> bool {
        self.profile.is_cruise_leg(leg, fl_to_ft(self.day.policy.cruise_floor_fl))
    }

    /// Finds where the stretch begins, and judges that place.
    fn begin(&self, stretch: &Stretch) -> Result<Begun, Rule> {
        let begun = match stretch.from_s {
            Some(from_s) => self.begin_at(from_s)?,
            None => self.begin_from_climb(stretch.level_ft)?,
        };
        if begun.leaves_ft == stretch.level_ft {
            return Err(Rule::SameLevel);
        }
        Ok(begun)
    }

    fn begin_at(&self, from_s: f64) -> Result<Begun, Rule> {
        if !(self.profile.start_s()..=self.profile.end_s()).contains(&from_s) {
            return Err(Rule::OutsideFlight);
        }
        let leg = self.profile.leg_at(from_s);
        // No leg follows the last point.
        if from_s >= self.profile.end_s() || !self.is_cruise_leg(leg) {
            return Err(Rule::FromNotInCruise);
        }
        let level_ft = self.profile.points()[leg].level_ft;
        Ok(Begun { filed_s: from_s, level_ft, leaves_ft: level_ft })
    }

    /// A lower level is taken where the filed climb passes it, a higher one from the top of climb.
    fn begin_from_climb(&self, level_ft: f64) -> Result<Begun, Rule> {
        if self.is_cruise_leg(0) {
            return Err(Rule::BeginsInCruise);
        }
        let top = self.cruise.top_of_climb;
        let top_ft = self.profile.points()[top].level_ft;
        if level_ft >= top_ft {
            return Ok(Begun { filed_s: self.point_s(top), level_ft: top_ft, leaves_ft: top_ft });
        }
        let climb = &self.profile.points()[..=top];
        let passed = climb
            .windows(2)
            .find(|w| w[0].level_ft <= level_ft && level_ft < w[1].level_ft)
            .ok_or(Rule::NotPassedInClimb)?;
        let share = (level_ft - passed[0].level_ft) / (passed[1].level_ft - passed[0].level_ft);
        let filed_s = passed[0].time_s + share * (passed[1].time_s - passed[0].time_s);
        Ok(Begun { filed_s, level_ft, leaves_ft: top_ft })
    }

    /// Climbs or descends to the new level, holds it, and returns.
    fn fly(
        &self,
        flown: &mut Flown<'_>,
        stretch: &Stretch,
        begun: &Begun,
    ) -> Result<StretchTimes, Rule> {
        let planned_from_s = flown.here().time_s;
        let level_ft = stretch.level_ft;
        if !flown.change_level(level_ft, self.rate_fpm(begun.level_ft, level_ft)) {
            return Err(Rule::NoRoomToReach);
        }
        let reached_s = flown.here().filed_s;
        let until_s = match stretch.until_s {
            Some(until_s) => self.until(until_s, begun)?,
            None => self.until_descent(level_ft, reached_s)?,
        };
        if reached_s > until_s {
            return Err(Rule::NoRoomToReach);
        }
        check_direction(self.day, self.profile, level_ft, begun.filed_s, until_s)?;
        flown.hold_until(until_s);
        let planned_until_s = flown.here().time_s;
        self.fly_return(flown, stretch, until_s)?;
        Ok(StretchTimes {
            filed_from_s: begun.filed_s,
            planned_from_s,
            planned_until_s,
            filed_returned_s: flown.here().filed_s,
        })
    }

    /// Judges the place of a given return.
    fn until(&self, until_s: f64, begun: &Begun) -> Result<f64, Rule> {
        if !(self.profile.start_s()..=self.profile.end_s()).contains(&until_s) {
            return Err(Rule::OutsideFlight);
        }
        if until_s <= begun.filed_s {
            return Err(Rule::EndsBeforeItBegins);
        }
        let leg = self.profile.leg_at(until_s);
        let at_point = self.point_s(leg) == until_s || until_s >= self.profile.end_s();
        let before = if until_s >= self.profile.end_s() { leg } else { leg.saturating_sub(1) };
        if self.is_cruise_leg(leg) || at_point && self.is_cruise_leg(before) {
            Ok(until_s)
        } else {
            Err(Rule::UntilNotInCruise)
        }
    }

    /// Where a return until the descent begins: a lower level is kept until the filed descent
    /// passes it; from a higher one the aircraft is at its filed level at the top of descent.
    fn until_descent(&self, level_ft: f64, reached_s: f64) -> Result<f64, Rule> {
        if self.is_cruise_leg(self.profile.leg_count() - 1) {
            return Err(Rule::EndsInCruise);
        }
        let top = self.cruise.top_of_descent;
        let top_ft = self.profile.points()[top].level_ft;
        if level_ft < top_ft {
            let passed = self.profile.points()[top..]
                .windows(2)
                .find(|w| w[0].level_ft > level_ft && level_ft >= w[1].level_ft)
                .ok_or(Rule::NotPassedInDescent)?;
            let share = (level_ft - passed[0].level_ft) / (passed[1].level_ft - passed[0].level_ft);
            return Ok(passed[0].time_s + share * (passed[1].time_s - passed[0].time_s));
        }
        let rate_fpm = self.rate_fpm(level_ft, top_ft);
        return_start_s(self.profile, reached_s, self.point_s(top), level_ft, top_ft, rate_fpm)
            .ok_or(Rule::NoRoomToReach)
    }

    /// Returns to the level filed at `until_s`, which must end while the filed profile cruises on
    /// at that level.
    fn fly_return(
        &self,
        flown: &mut Flown<'_>,
        stretch: &Stretch,
        until_s: f64,
    ) -> Result<(), Rule> {
        let level_ft = stretch.level_ft;
        let top = self.cruise.top_of_descent;
        if stretch.until_s.is_none() {
            let target_ft = self.profile.points()[top].level_ft;
            if level_ft > target_ft {
                if !flown.change_level(target_ft, self.rate_fpm(level_ft, target_ft)) {
                    return Err(Rule::NoRoomToReturn);
                }
                // The place is found by iteration; it is the top of descent itself.
                if let Some(last) = flown.marks.last_mut() {
                    last.filed_s = self.point_s(top);
                }
            }
            return Ok(());
        }
        let target_ft = self.profile.level_ft_at(until_s);
        if !flown.change_level(target_ft, self.rate_fpm(level_ft, target_ft)) {
            return Err(Rule::NoRoomToReturn);
        }
        let returned_s = flown.here().filed_s;
        let mut leg = self.profile.leg_at(until_s);
        while leg < self.profile.leg_count() && self.point_s(leg) < returned_s {
            let level = self.profile.points()[leg].level_ft;
            if !self.is_cruise_leg(leg) || level != target_ft {
                return Err(Rule::NoRoomToReturn);
            }
            leg += 1;
        }
        Ok(())
    }

    /// Vertical rate of the aircraft class from one level to another, ft/min.
    fn rate_fpm(&self, from_ft: f64, to_ft: f64) -> f64 {
        if to_ft > from_ft { self.class.climb_fpm } else { self.class.descent_fpm }
    }
}

/// Merges the marks with the cuts of the track between them.
fn knots_of(profile: &Profile, track: &Track, marks: &[Mark]) -> Changed {
    let filed = track.knots();
    let (first, last) = (marks[0], marks[marks.len() - 1]);
    let shift_s = to_millisecond(last.time_s - last.filed_s);
    let kept = filed.partition_point(|k| k.filed_s < first.filed_s);
    let mut resume = filed.partition_point(|k| k.filed_s <= last.filed_s);
    let mut knots: Vec<Knot> = Vec::with_capacity(resume - kept + marks.len());
    let mut push = |knot: Knot| match knots.last() {
        Some(before) if knot.time_s <= before.time_s => {}
        _ => knots.push(knot),
    };
    push(on_track(track, first.filed_s, first.time_s, first.level_ft));
    let mut next = kept;
    for w in marks.windows(2) {
        let (a, b) = (w[0], w[1]);
        while filed[next].filed_s <= a.filed_s {
            next += 1;
        }
        while filed[next].filed_s < b.filed_s {
            let cut = filed[next];
            let share = (cut.filed_s - a.filed_s) / (b.filed_s - a.filed_s);
            push(Knot {
                time_s: a.time_s + share * (b.time_s - a.time_s),
                level_ft: a.level_ft + share * (b.level_ft - a.level_ft),
                ..cut
            });
            next += 1;
        }
        push(on_track(track, b.filed_s, b.time_s, b.level_ft));
    }
    // A knot that would fall on its predecessor's time is left out.
    if let Some(end) = knots.last() {
        while resume + 1 < filed.len() && filed[resume].time_s + shift_s <= end.time_s {
            resume += 1;
        }
    }
    Changed { kept, knots, resume, shift_s, off_level_s: off_level_s(profile, marks) }
}

/// The knot of a place on the track, passed at a time and level.
fn on_track(track: &Track, filed_s: f64, time_s: f64, level_ft: f64) -> Knot {
    let piece = track.piece_at(filed_s);
    let (a, b) = (&track.knots()[piece], &track.knots()[piece + 1]);
    Knot::between(a, b, filed_s, time_s, level_ft)
}

/// Intervals of new time between marks of which one is off the level filed at its place.
fn off_level_s(profile: &Profile, marks: &[Mark]) -> Vec<(f64, f64)> {
    let off = |mark: &Mark| (mark.level_ft - profile.level_ft_at(mark.filed_s)).abs() > 1e-6;
    let mut intervals: Vec<(f64, f64)> = Vec::new();
    for w in marks.windows(2).filter(|w| off(&w[0]) || off(&w[1])) {
        match intervals.last_mut() {
            Some(last) if last.1 >= w[0].time_s => last.1 = w[1].time_s,
            _ => intervals.push((w[0].time_s, w[1].time_s)),
        }
    }
    intervals
}
