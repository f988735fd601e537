//! Counts of traffic, recounted from visits.
//!
//! Every count is kept twice: what is counted for certain, and what may be counted where a
//! crossing lies within a millisecond of an edge. A plan is faulted only where its certain count
//! is above what the filed day and the limit may allow; so a borderline count is left undecided,
//! and how many were is reported.

use std::collections::BTreeMap;

use super::path::Path;
use super::tolerances::COUNT;
use super::visits::{AsFiled, Moment, Visit};
use crate::answer::{LoadMeasure, Place};
use crate::day::{Day, Flight, Policy, period_at, smallest_limit};
use crate::ids::{AirportId, SectorId};
use crate::units::{SECONDS_PER_HOUR, SECONDS_PER_MINUTE};

/// Nothing farther than this from 00:00 is counted, seconds.
const FARTHEST_S: f64 = 20.0 * 86_400.0;
/// Level flight shorter than this does not end a climb or descent, seconds.
const LEVEL_BREAK_S: f64 = 1.0;

/// What is counted where.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub(super) enum Counted {
    Entries(SectorId),
    Occupancy(SectorId),
    LevelChanges(SectorId),
    Arrivals(AirportId),
}

/// What one flown profile adds to counts.
#[derive(Debug, Clone, Default)]
pub(super) struct Traffic {
    /// Visits as counted: near ones joined, short ones dropped; by sector, then time.
    visits: Vec<Visit>,
    /// Climbs and descents begun inside a sector; whether for certain.
    changes: Vec<(SectorId, Moment, bool)>,
    arrival: Option<(AirportId, Moment)>,
}

impl Traffic {
    pub(super) fn new(
        policy: &Policy,
        flight: &Flight,
        path: &Path<'_>,
        raw: &[Visit],
        as_filed: AsFiled,
    ) -> Self {
        let moment = |time_s| match as_filed {
            AsFiled::Yes => Moment::exact(time_s),
            AsFiled::No => Moment::computed(time_s),
        };
        let mut changes = Vec::new();
        for time_s in level_change_starts(path) {
            for visit in raw {
                let slack = |m: Moment| m.within_s;
                let sure = visit.begin.time_s + slack(visit.begin) <= time_s
                    && time_s < visit.end.time_s - slack(visit.end);
                let possible = visit.begin.time_s - slack(visit.begin) <= time_s
                    && time_s < visit.end.time_s + slack(visit.end);
                if possible {
                    changes.push((visit.sector, moment(time_s), sure));
                }
            }
        }
        Self {
            visits: counted_visits(policy, raw),
            changes,
            arrival: flight.arrives_at.map(|airport| (airport, moment(path.end_s()))),
        }
    }

    /// All counts to which it adds one: what, number of the window or minute, whether for certain.
    fn marks(&self, day: &Day, mut mark: impl FnMut(Counted, i64, bool)) {
        let step_s = day.policy.entry_step_s();
        for visit in &self.visits {
            let open = &day.sectors[visit.sector].open;
            let is_open = |time_s| period_at(open, time_s).is_some();
            let Moment { time_s, within_s } = visit.begin;
            let around = [time_s - within_s, time_s, time_s + within_s].map(is_open);
            if around.contains(&true) {
                let sure_open = !around.contains(&false);
                windows(visit.begin, step_s, |w, sure| {
                    mark(Counted::Entries(visit.sector), w, sure && sure_open);
                });
            }
            minutes(visit, |m, sure| {
                if is_open(m as f64 * SECONDS_PER_MINUTE) {
                    mark(Counted::Occupancy(visit.sector), m, sure);
                }
            });
        }
        for &(sector, moment, inside) in &self.changes {
            if period_at(&day.sectors[sector].open, moment.time_s).is_some() {
                windows(moment, step_s, |w, sure| {
                    mark(Counted::LevelChanges(sector), w, sure && inside);
                });
            }
        }
        if let Some((airport, moment)) = self.arrival {
            windows(moment, step_s, |w, sure| mark(Counted::Arrivals(airport), w, sure));
        }
    }
}

