//! Branch and bound on one part (Land and Doig 1960), with bounds from the linear relaxation, proven
//! in whole numbers, and candidates ruled out wherever their choice can't lead to anything better.
//! Branching follows pseudo-costs that are initialised by trial (Achterberg, Koch and Martin 2005,
//! Operations Research Letters 33). Any-ofs are left out of the relaxation; a choice that breaks one
//! is branched on like a fractional one, so bounds stay valid without them.

use std::cmp::Ordering;
use std::collections::BinaryHeap;
use std::rc::Rc;

use super::budget::Budget;
use super::improve;
use super::index::Index;
use super::prices::{Proof, proves_infeasible};
use super::relaxation::Relaxation;
use super::simplex::{Basis, Outcome, Simplex};
use super::state::State;

/// Most simplex steps in one node, and in one trial of a branch.
const STEPS: usize = 20_000;
const TRIAL_STEPS: usize = 40;
/// Most candidates tried at one node.
const TRIALS: usize = 8;
/// Most memory for open nodes, in bytes, about.
const MEMORY: usize = 1 << 29;
/// Further from a whole number counts as fractional.
const FRACTIONAL: f64 = 1e-6;

/// What is known about a part.
#[derive(Debug, Clone)]
pub(super) struct Known {
    /// Best choices so far, as variables, and what they are worth; worth nothing if infeasible.
    pub(super) chosen: Vec<u32>,
    pub(super) objective: Option<i64>,
    /// Nothing feasible is worth more than this.
    pub(super) bound: i64,
}

impl Known {
    /// A node is of interest only if it could hold something worth this.
    pub(super) fn target(&self) -> i64 {
        self.objective.map_or(i64::MIN + 1, |objective| objective + 1)
    }

    /// Whether the gap, relative to the bound, is at most this.
    pub(super) fn is_good_enough(&self, gap: f64) -> bool {
        let most = (gap * self.bound.unsigned_abs() as f64) as i64;
        self.objective.map_or(self.bound == i64::MIN, |objective| self.bound - objective <= most)
    }

    /// Takes over choices if they are better.
    pub(super) fn offer(&mut self, state: &State<'_>) {
        if state.is_feasible() && self.objective.is_none_or(|best| best < state.objective()) {
            self.objective = Some(state.objective());
            self.chosen.copy_from_slice(&state.chosen);
        }
    }
}

/// A part of the tree still to be searched.
struct Node {
    bound: i64,
    depth: u32,
    serial: u64,
    left: Vec<bool>,
    basis: Rc<Basis>,
}

impl Ord for Node {
    fn cmp(&self, other: &Self) -> Ordering {
        (self.bound, self.depth, self.serial).cmp(&(other.bound, other.depth, other.serial))
    }
}

impl PartialOrd for Node {
    fn partial_cmp(&self, other: &Self) -> Option<Ordering> {
        Some(self.cmp(other))
    }
}

impl PartialEq for Node {
    fn eq(&self, other: &Self) -> bool {
        self.cmp(other) == Ordering::Equal
    }
}

impl Eq for Node {}

/// The search of one part.
pub(super) struct Tree<'i> {
    index: &'i Index,
    relaxation: &'i Relaxation,
    simplex: Simplex<'i>,
    known: Known,
    open: BinaryHeap<Node>,
    /// More nodes than this take too much memory: the search ends.
    most_open: usize,
    serial: u64,
    /// Mean loss of bound per unit of change, and of how many trials, down and up, by variable.
    losses: Vec<[(f64, u32); 2]>,
    pub(super) root_prices: Vec<f64>,
}

/// What became of a node.
enum Fate {
    Closed,
    Branch { bound: i64, var: u32, first: Way },
    Abandoned,
}

/// The two ways to branch on a variable.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Way {
    RuleOut,
    Choose,
}

impl<'i> Tree<'i> {
    pub(super) fn new(index: &'i Index, relaxation: &'i Relaxation, known: Known) -> Self {
        Self {
            index,
            relaxation,
            simplex: Simplex::new(index, relaxation),
            known,
            open: BinaryHeap::new(),
            most_open: MEMORY / (8 * (index.value.len() + relaxation.right.len() + 1)),
            serial: 0,
            losses: vec![[(0.0, 0); 2]; index.value.len()],
            root_prices: vec![0.0; relaxation.right.len()],
        }
    }

    pub(super) fn known(&self) -> &Known {
        &self.known
    }

