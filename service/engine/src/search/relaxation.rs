//! The linear relaxation of a part: its rows, and cliques of candidates of which at most one can be
//! chosen, grown from clashes and tight rows over all candidates, resting ones included. Cliques
//! bring the relaxation much nearer to the optimum than the clashes they cover (Padberg 1973,
//! Mathematical Programming 5; Atamtürk, Nemhauser and Savelsbergh 2000, European Journal of
//! Operational Research 121).

use super::index::{Index, Lists};
use super::presolve::by_group;
use super::split::Part;

/// max Σ value, one candidate a group, Σ coefficient ≤ right side (more at a cost where soft).
#[derive(Debug)]
pub(super) struct Relaxation {
    /// (variable, coefficient) of every inequality.
    pub(super) rows: Lists<(u32, i64)>,
    pub(super) right: Vec<i64>,
    /// What one unit above the right side costs; `None` where it is not possible.
    pub(super) cap: Vec<Option<i64>>,
    /// (inequality, coefficient) of every variable.
    pub(super) columns: Lists<(u32, i64)>,
    /// The part's row that an inequality stands for, if it does.
    pub(super) source: Vec<Option<u32>>,
    /// Prices to start from.
    pub(super) start: Vec<f64>,
}

/// Prices found earlier: of rows, and of cliques of candidates.
#[derive(Debug, Clone, PartialEq, Default)]
pub(super) struct Hints {
    /// By row of the index; as good as all 0 if empty.
    pub(super) rows: Vec<f64>,
    pub(super) cliques: Vec<(Vec<u32>, f64)>,
}

impl Hints {
    /// The same for a part of the index.
    pub(super) fn inside(&self, part: &Part) -> Self {
        let local = |var: &u32| part.vars.binary_search(var).ok().map(|var| var as u32);
        let price = |&row: &u32| self.rows.get(row as usize).copied().unwrap_or(0.0);
        let clique = |(clique, price): &(Vec<u32>, f64)| {
            let clique: Vec<u32> = clique.iter().filter_map(local).collect();
            (clique.len() > 1).then_some((clique, *price))
        };
        let mut rows: Vec<f64> = part.rows.iter().map(price).collect();
        for (here, whole) in &part.twins {
            rows[*here as usize] += price(whole);
        }
        Self { rows, cliques: self.cliques.iter().filter_map(clique).collect() }
    }
}

/// Longest list of candidates that a clique is grown from.
const WIDEST: usize = 64;

impl Relaxation {
    /// The relaxation of all firm rows and clashes; any-ofs are left out.
    pub(super) fn new(index: &Index, hints: &Hints) -> Self {
        let mut inequalities = Vec::new();
        let mut graph = Graph::new(index);
        let mut seeds = Vec::new();
        for row in 0..index.firm_rows {
            let price = hints.rows.get(row as usize).copied().unwrap_or(0.0);
            match graph.add_row(index, row) {
                Some(clique) => seeds.push((clique, Some(row), price)),
                None => inequalities.push(Inequality {
                    terms: index.row_terms[row].to_vec(),
                    right: index.slack[row as usize],
                    cap: None,
                    source: Some(row),
                    price,
                }),
            }
        }
        for any_of in 0..index.any_of_rows.len() as u32 {
            graph.add_any_of(index, any_of);
        }
        graph.seal();
        let known = hints.cliques.iter().filter(|(clique, _)| graph.is_clique(clique));
        seeds.extend(known.map(|(clique, price)| (clique.clone(), None, *price)));
        inequalities.extend(graph.cover(seeds));
        inequalities.extend(stars(index));
        Self::collect(index, &inequalities)
    }

    fn collect(index: &Index, inequalities: &[Inequality]) -> Self {
        let by_row: Vec<_> = (0u32..)
            .zip(inequalities)
            .flat_map(|(row, it)| it.terms.iter().map(move |&term| (row, term)))
            .collect();
        let by_var: Vec<_> = by_row.iter().map(|&(row, (var, by))| (var, (row, by))).collect();
        Self {
            rows: Lists::collect(inequalities.len(), &by_row),
            right: inequalities.iter().map(|it| it.right).collect(),
            cap: inequalities.iter().map(|it| it.cap).collect(),
            columns: Lists::collect(index.value.len(), &by_var),
            source: inequalities.iter().map(|it| it.source).collect(),
            start: inequalities.iter().map(|it| it.price).collect(),
        }
    }

