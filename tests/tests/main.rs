//! Checks of the whole: one module a boundary.

mod tidy;
