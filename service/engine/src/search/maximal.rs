//! Several plans, best first, each differing enough from all better ones and each *maximal*: no
//! single group's switch is feasible and gains. A plan that is another one less something is no
//! choice for anybody, although there are as many of these as there are things to leave out.
//!
//! Whether a switch is feasible and gains depends only on the groups with which the switched one
//! shares a clash or a row that can bind. A plan in which a switch is possible is therefore cut off
//! together with all others that choose the same in those groups: of them none is maximal. Where a
//! group shares nothing, its choice can't differ at all.

use std::sync::atomic::AtomicU64;

use super::budget::{Budget, Watch};
use super::improve;
use super::index::Index;
use super::model::{Defect, Row, choice};
use super::ranking::{RankOptions, differ};
use super::solve::{Search, Solution, SolveOptions, Stopped};
use super::state::State;

/// Most terms of the rows that cut off what is around one plan.
const MOST_TERMS: usize = 300_000;
/// Most plans that are cut off before the search for one more is given up.
const MOST_ROUNDS: usize = 200;

impl Search<'_> {
    /// The best plan, the best maximal one of those that differ from it in enough groups, and so on;
    /// fewer than asked for if no more exist or none was found in good time. A bound speaks of all
    /// maximal plans that differ enough from the better ones listed.
    ///
    /// # Errors
    /// The first [`Defect`] of a row added; there is none.
    pub fn rank_maximal(
        &mut self,
        options: &RankOptions,
        watch: Watch<'_>,
    ) -> Result<Vec<Solution>, Defect> {
        let mut plans = vec![self.solve(&options.solve, watch)];
        let neighbours = Neighbours::new(&self.index);
        let mut rows = Vec::new();
        while plans.len() < options.plans
            && let Some(last) = plans.last()
            && last.bound.is_some()
            && last.stopped != Stopped::Asked
        {
            rows.push(differ(&last.choices, options.min_difference.max(1)));
            if plans.len() == 1 {
                rows.extend(neighbours.settled(&last.choices));
            }
            rows.extend(neighbours.lesser(&last.choices));
            match self.next_maximal(&mut rows, &neighbours, &plans, options, watch)? {
                Some(next) => plans.push(next),
                None => break,
            }
        }
        Ok(plans)
    }

    fn next_maximal(
        &self,
        rows: &mut Vec<Row>,
        neighbours: &Neighbours<'_>,
        plans: &[Solution],
        options: &RankOptions,
        watch: Watch<'_>,
    ) -> Result<Option<Solution>, Defect> {
        let start = plans.last().map(|last| last.choices.clone());
        let ask = SolveOptions { start, ..options.solve.clone() };
        let meter = AtomicU64::new(0);
        let mut work = 0;
        for _ in 0..MOST_ROUNDS {
            let left = SolveOptions { work: options.solve.work - work, ..ask.clone() };
            let next = self.solve_within(rows, &left, watch)?;
            work += next.work;
            if next.bound.is_none() {
                return Ok(None);
            }
            let Some(mut state) = State::new(&self.index, &next.choices) else { return Ok(None) };
            let before = state.clone();
            improve::polish(&mut state, None, &mut Budget::new(u64::MAX, watch, &meter));
            let choices = state.choices();
            let differs = |plan: &Solution| {
                let apart = plan.choices.iter().zip(&choices).filter(|(a, b)| a != b).count();
                apart >= options.min_difference.max(1)
            };
            if plans.iter().all(differs) {
                let objective = state.objective();
                let mut found = Solution { choices, objective, ..next };
                found.row_prices.truncate(self.model.rows.len());
                if found.bound.is_some_and(|bound| bound <= objective) {
                    found.stopped = Stopped::Optimal;
                }
                return Ok(Some(found));
            }
            if next.stopped == Stopped::Asked || work >= options.solve.work {
                return Ok(None);
            }
            rows.extend(neighbours.cuts(&before));
        }
        Ok(None)
    }
}

/// Which groups have a say in whether a switch is possible.
struct Neighbours<'i> {
    index: &'i Index,
    /// Whether a row can bind at all.
    binds: Vec<bool>,
}

impl<'i> Neighbours<'i> {
    fn new(index: &'i Index) -> Self {
        let binds = (0..index.slack.len() as u32)
            .map(|row| {
                // One candidate a group: the most that each can add.
                let of_groups = index.row_terms[row]
                    .chunk_by(|a, b| index.group_of[a.0 as usize] == index.group_of[b.0 as usize]);
                let most = |of: &[(u32, i64)]| of.iter().map(|t| t.1).max().unwrap_or(0).max(0);
                of_groups.map(most).sum::<i64>() > index.slack[row as usize]
            })
            .collect();
        Self { index, binds }
    }

    /// The groups on whose choices it depends whether `to` can take the place of `from`, both of one
    /// group, and what that gains.
    fn of(&self, from: u32, to: u32) -> Vec<u32> {
        let index = self.index;
        let own = index.group_of[to as usize];
        let mut groups: Vec<u32> = Vec::new();
        let mut add = |var: u32| groups.push(index.group_of[var as usize]);
        index.hard[to].iter().for_each(|&var| add(var));
        [from, to].into_iter().flat_map(|v| &index.soft[v]).for_each(|&(var, _)| add(var));
        let rows = index.var_terms[to].iter().chain(&index.var_terms[from]);
        for &(row, _) in rows.filter(|(row, _)| self.binds[*row as usize]) {
            index.row_terms[row].iter().for_each(|&(var, _)| add(var));
            // An any-of holds by any of its rows.
            let beside = index.row_any_ofs[row].iter().flat_map(|&of| &index.any_of_rows[of]);
            for &other in beside {
                index.row_terms[other].iter().for_each(|&(var, _)| add(var));
            }
        }
        groups.sort_unstable();
        groups.dedup();
        groups.retain(|&group| group != own);
        groups
    }

