//! One module a service: decode, call, encode, nothing more.

mod ask;
mod day;
mod explain;
mod export;
mod find;
mod paging;
mod plan;
mod trade_off;
mod traffic;

use std::sync::Arc;

use crate::compute::Compute;
use crate::days::LoadedDay;
use crate::error::{Kind, ServiceError};
use crate::names::DayName;
use crate::settings::Settings;
use crate::shelf::Shelf;

/// What every handler works with.
#[derive(Debug, Clone)]
pub(crate) struct Api {
    pub(crate) days: Arc<Shelf<DayName, LoadedDay>>,
    pub(crate) compute: Arc<Compute>,
    pub(crate) settings: Arc<Settings>,
    /// Places for streams of rows.
    pub(crate) loads: Arc<tokio::sync::Semaphore>,
}

impl Api {
    /// An api without days.
    ///
    /// # Errors
    /// The system gives no threads.
    pub(crate) fn start(settings: Settings) -> Result<Self, rayon::ThreadPoolBuildError> {
        Ok(Self {
            days: Arc::new(Shelf::new(Kind::Day, settings.max_days)),
            compute: Arc::new(Compute::start(&settings)?),
            loads: Arc::new(tokio::sync::Semaphore::new(
                settings.max_loads.min(tokio::sync::Semaphore::MAX_PERMITS),
            )),
            settings: Arc::new(settings),
        })
    }

    /// Whether a day is still the one of its name, so that a plan put under it can be found.
    fn still_held(&self, day: &Arc<LoadedDay>) -> Result<(), ServiceError> {
        let now = self.days.get(&day.name)?;
        if Arc::ptr_eq(&now, day) {
            return Ok(());
        }
        Err(ServiceError::Precondition {
            subject: day.name.to_string(),
            problem: "the day was replaced meanwhile; the plan is of the former one".to_owned(),
        })
    }
}
