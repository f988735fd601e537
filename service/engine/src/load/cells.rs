//! Windows and minutes as numbers, series of counts over them, and limits that change in time.

use std::ops::Range;

use crate::units::{SECONDS_PER_DAY, SECONDS_PER_HOUR, SECONDS_PER_MINUTE};

/// Nothing farther than this from 00:00 is counted: filed times lie within three days of the date,
/// and a changed profile that wanders off farther must not cost memory.
const FARTHEST_S: f64 = 20.0 * SECONDS_PER_DAY;

/// One count: one window or minute of one series (a measure at a place). Cells are ordered by
/// place, measure and time.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub struct Cell {
    /// Number of the series.
    pub(super) series: u32,
    /// Number of the window or minute.
    pub(super) index: i32,
}

/// When a measure is counted.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Clock {
    /// In 60-minute windows `[k step, k step + 60 min)`.
    Windows,
    /// At whole minutes.
    Minutes,
}

/// The clock of a day: when the windows and minutes of each number are.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Times {
    step_s: f64,
}

impl Times {
    /// Windows that start at every multiple of `step_s` (a whole number of minutes, at most 60).
    pub(super) fn new(step_s: f64) -> Self {
        Self { step_s }
    }

    /// The windows that hold a time.
    #[must_use]
    pub fn windows_around(&self, time_s: f64) -> Range<i32> {
        if time_s.abs() > FARTHEST_S {
            return 0..0;
        }
        // Quotients may be rounded across a whole number; products of whole numbers are exact.
        let mut first = ((time_s - SECONDS_PER_HOUR) / self.step_s).floor() as i32;
        while self.start_s(Clock::Windows, first) + SECONDS_PER_HOUR <= time_s {
            first += 1;
        }
        let mut last = (time_s / self.step_s).floor() as i32 + 1;
        while self.start_s(Clock::Windows, last) > time_s {
            last -= 1;
        }
        first..last + 1
    }

    /// The windows that share time with a period, and perhaps one more on either side.
    pub(super) fn windows_over(&self, from_s: f64, until_s: f64) -> Range<i32> {
        let near = |time_s: f64| time_s.clamp(-FARTHEST_S, FARTHEST_S);
        self.windows_around(near(from_s)).start..self.windows_around(near(until_s)).end
    }

    /// The whole minutes m with `from_s` ≤ m < `until_s`.
    #[must_use]
    pub fn minutes_within(&self, from_s: f64, until_s: f64) -> Range<i32> {
        let minute = |time_s: f64| {
            (time_s.clamp(-FARTHEST_S, FARTHEST_S) / SECONDS_PER_MINUTE).ceil() as i32
        };
        minute(from_s)..minute(until_s).max(minute(from_s))
    }

    /// The minutes of the slice that starts where the window of that number does.
    pub(super) fn slice_minutes(&self, window: i32) -> Range<i32> {
        let minutes = (self.step_s / SECONDS_PER_MINUTE) as i32;
        window * minutes..(window + 1) * minutes
    }

    /// The slice that holds a minute.
    pub(super) fn slice_of(&self, minute: i32) -> i32 {
        minute.div_euclid((self.step_s / SECONDS_PER_MINUTE) as i32)
    }

    /// When a window or minute starts, seconds of the day.
    pub(super) fn start_s(&self, clock: Clock, index: i32) -> f64 {
        f64::from(index)
            * match clock {
                Clock::Windows => self.step_s,
                Clock::Minutes => SECONDS_PER_MINUTE,
            }
    }

    /// When a window or minute ends, seconds of the day.
    pub(super) fn end_s(&self, clock: Clock, index: i32) -> f64 {
        self.start_s(clock, index)
            + match clock {
                Clock::Windows => SECONDS_PER_HOUR,
                Clock::Minutes => SECONDS_PER_MINUTE,
            }
    }

    /// The numbers next to which a limit may change because a period begins or ends at a time.
    fn indexes_near(&self, clock: Clock, time_s: f64) -> impl Iterator<Item = i32> + use<> {
        let (step_s, reach_s) = match clock {
            Clock::Windows => (self.step_s, SECONDS_PER_HOUR),
            Clock::Minutes => (SECONDS_PER_MINUTE, 0.0),
        };
        [time_s - reach_s, time_s].into_iter().flat_map(move |time_s| {
            let index = (time_s / step_s).floor() as i32;
            (-1..=2).map(move |offset: i32| index.saturating_add(offset))
        })
    }
}

/// A limit that changes in time: each holds from its index up to the next.
#[derive(Debug, Clone, PartialEq, Default)]
pub(super) struct LimitSteps(Vec<(i32, Option<f64>)>);

