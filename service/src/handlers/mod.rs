//! One module a service: decode, call, encode, nothing more.

mod day;
mod paging;

use std::sync::Arc;

use crate::compute::Compute;
use crate::days::Days;
use crate::settings::Settings;

/// What every handler works with.
#[derive(Debug, Clone)]
pub(crate) struct Api {
    pub(crate) days: Arc<Days>,
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
            days: Arc::new(Days::new(settings.max_days)),
            compute: Arc::new(Compute::start(&settings)?),
            loads: Arc::new(tokio::sync::Semaphore::new(
                settings.max_loads.min(tokio::sync::Semaphore::MAX_PERMITS),
            )),
            settings: Arc::new(settings),
        })
    }
}
