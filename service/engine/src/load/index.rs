//! Which volumes may lie around a place: a grid over longitude and latitude.

use super::piece::Piece;
use crate::day::{Day, Sector, Volume};
use crate::geometry::polygon::Polygon;
use crate::ids::SectorId;

/// Smallest side of a grid cell, degrees: about one piece of a track.
const SMALLEST_SIDE_DEG: f64 = 0.25;
/// Most grid cells; a larger region gets larger cells.
const MOST_CELLS: f64 = 65_536.0;
/// Cells are taken as larger by this on every side when edges are looked for in them, so that
/// rounding can't hide an edge, degrees.
const MARGIN_DEG: f64 = 1e-9;

/// The volumes of all sectors, found by place.
#[derive(Debug, Clone)]
pub struct SectorIndex {
    volumes: Vec<(SectorId, Volume)>,
    grid: Grid,
    /// Where the list of each grid cell starts in `entries`; one more at the end.
    starts: Vec<u32>,
    entries: Vec<Entry>,
}

/// A volume in a grid cell.
#[derive(Debug, Clone, Copy)]
struct Entry {
    volume: u32,
    cover: Cover,
    floor_ft: f64,
    ceiling_ft: f64,
}

/// How much of a grid cell, or of the ground under a piece, lies inside a polygon.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Cover {
    /// All of it.
    Whole,
    /// An edge may run through it.
    Part,
}

/// Rows and columns of cells.
#[derive(Debug, Clone, Copy)]
struct Grid {
    west_deg: f64,
    south_deg: f64,
    side_deg: f64,
    columns: usize,
    rows: usize,
}

/// The cells under a box, and whether the box also lies outside the grid.
#[derive(Debug, Clone, Copy)]
struct Range {
    columns: (usize, usize),
    rows: (usize, usize),
    beyond: bool,
}

impl Range {
    fn cells(&self) -> usize {
        (self.columns.1 - self.columns.0 + 1) * (self.rows.1 - self.rows.0 + 1)
    }
}

impl Grid {
    fn around(volumes: &[(SectorId, Volume)]) -> Self {
        let (mut west, mut south) = (f64::INFINITY, f64::INFINITY);
        let (mut east, mut north) = (f64::NEG_INFINITY, f64::NEG_INFINITY);
        for bounds in volumes.iter().map(|(_, volume)| volume.polygon.bounds()) {
            (west, south) = (west.min(bounds.west), south.min(bounds.south));
            (east, north) = (east.max(bounds.east), north.max(bounds.north));
        }
        if volumes.is_empty() {
            (west, south, east, north) = (0.0, 0.0, 0.0, 0.0);
        }
        let (width, height) = (east - west, north - south);
        let side_deg = SMALLEST_SIDE_DEG.max((width * height / MOST_CELLS).sqrt());
        Self {
            west_deg: west,
            south_deg: south,
            side_deg,
            columns: (width / side_deg) as usize + 1,
            rows: (height / side_deg) as usize + 1,
        }
    }

    /// The cells that a closed box `[west, south, east, north]` touches.
    fn range(&self, bounds: [f64; 4]) -> Option<Range> {
        let at = |value: f64, origin: f64| ((value - origin) / self.side_deg).floor();
        let span = |low: f64, high: f64, count: usize| {
            let last = (count - 1) as f64;
            let inside = high >= 0.0 && low <= last;
            inside.then(|| {
                let cells = (low.max(0.0) as usize, high.min(last) as usize);
                (cells, low < 0.0 || high > last)
            })
        };
        let [west, south, east, north] = bounds;
        let (columns, x) = span(at(west, self.west_deg), at(east, self.west_deg), self.columns)?;
        let (rows, y) = span(at(south, self.south_deg), at(north, self.south_deg), self.rows)?;
        Some(Range { columns, rows, beyond: x || y })
    }

    fn bounds_of(&self, column: usize, row: usize) -> [f64; 4] {
        let west = self.west_deg + column as f64 * self.side_deg;
        let south = self.south_deg + row as f64 * self.side_deg;
        [west, south, west + self.side_deg, south + self.side_deg]
    }
}

impl SectorIndex {
    /// Indexes every volume of a day's sectors, closed ones included.
    #[must_use]
    pub fn new(day: &Day) -> Self {
        let of_sector = |(id, sector): (SectorId, &Sector)| {
            sector.volumes.iter().map(move |v| (id, v.clone())).collect::<Vec<_>>()
        };
        Self::of(day.sectors.iter_with_id().flat_map(of_sector).collect())
    }

    /// Indexes volumes, each of the sector beside it.
    pub(super) fn of(volumes: Vec<(SectorId, Volume)>) -> Self {
        let grid = Grid::around(&volumes);
        let mut lists: Vec<Vec<Entry>> = vec![Vec::new(); grid.columns * grid.rows];
        for (index, (_, volume)) in volumes.iter().enumerate() {
            let (floor_ft, ceiling_ft) = (volume.floor_ft, volume.ceiling_ft);
            for (cell, cover) in covered_cells(&grid, &volume.polygon) {
                let volume = index as u32;
                lists[cell].push(Entry { volume, cover, floor_ft, ceiling_ft });
            }
        }
        let mut starts = Vec::with_capacity(lists.len() + 1);
        let mut entries = Vec::with_capacity(lists.iter().map(Vec::len).sum());
        for list in &lists {
            starts.push(entries.len() as u32);
            entries.extend_from_slice(list);
        }
        starts.push(entries.len() as u32);
        Self { volumes, grid, starts, entries }
    }