/// Visits less than `rejoin_s` apart as one, then those shorter than `min_visit_s` dropped.
fn counted_visits(policy: &Policy, raw: &[Visit]) -> Vec<Visit> {
    let mut joined: Vec<Visit> = Vec::with_capacity(raw.len());
    for &visit in raw {
        match joined.last_mut() {
            Some(last)
                if last.sector == visit.sector
                    && visit.begin.time_s - last.end.time_s < policy.rejoin_s =>
            {
                last.end = visit.end;
            }
            _ => joined.push(visit),
        }
    }
    joined.retain(|v| v.end.time_s - v.begin.time_s >= policy.min_visit_s);
    joined
}

/// When each climb and descent begins; a level part shorter than a second does not end one.
fn level_change_starts(path: &Path<'_>) -> Vec<f64> {
    let mut starts = Vec::new();
    // Whether it climbs, and when it was last seen to.
    let mut under_way: Option<(bool, f64)> = None;
    for ends in path.knots().windows(2) {
        let (a, b) = (ends[0], ends[1]);
        let change_ft = b.level_ft - a.level_ft;
        if change_ft == 0.0 {
            continue;
        }
        let climbs = change_ft > 0.0;
        let goes_on = under_way.is_some_and(|(climbed, until_s)| {
            climbed == climbs && a.time_s - until_s < LEVEL_BREAK_S
        });
        if !goes_on {
            starts.push(a.time_s);
        }
        under_way = Some((climbs, b.time_s));
    }
    starts
}

/// Numbers of the 60-minute windows that hold a moment; window `n` starts at `n * step_s`.
fn windows(moment: Moment, step_s: f64, mut f: impl FnMut(i64, bool)) {
    let Moment { time_s, within_s } = moment;
    let first = ((time_s - within_s - SECONDS_PER_HOUR) / step_s).floor() as i64;
    let last = ((time_s + within_s) / step_s).floor() as i64;
    for n in first..=last {
        let from_s = n as f64 * step_s;
        let until_s = from_s + SECONDS_PER_HOUR;
        if from_s - within_s <= time_s && time_s < until_s + within_s {
            f(n, from_s + within_s <= time_s && time_s < until_s - within_s);
        }
    }
}

/// Numbers of the whole minutes of a visit.
fn minutes(visit: &Visit, mut f: impl FnMut(i64, bool)) {
    let (begin, end) = (visit.begin, visit.end);
    let first = ((begin.time_s - begin.within_s) / SECONDS_PER_MINUTE).floor() as i64;
    let last = ((end.time_s + end.within_s) / SECONDS_PER_MINUTE).ceil() as i64;
    for n in first..=last {
        let time_s = n as f64 * SECONDS_PER_MINUTE;
        if begin.time_s - begin.within_s <= time_s && time_s < end.time_s + end.within_s {
            let sure =
                begin.time_s + begin.within_s <= time_s && time_s < end.time_s - end.within_s;
            f(n, sure);
        }
    }
}

/// A count: for certain, and at most.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub(super) struct Range {
    pub(super) low: i64,
    pub(super) high: i64,
}

impl Range {
    fn add(&mut self, by: i64, sure: bool) {
        self.high += by;
        self.low += if sure { by } else { 0 };
    }
}

/// All counts of one version of a day.
#[derive(Debug, Clone, Default)]
pub(super) struct Counts {
    by: BTreeMap<Counted, Series>,
}

/// Counts of consecutive windows or minutes.
#[derive(Debug, Clone, Default)]
struct Series {
    first: i64,
    counts: Vec<Range>,
}

impl Series {
    fn get(&self, n: i64) -> Range {
        let at = usize::try_from(n - self.first).ok();
        at.and_then(|i| self.counts.get(i)).copied().unwrap_or_default()
    }

