//! What the checks against the outside world share, and the converter that makes day folders of
//! real timetables.

pub mod real_day;
pub mod search_model;
