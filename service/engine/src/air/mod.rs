//! The air that aircraft fly in.

pub mod isa;