    /// Solves the relaxation of what is left, lowers the bound, rules out candidates in `left` and
    /// rounds. True if that finished in good order.
    pub(super) fn root(&mut self, left: &mut [bool], budget: &mut Budget<'_>) -> bool {
        self.simplex.allow(left);
        let outcome = self.simplex.run(self.cutoff(), 4 * STEPS, budget);
        self.root_prices = self.simplex.prices();
        if outcome == Outcome::Infeasible {
            if proves_infeasible(self.index, self.relaxation, &self.root_prices, left) {
                self.known.bound = self.known.objective.unwrap_or(i64::MIN);
            }
            return false;
        }
        let proof = Proof::new(self.index, self.relaxation, &self.root_prices, left);
        self.known.bound =
            self.known.bound.min(proof.bound).max(self.known.objective.unwrap_or(i64::MIN));
        if outcome == Outcome::Optimal {
            let shares = self.simplex.shares();
            self.round(&shares, budget);
        }
        // What is known stays in, as a start for what is left.
        self.rule_out(&proof, left, self.known.objective.unwrap_or(i64::MIN + 1));
        outcome == Outcome::Optimal
    }

    fn cutoff(&self) -> f64 {
        self.known.objective.map_or(f64::NEG_INFINITY, |objective| objective as f64 + 1.0 - 1e-3)
    }

    /// Searches the tree below the root until the gap is reached or the budget is out.
    pub(super) fn search(&mut self, left: Vec<bool>, gap: f64, budget: &mut Budget<'_>) {
        let basis = Rc::new(self.simplex.basis());
        let bound = self.known.bound;
        let mut current = Some(Node { bound, depth: 0, serial: 0, left, basis });
        let mut fresh = false;
        while let Some(mut node) = current.take().or_else(|| self.open.pop()) {
            let best = self.known.objective.unwrap_or(i64::MIN);
            let highest = self.open.peek().map_or(i64::MIN, |open| open.bound).max(node.bound);
            self.known.bound = self.known.bound.min(highest).max(best);
            budget.tell(self.known.objective, self.known.bound);
            if self.known.is_good_enough(gap) {
                return;
            }
            if node.bound <= best {
                fresh = false;
                continue;
            }
            if budget.is_out() {
                return;
            }
            if !fresh {
                self.simplex.restore(&node.basis, budget);
            }
            fresh = false;
            match self.examine(&mut node, budget) {
                Fate::Closed => {}
                Fate::Abandoned => return,
                Fate::Branch { bound, var, first } => {
                    let (now, later) = self.branch(node, bound, var, first);
                    self.open.push(later);
                    if self.open.len() > self.most_open {
                        return;
                    }
                    current = Some(now);
                    fresh = true;
                }
            }
        }
        self.known.bound = self.known.objective.unwrap_or(i64::MIN);
    }

    fn branch(&mut self, node: Node, bound: i64, var: u32, first: Way) -> (Node, Node) {
        let basis = Rc::new(self.simplex.basis());
        let mut child = |way: Way, left: Vec<bool>| {
            self.serial += 1;
            let left = restricted(self.index, left, var, way);
            Node {
                bound,
                depth: node.depth + 1,
                serial: self.serial,
                left,
                basis: Rc::clone(&basis),
            }
        };
        let second = if first == Way::Choose { Way::RuleOut } else { Way::Choose };
        let later = child(second, node.left.clone());
        (child(first, node.left), later)
    }

    fn examine(&mut self, node: &mut Node, budget: &mut Budget<'_>) -> Fate {
        self.simplex.allow(&node.left);
        let outcome = self.simplex.run(self.cutoff(), STEPS, budget);
        if outcome == Outcome::Unfinished && budget.is_out() {
            return Fate::Abandoned;
        }
        let prices = self.simplex.prices();
        if outcome == Outcome::Infeasible {
            if proves_infeasible(self.index, self.relaxation, &prices, &node.left) {
                return Fate::Closed;
            }
            return self.branch_anywhere(node);
        }
        let proof = Proof::new(self.index, self.relaxation, &prices, &node.left);
        budget.spend(self.relaxation.columns.items_len());
        node.bound = node.bound.min(proof.bound);
        if node.bound < self.known.target() {
            return Fate::Closed;
        }
        if !self.rule_out(&proof, &mut node.left, self.known.target()) {
            return Fate::Closed;
        }
        if outcome != Outcome::Optimal {
            return self.branch_anywhere(node);
        }
        let shares = self.simplex.shares();
        let fractional = self.fractional(&shares, &node.left);
        if fractional.is_empty() {
            return self.examine_whole(node, &shares, budget);
        }
        if node.serial % 16 == 1 {
            self.round(&shares, budget);
            if node.bound < self.known.target() {
                return Fate::Closed;
            }
        }
        let bound = node.bound;
        match self.choose(node, fractional, budget) {
            Some((var, first)) => Fate::Branch { bound: node.bound.min(bound), var, first },
            None => Fate::Closed,
        }
    }

