//! The search against dynamic programming on models too large to enumerate: groups in a line, with
//! constraints between neighbours only, so that the best choices are found group by group.

use rand::{RngExt, SeedableRng};
use rand_pcg::Pcg64;

use super::*;

/// Groups in a line, tied to one part by clashes, soft costs, rows and any-ofs of neighbours.
fn line(rng: &mut Pcg64, groups: u32) -> Model {
    let mut model = Model::default();
    for _ in 0..groups {
        let mut values = vec![0];
        values.extend((0..rng.random_range(1..=3)).map(|_| rng.random_range(1..=1000)));
        model.groups.push(Group::of(&values));
    }
    for group in 1..groups {
        for _ in 0..rng.random_range(1..=3) {
            let (a, b) = (any(rng, &model, group - 1), any(rng, &model, group));
            let soft = Cost::Soft(rng.random_range(0..=400));
            let cost = if rng.random_bool(0.6) { Cost::Hard } else { soft };
            if a.candidate + b.candidate > 0 {
                model.clashes.push(Clash { a, b, cost });
            }
        }
        if rng.random_bool(0.5) {
            let row = row(rng, &model, group);
            model.rows.push(row);
        }
        if rng.random_bool(0.5) {
            let rows = vec![row(rng, &model, group), row(rng, &model, group)];
            model.any_ofs.push(AnyOf { rows });
        }
    }
    model
}

fn any(rng: &mut Pcg64, model: &Model, group: u32) -> Choice {
    choice(group, rng.random_range(0..model.groups[group as usize].candidates.len() as u32))
}

/// A row of two neighbours that holds at rest.
fn row(rng: &mut Pcg64, model: &Model, group: u32) -> Row {
    let mut terms = Vec::new();
    for near in [group - 1, group] {
        for candidate in 1..model.groups[near as usize].candidates.len() as u32 {
            terms.push((choice(near, candidate), rng.random_range(0..=2)));
        }
    }
    Row { slack: rng.random_range(0..=2), terms }
}

/// The greatest objective of choices that move at most so many groups, for every such number.
fn best_by_moved(model: &Model) -> Vec<Option<i64>> {
    let groups = model.groups.len();
    let mut best = vec![vec![None; groups + 1]; model.groups[0].candidates.len()];
    for (candidate, of) in model.groups[0].candidates.iter().enumerate() {
        if of.allowed {
            best[candidate][usize::from(candidate > 0)] = Some(of.value);
        }
    }
    for group in 1..groups as u32 {
        let candidates = &model.groups[group as usize].candidates;
        let mut next = vec![vec![None; groups + 1]; candidates.len()];
        let near = Near::new(model, group);
        for (candidate, of) in (0u32..).zip(candidates).filter(|(_, of)| of.allowed) {
            for (before, counts) in (0u32..).zip(&best) {
                let Some(cost) = near.cost(before, candidate) else { continue };
                for (moved, worth) in counts.iter().enumerate() {
                    let Some(worth) = worth.map(|worth: i64| worth + of.value - cost) else {
                        continue;
                    };
                    let moved = moved + usize::from(candidate > 0);
                    let known = &mut next[candidate as usize][moved];
                    *known = (*known).max(Some(worth));
                }
            }
        }
        best = next;
    }
    let mut so_far = None;
    (0..=groups)
        .map(|moved| {
            so_far = so_far.max(best.iter().filter_map(|counts| counts[moved]).max());
            so_far
        })
        .collect()
}

/// The constraints between a group and the one before it, as a model of two groups.
struct Near(Model);

impl Near {
    fn new(model: &Model, group: u32) -> Self {
        let shift = |of: Choice| choice(of.group + 1 - group, of.candidate);
        let here = |of: &Choice| of.group == group || of.group + 1 == group;
        let cut = |row: &Row| Row {
            slack: row.slack,
            terms: row.terms.iter().map(|&(of, delta)| (shift(of), delta)).collect(),
        };
        let ours = |row: &&Row| row.terms.iter().all(|(of, _)| here(of));
        let clashes = model.clashes.iter().filter(|clash| here(&clash.a) && here(&clash.b));
        Self(Model {
            groups: model.groups[group as usize - 1..=group as usize].to_vec(),
            clashes: clashes
                .map(|c| Clash { a: shift(c.a), b: shift(c.b), cost: c.cost })
                .collect(),
            rows: model.rows.iter().filter(ours).map(cut).collect(),
            any_ofs: (model.any_ofs.iter())
                .filter(|any_of| any_of.rows.iter().all(|row| ours(&row)))
                .map(|any_of| AnyOf { rows: any_of.rows.iter().map(cut).collect() })
                .collect(),
        })
    }