impl LimitSteps {
    /// The steps of a limit that can change only where one of these times lies.
    pub(super) fn new(
        times: Times,
        clock: Clock,
        changes_s: impl Iterator<Item = f64>,
        limit: impl Fn(i32) -> Option<f64>,
    ) -> Self {
        let mut indexes: Vec<i32> =
            changes_s.flat_map(|time_s| times.indexes_near(clock, time_s)).collect();
        indexes.sort_unstable();
        indexes.dedup();
        let mut steps: Vec<(i32, Option<f64>)> = Vec::new();
        for (index, limit) in indexes.into_iter().map(|index| (index, limit(index))) {
            if steps.last().map_or(limit.is_some(), |(_, before)| *before != limit) {
                steps.push((index, limit));
            }
        }
        Self(steps)
    }

    /// The limit of a window or minute, if there is one.
    pub(super) fn at(&self, index: i32) -> Option<f64> {
        let after = self.0.partition_point(|&(from, _)| from <= index);
        self.0[..after].last().and_then(|&(_, limit)| limit)
    }

    /// Whether there never is a limit.
    pub(super) fn is_empty(&self) -> bool {
        self.0.is_empty()
    }
}

/// Counts of consecutive windows or minutes; zero elsewhere.
#[derive(Debug, Clone, PartialEq, Default)]
pub(super) struct Counts<T> {
    first: i32,
    counts: Vec<T>,
}

impl<T: Copy + Default + std::ops::AddAssign> Counts<T> {
    pub(super) fn at(&self, index: i32) -> T {
        let position = index.checked_sub(self.first).and_then(|p| usize::try_from(p).ok());
        position.and_then(|p| self.counts.get(p)).copied().unwrap_or_default()
    }

    /// Adds to each count of a range, which must be within [`FARTHEST_S`].
    pub(super) fn add(&mut self, range: Range<i32>, amount: T) {
        if range.is_empty() {
            return;
        }
        self.cover(&range);
        let from = (range.start - self.first) as usize;
        for count in &mut self.counts[from..from + range.len()] {
            *count += amount;
        }
    }

    /// Makes place for the counts of a range.
    fn cover(&mut self, range: &Range<i32>) {
        if self.counts.is_empty() {
            self.first = range.start;
        }
        if range.start < self.first {
            // Room to spare, so that counting backwards in time stays cheap.
            let start = range.start - self.counts.len() as i32;
            let missing = (self.first - start) as usize;
            self.counts.splice(0..0, std::iter::repeat_n(T::default(), missing));
            self.first = start;
        }
        let needed = (range.end - self.first) as usize;
        if needed > self.counts.len() {
            self.counts.resize(needed, T::default());
        }
    }

    /// The range outside which every count is zero.
    pub(super) fn range(&self) -> Range<i32> {
        self.first..self.first + self.counts.len() as i32
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn windows_hold_their_start_but_not_their_end() {
        let times = Times::new(1200.0);
        assert_eq!(times.windows_around(0.0), -2..1);
        assert_eq!(times.windows_around(1199.999), -2..1);
        assert_eq!(times.windows_around(1200.0), -1..2);
        assert_eq!(times.windows_around(-1e-9), -3..0);
        // A step that does not divide the hour: 60 minutes hold eight or nine starts of seven.
        let odd = Times::new(420.0);
        for minute in -30..30 {
            for time_s in [f64::from(minute) * 60.0, f64::from(minute) * 60.0 + 17.5] {
                let naive: Vec<i32> = (-100..100)
                    .filter(|&k| {
                        let start_s = f64::from(k) * 420.0;
                        start_s <= time_s && time_s < start_s + 3600.0
                    })
                    .collect();
                assert_eq!(odd.windows_around(time_s).collect::<Vec<_>>(), naive);
            }
        }
        assert!(times.windows_around(1e12).is_empty());
    }

    #[test]
    fn minutes_are_those_from_the_first_time_up_to_the_second() {
        let times = Times::new(1200.0);
        assert_eq!(times.minutes_within(0.0, 60.0), 0..1);
        assert_eq!(times.minutes_within(0.1, 60.0), 1..1);
        assert_eq!(times.minutes_within(-60.0, 60.1), -1..2);
        assert!(times.minutes_within(50.0, 20.0).is_empty());
        assert!(times.minutes_within(1e300, f64::INFINITY).is_empty());
    }

    #[test]
    fn slices_hold_the_minutes_from_one_window_start_to_the_next() {
        let times = Times::new(420.0);
        assert_eq!(times.slice_minutes(-1), -7..0);
        assert_eq!((times.slice_of(-1), times.slice_of(6), times.slice_of(7)), (-1, 0, 1));
    }

    #[test]
    fn counts_grow_both_ways() {
        let mut counts = Counts::<i32>::default();
        counts.add(5..8, 1);
        counts.add(-3..6, 2);
        counts.add(20..21, 4);
        let read: Vec<i32> = (-5..22).map(|i| counts.at(i)).collect();
        let mut naive = vec![0; 27];
        (10..13).for_each(|i| naive[i] += 1);
        (2..11).for_each(|i| naive[i] += 2);
        naive[25] += 4;
        assert_eq!(read, naive);
        assert_eq!((counts.at(i32::MIN), counts.at(i32::MAX)), (0, 0));
    }
}
