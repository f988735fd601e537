//! A day with its indexes built: what every question reads, and none changes.

use std::sync::Arc;

use rayon::prelude::*;

use crate::answer::{Loss, Rule};
use crate::change::Change;
use crate::day::{Day, Flight};
use crate::ids::{FlightId, Id, IdVec, SectorId};
use crate::load::{DayLoads, FlightLoad, RestrictionIndex, SectorIndex, Visit};
use crate::path::{Changed, Path, Track};
use crate::separation::{HorizontalMinimum, Scene, Version};

/// A day with its indexes.
#[derive(Debug, Clone)]
pub struct Traffic {
    /// The day.
    pub day: Day,
    /// The ground track of every flight.
    pub tracks: Arc<IdVec<FlightId, Track>>,
    /// Where sectors are.
    pub sectors: SectorIndex,
    /// Where restrictions are.
    pub restrictions: RestrictionIndex,
    /// What every filed flight is counted for.
    pub filed: IdVec<FlightId, FlightLoad>,
    /// What the filed day counts.
    pub loads: Arc<DayLoads>,
    /// Where the filed flights are, and their losses.
    pub scene: Scene,
    /// Whether any sector sets a horizontal minimum of its own.
    own_minima: bool,
    /// Whether any sector allows no changes.
    closed_to_changes: bool,
}

/// A version of a flight with the minima of the sectors on its way.
#[derive(Debug, Clone, PartialEq)]
pub struct VersionMinima(Vec<HorizontalMinimum>);

impl Traffic {
    /// Builds the indexes of a day.
    #[must_use]
    pub fn new(day: Day) -> Self {
        let flights = day.flights.as_slice();
        let tracks: Vec<Track> = flights.par_iter().map(|f| Track::new(&f.profile)).collect();
        let tracks: Arc<IdVec<FlightId, Track>> = Arc::new(tracks.into());
        let sectors = SectorIndex::new(&day);
        let restrictions = RestrictionIndex::new(&day);
        let own_minima = day.sectors.iter().any(|s| s.horizontal_nm.is_some());
        let closed_to_changes = day.sectors.iter().any(|s| s.no_changes);
        let filed: Vec<FlightLoad> = (0..flights.len())
            .into_par_iter()
            .map(|i| {
                let path = Path::filed(&tracks[FlightId::from_index(i)]);
                sectors.flight_load(&path, &flights[i], &day)
            })
            .collect();
        let loads = Arc::new(DayLoads::new(&day, &filed));
        let minima: Vec<Vec<HorizontalMinimum>> = if own_minima {
            let minima_of = |track| minima_on(&day, &sectors.inside(&Path::filed(track)));
            tracks.as_slice().par_iter().map(minima_of).collect()
        } else {
            Vec::new()
        };
        let scene = Scene::new(&day, Arc::clone(&tracks), minima.into());
        let filed = filed.into();
        Self {
            day,
            tracks,
            sectors,
            restrictions,
            filed,
            loads,
            scene,
            own_minima,
            closed_to_changes,
        }
    }

    /// The flight of an id.
    #[must_use]
    pub fn flight(&self, id: FlightId) -> &Flight {
        &self.day.flights[id]
    }

    /// The path of a flight, filed or changed.
    #[must_use]
    pub fn path<'a>(&'a self, flight: FlightId, changed: Option<&'a Changed>) -> Path<'a> {
        Path::new(&self.tracks[flight], changed)
    }

    /// What a changed flight is counted for.
    #[must_use]
    pub fn changed_load(&self, flight: FlightId, changed: &Changed) -> FlightLoad {
        let path = self.path(flight, Some(changed));
        self.sectors.changed_load(&path, self.flight(flight), &self.day, &self.filed[flight])
    }

    /// The horizontal minima on the way of a changed flight.
    #[must_use]
    pub fn minima(&self, flight: FlightId, changed: &Changed) -> VersionMinima {
        if !self.own_minima {
            return VersionMinima(Vec::new());
        }
        let inside = self.sectors.inside(&self.path(flight, Some(changed)));
        VersionMinima(minima_on(&self.day, &inside))
    }

