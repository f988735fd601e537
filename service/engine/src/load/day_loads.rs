//! The counts and limits of the filed day, and how a changed flight would alter the counts.

use super::allowed::{allowed, room};
use super::background;
use super::cells::{Cell, Clock, Counts, LimitSteps, Times};
use super::flight_load::FlightLoad;
use super::lasting::Lasting;
use super::measure::{MEASURES, Measure, Places};
use crate::answer::{LoadMeasure, Place};
use crate::day::{Day, Period};
use crate::ids::{AirportId, SectorId};

/// By how much a count changes.
pub type Difference = (Cell, i32);

/// Of which cells differences are wanted.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Which {
    /// Those with a limit that binds, a lasting one included.
    Binding,
    /// All.
    All,
}

/// The counts of the filed day, their limits, and what a plan may make of them.
#[derive(Debug, Clone)]
pub struct DayLoads {
    times: Times,
    layout: Layout,
    series: Vec<Series>,
}

/// One measure at one place.
#[derive(Debug, Clone)]
pub(super) struct Series {
    pub(super) place: Place,
    /// Position in [`MEASURES`].
    measure: usize,
    pub(super) limits: LimitSteps,
    /// What limits how long an occupancy may last; empty for other measures.
    pub(super) lasting: Lasting,
    /// Flights, and traffic known only as counts, of the filed day.
    pub(super) filed: Counts<f64>,
}

impl Series {
    pub(super) fn measure(&self) -> &'static dyn Measure {
        MEASURES[self.measure]
    }

    pub(super) fn kind(&self) -> LoadMeasure {
        self.measure().kind()
    }

    pub(super) fn clock(&self) -> Clock {
        self.measure().clock()
    }

    /// The limit that a plan must keep in a window or at a minute, if there is one.
    pub(super) fn binding_limit(&self, index: i32) -> Option<f64> {
        self.limits.at(index).filter(|_| self.measure().binds())
    }

    /// The largest count that a plan may have there, if it is limited.
    pub(super) fn allowed(&self, index: i32) -> Option<f64> {
        self.binding_limit(index).map(|limit| allowed(limit, self.filed.at(index)))
    }
}

/// Series are numbered by place (sectors, then airports), then in the order of [`MEASURES`].
#[derive(Debug, Clone, Copy)]
struct Layout {
    /// Position of each measure among those of its kind of place.
    ranks: [u32; MEASURES.len()],
    sector_measures: u32,
    airport_measures: u32,
    sectors: u32,
}

impl Layout {
    fn new(day: &Day) -> Self {
        let mut ranks = [0; MEASURES.len()];
        let (mut sector_measures, mut airport_measures) = (0, 0);
        for (rank, measure) in ranks.iter_mut().zip(MEASURES) {
            let next = match measure.places() {
                Places::Sectors => &mut sector_measures,
                Places::Airports => &mut airport_measures,
            };
            *rank = *next;
            *next += 1;
        }
        let sectors = day.sectors.len() as u32;
        Self { ranks, sector_measures, airport_measures, sectors }
    }

    fn series(&self, measure: usize, place: Place) -> u32 {
        self.ranks[measure]
            + match place {
                Place::Sector(SectorId(sector)) => sector * self.sector_measures,
                Place::Airport(AirportId(airport)) => {
                    self.sectors * self.sector_measures + airport * self.airport_measures
                }
            }
    }
}

impl DayLoads {
    /// Counts the filed versions of a day's flights.
    #[must_use]
    pub fn new(day: &Day, filed: &[FlightLoad]) -> Self {
        let mut loads = Self::without_traffic(day);
        for load in filed {
            for (number, measure) in MEASURES.iter().enumerate() {
                measure.count(day, loads.times, load, &mut |place, range| {
                    let series = loads.layout.series(number, place) as usize;
                    loads.series[series].filed.add(range, 1.0);
                });
            }
        }
        // Before lasting overloads are looked for: it counts in filed and planned alike.
        background::count(day, loads.times, &mut |kind, place, range, amount| {
            if let Some(number) = MEASURES.iter().position(|measure| measure.kind() == kind) {
                let series = loads.layout.series(number, place) as usize;
                loads.series[series].filed.add(range, amount);
            }
        });
        for series in &mut loads.series {
            let filed = &series.filed;
            series.lasting.find_filed(filed.range(), |minute| filed.at(minute));
        }
        loads
    }

    fn without_traffic(day: &Day) -> Self {
        let times = Times::new(day.policy.entry_step_s());
        let sectors = day.sectors.ids().map(Place::Sector);
        let airports = day.airports.ids().map(Place::Airport);
        let mut series = Vec::new();
        for place in sectors.chain(airports) {
            for (number, measure) in MEASURES.iter().enumerate() {
                if measure.places() == places_of(place) {
                    series.push(empty_series(day, times, place, number));
                }
            }
        }
        Self { times, layout: Layout::new(day), series }
    }

    /// Where a cell is counted.
    #[must_use]
    pub fn place(&self, cell: Cell) -> Place {
        self.series(cell).place
    }

