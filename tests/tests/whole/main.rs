//! Checks of the whole: one module a boundary.

#![expect(clippy::expect_used, reason = "a test fails by panicking")]

mod search;
mod standards;
mod tidy;
