//! Which sectors a flight is inside, and when: by looking, never by solving.
//!
//! A flight is looked at; from what is seen follows how long nothing can change: it can't reach
//! an outline sooner than the distance to it allows at its greatest speed, nor a floor or ceiling
//! sooner than its rate of climb allows. Then it is looked at again. Where two looks differ, the
//! crossing between them is found by bisection.

use super::path::{Path, State};
use super::tolerances::{BISECTION_S, EDGE_S, EDGE_STEP_S};
use crate::day::{Day, Volume};
use crate::geometry::geodesic::LonLat;
use crate::ids::SectorId;

/// A time, and how far it may be off.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Moment {
    pub(super) time_s: f64,
    /// 0 where the time is a filed one, not a computed one.
    pub(super) within_s: f64,
}

impl Moment {
    pub(super) fn exact(time_s: f64) -> Self {
        Self { time_s, within_s: 0.0 }
    }

    pub(super) fn computed(time_s: f64) -> Self {
        Self { time_s, within_s: EDGE_S }
    }
}

/// A maximal time inside a sector.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Visit {
    pub(super) sector: SectorId,
    pub(super) begin: Moment,
    pub(super) end: Moment,
}

/// Outlines of the sectors of a day by cells of one degree.
#[derive(Debug)]
pub(super) struct SectorMap<'d> {
    day: &'d Day,
    /// Sectors whose outlines' boxes touch a cell, by cell.
    cells: Vec<Vec<u32>>,
}

/// Nearer than this to the box around an outline, its edges are looked at, degrees.
const NEAR_BOX_DEG: f64 = 0.05;

const CELLS_EAST: usize = 361;
const CELLS_NORTH: usize = 181;

fn cell_range(low_deg: f64, high_deg: f64, offset_deg: f64, cells: usize) -> (usize, usize) {
    let cell = |deg: f64| ((deg + offset_deg).floor().max(0.0) as usize).min(cells - 1);
    (cell(low_deg), cell(high_deg))
}

impl<'d> SectorMap<'d> {
    /// Sectors that ever open or that forbid changes; no other matters.
    pub(super) fn new(day: &'d Day) -> Self {
        let mut cells = vec![Vec::new(); CELLS_EAST * CELLS_NORTH];
        for (id, sector) in day.sectors.iter_with_id() {
            if sector.open.is_empty() && !sector.no_changes {
                continue;
            }
            for volume in &sector.volumes {
                let b = volume.polygon.bounds();
                for_cells([b.west, b.south, b.east, b.north], |cell| {
                    let list: &mut Vec<u32> = &mut cells[cell];
                    if list.last() != Some(&id.0) {
                        list.push(id.0);
                    }
                });
            }
        }
        Self { day, cells }
    }

    /// All visits of a flown profile, by sector, then by time. `as_filed` times are exact at the
    /// end of the profile too; the first point never moves.
    pub(super) fn visits(&self, path: &Path<'_>, as_filed: AsFiled) -> Vec<Visit> {
        let mut visits = Vec::new();
        let passes = self.passes(path);
        for of_sector in passes.chunk_by(|a, b| a.sector == b.sector) {
            let sector = SectorId(of_sector[0].sector);
            let (low_ft, high_ft) = path.level_range_ft();
            let volumes: Vec<&Volume> = self.day.sectors[sector]
                .volumes
                .iter()
                .filter(|v| v.floor_ft <= high_ft && low_ft < v.ceiling_ft)
                .collect();
            if volumes.is_empty() {
                continue;
            }
            let look = Look { path, volumes: &volumes, degps: path.fastest_degps() };
            for together in of_sector.chunk_by(|a, b| a.piece + 1 == b.piece) {
                let (first, last) = (together[0].piece, together[together.len() - 1].piece);
                let (from_s, until_s) = (path.passes_piece_s(first).0, path.passes_piece_s(last).1);
                look.visits(sector, (from_s, until_s), as_filed, &mut visits);
            }
        }
        visits
    }
}

/// A piece of a track's polyline that comes within the box around a volume of a sector.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
struct Pass {
    sector: u32,
    piece: usize,
}