    /// What the two choices cost together, if they go together.
    fn cost(&self, before: u32, here: u32) -> Option<i64> {
        let choices = [before, here];
        let apart: i64 = (self.0.groups.iter().zip(choices))
            .map(|(group, candidate)| group.candidates[candidate as usize].value)
            .sum();
        let fits = self.0.violations(&choices).is_empty();
        fits.then(|| apart - self.0.objective(&choices))
    }
}

fn assert_best(model: &Model, solution: &Solution, best: Option<i64>, seed: u64) {
    assert_eq!(solution.violations, [], "seed {seed}");
    assert_eq!(model.violations(&solution.choices), [], "seed {seed}");
    assert_eq!(Some(solution.objective), best, "seed {seed}");
    assert_eq!(solution.bound, best, "seed {seed}");
    assert_eq!(solution.objective, model.objective(&solution.choices));
}

#[test]
fn long_lines_are_solved_and_asked_about_again() {
    for seed in 0..8 {
        let mut rng = Pcg64::seed_from_u64(seed);
        let groups = rng.random_range(50..150);
        let model = line(&mut rng, groups);
        let by_moved = best_by_moved(&model);
        let options = SolveOptions { seed, ..SolveOptions::default() };
        let mut search = Search::new(&model).unwrap();
        let solution = search.solve(&options, Watch::unattended());
        assert_best(&model, &solution, by_moved.last().copied().flatten(), seed);

        for _ in 0..10 {
            let group = rng.random_range(0..groups);
            let forced = any(&mut rng, &model, group);
            let mut fixed = model.clone();
            fixed.groups[group as usize].fix(forced.candidate);
            let best = best_by_moved(&fixed).last().copied().flatten();
            let answer = search.solve_forced(forced, &options, Watch::unattended()).unwrap();
            match best {
                Some(_) => assert_best(&fixed, &answer, best, seed),
                None => assert_eq!(answer.stopped, Stopped::Infeasible),
            }
        }

        // Proofs under such a row may take long; what is found must be sound at any rate.
        let options = SolveOptions { work: 1_000_000, ..options };
        let moved = solution.choices.iter().filter(|&&candidate| candidate > 0).count();
        for fewer in [1, 3, moved / 2] {
            let most = moved - fewer;
            let row = at_most_moved(&model, most);
            let answer = search.solve_within(&[row], &options, Watch::unattended()).unwrap();
            assert_eq!(model.violations(&answer.choices), [], "seed {seed}");
            assert!(answer.choices.iter().filter(|&&candidate| candidate > 0).count() <= most);
            let best = by_moved[most];
            assert!(Some(answer.objective) <= best && best <= answer.bound, "seed {seed}");
        }
    }
}

fn at_most_moved(model: &Model, most: usize) -> Row {
    let terms = (0u32..).zip(&model.groups).flat_map(|(group, of)| {
        (1..of.candidates.len() as u32).map(move |candidate| (choice(group, candidate), 1))
    });
    Row { slack: most as i64, terms: terms.collect() }
}

/// The any-ofs decide: without them more could be had.
#[test]
fn any_ofs_are_kept_in_large_parts() {
    let mut decided = 0;
    for seed in 100..120 {
        let model = line(&mut Pcg64::seed_from_u64(seed), 80);
        let best = best_by_moved(&model).last().copied().flatten();
        let without = Model { any_ofs: Vec::new(), ..model.clone() };
        decided += i32::from(best_by_moved(&without).last().copied().flatten() > best);
        let solution = solve(&model, &SolveOptions::default(), Watch::unattended()).unwrap();
        assert_best(&model, &solution, best, seed);
    }
    assert_eq!(decided, 20);
}

/// Out of work or told to stop, the plan is sound and the bound holds.
#[test]
fn unfinished_searches_are_sound() {
    for seed in 200..220 {
        let model = line(&mut Pcg64::seed_from_u64(seed), 120);
        let best = best_by_moved(&model).last().copied().flatten();
        for work in [0, 1_000, 10_000, 100_000, 300_000] {
            let options = SolveOptions { work, ..SolveOptions::default() };
            let solution = solve(&model, &options, Watch::unattended()).unwrap();
            assert_eq!(model.violations(&solution.choices), [], "seed {seed} work {work}");
            assert!(Some(solution.objective) <= best && best <= solution.bound);
        }
    }
}
