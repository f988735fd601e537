//! A plan as a folder: written so that anyone can check it without trusting this program, and read
//! back.
//!
//! What: `plan.json` (where the plan comes from, every decision with its reasons), `points.csv` (the
//! new profiles of the moved flights of the best plan; `points-2.csv` and so on of the others),
//! `loads.csv` and `losses.csv` (of the best plan).
//!
//! How: the same day, policy, seed and work give the same bytes: numbers are the shortest that read
//! back as the same value, times are to the millisecond, nothing of the clock is written. A folder
//! appears whole or not at all: it is written beside its place, flushed to the disk, and renamed.

mod document;
mod hand;
mod read;
mod tables;
#[cfg(test)]
pub(crate) mod tests;
mod write;

pub(crate) use document::{ReasonDocument, StretchDocument};
pub(crate) use hand::HandDocument;
pub(crate) use read::{load, read};
pub(crate) use write::{Existing, check_place, write};

use rimeshift_proto::v1::{Day, LimitPrice, Plan, PlanOrigin, PlanRows};

/// The plans that a search found, best first.
#[derive(Debug, Clone, Default)]
pub(crate) struct FoundPlans {
    /// The day.
    pub(crate) day: Day,
    /// What they share.
    pub(crate) origin: PlanOrigin,
    /// The plans.
    pub(crate) plans: Vec<FoundPlan>,
    /// What the limits that bind cost the best one, dearest first.
    pub(crate) limit_prices: Vec<LimitPrice>,
}

/// One plan with its rows.
#[derive(Debug, Clone, Default)]
pub(crate) struct FoundPlan {
    /// What it adds up to.
    pub(crate) plan: Plan,
    /// Its rows.
    pub(crate) rows: PlanRows,
}

/// The name of the file that makes a folder a plan.
const DOCUMENT: &str = "plan.json";

/// The name of the profiles of the plan of a rank.
fn points_name(rank: usize) -> String {
    if rank <= 1 { "points.csv".to_owned() } else { format!("points-{rank}.csv") }
}
