//! The plan search: which candidate of every group to choose, so that the total value is greatest
//! and no constraint is broken, and how far from the best the answer can be at most.
//!
//! It knows nothing of aviation. A [`Model`] is plain data: *groups*, of whose *candidates* exactly
//! one is chosen; *clashes* between candidates of different groups, hard or at a cost; *rows*, sums
//! of signed deltas that may not exceed a slack; *any-ofs*, sets of rows of which one must hold.
//! In the terms of the literature: a set-packing problem with generalised upper bounds, knapsack
//! rows and a few disjunctions.
//!
//! There is no clock here. Effort is counted in work units (about one touched term each), so the
//! same model, seed and budget give the same answer on any machine with any number of threads;
//! only the stop flag comes from outside.
//!
//! In reading order: [`model`] and [`check`] say what is asked for and judge an answer slowly and
//! plainly; `index` and `state` make single switches cheap; `greedy` and `improve` find plans;
//! `presolve` and `split` settle what reasoning can and cut the rest into parts; `relaxation`,
//! `prices`, `simplex` (on `factor`) and `exact` bound and close a part, in the order that `part`
//! gives; `solve` is the whole. `forced`, `further` and `ranking` answer later questions from what is
//! known by then; `budget` and `progress` count and tell.

mod budget;
pub mod check;
mod exact;
mod factor;
mod forced;
mod further;
mod greedy;
mod improve;
mod index;
mod maximal;
pub mod model;
#[cfg(test)]
mod oracle;
mod part;
#[cfg(test)]
mod paths;
mod presolve;
mod prices;
mod progress;
mod ranking;
mod relaxation;
mod simplex;
mod solve;
mod split;
mod state;

pub use budget::{Progress, Watch};
pub use check::Violation;
pub use index::Index;
pub use model::{AnyOf, Candidate, Choice, Clash, Cost, Defect, Group, Model, Row, choice};
pub use ranking::{RankOptions, rank};
pub use solve::{Presolved, Search, Solution, SolveOptions, Stopped, solve};
pub use state::{Blocker, State};
