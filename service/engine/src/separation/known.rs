//! Which losses of a changed day are new, and which the filed day already holds.

use super::minima::{MARGIN_M, Minimum};
use super::scene::{Scene, Version, pair_losses_at};
use crate::answer::Loss;
use crate::day::Policy;
use crate::units::nm_to_m;

/// Whether a loss between two versions is one that the filed day already holds: throughout it both
/// flights are at the level they filed at that place, and one filed loss of the pair is at most
/// `same_loss_s` apart in time and not farther by more than `known_loss_margin_nm`.
///
/// `filed` are the filed losses of the pair; the intervals are when each version is off its filed
/// level.
#[must_use]
pub fn is_known(
    loss: &Loss,
    filed: &[Loss],
    off_level_s: [&[(f64, f64)]; 2],
    policy: &Policy,
) -> bool {
    let off = off_level_s.iter().copied().flatten();
    !meets_any(loss, off) && filed.iter().any(|f| matches(loss, f, policy, 0.0))
}

/// A loss that begins as a flight is back at its filed level does not meet the time before: flights
/// that were exactly a minimum apart until then lose it from that moment on.
fn meets_any<'a>(loss: &Loss, mut intervals: impl Iterator<Item = &'a (f64, f64)>) -> bool {
    intervals.any(|&(from_s, until_s)| loss.from_s < until_s && from_s < loss.until_s)
}

fn matches(loss: &Loss, filed: &Loss, policy: &Policy, margin_m: f64) -> bool {
    let gap_s = (loss.from_s - filed.until_s).max(filed.from_s - loss.until_s);
    let closest_m = filed.horizontal_m - nm_to_m(policy.known_loss_margin_nm) + margin_m;
    gap_s <= policy.same_loss_s && loss.horizontal_m >= closest_m
}

/// The losses between two versions that count as new when a plan is made, each within half a metre
/// of a minimum decided against the change; by time. Losses of two filed versions are never new.
#[must_use]
pub fn new_losses(scene: &Scene, one: &Version<'_>, other: &Version<'_>) -> Vec<Loss> {
    if one.path.change().is_none() && other.path.change().is_none() {
        return Vec::new();
    }
    let mut losses = pair_losses_at(scene, one, other, Minimum::Wider);
    losses.retain(|loss| is_new(scene, loss, one, other));
    losses
}

/// Whether a loss found with the wider minimum is new.
pub(super) fn is_new(scene: &Scene, loss: &Loss, one: &Version<'_>, other: &Version<'_>) -> bool {
    if as_filed_throughout(one, loss) && as_filed_throughout(other, loss) {
        return false;
    }
    let off = one.path.off_level_s().iter().chain(other.path.off_level_s());
    if meets_any(loss, off) {
        return true;
    }
    let filed = scene.losses_of(loss.first, loss.second);
    let near = |f: &Loss, loss: &Loss| matches(loss, f, &scene.policy, MARGIN_M);
    if !filed.iter().any(|f| near(f, loss)) {
        return true;
    }
    // The wider minimum lengthens a loss and so brings it nearer to the filed one in time. Where
    // the filed one is not near to all of it, the shorter losses inside are looked at as well.
    let throughout = |f: &Loss| {
        let farthest_s = (loss.until_s - f.until_s).max(f.from_s - loss.from_s);
        near(f, loss) && farthest_s <= scene.policy.same_loss_s
    };
    if filed.iter().any(throughout) {
        return false;
    }
    [Minimum::Plain, Minimum::Narrower].into_iter().any(|minimum| {
        pair_losses_at(scene, one, other, minimum)
            .iter()
            .filter(|inner| loss.from_s <= inner.until_s && inner.from_s <= loss.until_s)
            .any(|inner| !filed.iter().any(|f| near(f, inner)))
    })
}

/// Whether a version is as filed in place, level and time throughout a loss.
fn as_filed_throughout(version: &Version<'_>, loss: &Loss) -> bool {
    let path = &version.path;
    let Some(change) = path.change() else { return true };
    let piece_s = path.knot(path.first_changed()).time_s;
    let leaves_s = path.off_level_s().first().map_or(piece_s, |off| off.0.max(piece_s));
    let resumed = change.kept + change.knots.len();
    let back = change.shift_s == 0.0 && resumed < path.len();
    loss.until_s < leaves_s || (back && loss.from_s > path.knot(resumed).time_s)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::ids::FlightId;

    fn loss(from_s: f64, until_s: f64, horizontal_m: f64) -> Loss {
        Loss {
            first: FlightId(0),
            second: FlightId(1),
            from_s,
            until_s,
            closest_s: from_s,
            horizontal_m,
            vertical_ft: 0.0,
            sector: None,
        }
    }

    #[test]
    fn one_filed_loss_must_be_near_enough_in_time_and_distance() {
        let policy = Policy::default();
        let known = |l: &Loss, filed: &[Loss]| is_known(l, filed, [&[], &[]], &policy);
        let filed = [loss(1000.0, 1100.0, 5000.0)];
        assert!(known(&loss(1220.0, 1300.0, 4074.0), &filed), "120 s and 0.5 NM are within");
        assert!(!known(&loss(1220.1, 1300.0, 5000.0), &filed), "later by more than 120 s");
        assert!(!known(&loss(800.0, 879.9, 5000.0), &filed), "earlier by more than 120 s");
        assert!(!known(&loss(1000.0, 1100.0, 4073.9), &filed), "closer by more than 0.5 NM");
        // Near in time to one, in distance to another: neither meets both.
        let two = [loss(1000.0, 1100.0, 5000.0), loss(5000.0, 5100.0, 1000.0)];
        assert!(!known(&loss(1000.0, 1100.0, 1000.0), &two));
    }

    #[test]
    fn a_loss_that_meets_a_part_off_the_filed_level_is_new() {
        let policy = Policy::default();
        let filed = [loss(1000.0, 1100.0, 5000.0)];
        let planned = loss(1000.0, 1100.0, 5000.0);
        for (off, known) in [((1100.0, 2000.0), true), ((1099.0, 2000.0), false)] {
            let off = [off];
            assert_eq!(is_known(&planned, &filed, [&off, &[]], &policy), known);
            assert_eq!(is_known(&planned, &filed, [&[], &off], &policy), known);
        }
    }
}
