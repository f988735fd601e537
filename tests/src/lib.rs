//! What the checks against the outside world share.

pub mod search_model;