    /// Rules out what can't be part of anything worth `target`; false if some group has nothing left.
    fn rule_out(&self, proof: &Proof, left: &mut [bool], target: i64) -> bool {
        for group in 0..self.index.groups() {
            let mut open = 0;
            for var in self.index.vars(group) {
                let may = &mut left[var as usize];
                *may = *may && !proof.excludes(self.index, var, target);
                open += u32::from(*may);
            }
            if open == 0 {
                return false;
            }
        }
        true
    }

    /// Fractional variables with their shares; resting ones only where a group has more than two.
    fn fractional(&self, shares: &[f64], left: &[bool]) -> Vec<(u32, f64)> {
        let mut found = Vec::new();
        for group in 0..self.index.groups() {
            let vars = self.index.vars(group);
            let open = vars.clone().filter(|&var| left[var as usize]).count();
            for var in vars.rev().take(if open > 2 { usize::MAX } else { open.max(1) }) {
                let share = shares[var as usize];
                if left[var as usize] && share > FRACTIONAL && share < 1.0 - FRACTIONAL {
                    found.push((var, share));
                    if open == 2 {
                        break;
                    }
                }
            }
        }
        found
    }

    /// A node whose relaxation chooses one candidate in every group.
    fn examine_whole(&mut self, node: &Node, shares: &[f64], budget: &mut Budget<'_>) -> Fate {
        let mut state = State::of_vars(self.index, self.greatest(shares, &node.left));
        budget.spend(self.relaxation.columns.items_len());
        let broken =
            if state.is_feasible() { None } else { self.group_in_broken(&state, &node.left) };
        if state.is_feasible() {
            self.known.offer(&state);
            improve::polish(&mut state, None, budget);
            self.known.offer(&state);
            if node.bound < self.known.target() {
                return Fate::Closed;
            }
        }
        match broken {
            Some(group) => {
                let var = state.chosen[group as usize];
                Fate::Branch { bound: node.bound, var, first: Way::RuleOut }
            }
            None => self.branch_anywhere(node),
        }
    }

    /// The candidate of greatest share of every group.
    fn greatest(&self, shares: &[f64], left: &[bool]) -> Vec<u32> {
        let greatest = |group| {
            let vars = self.index.vars(group);
            let open = vars.clone().filter(|&var| left[var as usize]);
            let best = open
                .max_by(|&a, &b| shares[a as usize].total_cmp(&shares[b as usize]).then(b.cmp(&a)));
            best.unwrap_or(vars.start)
        };
        (0..self.index.groups()).map(greatest).collect()
    }

    /// An undecided group that takes part in a broken any-of, the one with most left.
    fn group_in_broken(&self, state: &State<'_>, left: &[bool]) -> Option<u32> {
        let index = self.index;
        let broken = (0..index.any_of_rows.len() as u32)
            .filter(|&any_of| state.holding[any_of as usize] == 0);
        let groups = broken.flat_map(|any_of| {
            let rows = index.any_of_rows[any_of].iter();
            rows.flat_map(|&row| {
                index.row_terms[row].iter().map(|&(var, _)| index.group_of[var as usize])
            })
        });
        let open = |group: u32| index.vars(group).filter(|&var| left[var as usize]).count();
        groups
            .map(|group| (open(group), group))
            .filter(|&(open, _)| open > 1)
            .max()
            .map(|(_, group)| group)
    }

    /// Branches on the first group that is undecided; with none, the node is a single set of choices
    /// and is judged exactly.
    fn branch_anywhere(&mut self, node: &Node) -> Fate {
        for group in 0..self.index.groups() {
            let mut open = self.index.vars(group).filter(|&var| node.left[var as usize]);
            if let (Some(var), Some(_)) = (open.next(), open.next()) {
                return Fate::Branch { bound: node.bound, var, first: Way::Choose };
            }
        }
        let only = |group| self.index.vars(group).find(|&var| node.left[var as usize]);
        if let Some(chosen) = (0..self.index.groups()).map(only).collect() {
            self.known.offer(&State::of_vars(self.index, chosen));
        }
        Fate::Closed
    }

