//! Answers in words and in JSON.
//!
//! A report gives the answer first, in one line, then the reason, then the detail in tables, then
//! what it is not. Words are made here alone: the service answers with data.

pub(crate) mod ask;
pub(crate) mod audit;
pub(crate) mod cautions;
pub(crate) mod check;
pub(crate) mod compare;
pub(crate) mod figures;
pub(crate) mod names;
pub(crate) mod plan;
pub(crate) mod policy;
mod sheet;
#[cfg(test)]
mod tests;
pub(crate) mod trade_off;
pub(crate) mod why;