    fn add(&mut self, n: i64, by: i64, sure: bool) {
        if self.counts.is_empty() {
            self.first = n;
        }
        if n < self.first {
            let missing = (self.first - n) as usize;
            self.counts.splice(0..0, std::iter::repeat_n(Range::default(), missing));
            self.first = n;
        }
        let at = (n - self.first) as usize;
        if at >= self.counts.len() {
            self.counts.resize(at + 1, Range::default());
        }
        self.counts[at].add(by, sure);
    }
}

impl Counts {
    pub(super) fn add(&mut self, day: &Day, traffic: &Traffic) {
        traffic.marks(day, |what, n, sure| self.by.entry(what).or_default().add(n, 1, sure));
    }

    pub(super) fn remove(&mut self, day: &Day, traffic: &Traffic) {
        traffic.marks(day, |what, n, sure| self.by.entry(what).or_default().add(n, -1, sure));
    }

    fn get(&self, what: Counted, n: i64) -> Range {
        self.by.get(&what).map_or_else(Range::default, |series| series.get(n))
    }
}

/// A count above what is allowed.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Excess {
    pub(super) place: Place,
    pub(super) measure: LoadMeasure,
    pub(super) from_s: f64,
    pub(super) until_s: f64,
    pub(super) count: f64,
    pub(super) filed: f64,
    pub(super) limit: f64,
}

/// How many counts were compared with a limit, and how many of them were too close to an edge.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq)]
pub(super) struct Compared {
    pub(super) windows: u64,
    pub(super) minutes: u64,
    pub(super) undecided: u64,
}

/// What traffic known only as counts adds to each count, filed and planned alike.
#[derive(Debug, Clone, Default)]
struct Background {
    by: BTreeMap<(Counted, i64), f64>,
}

impl Background {
    fn new(day: &Day) -> Self {
        let mut by: BTreeMap<(Counted, i64), f64> = BTreeMap::new();
        let step_s = day.policy.entry_step_s();
        let whole = |s: f64| s.clamp(-FARTHEST_S, FARTHEST_S);
        for row in &day.background {
            let open = &day.sectors[row.sector].open;
            let (from_s, until_s) = (whole(row.from_s), whole(row.until_s));
            let first = (from_s / SECONDS_PER_MINUTE).floor() as i64;
            for m in first..=(until_s / SECONDS_PER_MINUTE).ceil() as i64 {
                let time_s = m as f64 * SECONDS_PER_MINUTE;
                if from_s <= time_s && time_s < until_s && period_at(open, time_s).is_some() {
                    *by.entry((Counted::Occupancy(row.sector), m)).or_default() += row.aircraft;
                }
            }
            let Some(entries) = row.entries else { continue };
            let first = ((from_s - SECONDS_PER_HOUR) / step_s).floor() as i64;
            for w in first..=(until_s / step_s).ceil() as i64 {
                let window_s = w as f64 * step_s;
                let in_window_s: f64 = open
                    .iter()
                    .map(|period| {
                        let begin_s = window_s.max(from_s).max(period.from_s);
                        let end_s = (window_s + SECONDS_PER_HOUR).min(until_s).min(period.until_s);
                        (end_s - begin_s).max(0.0)
                    })
                    .sum();
                if in_window_s > 0.0 {
                    let share = in_window_s / (row.until_s - row.from_s);
                    *by.entry((Counted::Entries(row.sector), w)).or_default() += entries * share;
                }
            }
        }
        Self { by }
    }

    fn at(&self, what: Counted, n: i64) -> f64 {
        if self.by.is_empty() {
            return 0.0;
        }
        self.by.get(&(what, n)).copied().unwrap_or(0.0)
    }
}

/// The filed day beside the planned one.
pub(super) struct Loads<'d> {
    day: &'d Day,
    filed: Counts,
    planned: Counts,
    background: Background,
}

