//! The search against exhaustive enumeration of thousands of random small models.

use rand::{Rng, RngExt, SeedableRng};
use rand_pcg::Pcg64;

use super::*;

/// A small model of every shape: soft and hard clashes that resting candidates take part in,
/// any-ofs with negative slack, and, where `hand` says so, candidates fixed or forbidden.
pub(super) fn random_model(rng: &mut Pcg64, hand: bool) -> Model {
    let count = rng.random_range(1..=6);
    let mut groups = Vec::new();
    for _ in 0..count {
        let mut values = vec![0];
        values.extend((0..rng.random_range(0..=3)).map(|_| rng.random_range(-4..=20)));
        let mut group = Group::of(&values);
        if rng.random_bool(0.2) {
            group.forbid(rng.random_range(1..=3));
        }
        if hand && rng.random_bool(0.3) {
            group.fix(rng.random_range(0..values.len() as u32));
            if group.candidates.iter().all(|candidate| !candidate.allowed) {
                group = Group::of(&values);
            }
        }
        groups.push(group);
    }
    let mut model = Model { groups, ..Model::default() };
    for _ in 0..rng.random_range(0..=8) {
        let (a, b) = (any_choice(rng, &model), any_choice(rng, &model));
        let cost =
            if rng.random_bool(0.6) { Cost::Hard } else { Cost::Soft(rng.random_range(0..=12)) };
        let rest = a.candidate == 0 && b.candidate == 0 && cost == Cost::Hard;
        if a.group != b.group && !rest {
            model.clashes.push(Clash { a, b, cost });
        }
    }
    for _ in 0..rng.random_range(0..=4) {
        let slack = rng.random_range(0..=3);
        let row = random_row(rng, &model, slack);
        model.rows.push(row);
    }
    for _ in 0..rng.random_range(0..=2) {
        let rows = rng.random_range(1..=3);
        let mut rows: Vec<Row> = (0..rows)
            .map(|_| {
                let slack = rng.random_range(-2..=1);
                random_row(rng, &model, slack)
            })
            .collect();
        if !rows.iter().any(|row| row.holds(&model.resting())) {
            rows[0].slack = 0;
        }
        model.any_ofs.push(AnyOf { rows });
    }
    model
}

fn any_choice(rng: &mut impl Rng, model: &Model) -> Choice {
    let group = rng.random_range(0..model.groups.len() as u32);
    let candidates = model.groups[group as usize].candidates.len() as u32;
    model::choice(group, rng.random_range(0..candidates))
}

fn random_row(rng: &mut impl Rng, model: &Model, slack: i64) -> Row {
    let mut terms = Vec::new();
    for _ in 0..rng.random_range(1..=8) {
        let choice = any_choice(rng, model);
        if choice.candidate != 0 {
            terms.push((choice, [1, 1, 1, 2, -1, -1][rng.random_range(0..6)]));
        }
    }
    Row { slack, terms }
}

/// All feasible choices, best first.
pub(super) fn enumerate(model: &Model) -> Vec<(i64, Vec<u32>)> {
    let mut found = Vec::new();
    let mut choices = model.resting();
    'all: loop {
        if model.violations(&choices).is_empty() {
            found.push((model.objective(&choices), choices.clone()));
        }
        for (chosen, group) in choices.iter_mut().zip(&model.groups) {
            *chosen += 1;
            if (*chosen as usize) < group.candidates.len() {
                continue 'all;
            }
            *chosen = 0;
        }
        break;
    }
    found.sort_by_key(|&(objective, _)| std::cmp::Reverse(objective));
    found
}

pub(super) fn is_maximal(model: &Model, choices: &[u32]) -> bool {
    let objective = model.objective(choices);
    (0..choices.len()).all(|group| {
        (0..model.groups[group].candidates.len() as u32).all(|candidate| {
            let mut switched = choices.to_vec();
            switched[group] = candidate;
            model.objective(&switched) <= objective || !model.violations(&switched).is_empty()
        })
    })
}

fn check(model: &Model, best: Option<i64>, solution: &Solution) {
    if best.is_none() {
        assert!(!solution.violations.is_empty());
        assert_eq!(solution.stopped, Stopped::Infeasible);
        assert_eq!(solution.bound, None);
        return;
    }
    assert_eq!(solution.violations, model.violations(&solution.choices));
    assert_eq!(solution.violations, []);
    {
        assert_eq!(solution.objective, model.objective(&solution.choices));
        assert!(solution.bound >= best, "bound {:?} {best:?}", solution.bound);
        assert_eq!(Some(solution.objective), best);
        assert_eq!(solution.stopped, Stopped::Optimal);
        assert!(is_maximal(model, &solution.choices));
    }
}

#[test]
fn answers_are_feasible_maximal_and_bounded() {
    for seed in 0..2000 {
        let mut rng = Pcg64::seed_from_u64(seed);
        let model = random_model(&mut rng, seed % 3 == 0);
        let best = enumerate(&model).first().map(|&(objective, _)| objective);
        let solution = solve(&model, &SolveOptions::default(), Watch::unattended()).unwrap();
        check(&model, best, &solution);
    }
}