impl SectorMap<'_> {
    /// Where a flight may be over a sector at all, by sector, then along the track.
    fn passes(&self, path: &Path<'_>) -> Vec<Pass> {
        let mut passes = Vec::new();
        for (piece, b) in path.track.boxes() {
            for_cells(b, |cell| {
                for &sector in &self.cells[cell] {
                    let volumes = &self.day.sectors[SectorId(sector)].volumes;
                    if volumes.iter().any(|v| boxes_meet(b, v)) {
                        passes.push(Pass { sector, piece });
                    }
                }
            });
        }
        passes.sort_unstable();
        passes.dedup();
        passes
    }
}

/// When a flight is inside the union of some volumes.
pub(super) fn stays_in(volumes: &[Volume], path: &Path<'_>, as_filed: AsFiled) -> Vec<(f64, f64)> {
    let volumes: Vec<&Volume> = volumes.iter().collect();
    let look = Look { path, volumes: &volumes, degps: path.fastest_degps() };
    let mut visits = Vec::new();
    // The name does not matter.
    look.visits(SectorId(0), (path.start_s(), path.end_s()), as_filed, &mut visits);
    visits.iter().map(|visit| (visit.begin.time_s, visit.end.time_s)).collect()
}

/// Whether a box in degrees and that around a volume's outline meet, with room for rounding.
fn boxes_meet([west, south, east, north]: [f64; 4], volume: &Volume) -> bool {
    let b = volume.polygon.bounds();
    let room = NEAR_BOX_DEG;
    west - room <= b.east
        && b.west <= east + room
        && south - room <= b.north
        && b.south <= north + room
}

/// Whether a profile is the filed one.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum AsFiled {
    Yes,
    No,
}

/// Cells that a box in degrees touches.
fn for_cells([west, south, east, north]: [f64; 4], mut f: impl FnMut(usize)) {
    let (x0, x1) = cell_range(west, east, 180.0, CELLS_EAST);
    let (y0, y1) = cell_range(south, north, 90.0, CELLS_NORTH);
    for y in y0..=y1 {
        for x in x0..=x1 {
            f(y * CELLS_EAST + x);
        }
    }
}

/// One flight beside one sector.
struct Look<'a, 'd> {
    path: &'a Path<'d>,
    volumes: &'a [&'a Volume],
    degps: f64,
}

impl Look<'_, '_> {
    /// The visits in a time before and after which the flight is not over the sector.
    fn visits(
        &self,
        sector: SectorId,
        (start_s, end_s): (f64, f64),
        as_filed: AsFiled,
        out: &mut Vec<Visit>,
    ) {
        let mut time_s = start_s;
        let (mut inside, mut quiet_s) = self.look(time_s);
        let mut begin = inside.then_some(Moment::exact(start_s));
        while time_s < end_s {
            let next_s = (time_s + quiet_s.max(EDGE_STEP_S)).min(end_s);
            let (next_inside, next_quiet_s) = self.look(next_s);
            if next_inside != inside {
                let crossing = Moment::computed(self.bisect(time_s, next_s, inside));
                match begin.take() {
                    Some(begin) => out.push(Visit { sector, begin, end: crossing }),
                    None => begin = Some(crossing),
                }
            }
            (time_s, inside, quiet_s) = (next_s, next_inside, next_quiet_s);
        }
        if let Some(begin) = begin {
            let end = match as_filed {
                AsFiled::Yes => Moment::exact(end_s),
                AsFiled::No => Moment::computed(end_s),
            };
            out.push(Visit { sector, begin, end });
        }
    }

    /// First time at which the flight is no longer as it is at `from_s`.
    fn bisect(&self, mut from_s: f64, mut until_s: f64, inside: bool) -> f64 {
        while until_s - from_s > BISECTION_S {
            let middle_s = f64::midpoint(from_s, until_s);
            if self.is_inside(middle_s) == inside {
                from_s = middle_s;
            } else {
                until_s = middle_s;
            }
        }
        until_s
    }

