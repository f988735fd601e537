//! Changed versions: clashes against their definition, pair by pair.

use super::losses::assert_same;
use super::*;
use crate::answer::Loss;
use crate::path::Path;
use crate::separation::{
    Version, VersionPair, VersionRef, clashes, is_known, new_losses, new_losses_against_filed,
    pair_losses,
};

/// Three changes of every third flight of a crowd: levels, paces and extents vary, some keep their
/// timing.
fn changes(tracks: &IdVec<FlightId, Track>, seed: u64) -> Vec<(FlightId, Changed)> {
    let mut random = random(seed);
    let mut changes = Vec::new();
    for (id, track) in tracks.iter_with_id().filter(|(id, _)| id.0 % 3 == 0) {
        let last = track.knots().len() - 1;
        if last < 4 {
            continue;
        }
        for _ in 0..3 {
            let leave = random.random_range(0..last - 2);
            let back = random.random_range(leave + 1..last);
            let level_ft = f64::from(random.random_range(29..41)) * 1000.0;
            let pace = [1.0, 0.99, 1.02][random.random_range(0..3)];
            changes.push((id, change(track, (leave, back), level_ft, pace)));
        }
    }
    changes
}

fn versions<'a>(
    tracks: &'a IdVec<FlightId, Track>,
    changes: &'a [(FlightId, Changed)],
) -> Vec<Version<'a>> {
    changes
        .iter()
        .map(|(flight, changed)| Version {
            flight: *flight,
            path: Path::changed(&tracks[*flight], changed),
            minima: &[],
        })
        .collect()
}

/// Every pair of versions, one by one.
fn clashes_by_definition(scene: &Scene, versions: &[Version<'_>], filed: u32) -> Vec<VersionPair> {
    let mut all: Vec<(VersionRef, Version<'_>)> =
        (0..filed).map(|i| (VersionRef::Filed(FlightId(i)), scene.filed(FlightId(i)))).collect();
    all.extend(versions.iter().enumerate().map(|(i, v)| (VersionRef::Changed(i), *v)));
    let mut found = Vec::new();
    for (a, one) in &all {
        for (b, other) in &all {
            if one.flight < other.flight && !new_losses(scene, one, other).is_empty() {
                found.push(VersionPair { a: *a, b: *b });
            }
        }
    }
    found.sort();
    found
}

#[test]
fn clashes_are_the_pairs_with_a_new_loss() {
    let mut counted = 0;
    for (i, centre) in CENTRES.into_iter().enumerate() {
        for (seed, margin_nm) in [(0, 0.5), (1, 0.0)] {
            let policy = Policy { known_loss_margin_nm: margin_nm, ..Policy::default() };
            let day = day_of(crowd(150, centre, 70 + 10 * i as u64 + seed), policy);
            let (scene, tracks) = (scene_of(&day), tracks_of(&day));
            let changes = changes(&tracks, seed);
            let versions = versions(&tracks, &changes);
            let found = clashes(&scene, &versions);
            counted += found.len();
            assert_eq!(found, clashes_by_definition(&scene, &versions, 150));
        }
    }
    assert!(counted > 500, "{counted}");
}

#[test]
fn one_version_against_the_filed_day_finds_its_new_losses() {
    let day = day_of(crowd(150, CENTRES[2], 5), Policy::default());
    let (scene, tracks) = (scene_of(&day), tracks_of(&day));
    let changes = changes(&tracks, 5);
    for version in versions(&tracks, &changes) {
        let expected: Vec<Loss> = (0..150)
            .flat_map(|i| new_losses(&scene, &version, &scene.filed(FlightId(i))))
            .collect();
        assert_same(&new_losses_against_filed(&scene, &version), &expected);
    }
}

/// What the maker of a plan lets pass is known by the rule itself, at the plain minimum.
#[test]
fn no_loss_that_is_let_pass_is_new_by_the_rule() {
    let policy = Policy::default();
    let day = day_of(crowd(150, CENTRES[0], 6), policy.clone());
    let (scene, tracks) = (scene_of(&day), tracks_of(&day));
    let changes = changes(&tracks, 6);
    let mut known = 0;
    for version in versions(&tracks, &changes) {
        for other in (0..150).map(|i| scene.filed(FlightId(i))) {
            if other.flight == version.flight || !new_losses(&scene, &version, &other).is_empty() {
                continue;
            }
            for loss in pair_losses(&scene, &version, &other) {
                let filed = scene.losses_of(loss.first, loss.second);
                let off = [version.path.off_level_s(), &[]];
                assert!(is_known(&loss, filed, off, &policy), "{loss:?}");
                known += 1;
            }
        }
    }
    assert!(known > 20, "{known}");
}
