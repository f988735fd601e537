//! Sectors and airports of a built day, and when which limit holds.

use crate::geometry::polygon::Polygon;

/// One sector: the union of its volumes.
#[derive(Debug, Clone, PartialEq)]
pub struct Sector {
    /// Unique name.
    pub name: String,
    /// A longer name for people, if any.
    pub title: Option<String>,
    /// At least one volume.
    pub volumes: Vec<Volume>,
    /// The sector's own horizontal minimum, NM.
    pub horizontal_nm: Option<f64>,
    /// Whether a flight may not be off its filed level here.
    pub no_changes: bool,
    /// When it is open, in time order, without overlap; empty: never.
    pub open: Vec<Period<SectorLimits>>,
}

/// A polygon with a floor and a ceiling.
#[derive(Debug, Clone, PartialEq)]
pub struct Volume {
    /// Its outline.
    pub polygon: Polygon,
    /// Lowest level inside, feet.
    pub floor_ft: f64,
    /// Lowest level above, feet.
    pub ceiling_ft: f64,
}

/// A half-open period `[from, until)` with its limits.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Period<L> {
    /// Start, seconds of the day.
    pub from_s: f64,
    /// End (not included), seconds of the day.
    pub until_s: f64,
    /// What holds then.
    pub limits: L,
}

/// Limits of a sector; `None` is no limit.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct SectorLimits {
    /// Most entries in a 60-minute window.
    pub entries_per_hour: Option<f64>,
    /// Most flights inside at a whole minute.
    pub occupancy_limit: Option<f64>,
    /// Most flights inside for longer than `lasting_min`.
    pub occupancy_lasting: Option<f64>,
    /// Most climbs and descents begun inside in a 60-minute window.
    pub level_changes_per_hour: Option<f64>,
}

/// An airport whose arrivals and departures are counted.
#[derive(Debug, Clone, PartialEq)]
pub struct Airport {
    /// Its code.
    pub code: String,
    /// A longer name for people, if any.
    pub title: Option<String>,
    /// Longitude, degrees.
    pub lon_deg: f64,
    /// Latitude, degrees.
    pub lat_deg: f64,
    /// Capacity periods, in time order, without overlap.
    pub periods: Vec<Period<AirportLimits>>,
}

/// Limits of an airport; `None` is no limit.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct AirportLimits {
    /// Most arrivals in a 60-minute window.
    pub arrivals_per_hour: Option<f64>,
    /// Most departures in a 60-minute window; shown, never binding.
    pub departures_per_hour: Option<f64>,
}

impl<L> Period<L> {
    /// Whether it holds at a time.
    #[must_use]
    pub fn contains(&self, time_s: f64) -> bool {
        self.from_s <= time_s && time_s < self.until_s
    }

    /// Whether it shares any time with `[from_s, until_s)`.
    #[must_use]
    pub fn overlaps(&self, from_s: f64, until_s: f64) -> bool {
        self.from_s < until_s && from_s < self.until_s
    }
}

/// The period that holds at a time, of periods in time order without overlap.
#[must_use]
pub fn period_at<L>(periods: &[Period<L>], time_s: f64) -> Option<&Period<L>> {
    let after = periods.partition_point(|p| p.from_s <= time_s);
    periods[..after].last().filter(|p| time_s < p.until_s)
}

/// The smallest limit in force at any time of `[from_s, until_s)`; `None` where none is.
pub fn smallest_limit<L>(
    periods: &[Period<L>],
    from_s: f64,
    until_s: f64,
    limit: impl Fn(&L) -> Option<f64>,
) -> Option<f64> {
    periods
        .iter()
        .filter(|p| p.overlaps(from_s, until_s))
        .filter_map(|p| limit(&p.limits))
        .min_by(f64::total_cmp)
}

impl Sector {
    /// Whether it is open at a time.
    #[must_use]
    pub fn is_open(&self, time_s: f64) -> bool {
        period_at(&self.open, time_s).is_some()
    }

    /// Whether it is ever open.
    #[must_use]
    pub fn ever_opens(&self) -> bool {
        !self.open.is_empty()
    }
}