    /// What a cell counts.
    #[must_use]
    pub fn measure(&self, cell: Cell) -> LoadMeasure {
        self.series(cell).kind()
    }

    /// When the window or minute of a cell starts, seconds of the day.
    #[must_use]
    pub fn start_s(&self, cell: Cell) -> f64 {
        self.times.start_s(self.series(cell).clock(), cell.index)
    }

    /// When it ends, seconds of the day; a minute 60 s after it starts.
    #[must_use]
    pub fn end_s(&self, cell: Cell) -> f64 {
        self.times.end_s(self.series(cell).clock(), cell.index)
    }

    /// The count of the filed day.
    #[must_use]
    pub fn filed(&self, cell: Cell) -> f64 {
        self.series(cell).filed.at(cell.index)
    }

    /// The limit in force, if there is one; departures have one that binds no plan.
    #[must_use]
    pub fn limit(&self, cell: Cell) -> Option<f64> {
        self.series(cell).limits.at(cell.index)
    }

    /// The largest count that a plan may have: the larger of the limit and the filed count; `None`
    /// where there is no limit that binds.
    #[must_use]
    pub fn allowed(&self, cell: Cell) -> Option<f64> {
        self.series(cell).allowed(cell.index)
    }

    /// How many flights a plan may add to the filed count; `None` where no limit binds.
    #[must_use]
    pub fn slack(&self, cell: Cell) -> Option<i64> {
        self.allowed(cell).map(|most| room(self.filed(cell), most))
    }

    /// By how much the counts change, by rising cell, where a flight is `changed` instead of
    /// `before`.
    #[must_use]
    pub fn differences(
        &self,
        day: &Day,
        before: &FlightLoad,
        changed: &FlightLoad,
        which: Which,
    ) -> Vec<Difference> {
        // Each range is noted by its two ends; a sweep then adds up what is under way.
        let mut ends: Vec<Difference> = Vec::new();
        for (load, amount) in [(before, -1), (changed, 1)] {
            for (number, measure) in MEASURES.iter().enumerate() {
                measure.count(day, self.times, load, &mut |place, range| {
                    if !range.is_empty() {
                        let series = self.layout.series(number, place);
                        ends.push((Cell { series, index: range.start }, amount));
                        ends.push((Cell { series, index: range.end }, -amount));
                    }
                });
            }
        }
        ends.sort_unstable();
        self.sweep(&ends, which)
    }

    fn sweep(&self, ends: &[Difference], which: Which) -> Vec<Difference> {
        let mut differences = Vec::new();
        let mut sum = 0;
        for (position, &(cell, amount)) in ends.iter().enumerate() {
            sum += amount;
            if sum == 0 {
                continue;
            }
            // A series in which something is under way has a later end.
            let Some(&(next, _)) = ends.get(position + 1) else { break };
            let cells = (cell.index..next.index).map(|index| Cell { index, ..cell });
            let wanted = cells.filter(|&cell| which == Which::All || self.binds(cell));
            differences.extend(wanted.map(|cell| (cell, sum)));
        }
        differences
    }

    /// Whether a count is limited at all, lasting limits included.
    fn binds(&self, cell: Cell) -> bool {
        let series = self.series(cell);
        series.binding_limit(cell.index).is_some() || series.lasting.limit(cell.index).is_some()
    }

    pub(super) fn times(&self) -> Times {
        self.times
    }

    pub(super) fn series(&self, cell: Cell) -> &Series {
        &self.series[cell.series as usize]
    }

    /// Every series with its number.
    pub(super) fn all_series(&self) -> impl Iterator<Item = (u32, &Series)> {
        self.series.iter().enumerate().map(|(number, series)| (number as u32, series))
    }
}

fn places_of(place: Place) -> Places {
    match place {
        Place::Sector(_) => Places::Sectors,
        Place::Airport(_) => Places::Airports,
    }
}

fn empty_series(day: &Day, times: Times, place: Place, number: usize) -> Series {
    let measure = MEASURES[number];
    let clock = measure.clock();
    let changes_s = limit_changes_s(day, place);
    let limits = LimitSteps::new(times, clock, changes_s.iter().copied(), |index| {
        measure.limit(day, place, times.start_s(clock, index), times.end_s(clock, index))
    });
    let lasting = match (measure.kind(), place) {
        (LoadMeasure::Occupancy, Place::Sector(sector)) => {
            Lasting::new(&day.sectors[sector], times, day.policy.lasting_min as i32)
        }
        _ => Lasting::default(),
    };
    Series { place, measure: number, limits, lasting, filed: Counts::default() }
}

/// When the limits of a place may change.
fn limit_changes_s(day: &Day, place: Place) -> Vec<f64> {
    fn ends<L>(periods: &[Period<L>]) -> Vec<f64> {
        periods.iter().flat_map(|p| [p.from_s, p.until_s]).collect()
    }
    match place {
        Place::Sector(sector) => ends(&day.sectors[sector].open),
        Place::Airport(airport) => ends(&day.airports[airport].periods),
    }
}
