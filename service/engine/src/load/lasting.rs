//! How long a sector may be fuller than its lasting limit.
//!
//! A lasting overload at minute m: the occupancy is above `occupancy_lasting` at m and at each of
//! the `lasting_min` minutes before it, each time by the limit then in force. A plan may have one
//! only where the filed day has one at m with at least the plan's count.

use std::ops::Range;

use super::allowed::{allowed, exceeds, room};
use super::cells::{Cell, Clock, LimitSteps, Times};
use super::day_loads::DayLoads;
use crate::day::{Sector, period_at};

/// The lasting limits of one sector, and where the filed day breaks them.
#[derive(Debug, Clone, PartialEq, Default)]
pub(super) struct Lasting {
    limits: LimitSteps,
    minutes_before: i32,
    /// Minutes with a lasting overload in the filed day, rising.
    filed: Vec<i32>,
}

impl Lasting {
    pub(super) fn new(sector: &Sector, times: Times, minutes_before: i32) -> Self {
        let changes_s = sector.open.iter().flat_map(|p| [p.from_s, p.until_s]);
        let limits = LimitSteps::new(times, Clock::Minutes, changes_s, |minute| {
            let minute_s = times.start_s(Clock::Minutes, minute);
            period_at(&sector.open, minute_s)?.limits.occupancy_lasting
        });
        Self { limits, minutes_before, filed: Vec::new() }
    }

    /// Notes the lasting overloads of the filed day, all of whose traffic is in `range`.
    pub(super) fn find_filed(&mut self, range: Range<i32>, count: impl Fn(i32) -> f64) {
        self.filed = self.overloads(range, count);
    }

    /// The minutes with a lasting overload, rising, where all traffic is in `range`.
    pub(super) fn overloads(&self, range: Range<i32>, count: impl Fn(i32) -> f64) -> Vec<i32> {
        let mut found = Vec::new();
        if self.limits.is_empty() {
            return found;
        }
        // Limits are not negative: without traffic nothing is above them.
        let mut minutes_above = 0;
        for minute in range {
            let above = self.limit(minute).is_some_and(|limit| exceeds(count(minute), limit));
            minutes_above = if above { minutes_above + 1 } else { 0 };
            if minutes_above > self.minutes_before {
                found.push(minute);
            }
        }
        found
    }

    /// The minute itself and those before it that must all be over for a lasting overload.
    fn run(&self, minute: i32) -> std::ops::RangeInclusive<i32> {
        minute - self.minutes_before..=minute
    }

    /// The minutes at which a count added at `minute` may make an overload last.
    pub(super) fn touched_by(&self, minute: i32) -> Range<i32> {
        minute..minute + self.minutes_before + 1
    }

    /// The limit at a minute, if there is one.
    pub(super) fn limit(&self, minute: i32) -> Option<f64> {
        self.limits.at(minute)
    }

    /// Whether there never is a limit.
    pub(super) fn is_empty(&self) -> bool {
        self.limits.is_empty()
    }

    /// The most that a plan may count at a minute at which its overload lasts.
    pub(super) fn allowed(&self, minute: i32, limit: f64, filed: f64) -> f64 {
        if self.filed.binary_search(&minute).is_ok() { allowed(limit, filed) } else { limit }
    }

    /// The best that any minute of the run does: the largest of allowed count less count, where the
    /// counts of the minutes before must be within the limit and that of the minute itself within
    /// what is allowed. Negative: a lasting overload that is not allowed. `None`: not limited.
    pub(super) fn room(&self, minute: i32, filed: f64, count: impl Fn(i32) -> f64) -> Option<f64> {
        let mut most = f64::NEG_INFINITY;
        for m in self.run(minute) {
            let limit = self.limit(m)?;
            let bound = if m == minute { self.allowed(m, limit, filed) } else { limit };
            most = most.max(bound - count(m));
        }
        Some(most)
    }
}

/// What a plan must keep so that no overload lasts at one minute: the additions to at least one of
/// these cells stay within its slack.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct LastingRule {
    /// The minute.
    pub minute: Cell,
    /// Occupancy cells, by time, and how many flights a plan may add to each to meet the rule by
    /// it (negative: so many must leave).
    pub alternatives: Vec<(Cell, i64)>,
}

impl DayLoads {
    /// The lasting rules that additions may break, by rising minute. `most_added` lists the cells
    /// that changes add to, rising, with the most that they can add in sum; rules that hold
    /// whatever is chosen are left out.
    #[must_use]
    pub fn lasting_rules_touching(&self, most_added: &[(Cell, i64)]) -> Vec<LastingRule> {
        let most_added_to = |cell: Cell| {
            let found = most_added.binary_search_by_key(&cell, |&(cell, _)| cell);
            found.map_or(0, |position| most_added[position].1.max(0))
        };
        let mut rules = Vec::new();
        let mut next: Option<Cell> = None;
        for &(cell, _) in most_added.iter().filter(|&&(_, most)| most > 0) {
            for index in self.series(cell).lasting.touched_by(cell.index) {
                let minute = Cell { index, ..cell };
                if next.is_some_and(|next| minute < next) {
                    continue;
                }
                next = Some(Cell { index: index + 1, ..cell });
                if let Some(rule) = self.lasting_rule(minute)
                    && rule.alternatives.iter().all(|&(c, slack)| slack < most_added_to(c))
                {
                    rules.push(rule);
                }
            }
        }
        rules
    }

    /// The lasting rule at a minute of an occupancy; `None` where a limit is missing at it or at
    /// one of the minutes before.
    #[must_use]
    pub fn lasting_rule(&self, minute: Cell) -> Option<LastingRule> {
        let series = self.series(minute);
        let lasting = &series.lasting;
        if lasting.is_empty() {
            return None;
        }
        let mut alternatives = Vec::with_capacity(lasting.minutes_before as usize + 1);
        for index in lasting.run(minute.index) {
            let (limit, filed) = (lasting.limit(index)?, series.filed.at(index));
            let most =
                if index == minute.index { lasting.allowed(index, limit, filed) } else { limit };
            alternatives.push((Cell { index, ..minute }, room(filed, most)));
        }
        Some(LastingRule { minute, alternatives })
    }
}