    /// The sectors that hold a place at a level, open or not, by rising id.
    #[must_use]
    pub fn sectors_at(&self, lon_deg: f64, lat_deg: f64, level_ft: f64) -> Vec<SectorId> {
        let mut found = Vec::new();
        self.push_sectors_at(lon_deg, lat_deg, level_ft, &mut found);
        // One meridian has two names.
        if lon_deg.abs() == 180.0 {
            self.push_sectors_at(-lon_deg, lat_deg, level_ft, &mut found);
        }
        found.sort_unstable();
        found.dedup();
        found
    }

    fn push_sectors_at(&self, lon: f64, lat: f64, level_ft: f64, found: &mut Vec<SectorId>) {
        let Some(range) = self.grid.range([lon, lat, lon, lat]) else { return };
        for entry in self.list(range.columns.0, range.rows.0) {
            let (sector, volume) = &self.volumes[entry.volume as usize];
            if entry.floor_ft <= level_ft
                && level_ft < entry.ceiling_ft
                && (entry.cover == Cover::Whole || volume.polygon.contains(lon, lat))
            {
                found.push(*sector);
            }
        }
    }

    /// The volumes that a piece may enter, each once; `scratch` is working space.
    pub(super) fn near<'a>(
        &'a self,
        piece: &Piece,
        scratch: &'a mut Vec<(u32, Cover)>,
    ) -> impl Iterator<Item = (&'a (SectorId, Volume), Cover)> + use<'a> {
        scratch.clear();
        if let Some(range) = self.grid.range(piece.bounds()) {
            self.gather(piece, &range, scratch);
        }
        scratch.iter().map(|&(volume, cover)| (&self.volumes[volume as usize], cover))
    }

    fn gather(&self, piece: &Piece, range: &Range, found: &mut Vec<(u32, Cover)>) {
        let (lowest_ft, highest_ft) = piece.levels_ft();
        for row in range.rows.0..=range.rows.1 {
            for column in range.columns.0..=range.columns.1 {
                found.extend(
                    self.list(column, row)
                        .iter()
                        .filter(|e| e.floor_ft <= highest_ft && lowest_ft < e.ceiling_ft)
                        .map(|e| (e.volume, e.cover)),
                );
            }
        }
        let cells = range.cells();
        if cells == 1 && !range.beyond {
            return;
        }
        // Whole only where every cell under the piece is.
        found.sort_unstable_by_key(|&(volume, _)| volume);
        let mut kept = 0;
        let mut next = 0;
        while next < found.len() {
            let volume = found[next].0;
            let group = found[next..].iter().take_while(|&&(v, _)| v == volume);
            let (count, whole) = group.fold((0, 0), |(count, whole), &(_, cover)| {
                (count + 1, whole + usize::from(cover == Cover::Whole))
            });
            let cover = if whole == cells && !range.beyond { Cover::Whole } else { Cover::Part };
            found[kept] = (volume, cover);
            kept += 1;
            next += count;
        }
        found.truncate(kept);
    }

    fn list(&self, column: usize, row: usize) -> &[Entry] {
        let cell = row * self.grid.columns + column;
        &self.entries[self.starts[cell] as usize..self.starts[cell + 1] as usize]
    }
}

/// The grid cells that a polygon covers, wholly or in part.
fn covered_cells(grid: &Grid, polygon: &Polygon) -> Vec<(usize, Cover)> {
    let b = polygon.bounds();
    let Some(range) = grid.range([b.west, b.south, b.east, b.north]) else { return Vec::new() };
    let width = range.columns.1 - range.columns.0 + 1;
    let mut has_edge = vec![false; range.cells()];
    for (p, q) in polygon.edges() {
        let bounds = [
            p[0].min(q[0]) - MARGIN_DEG,
            p[1].min(q[1]) - MARGIN_DEG,
            p[0].max(q[0]) + MARGIN_DEG,
            p[1].max(q[1]) + MARGIN_DEG,
        ];
        let Some(under) = grid.range(bounds) else { continue };
        // The margin may reach cells beyond those of the polygon's own box.
        for row in under.rows.0.max(range.rows.0)..=under.rows.1.min(range.rows.1) {
            for column in
                under.columns.0.max(range.columns.0)..=under.columns.1.min(range.columns.1)
            {
                if line_meets_box(p, q, grid.bounds_of(column, row)) {
                    has_edge[(row - range.rows.0) * width + column - range.columns.0] = true;
                }
            }
        }
    }
    let mut covered = Vec::new();
    for row in range.rows.0..=range.rows.1 {
        for column in range.columns.0..=range.columns.1 {
            let cell = row * grid.columns + column;
            let [west, south, east, north] = grid.bounds_of(column, row);
            if has_edge[(row - range.rows.0) * width + column - range.columns.0] {
                covered.push((cell, Cover::Part));
            } else if polygon.contains(0.5 * (west + east), 0.5 * (south + north)) {
                covered.push((cell, Cover::Whole));
            }
        }
    }
    covered
}

/// Whether the line through two points comes within the margin of a box.
fn line_meets_box(p: [f64; 2], q: [f64; 2], [west, south, east, north]: [f64; 4]) -> bool {
    let (dx, dy) = (q[0] - p[0], q[1] - p[1]);
    let side = |x: f64, y: f64| dx * (y - p[1]) - dy * (x - p[0]);
    let margin = MARGIN_DEG * (dx.abs() + dy.abs());
    let corners = [side(west, south), side(west, north), side(east, south), side(east, north)];
    !(corners.iter().all(|&s| s > margin) || corners.iter().all(|&s| s < -margin))
}
