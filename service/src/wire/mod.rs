//! Wire messages to the engine's data, and back: the only place that knows both.
//!
//! `from_wire` checks everything that the engine's own types can't hold (missing fields, unknown
//! words, times that are none) and collects every defect with its path; `to_wire` can't fail.
//! Adding a column: its protobuf field, a line in `from_wire`, and one in `canonical` so that it
//! counts for the day's hash.

pub(crate) mod answer;
pub(crate) mod by_hand;
pub(crate) mod chunks;
pub(crate) mod clock;
pub(crate) mod fields;
pub(crate) mod finding;
pub(crate) mod plan_rows;
pub(crate) mod policy;
pub(crate) mod question;
pub(crate) mod rows;
pub(crate) mod to_wire;
mod words;