    /// What these prices are worth knowing for later. `rows` is the number of rows of the index.
    pub(super) fn hints(&self, prices: &[f64], rows: usize) -> Hints {
        let mut hints = Hints { rows: vec![0.0; rows], cliques: Vec::new() };
        for (inequality, &price) in (0u32..).zip(prices) {
            match self.source[inequality as usize] {
                Some(row) => hints.rows[row as usize] = price,
                None if price > 0.0 && self.cap[inequality as usize].is_none() => {
                    let clique = self.rows[inequality].iter().map(|&(var, _)| var).collect();
                    hints.cliques.push((clique, price));
                }
                None => {}
            }
        }
        hints
    }
}

#[derive(Debug)]
struct Inequality {
    terms: Vec<(u32, i64)>,
    right: i64,
    cap: Option<i64>,
    source: Option<u32>,
    price: f64,
}

/// Candidates that exclude each other, as neighbours: by a clash, by a row, or as mates.
struct Graph<'i> {
    index: &'i Index,
    /// Pairs of different groups, both ways.
    pairs: Vec<(u32, u32)>,
    neighbours: Lists<u32>,
}

impl<'i> Graph<'i> {
    fn new(index: &'i Index) -> Self {
        let vars = 0..index.value.len() as u32;
        let pairs =
            vars.flat_map(|var| index.hard[var].iter().map(move |&other| (var, other))).collect();
        Self { index, pairs, neighbours: Lists::collect(index.value.len(), &[]) }
    }

    /// Adds the pairs that a row excludes. If the row says no more than that at most one of its
    /// candidates can be chosen, returns them.
    fn add_row(&mut self, index: &Index, row: u32) -> Option<Vec<u32>> {
        let Over { room, mut over } = Over::new(index, row);
        if over.iter().all(|&(over, _)| over == 1) && room == 1 {
            let mut clique: Vec<u32> = over.iter().map(|&(_, var)| var).collect();
            clique.sort_unstable();
            self.pair_all(&clique);
            return Some(clique);
        }
        over.sort_unstable();
        let big: Vec<u32> =
            over.iter().filter(|&&(over, _)| 2 * over > room).map(|&(_, var)| var).collect();
        if big.len() <= WIDEST {
            self.pair_all(&big);
        }
        None
    }

    /// Adds the pairs that break every row of an any-of by themselves.
    fn add_any_of(&mut self, index: &Index, any_of: u32) {
        let rows: Vec<Over> =
            index.any_of_rows[any_of].iter().map(|&row| Over::new(index, row)).collect();
        let Some(first) = rows.first() else { return };
        if first.over.len() > WIDEST {
            return;
        }
        for (position, &(_, a)) in first.over.iter().enumerate() {
            for &(_, b) in &first.over[position + 1..] {
                let apart = index.group_of[a as usize] != index.group_of[b as usize];
                if apart && rows.iter().all(|row| row.of(a) + row.of(b) > row.room) {
                    self.pairs.extend([(a, b), (b, a)]);
                }
            }
        }
    }

    fn pair_all(&mut self, vars: &[u32]) {
        for &a in vars {
            for &b in vars {
                if self.index.group_of[a as usize] != self.index.group_of[b as usize] {
                    self.pairs.push((a, b));
                }
            }
        }
    }

    fn seal(&mut self) {
        self.pairs.sort_unstable();
        self.pairs.dedup();
        self.neighbours = Lists::collect(self.index.value.len(), &self.pairs);
    }

    fn excludes(&self, a: u32, b: u32) -> bool {
        a != b
            && (self.index.group_of[a as usize] == self.index.group_of[b as usize]
                || self.neighbours[a].binary_search(&b).is_ok())
    }

    fn is_clique(&self, vars: &[u32]) -> bool {
        let earlier = |last: usize| vars[..last].iter().all(|&a| self.excludes(a, vars[last]));
        (1..vars.len()).all(earlier)
    }

