//! Whether a changed profile is inside a restriction in force where its filed profile is not, by
//! the judge's own looks.

use super::path::Path;
use super::tolerances::Lean;
use super::visits::{AsFiled, stays_in};
use crate::answer::Rule;
use crate::day::{Day, Flight, Restriction};

/// Shorter than this is a borderline case for a plan, seconds.
const FOR_PLAN_S: f64 = 1e-2;
/// Shorter than this is one against it, seconds: crossings are bisected far finer.
const AGAINST_PLAN_S: f64 = 1e-4;

/// The first restriction entered, and when.
pub(super) fn entered(
    day: &Day,
    flight: &Flight,
    filed: &Path<'_>,
    flown: &Path<'_>,
    lean: Lean,
) -> Option<Rule> {
    let allowed_s = match lean {
        Lean::ForPlan => FOR_PLAN_S,
        Lean::AgainstPlan => AGAINST_PLAN_S,
    };
    day.restrictions
        .iter_with_id()
        .filter(|(_, r)| r.is_about(&flight.departure, &flight.destination))
        .filter_map(|(restriction, r)| {
            let excused = places(filed, stays(r, filed, AsFiled::Yes));
            let inside = places(flown, stays(r, flown, AsFiled::No));
            let time_s = inside.iter().find_map(|&(from, until)| {
                // What the filed profile does not cover of this part of the track.
                let covered = excused.iter().map(|&(a, b)| b.min(until) - a.max(from));
                let bare_s = (until - from) - covered.filter(|&s| s > 0.0).sum::<f64>();
                (bare_s > allowed_s).then_some(from)
            })?;
            Some(Rule::Restriction { restriction, time_s })
        })
        .next()
}

/// When a profile is inside a restriction, levels held that are allowed left out.
fn stays(restriction: &Restriction, path: &Path<'_>, as_filed: AsFiled) -> Vec<(f64, f64)> {
    let mut found = Vec::new();
    for (from_s, until_s) in stays_in(&restriction.volumes, path, as_filed) {
        let from_s = from_s.max(restriction.from_s);
        let until_s = until_s.min(restriction.until_s);
        for ends in path.knots().windows(2) {
            let (a, b) = (ends[0], ends[1]);
            let holds = a.level_ft == b.level_ft && restriction.allows_level(a.level_ft);
            let part = (a.time_s.max(from_s), b.time_s.min(until_s));
            if part.0 < part.1 && !holds {
                found.push(part);
            }
        }
    }
    found
}

/// Times of a profile as places of its track, adjoining ones as one.
fn places(path: &Path<'_>, times: Vec<(f64, f64)>) -> Vec<(f64, f64)> {
    let mut places: Vec<(f64, f64)> = Vec::new();
    for (from_s, until_s) in times {
        let (from, until) = (path.state(from_s).filed_s, path.state(until_s).filed_s);
        match places.last_mut() {
            Some(last) if from - last.1 < 1e-6 => last.1 = until,
            _ => places.push((from, until)),
        }
    }
    places
}
