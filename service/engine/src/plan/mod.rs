//! The best sets of level changes that can be granted together, and why the rest is refused.
//!
//! `options` judges each alternative by itself and finds what one flight can fly together;
//! `problem` turns the day into a model for the search; `find` runs it and maps the answer back;
//! `refusal` says what blocks an option, and which grants would have to go for it. `state` is the
//! day as a plan makes it, against which single questions are answered too.

mod apart;
mod by_hand;
mod decide;
mod export;
mod find;
mod limit_prices;
mod operators;
mod options;
mod problem;
mod quantum;
mod refusal;
mod state;
#[cfg(test)]
mod tests;
#[cfg(test)]
mod tests_apart;
#[cfg(test)]
mod tests_rules;
mod trade_off;
mod why;

pub use by_hand::Unmet;
pub(crate) use decide::planned_stretches;
pub use export::export_mps;
pub use find::{FindOptions, PlanError, Progress, Watch, find};
pub use options::TooManyCombinations;
pub(crate) use options::sort_by_start;
pub use state::{Moved, PlanState};
pub use trade_off::trade_off;
pub use why::why;