    /// The variable to branch on and the way to go first; none if a trial closed the node.
    fn choose(
        &mut self,
        node: &mut Node,
        mut fractional: Vec<(u32, f64)>,
        budget: &mut Budget<'_>,
    ) -> Option<(u32, Way)> {
        let guess = |tree: &Self, var: u32, share: f64| {
            let [down, up] = tree.losses[var as usize];
            let typical = tree.typical_loss();
            let of = |(mean, count): (f64, u32)| if count > 0 { mean } else { typical };
            score(of(down) * share, of(up) * (1.0 - share))
        };
        fractional.sort_by(|a, b| {
            let (of_a, of_b) = (guess(self, a.0, a.1), guess(self, b.0, b.1));
            of_b.total_cmp(&of_a).then(a.0.cmp(&b.0))
        });
        let untried =
            |tree: &Self, var: u32| tree.losses[var as usize].iter().any(|&(_, count)| count == 0);
        let trials: Vec<(u32, f64)> = fractional
            .iter()
            .copied()
            .filter(|&(var, _)| untried(self, var))
            .take(TRIALS)
            .collect();
        if !trials.is_empty() {
            let basis = self.simplex.basis();
            for (var, share) in trials {
                self.try_both(node, var, share, &basis, budget);
            }
            self.simplex.restore(&basis, budget);
        }
        let best = fractional.iter().max_by(|a, b| {
            let (of_a, of_b) = (guess(self, a.0, a.1), guess(self, b.0, b.1));
            of_a.total_cmp(&of_b).then(b.0.cmp(&a.0))
        });
        best.map(|&(var, share)| (var, if share > 0.5 { Way::Choose } else { Way::RuleOut }))
    }

    fn typical_loss(&self) -> f64 {
        1.0
    }

    /// Takes a few simplex steps each way to learn what branching on a variable costs.
    fn try_both(
        &mut self,
        node: &Node,
        var: u32,
        share: f64,
        basis: &Basis,
        budget: &mut Budget<'_>,
    ) {
        for (way, change) in [(Way::RuleOut, share), (Way::Choose, 1.0 - share)] {
            self.simplex.restore(basis, budget);
            let left = restricted(self.index, node.left.clone(), var, way);
            if !every_group_open(self.index, &left) {
                continue;
            }
            self.simplex.allow(&left);
            let outcome = self.simplex.run(self.cutoff(), TRIAL_STEPS, budget);
            let after = match outcome {
                Outcome::Infeasible | Outcome::Cutoff => self.cutoff().max(node.bound as f64 / 2.0),
                Outcome::Optimal | Outcome::Unfinished => self.simplex.objective(),
            };
            let loss = (node.bound as f64 - after).max(0.0) / change.max(1e-3);
            let (mean, count) = &mut self.losses[var as usize][usize::from(way == Way::Choose)];
            *mean = (*mean * f64::from(*count) + loss) / f64::from(*count + 1);
            *count += 1;
        }
    }

    /// Choices near the fractional ones: candidates of great share first, as far as they go together.
    fn round(&mut self, shares: &[f64], budget: &mut Budget<'_>) {
        if self.known.objective.is_none() {
            return;
        }
        let mut state = State::of_vars(self.index, self.known.chosen.clone());
        let mut order: Vec<u32> =
            (0..shares.len() as u32).filter(|&var| shares[var as usize] > 0.01).collect();
        order.sort_by(|&a, &b| shares[b as usize].total_cmp(&shares[a as usize]).then(a.cmp(&b)));
        for group in 0..self.index.groups() {
            let rest = self.index.vars(group).start;
            if shares[state.chosen[group as usize] as usize] < 0.5 && state.allows_var(rest) {
                state.switch_to(rest);
            }
        }
        for _ in 0..3 {
            for &var in &order {
                budget.spend(1 + self.index.var_terms[var].len());
                let group = self.index.group_of[var as usize];
                let now = state.chosen[group as usize];
                if now != var
                    && shares[now as usize] < shares[var as usize]
                    && state.allows_var(var)
                {
                    state.switch_to(var);
                }
            }
        }
        improve::climb(&mut state, budget);
        self.known.offer(&state);
    }
}

/// A branch is good if both its sides lose.
fn score(down: f64, up: f64) -> f64 {
    down.max(1e-6) * up.max(1e-6)
}

fn restricted(index: &Index, mut left: Vec<bool>, var: u32, way: Way) -> Vec<bool> {
    match way {
        Way::RuleOut => left[var as usize] = false,
        Way::Choose => {
            for mate in index.vars(index.group_of[var as usize]) {
                left[mate as usize] = mate == var;
            }
        }
    }
    left
}

fn every_group_open(index: &Index, left: &[bool]) -> bool {
    (0..index.groups()).all(|group| index.vars(group).any(|var| left[var as usize]))
}