    /// A changed flight, as separation sees it.
    #[must_use]
    pub fn version<'a>(
        &'a self,
        flight: FlightId,
        changed: &'a Changed,
        minima: &'a VersionMinima,
    ) -> Version<'a> {
        Version { flight, path: self.path(flight, Some(changed)), minima: &minima.0 }
    }

    /// Why a change may not be made where it is: it is off its filed level in a sector that allows
    /// no changes, open or not, or inside a restriction in force.
    #[must_use]
    pub fn forbidden(&self, flight: FlightId, change: &Change) -> Option<Rule> {
        self.off_level_where_forbidden(flight, change).or_else(|| {
            let path = self.path(flight, Some(&change.changed));
            let entered = self.restrictions.entered(&self.day, self.flight(flight), &path);
            entered.map(|(restriction, time_s)| Rule::Restriction { restriction, time_s })
        })
    }

    fn off_level_where_forbidden(&self, flight: FlightId, change: &Change) -> Option<Rule> {
        if !self.closed_to_changes {
            return None;
        }
        let inside = self.sectors.inside(&self.path(flight, Some(&change.changed)));
        let off_level = &change.changed.off_level_s;
        inside
            .iter()
            .filter(|visit| self.day.sectors[visit.sector].no_changes)
            .flat_map(|visit| {
                off_level.iter().filter_map(|&(from_s, until_s)| {
                    let time_s = from_s.max(visit.in_s);
                    (time_s < until_s.min(visit.out_s)).then_some((time_s, visit.sector))
                })
            })
            .min_by(|a, b| a.0.total_cmp(&b.0).then(a.1.cmp(&b.1)))
            .map(|(time_s, sector)| Rule::NoChangesSector { sector, time_s })
    }

    /// The loss with the sector filled in: the first by name of those open where the first flight
    /// is at the closest moment.
    #[must_use]
    pub fn located(&self, loss: Loss, first: Path<'_>) -> Loss {
        let piece = first.piece_at(loss.closest_s);
        let (a, b) = (first.knot(piece), first.knot(piece + 1));
        let share = ((loss.closest_s - a.time_s) / (b.time_s - a.time_s)).clamp(0.0, 1.0);
        let filed_s = a.filed_s + share * (b.filed_s - a.filed_s);
        let level_ft = a.level_ft + share * (b.level_ft - a.level_ft);
        let here = crate::path::Knot::between(&a, &b, filed_s, loss.closest_s, level_ft);
        let open = |s: &SectorId| self.day.sectors[*s].is_open(loss.closest_s);
        let around = self.sectors.sectors_at(here.lon_deg, here.lat_deg, level_ft);
        Loss { sector: around.into_iter().filter(open).min(), ..loss }
    }
}

/// The periods in which the first open sector by name, of those that a flight is inside, sets a
/// horizontal minimum of its own.
fn minima_on(day: &Day, inside: &[Visit]) -> Vec<HorizontalMinimum> {
    let mut cuts: Vec<f64> = Vec::new();
    for visit in inside {
        cuts.extend([visit.in_s, visit.out_s]);
        let open = &day.sectors[visit.sector].open;
        cuts.extend(open.iter().flat_map(|p| [p.from_s, p.until_s]));
    }
    cuts.sort_by(f64::total_cmp);
    cuts.dedup();
    let mut minima: Vec<HorizontalMinimum> = Vec::new();
    for w in cuts.windows(2) {
        let here = inside
            .iter()
            .filter(|v| v.in_s <= w[0] && w[0] < v.out_s && day.sectors[v.sector].is_open(w[0]))
            .map(|v| v.sector)
            .min();
        let own_nm = here.and_then(|sector| day.sectors[sector].horizontal_nm);
        let Some(horizontal_nm) = own_nm else { continue };
        match minima.last_mut() {
            Some(last) if last.until_s == w[0] && last.horizontal_nm == horizontal_nm => {
                last.until_s = w[1];
            }
            _ => minima.push(HorizontalMinimum { from_s: w[0], until_s: w[1], horizontal_nm }),
        }
    }
    minima
}
