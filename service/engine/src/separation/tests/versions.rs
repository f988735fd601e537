//! Changed versions: clashes against their definition, pair by pair.

use super::losses::assert_same;
use super::*;
use crate::answer::Loss;
use crate::path::Path;
use crate::separation::{
    MovedIndex, ShiftRule, Version, VersionPair, VersionRef, clashes, is_known, new_losses,
    new_losses_against_filed, new_losses_in_plan, pair_losses, pair_probability, shift_clashes,
    shift_set,
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

#[test]
fn a_version_in_a_plan_finds_its_new_losses() {
    let day = day_of(crowd(150, CENTRES[0], 14), Policy::default());
    let (scene, tracks) = (scene_of(&day), tracks_of(&day));
    let changes = changes(&tracks, 14);
    let all = versions(&tracks, &changes);
    let mut moved = all.clone();
    moved.dedup_by_key(|v| v.flight);
    let index = MovedIndex::new(&scene, &moved);
    let mut counted = 0;
    for version in all.iter().take(60) {
        let planned = |i: u32| {
            let flight = FlightId(i);
            moved.iter().find(|v| v.flight == flight).copied().unwrap_or(scene.filed(flight))
        };
        let mut expected: Vec<Loss> =
            (0..150).map(planned).flat_map(|other| new_losses(&scene, version, &other)).collect();
        expected.sort_by(|x, y| {
            (x.first, x.second).cmp(&(y.first, y.second)).then(x.from_s.total_cmp(&y.from_s))
        });
        let found = new_losses_in_plan(&scene, version, &moved, &index);
        counted += found.len();
        assert_same(&found, &expected);
    }
    assert!(counted > 20, "{counted}");
}

/// The rules for uncertain times, pair by pair.
#[test]
fn clashes_of_uncertain_times_are_the_pairs_that_break_the_rule() {
    let policy = Policy { time_sigma_s: 60.0, ..Policy::default() };
    let day = day_of(crowd(70, CENTRES[1], 15), policy);
    let (scene, tracks) = (scene_of(&day), tracks_of(&day));
    let changes = changes(&tracks, 15);
    let versions = versions(&tracks, &changes);
    let filed = |v: &Version<'_>| scene.filed(v.flight);
    let meets = |a: &Version<'_>, b: &Version<'_>| {
        shift_set(&scene, a, b, (-60.0, 60.0)).meets((-60.0, 60.0))
    };
    let buffered = |a: &Version<'_>, b: &Version<'_>| meets(a, b) && !meets(&filed(a), &filed(b));
    let risky = |a: &Version<'_>, b: &Version<'_>| {
        let planned = pair_probability(&scene, a, b);
        planned > 0.1 && planned > pair_probability(&scene, &filed(a), &filed(b)) + 1e-9
    };
    type Broken<'a> = &'a dyn Fn(&Version<'_>, &Version<'_>) -> bool;
    let rules: [(ShiftRule, Broken<'_>); 2] = [
        (ShiftRule::Buffered { buffer_s: 30.0 }, &buffered),
        (ShiftRule::Risk { max_probability: 0.1 }, &risky),
    ];
    let mut all: Vec<(VersionRef, Version<'_>)> =
        (0..70).map(|i| (VersionRef::Filed(FlightId(i)), scene.filed(FlightId(i)))).collect();
    all.extend(versions.iter().enumerate().map(|(i, v)| (VersionRef::Changed(i), *v)));
    for (rule, broken) in rules {
        let mut expected = Vec::new();
        for (a, one) in &all {
            for (b, other) in &all {
                if one.flight < other.flight && broken(one, other) {
                    expected.push(VersionPair { a: *a, b: *b });
                }
            }
        }
        expected.sort();
        assert!(expected.len() > 30, "{}", expected.len());
        assert_eq!(shift_clashes(&scene, &versions, rule), expected);
    }
}