    fn is_inside(&self, time_s: f64) -> bool {
        let state = self.path.state(time_s);
        let place = self.path.track.polyline_place(state.filed_s);
        self.volumes.iter().any(|v| is_in_band(v, state.level_ft) && is_over(v, place))
    }

    /// Whether the flight is inside at a time, and for how long after that can't change.
    fn look(&self, time_s: f64) -> (bool, f64) {
        let state = self.path.state(time_s);
        let place = self.path.track.polyline_place(state.filed_s);
        let mut inside_s: Option<f64> = None;
        let mut outside_s = f64::INFINITY;
        for &volume in self.volumes {
            let band_s = band_quiet_s(volume, state, time_s);
            let (in_band, over) = (is_in_band(volume, state.level_ft), is_over(volume, place));
            let outline_s = || outline_distance_deg(volume, place) / self.degps;
            match (in_band, over) {
                (true, true) => {
                    let quiet_s = if band_s > 0.0 { band_s.min(outline_s()) } else { 0.0 };
                    inside_s = Some(inside_s.unwrap_or(0.0).max(quiet_s));
                }
                (true, false) => outside_s = outside_s.min(outline_s()),
                (false, true) => outside_s = outside_s.min(band_s),
                // Minutes out of the band need no look at the outline.
                (false, false) if band_s > 120.0 => outside_s = outside_s.min(band_s),
                (false, false) => outside_s = outside_s.min(band_s.max(outline_s())),
            }
        }
        inside_s.map_or((false, outside_s), |quiet_s| (true, quiet_s))
    }
}

fn is_in_band(volume: &Volume, level_ft: f64) -> bool {
    volume.floor_ft <= level_ft && level_ft < volume.ceiling_ft
}

fn is_over(volume: &Volume, place: LonLat) -> bool {
    volume.polygon.contains(place.lon_deg, place.lat_deg)
}

/// How long a flight's level stays on its side of a volume's floor and ceiling, at least.
fn band_quiet_s(volume: &Volume, state: State, time_s: f64) -> f64 {
    let steady_s = state.until_s - time_s;
    if state.rate_ftps == 0.0 {
        return steady_s;
    }
    let to_s = |bound_ft: f64| (bound_ft - state.level_ft) / state.rate_ftps;
    [to_s(volume.floor_ft), to_s(volume.ceiling_ft)]
        .into_iter()
        .filter(|&s| s >= 0.0)
        .fold(steady_s, f64::min)
}

/// A bound from below on the distance to a volume's outline in the plane of longitude and
/// latitude, degrees; across the 180th meridian too.
fn outline_distance_deg(volume: &Volume, place: LonLat) -> f64 {
    let distance = |lon_deg: f64| {
        let b = volume.polygon.bounds();
        let off = |value: f64, low: f64, high: f64| (low - value).max(value - high).max(0.0);
        let (x, y) = (off(lon_deg, b.west, b.east), off(place.lat_deg, b.south, b.north));
        let to_box2 = x * x + y * y;
        // Far away the box says enough; edges are worth their price only near it.
        let nearest2 = if to_box2 > NEAR_BOX_DEG * NEAR_BOX_DEG {
            to_box2
        } else {
            volume
                .polygon
                .edges()
                .map(|(a, b)| segment_distance2([lon_deg, place.lat_deg], a, b))
                .fold(f64::INFINITY, f64::min)
        };
        nearest2.sqrt()
    };
    let here = distance(place.lon_deg);
    if place.lon_deg.abs() > 90.0 {
        here.min(distance(place.lon_deg - 360.0 * place.lon_deg.signum()))
    } else {
        here
    }
}

/// Squared distance of a point from a segment in the plane.
fn segment_distance2(p: [f64; 2], a: [f64; 2], b: [f64; 2]) -> f64 {
    let (dx, dy) = (b[0] - a[0], b[1] - a[1]);
    let length2 = dx * dx + dy * dy;
    let along = if length2 > 0.0 {
        (((p[0] - a[0]) * dx + (p[1] - a[1]) * dy) / length2).clamp(0.0, 1.0)
    } else {
        0.0
    };
    let (x, y) = (p[0] - a[0] - along * dx, p[1] - a[1] - along * dy);
    x * x + y * y
}