#[test]
fn plans_come_in_order_and_differ_enough() {
    for seed in 0..600 {
        let mut rng = Pcg64::seed_from_u64(seed);
        let model = random_model(&mut rng, seed % 3 == 0);
        let min_difference = 1 + seed as usize % 3;
        let options = RankOptions { plans: 4, min_difference, solve: SolveOptions::default() };
        let plans = rank(&model, &options, Watch::unattended()).unwrap();
        if enumerate(&model).is_empty() {
            assert_eq!(plans.len(), 1);
            assert_eq!(plans[0].stopped, Stopped::Infeasible);
            continue;
        }
        for (position, plan) in plans.iter().enumerate() {
            assert_eq!(model.violations(&plan.choices), []);
            assert_eq!(plan.stopped, Stopped::Optimal);
            assert_eq!(plan.bound, Some(plan.objective));
            assert_eq!(
                plan.objective,
                best_differing(&model, &plans[..position], min_difference).unwrap()
            );
        }
        let another = best_differing(&model, &plans, min_difference);
        assert!(plans.len() == 4 || another.is_none(), "seed {seed}");
    }
}

/// The objective of the best choices that differ enough from all of these plans.
fn best_differing(model: &Model, plans: &[Solution], min_difference: usize) -> Option<i64> {
    let differs = |choices: &[u32], plan: &Solution| {
        choices.iter().zip(&plan.choices).filter(|(a, b)| a != b).count() >= min_difference
    };
    let mut all = enumerate(model).into_iter();
    all.find(|(_, choices)| plans.iter().all(|plan| differs(choices, plan)))
        .map(|(objective, _)| objective)
}

#[test]
fn forced_choices_are_made_at_the_least_cost() {
    for seed in 0..1500 {
        let mut rng = Pcg64::seed_from_u64(seed);
        let model = random_model(&mut rng, seed % 3 == 0);
        let options = SolveOptions::default();
        let mut search = Search::new(&model).unwrap();
        search.solve(&options, Watch::unattended());
        for group in 0..model.groups.len() as u32 {
            for candidate in 0..model.groups[group as usize].candidates.len() as u32 {
                let forced = choice(group, candidate);
                let answer = search.solve_forced(forced, &options, Watch::unattended());
                if !model.candidate(forced).unwrap().allowed {
                    assert_eq!(answer, Err(Defect::NothingAllowed { group }));
                    continue;
                }
                let mut fixed = model.clone();
                fixed.groups[group as usize].fix(candidate);
                let best = enumerate(&fixed).first().map(|&(objective, _)| objective);
                check(&fixed, best, &answer.unwrap());
            }
        }
    }
}

#[test]
fn further_rows_are_kept_at_the_least_cost() {
    for seed in 0..1500 {
        let mut rng = Pcg64::seed_from_u64(seed);
        let mut model = random_model(&mut rng, seed % 3 == 0);
        let without = model.clone();
        let options = SolveOptions::default();
        let mut search = Search::new(&without).unwrap();
        search.solve(&options, Watch::unattended());
        let slack = rng.random_range(-1..=2);
        let rows = [random_row(&mut rng, &model, slack), random_row(&mut rng, &model, 2)];
        let answer = search.solve_within(&rows, &options, Watch::unattended()).unwrap();
        model.rows.extend(rows);
        let best = enumerate(&model).first().map(|&(objective, _)| objective);
        check(&model, best, &answer);
    }
}

#[test]
fn the_state_agrees_with_the_judge() {
    for seed in 0..500 {
        let mut rng = Pcg64::seed_from_u64(seed);
        let model = random_model(&mut rng, true);
        let index = Index::new(&model).unwrap();
        let mut choices = model.resting();
        let mut state = State::new(&index, &choices).unwrap();
        for _ in 0..20 {
            let choice = any_choice(&mut rng, &model);
            let blockers = model.blockers(&choices, choice);
            assert_eq!(state.allows(choice), blockers.is_empty(), "seed {seed}");
            assert_eq!(
                kinds_of_violations(&model, &choices, &blockers),
                kinds(&state.blockers(choice))
            );
            let gain = state.gain(choice);
            let before = state.objective();
            state.switch(choice);
            choices[choice.group as usize] = choice.candidate;
            assert_eq!(state.objective(), before + gain);
            assert_eq!(state.objective(), model.objective(&choices));
            assert_eq!(state.choices(), choices);
            assert_eq!(state.is_feasible(), model.violations(&choices).is_empty());
        }
    }
}

/// Blockers as the state tells them, in one order.
fn kinds(blockers: &[Blocker]) -> Vec<Blocker> {
    let mut kinds = blockers.to_vec();
    kinds.sort_unstable();
    kinds
}

fn kinds_of_violations(model: &Model, choices: &[u32], violations: &[Violation]) -> Vec<Blocker> {
    let mut kinds: Vec<Blocker> = (violations.iter())
        .map(|violation| match *violation {
            Violation::Forbidden { .. } => Blocker::Forbidden,
            Violation::Clash { clash } => {
                let Clash { a, b, .. } = model.clashes[clash];
                let stays = choices[a.group as usize] == a.candidate;
                Blocker::Clash { with: if stays { a } else { b } }
            }
            Violation::Row { row, excess } => Blocker::Row { row, excess },
            Violation::AnyOf { any_of } => Blocker::AnyOf { any_of },
        })
        .collect();
    kinds.sort_unstable();
    kinds.dedup();
    kinds
}
