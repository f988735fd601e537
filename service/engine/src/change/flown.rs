//! A filed profile flown anew: where along the track, when, and at which level.

use crate::air::isa::speed_of_sound_at_mps;
use crate::day::Profile;
use crate::units::SECONDS_PER_MINUTE;

/// Highest step between two points of a transition, feet.
const STEP_FT: f64 = 1000.0;
/// Rounds of the fixed-point iterations below: each gains at least two digits.
const ROUNDS: usize = 8;

/// A place along the track, when it is now passed, and at which level.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Mark {
    /// Filed time of the place.
    pub(super) filed_s: f64,
    /// New time of the place.
    pub(super) time_s: f64,
    /// New level there.
    pub(super) level_ft: f64,
}

/// Flies along a filed profile, leaving a mark wherever ground speed or vertical rate changes.
#[derive(Debug)]
pub(super) struct Flown<'a> {
    pub(super) profile: &'a Profile,
    pub(super) marks: Vec<Mark>,
}

impl<'a> Flown<'a> {
    /// Starts as filed at a place.
    pub(super) fn start(profile: &'a Profile, filed_s: f64, level_ft: f64) -> Self {
        Self { profile, marks: vec![Mark { filed_s, time_s: filed_s, level_ft }] }
    }

    /// Where the aircraft is now.
    pub(super) fn here(&self) -> Mark {
        self.marks[self.marks.len() - 1]
    }

    fn mark(&mut self, filed_s: f64, time_s: f64, level_ft: f64) {
        let here = self.here();
        if filed_s > here.filed_s {
            self.marks.push(Mark { filed_s, time_s, level_ft });
        }
    }

    /// Stays at the present level up to a place.
    pub(super) fn hold_until(&mut self, until_s: f64) {
        while self.here().filed_s < until_s {
            let here = self.here();
            let leg = self.profile.leg_at(here.filed_s);
            let end_s = self.profile.points()[leg + 1].time_s.min(until_s);
            let time_s = here.time_s + (end_s - here.filed_s) * self.slowness(leg, here.level_ft);
            self.mark(end_s, time_s, here.level_ft);
        }
    }

    /// Follows the filed profile, level included, up to a place.
    pub(super) fn follow_until(&mut self, until_s: f64) {
        while self.here().filed_s < until_s {
            let here = self.here();
            let leg = self.profile.leg_at(here.filed_s);
            let end_s = self.profile.points()[leg + 1].time_s.min(until_s);
            let level_ft = self.profile.level_ft_at(end_s);
            self.mark(end_s, here.time_s + (end_s - here.filed_s), level_ft);
        }
    }

    /// Climbs or descends to a level at a rate; `false` if the profile ends before it is reached.
    pub(super) fn change_level(&mut self, target_ft: f64, rate_fpm: f64) -> bool {
        let left_ft = self.here().level_ft;
        let step_ft = if target_ft > left_ft { STEP_FT } else { -STEP_FT };
        let steps = ((target_ft - left_ft).abs() / STEP_FT).ceil() as usize;
        for step in 1..=steps {
            // Counted from the level that was left, so that a filed point in mid-step does not
            // move the later ones; the last step ends on the very level.
            let next_ft = if step == steps { target_ft } else { left_ft + step as f64 * step_ft };
            while self.here().level_ft != next_ft {
                if !self.climb_towards(next_ft, rate_fpm) {
                    return false;
                }
            }
        }
        true
    }

    /// Climbs or descends to a level at most a step away, or up to the next filed point.
    fn climb_towards(&mut self, next_ft: f64, rate_fpm: f64) -> bool {
        let here = self.here();
        let leg = self.profile.leg_at(here.filed_s);
        let leg_end_s = self.profile.points()[leg + 1].time_s;
        if here.filed_s >= leg_end_s {
            return false;
        }
        let rate_fps = (next_ft - here.level_ft).signum() * rate_fpm / SECONDS_PER_MINUTE;
        let duration_s = (next_ft - here.level_ft) / rate_fps;
        let slowness = self.slowness(leg, 0.5 * (here.level_ft + next_ft));
        let filed_s = here.filed_s + duration_s / slowness;
        if filed_s <= leg_end_s {
            self.marks.push(Mark { filed_s, time_s: here.time_s + duration_s, level_ft: next_ft });
            return true;
        }
        // The middle level of the shortened step depends on how long it takes, by a little.
        let mut duration_s = leg_end_s - here.filed_s;
        for _ in 0..ROUNDS {
            let middle_ft = here.level_ft + 0.5 * duration_s * rate_fps;
            duration_s = (leg_end_s - here.filed_s) * self.slowness(leg, middle_ft);
        }
        let level_ft = here.level_ft + duration_s * rate_fps;
        self.marks.push(Mark { filed_s: leg_end_s, time_s: here.time_s + duration_s, level_ft });
        true
    }

    /// New over filed duration on a leg at a level: constant Mach number on level legs, constant
    /// ground speed where the filed profile climbs or descends. A leg of no length keeps its
    /// duration.
    fn slowness(&self, leg: usize, level_ft: f64) -> f64 {
        let (a, b) = (&self.profile.points()[leg], &self.profile.points()[leg + 1]);
        let level_leg = a.level_ft == b.level_ft;
        let stands = a.lon_deg == b.lon_deg && a.lat_deg == b.lat_deg;
        if !level_leg || stands || a.level_ft == level_ft {
            return 1.0;
        }
        speed_of_sound_at_mps(a.level_ft) / speed_of_sound_at_mps(level_ft)
    }
}

/// The place at which a return must begin in order to end at `end_s`, or `None` where the profile
/// has no room for it after `from`.
pub(super) fn return_start_s(
    profile: &Profile,
    from_s: f64,
    end_s: f64,
    level_ft: f64,
    target_ft: f64,
    rate_fpm: f64,
) -> Option<f64> {
    let mut start_s = end_s - (level_ft - target_ft).abs() / rate_fpm * SECONDS_PER_MINUTE;
    for _ in 0..ROUNDS {
        if start_s < from_s {
            return None;
        }
        let mut trial = Flown::start(profile, start_s, level_ft);
        if !trial.change_level(target_ft, rate_fpm) {
            start_s -= 1.0;
            continue;
        }
        start_s -= trial.here().filed_s - end_s;
    }
    (start_s >= from_s).then_some(start_s)
}
