//! The API as a client meets it: real messages over an in-memory connection.

#![expect(clippy::unwrap_used, reason = "helpers of tests, which clippy takes for other code")]

mod any_message;
mod by_hand;
mod days;
mod plans;
mod program;
mod serving;
mod support;
mod tables;
mod traffic;