    /// Everything that excludes `var`.
    fn around(&self, var: u32) -> impl Iterator<Item = u32> + '_ {
        let mates =
            self.index.vars(self.index.group_of[var as usize]).filter(move |&mate| mate != var);
        mates.chain(self.neighbours[var].iter().copied())
    }

    /// Adds to a clique what excludes all of it, best connected first.
    fn grow(&self, clique: &mut Vec<u32>) {
        let Some(&first) = clique.iter().min_by_key(|&&var| self.neighbours[var].len()) else {
            return;
        };
        let mut open: Vec<u32> = self
            .around(first)
            .filter(|&var| clique.iter().all(|&member| self.excludes(var, member)))
            .take(WIDEST)
            .collect();
        while !open.is_empty() {
            let degree = |var: u32| open.iter().filter(|&&other| self.excludes(var, other)).count();
            let Some(next) =
                open.iter().copied().max_by_key(|&var| (degree(var), std::cmp::Reverse(var)))
            else {
                break;
            };
            clique.push(next);
            open.retain(|&var| self.excludes(var, next));
        }
        clique.sort_unstable();
    }

    /// Cliques that cover the seeds and every pair.
    fn cover(&self, seeds: Vec<(Vec<u32>, Option<u32>, f64)>) -> Vec<Inequality> {
        let mut covered = vec![false; self.pairs.len()];
        let mut cliques = Vec::new();
        for (mut clique, source, price) in seeds {
            self.grow(&mut clique);
            self.mark(&clique, &mut covered);
            cliques.push(at_most_one(&clique, source, price));
        }
        for (position, &(a, b)) in self.pairs.iter().enumerate() {
            if a < b && !covered[position] {
                let mut clique = vec![a, b];
                self.grow(&mut clique);
                self.mark(&clique, &mut covered);
                cliques.push(at_most_one(&clique, None, 0.0));
            }
        }
        cliques
    }

    fn mark(&self, clique: &[u32], covered: &mut [bool]) {
        for &a in clique {
            for &b in clique.iter().filter(|&&b| a < b) {
                if let Ok(position) = self.pairs.binary_search(&(a, b)) {
                    covered[position] = true;
                }
            }
        }
    }
}

/// What candidates add to a row beyond the least that their group does, where that is more than 0,
/// and the room that the least sum leaves.
struct Over {
    room: i64,
    over: Vec<(i64, u32)>,
}

impl Over {
    fn new(index: &Index, row: u32) -> Self {
        let mut room = index.slack[row as usize];
        let mut over = Vec::new();
        for run in by_group(index, &index.row_terms[row]) {
            let all = run.len() == index.vars(index.group_of[run[0].0 as usize]).len();
            let least = run.iter().map(|term| term.1).min().unwrap_or(0);
            let least = if all { least } else { least.min(0) };
            room -= least;
            for var in index.vars(index.group_of[run[0].0 as usize]) {
                let delta = run.iter().find(|term| term.0 == var).map_or(0, |term| term.1);
                if delta > least {
                    over.push((delta - least, var));
                }
            }
        }
        Self { room, over }
    }

    fn of(&self, var: u32) -> i64 {
        self.over.iter().find(|over| over.1 == var).map_or(0, |over| over.0)
    }
}

fn at_most_one(clique: &[u32], source: Option<u32>, price: f64) -> Inequality {
    let terms = clique.iter().map(|&var| (var, 1)).collect();
    Inequality { terms, right: 1, cap: None, source, price }
}

/// Soft clashes, those of one candidate with one group together: of costs c1 ≤ c2 ≤ … the step from
/// each to the next is paid if the candidate meets any of those that cost as much or more.
fn stars(index: &Index) -> Vec<Inequality> {
    let mut stars = Vec::new();
    for var in 0..index.value.len() as u32 {
        let group = |other: u32| index.group_of[other as usize];
        for run in index.soft[var].chunk_by(|a, b| group(a.0) == group(b.0)) {
            if group(var) > group(run[0].0) {
                continue;
            }
            let mut by_cost: Vec<(i64, u32)> =
                run.iter().map(|&(other, cost)| (cost, other)).collect();
            by_cost.sort_unstable();
            let mut paid = 0;
            for start in 0..by_cost.len() {
                let cost = by_cost[start].0;
                if cost > paid {
                    let rest = by_cost[start..].iter().map(|&(_, other)| (other, 1));
                    let mut terms: Vec<(u32, i64)> = rest.chain([(var, 1)]).collect();
                    terms.sort_unstable();
                    stars.push(Inequality {
                        terms,
                        right: 1,
                        cap: Some(cost - paid),
                        source: None,
                        price: 0.0,
                    });
                    paid = cost;
                }
            }
        }
    }
    stars
}