impl<'d> Loads<'d> {
    /// The counts of a day's flights, filed and planned, beside its traffic known only as counts.
    pub(super) fn new(day: &'d Day, filed: Counts, planned: Counts) -> Self {
        Self { day, filed, planned, background: Background::new(day) }
    }
}

impl Loads<'_> {
    /// The limit on a window or minute, `None` where there is none.
    fn limit(&self, what: Counted, n: i64) -> Option<f64> {
        let window_s = n as f64 * self.day.policy.entry_step_s();
        let until_s = window_s + SECONDS_PER_HOUR;
        match what {
            Counted::Entries(id) => {
                let open = &self.day.sectors[id].open;
                smallest_limit(open, window_s, until_s, |l| l.entries_per_hour)
            }
            Counted::LevelChanges(id) => {
                let open = &self.day.sectors[id].open;
                smallest_limit(open, window_s, until_s, |l| l.level_changes_per_hour)
            }
            Counted::Arrivals(id) => {
                let periods = &self.day.airports[id].periods;
                smallest_limit(periods, window_s, until_s, |l| l.arrivals_per_hour)
            }
            Counted::Occupancy(id) => {
                let open = &self.day.sectors[id].open;
                period_at(open, n as f64 * SECONDS_PER_MINUTE)?.limits.occupancy_limit
            }
        }
    }

    fn lasting_limit(&self, sector: SectorId, minute: i64) -> Option<f64> {
        let open = &self.day.sectors[sector].open;
        period_at(open, minute as f64 * SECONDS_PER_MINUTE)?.limits.occupancy_lasting
    }

    /// Whether occupancy exceeds its lasting limit at a minute and at each of the minutes before.
    fn is_lasting(&self, sector: SectorId, minute: i64, count: impl Fn(i64) -> i64) -> bool {
        let before = self.day.policy.lasting_min as i64;
        (minute - before..=minute).all(|m| {
            let more = self.background.at(Counted::Occupancy(sector), m);
            let over = |limit: f64| count(m) as f64 + more > limit + COUNT;
            self.lasting_limit(sector, m).is_some_and(over)
        })
    }

    /// Everything in which the plan is worse than it may be.
    pub(super) fn excesses(&self, compared: &mut Compared) -> Vec<Excess> {
        let mut found = Vec::new();
        for (&what, series) in &self.planned.by {
            let mut runs = Runs::default();
            let mut lasting = Runs::default();
            for (i, &planned) in series.counts.iter().enumerate() {
                let n = series.first + i as i64;
                let filed = self.filed.get(what, n);
                // Limits are for all traffic, so what others take of them is taken off first.
                let more = self.background.at(what, n);
                if let Some(limit) = self.limit(what, n).filter(|_| planned.high > 0) {
                    match what {
                        Counted::Occupancy(_) => compared.minutes += 1,
                        _ => compared.windows += 1,
                    }
                    if exceeds(planned.low, filed.high, limit - more) {
                        runs.add(n, planned.low, filed.high, more, limit);
                    } else if exceeds(planned.high, filed.low, limit - more) {
                        compared.undecided += 1;
                    }
                }
                if let Counted::Occupancy(sector) = what {
                    let planned_low = |m| series.get(m).low;
                    let filed_high = |m| self.filed.get(what, m).high;
                    let limit = self.lasting_limit(sector, n);
                    if let Some(limit) = limit
                        && self.is_lasting(sector, n, planned_low)
                        && !(self.is_lasting(sector, n, filed_high) && filed.high >= planned.low)
                    {
                        lasting.add(n, planned.low, filed.high, more, limit);
                    }
                }
            }
            found.extend(runs.excesses(self.day, what, Duration::Once));
            found.extend(lasting.excesses(self.day, what, Duration::Lasting));
        }
        found
    }

    /// Whether one flight's profile can take the place of its present one for certain, as far as
    /// counts go.
    pub(super) fn has_room(&self, present: &Traffic, instead: &Traffic) -> bool {
        let mut change: BTreeMap<(Counted, i64), Range> = BTreeMap::new();
        let mut mark = |traffic: &Traffic, by| {
            traffic.marks(self.day, |what, n, sure| {
                change.entry((what, n)).or_default().add(by, sure);
            });
        };
        mark(present, -1);
        mark(instead, 1);
        let high = |what: Counted, n: i64| {
            let by = change.get(&(what, n)).copied().unwrap_or_default();
            self.planned.get(what, n).high + by.high
        };
        change.iter().filter(|(_, by)| by.high > 0 || by.low > 0).all(|(&(what, n), _)| {
            let filed = self.filed.get(what, n);
            let more = self.background.at(what, n);
            let over = |limit: f64| exceeds(high(what, n), filed.low, limit - more);
            let within = !self.limit(what, n).is_some_and(over);
            within && self.has_lasting_room(what, n, |m| high(what, m))
        })
    }

    /// Whether a greater occupancy at a minute makes no lasting overload, now or later.
    fn has_lasting_room(&self, what: Counted, minute: i64, high: impl Fn(i64) -> i64) -> bool {
        let Counted::Occupancy(sector) = what else { return true };
        if self.lasting_limit(sector, minute).is_none() {
            return true;
        }
        let filed_low = |m: i64| self.filed.get(what, m).low;
        (minute..=minute + self.day.policy.lasting_min as i64).all(|m| {
            !self.is_lasting(sector, m, &high)
                || (self.is_lasting(sector, m, filed_low) && filed_low(m) >= high(m))
        })
    }
}

