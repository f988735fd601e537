//! The days held, and the plans kept under them.
//!
//! Readers take an `Arc` of a whole day and keep it for as long as their call lasts; replacing or
//! deleting a day waits for nobody. The locks are held only to look up or change a map entry.

use std::collections::BTreeMap;
use std::sync::{Arc, PoisonError, RwLock};
use std::time::SystemTime;

use rimeshift_engine::day::Day;

use crate::error::{Kind, ServiceError};
use crate::names::DayName;

/// A loaded day: never changed once it is here.
#[derive(Debug)]
pub(crate) struct LoadedDay {
    /// Its name.
    pub(crate) name: DayName,
    /// The day.
    pub(crate) day: Day,
    /// SHA-256 of its canonical form, in hexadecimal.
    pub(crate) sha256: String,
    /// When it was loaded.
    pub(crate) loaded: SystemTime,
}

/// Whether a resource that is there already may be replaced.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Replace {
    /// Yes.
    Allowed,
    /// No: it is an error.
    Refused,
}

impl From<bool> for Replace {
    /// From the field `allow_replace`.
    fn from(allow_replace: bool) -> Self {
        if allow_replace { Self::Allowed } else { Self::Refused }
    }
}

/// Days by name.
#[derive(Debug)]
pub(crate) struct Days {
    by_name: RwLock<BTreeMap<DayName, Arc<LoadedDay>>>,
    most: usize,
}

impl Days {
    /// No days yet, and at most so many later.
    pub(crate) fn new(most: usize) -> Self {
        Self { by_name: RwLock::new(BTreeMap::new()), most }
    }

    /// The day of that name.
    pub(crate) fn get(&self, name: &DayName) -> Result<Arc<LoadedDay>, ServiceError> {
        self.read().get(name).cloned().ok_or_else(|| not_found(name))
    }

    /// Up to `most` days by name, from the first after `after` on.
    pub(crate) fn page(&self, after: Option<&DayName>, most: usize) -> Vec<Arc<LoadedDay>> {
        use std::ops::Bound::{Excluded, Unbounded};
        let start = after.map_or(Unbounded, Excluded);
        self.read().range((start, Unbounded)).take(most).map(|(_, day)| Arc::clone(day)).collect()
    }

    /// Whether a day could be put under that name now.
    pub(crate) fn check_room(&self, name: &DayName, replace: Replace) -> Result<(), ServiceError> {
        check_room(&self.read(), name, replace, self.most)
    }

    /// Puts a day under its name.
    pub(crate) fn put(&self, day: Arc<LoadedDay>, replace: Replace) -> Result<(), ServiceError> {
        let mut by_name = self.by_name.write().unwrap_or_else(PoisonError::into_inner);
        check_room(&by_name, &day.name, replace, self.most)?;
        let replaced = by_name.insert(day.name.clone(), day);
        drop(by_name);
        // Freed outside the lock: a day is large.
        drop(replaced);
        Ok(())
    }

    /// Deletes the day of that name.
    pub(crate) fn delete(&self, name: &DayName) -> Result<(), ServiceError> {
        let mut by_name = self.by_name.write().unwrap_or_else(PoisonError::into_inner);
        let deleted = by_name.remove(name);
        drop(by_name);
        deleted.map(drop).ok_or_else(|| not_found(name))
    }

    fn read(&self) -> std::sync::RwLockReadGuard<'_, BTreeMap<DayName, Arc<LoadedDay>>> {
        self.by_name.read().unwrap_or_else(PoisonError::into_inner)
    }
}

fn not_found(name: &DayName) -> ServiceError {
    ServiceError::NotFound { kind: Kind::Day, name: name.to_string() }
}

fn check_room(
    days: &BTreeMap<DayName, Arc<LoadedDay>>,
    name: &DayName,
    replace: Replace,
    most: usize,
) -> Result<(), ServiceError> {
    if days.contains_key(name) {
        return match replace {
            Replace::Allowed => Ok(()),
            Replace::Refused => {
                Err(ServiceError::AlreadyExists { kind: Kind::Day, name: name.to_string() })
            }
        };
    }
    if days.len() >= most {
        return Err(ServiceError::Exhausted {
            subject: "days",
            problem: format!("{most} days are held, the most allowed; delete one"),
        });
    }
    Ok(())
}
