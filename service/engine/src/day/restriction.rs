//! Restrictions of a built day.

use super::sector::Volume;

/// Volumes that a changed profile must keep out of in a period.
#[derive(Debug, Clone, PartialEq)]
pub struct Restriction {
    /// A name, as answers tell it.
    pub name: String,
    /// At least one volume.
    pub volumes: Vec<Volume>,
    /// Start, seconds of the day.
    pub from_s: f64,
    /// End (not included), seconds of the day.
    pub until_s: f64,
    /// Levels that stay allowed where they are held, feet, rising.
    pub levels_allowed_ft: Vec<f64>,
    /// Only flights from this airport, if given.
    pub departure: Option<String>,
    /// Only flights to this airport, if given.
    pub destination: Option<String>,
}

impl Restriction {
    /// Whether it is about flights between these airports.
    #[must_use]
    pub fn is_about(&self, departure: &str, destination: &str) -> bool {
        self.departure.as_deref().is_none_or(|only| only == departure)
            && self.destination.as_deref().is_none_or(|only| only == destination)
    }

    /// Whether a level may be held inside it.
    #[must_use]
    pub fn allows_level(&self, level_ft: f64) -> bool {
        self.levels_allowed_ft.contains(&level_ft)
    }
}