/// No worse: at most the larger of the limit and the filed count.
fn exceeds(planned: i64, filed: i64, limit: f64) -> bool {
    planned as f64 > limit.max(filed as f64) + COUNT
}

#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Duration {
    Once,
    Lasting,
}

/// Runs of consecutive windows or minutes, each with its worst count.
#[derive(Debug, Default)]
struct Runs {
    runs: Vec<Run>,
}

#[derive(Debug)]
struct Run {
    first: i64,
    last: i64,
    count: f64,
    filed: f64,
    limit: f64,
}

impl Runs {
    fn add(&mut self, n: i64, count: i64, filed: i64, more: f64, limit: f64) {
        let (count, filed) = (count as f64 + more, filed as f64 + more);
        match self.runs.last_mut() {
            Some(run) if run.last + 1 == n => {
                run.last = n;
                if count > run.count {
                    (run.count, run.filed, run.limit) = (count, filed, limit);
                }
            }
            _ => self.runs.push(Run { first: n, last: n, count, filed, limit }),
        }
    }

    fn excesses(
        self,
        day: &Day,
        what: Counted,
        duration: Duration,
    ) -> impl Iterator<Item = Excess> {
        let (place, measure, step_s, length_s) = match what {
            Counted::Entries(id) => (
                Place::Sector(id),
                LoadMeasure::Entries,
                day.policy.entry_step_s(),
                SECONDS_PER_HOUR,
            ),
            Counted::LevelChanges(id) => (
                Place::Sector(id),
                LoadMeasure::LevelChanges,
                day.policy.entry_step_s(),
                SECONDS_PER_HOUR,
            ),
            Counted::Arrivals(id) => (
                Place::Airport(id),
                LoadMeasure::Arrivals,
                day.policy.entry_step_s(),
                SECONDS_PER_HOUR,
            ),
            Counted::Occupancy(id) => {
                let measure = match duration {
                    Duration::Once => LoadMeasure::Occupancy,
                    Duration::Lasting => LoadMeasure::Lasting,
                };
                (Place::Sector(id), measure, SECONDS_PER_MINUTE, SECONDS_PER_MINUTE)
            }
        };
        self.runs.into_iter().map(move |run| Excess {
            place,
            measure,
            from_s: run.first as f64 * step_s,
            until_s: run.last as f64 * step_s + length_s,
            count: run.count,
            filed: run.filed,
            limit: run.limit,
        })
    }
}
