//! The Rimeshift gRPC service: wire messages to the engine's data and back, the days held, and
//! where their CPU work runs.
//!
//! Reading order: `wire` (messages to data), `shelf`, `days`,
//! `plans` (what is held), `compute` (where work runs),
//! `handlers` (decode, call, encode), `error` (one table to gRPC statuses), then [`serve`].

#![warn(
    clippy::indexing_slicing,
    clippy::cast_possible_truncation,
    clippy::cast_sign_loss,
    clippy::cast_possible_wrap
)]

mod canonical;
mod compute;
mod days;
mod deadline;
mod error;
mod handlers;
mod names;
mod pipe;
mod plans;
mod serve;
mod settings;
mod shelf;
mod stream;
mod wire;

pub use error::ERROR_DOMAIN;
pub use pipe::{PipeConnector, PipeIncoming, pipe};
pub use serve::{ServeError, serve};
pub use settings::Settings;
