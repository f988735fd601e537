//! The built program from outside: command line in, standard output, standard error, exit code and
//! folders out.

#![expect(clippy::expect_used, reason = "a test fails by panicking")]

mod answers;
mod bad_input;
mod plans;
mod service;
mod support;
