//! Whether a changed profile is inside a restriction in force.
//!
//! A profile is inside where it is in one of the restriction's volumes in its period, except where
//! it holds a level that is allowed there. A change is barred where it is inside at a place at
//! which the filed profile, at its own time, is not.

use super::index::SectorIndex;
use crate::day::{Day, Flight, Restriction};
use crate::ids::{Id, RestrictionId, SectorId};
use crate::path::Path;

/// Being inside for shorter than this is no more than rounding, seconds.
const TOUCH_S: f64 = 1e-3;

/// The volumes of a day's restrictions, found by place.
#[derive(Debug, Clone)]
pub struct RestrictionIndex {
    /// Its sectors are the restrictions, by number.
    index: SectorIndex,
    is_empty: bool,
}

/// A stay inside a restriction, in a path's own time.
#[derive(Debug, Clone, Copy)]
struct Stay {
    restriction: RestrictionId,
    from_s: f64,
    until_s: f64,
}

impl RestrictionIndex {
    /// Indexes a day's restrictions.
    #[must_use]
    pub fn new(day: &Day) -> Self {
        let volumes = day.restrictions.iter_with_id().flat_map(|(id, restriction)| {
            let volumes = restriction.volumes.iter().cloned();
            volumes.map(move |volume| (SectorId::from_index(id.index()), volume))
        });
        let is_empty = day.restrictions.iter().len() == 0;
        Self { index: SectorIndex::of(volumes.collect()), is_empty }
    }

    /// The restriction that a changed flight is the first to be inside of where its filed profile
    /// is not, and when.
    #[must_use]
    pub fn entered(
        &self,
        day: &Day,
        flight: &Flight,
        changed: &Path<'_>,
    ) -> Option<(RestrictionId, f64)> {
        if self.is_empty {
            return None;
        }
        let stays = self.stays(day, flight, changed);
        if stays.is_empty() {
            return None;
        }
        let filed = self.stays(day, flight, &Path::filed(changed.track()));
        stays
            .iter()
            .filter_map(|stay| {
                let excused = filed.iter().filter(|f| f.restriction == stay.restriction);
                let from_s = first_outside(changed, stay, excused)?;
                Some((stay.restriction, from_s))
            })
            .min_by(|a, b| a.1.total_cmp(&b.1).then(a.0.cmp(&b.0)))
    }

    fn stays(&self, day: &Day, flight: &Flight, path: &Path<'_>) -> Vec<Stay> {
        let mut stays = Vec::new();
        for visit in self.index.inside(path) {
            let id = RestrictionId::from_index(visit.sector.index());
            let restriction = &day.restrictions[id];
            if !restriction.is_about(&flight.departure, &flight.destination) {
                continue;
            }
            let from_s = visit.in_s.max(restriction.from_s);
            let until_s = visit.out_s.min(restriction.until_s);
            if from_s < until_s {
                let mut add =
                    |from_s, until_s| stays.push(Stay { restriction: id, from_s, until_s });
                off_allowed_levels(restriction, path, (from_s, until_s), &mut add);
            }
        }
        stays
    }
}

/// The parts of a stay in which no allowed level is held.
fn off_allowed_levels(
    restriction: &Restriction,
    path: &Path<'_>,
    (from_s, until_s): (f64, f64),
    add: &mut impl FnMut(f64, f64),
) {
    if restriction.levels_allowed_ft.is_empty() {
        return add(from_s, until_s);
    }
    let mut begun_s = None;
    for piece in path.piece_at(from_s)..path.len() - 1 {
        let (a, b) = (path.knot(piece), path.knot(piece + 1));
        if a.time_s >= until_s {
            break;
        }
        let holds = a.level_ft == b.level_ft && restriction.allows_level(a.level_ft);
        match (holds, begun_s) {
            (false, None) => begun_s = Some(a.time_s.max(from_s)),
            (true, Some(begun)) => {
                add(begun, a.time_s);
                begun_s = None;
            }
            _ => {}
        }
    }
    if let Some(begun) = begun_s {
        add(begun, until_s);
    }
}

/// When a stay is first at a place where the filed profile stays in the same restriction at no
/// time; `filed` in time order.
fn first_outside<'s>(
    path: &Path<'_>,
    stay: &Stay,
    filed: impl Iterator<Item = &'s Stay>,
) -> Option<f64> {
    let until_filed_s = filed_s_at(path, stay.until_s);
    let mut open_s = filed_s_at(path, stay.from_s);
    for excused in filed {
        if excused.from_s - open_s > TOUCH_S {
            break;
        }
        open_s = open_s.max(excused.until_s);
    }
    (until_filed_s - open_s > TOUCH_S).then(|| time_s_at(path, open_s))
}

/// The filed time of the place where a path is at a time.
fn filed_s_at(path: &Path<'_>, time_s: f64) -> f64 {
    let piece = path.piece_at(time_s);
    let (a, b) = (path.knot(piece), path.knot(piece + 1));
    let share = ((time_s - a.time_s) / (b.time_s - a.time_s)).clamp(0.0, 1.0);
    a.filed_s + (b.filed_s - a.filed_s) * share
}

/// When a path is at the place of a filed time.
fn time_s_at(path: &Path<'_>, filed_s: f64) -> f64 {
    let next = (1..path.len() - 1).find(|&i| path.knot(i).filed_s > filed_s);
    let next = next.unwrap_or(path.len() - 1);
    let (a, b) = (path.knot(next - 1), path.knot(next));
    let share = ((filed_s - a.filed_s) / (b.filed_s - a.filed_s)).clamp(0.0, 1.0);
    a.time_s + (b.time_s - a.time_s) * share
}