    /// A row for each group that shares nothing with any other and has one best candidate: every
    /// maximal plan chooses it as this one does.
    fn settled(&self, choices: &[u32]) -> Vec<Row> {
        let settled = |group: u32| {
            let chosen = self.index.vars(group).start + choices[group as usize];
            let others = || self.index.allowed_vars(group).filter(move |&var| var != chosen);
            let value = |var: u32| self.index.value[var as usize];
            others().all(|var| value(var) < value(chosen))
                && others().all(|var| self.of(var, chosen).is_empty())
        };
        (0..self.index.groups())
            .filter(|&group| settled(group))
            .map(|group| Row {
                slack: -1,
                terms: vec![(choice(group, choices[group as usize]), -1)],
            })
            .collect()
    }

    /// A row for each lesser candidate of each group: beside what the groups around it choose in
    /// this plan, which is feasible, it could be switched to what the plan chooses. No rows where
    /// they would be too long in all.
    fn lesser(&self, choices: &[u32]) -> Vec<Row> {
        let mut rows = Vec::new();
        let mut terms_left = MOST_TERMS;
        for group in 0..self.index.groups() {
            let to = self.index.vars(group).start + choices[group as usize];
            let value = |var: u32| self.index.value[var as usize];
            for from in self.index.allowed_vars(group).filter(|&var| value(var) < value(to)) {
                // What is gained must not depend on others.
                if !self.index.soft[from].is_empty() || !self.index.soft[to].is_empty() {
                    continue;
                }
                let around = self.of(from, to);
                let Some(left) = terms_left.checked_sub(around.len() + 1) else {
                    return Vec::new();
                };
                terms_left = left;
                let slack = around.len() as i64;
                let chosen = |group: u32| (choice(group, choices[group as usize]), 1);
                let terms = around.into_iter().map(chosen).chain([(self.index.choice(from), 1)]);
                rows.push(Row { slack, terms: terms.collect() });
            }
        }
        rows
    }

    /// A row for each switch that is possible and gains.
    fn cuts(&self, state: &State<'_>) -> Vec<Row> {
        let mut rows = Vec::new();
        for group in 0..self.index.groups() {
            let from = state.chosen[group as usize];
            let possible = self
                .index
                .allowed_vars(group)
                .find(|&to| to != from && state.gain_of(to) > 0 && state.allows_var(to));
            let Some(to) = possible else { continue };
            let around = self.of(from, to);
            let slack = around.len() as i64;
            let chosen = |group: u32| (self.index.choice(state.chosen[group as usize]), 1);
            let terms = around.into_iter().chain([group]).map(chosen).collect();
            rows.push(Row { slack, terms });
        }
        rows
    }
}

#[cfg(test)]
mod tests {
    use rand::{RngExt, SeedableRng};
    use rand_pcg::Pcg64;

    use super::super::oracle::{enumerate, is_maximal, random_model};
    use super::*;

    /// Against all maximal plans of small models, taken greedily from the best on.
    #[test]
    fn later_plans_are_the_best_maximal_ones_that_differ() {
        let mut rng = Pcg64::seed_from_u64(7);
        let (mut second, mut maximal_but_not_second) = (0, 0);
        for round in 0..600 {
            let model = random_model(&mut rng, false);
            let min_difference = rng.random_range(1..=2);
            let options = RankOptions { plans: 4, min_difference, solve: SolveOptions::default() };
            let mut search = Search::new(&model).unwrap();
            let plans = search.rank_maximal(&options, Watch::unattended()).unwrap();
            if plans[0].bound.is_none() {
                continue;
            }
            let all = enumerate(&model);
            let maximal: Vec<_> = all.iter().filter(|(_, c)| is_maximal(&model, c)).collect();
            let mut kept: Vec<&Vec<u32>> = vec![&plans[0].choices];
            for plan in &plans {
                assert!(is_maximal(&model, &plan.choices), "{round}");
            }
            for rank in 1..4 {
                // Of equal plans any may have been listed before.
                let differs = |c: &&&(i64, Vec<u32>)| {
                    plans[..rank.min(plans.len())].iter().all(|plan| {
                        let apart = plan.choices.iter().zip(&c.1).filter(|(a, b)| a != b).count();
                        apart >= min_difference
                    })
                };
                let best = maximal.iter().find(differs);
                match (best, plans.get(rank)) {
                    (Some((objective, _)), Some(plan)) => {
                        assert_eq!(plan.objective, *objective, "{round} {rank}");
                        assert_eq!(plan.bound, Some(*objective));
                        second += 1;
                        kept.push(&plan.choices);
                    }
                    (None, None) => break,
                    (expected, found) => panic!("{round} {rank}: {expected:?} {found:?}"),
                }
            }
            maximal_but_not_second += usize::from(all.len() > maximal.len());
        }
        assert!(second > 100 && maximal_but_not_second > 100, "{second} {maximal_but_not_second}");
    }
}
