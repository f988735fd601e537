//! A loaded day: ready to answer questions, with the plans kept under it.

use std::sync::Arc;
use std::time::SystemTime;

use rimeshift_engine::answer::DayCheck;
use rimeshift_engine::check::check;
use rimeshift_engine::day::{Day, Policy};
use rimeshift_engine::plan::PlanState;
use rimeshift_engine::traffic::Traffic;
use tokio::sync::{Mutex, OnceCell};

use crate::compute::{Compute, Work};
use crate::error::ServiceError;
use crate::names::{DayName, PlanName};
use crate::plans::KeptPlan;
use crate::shelf::Shelf;
use crate::wire::answer::Answers;
use crate::wire::clock::DayClock;

/// Days under other policies than their own that are kept ready, per day.
const MOST_VARIANTS: usize = 2;

/// A day with all that questions need.
#[derive(Debug)]
pub(crate) struct Ready {
    /// The day with its indexes.
    pub(crate) traffic: Traffic,
    /// The day as filed.
    pub(crate) filed: PlanState,
    /// Its clock.
    pub(crate) clock: DayClock,
    /// Made when first asked for. Asynchronous, as a worker that waited for another to make it
    /// could be the very worker that is to make it.
    check: OnceCell<Arc<DayCheck>>,
}

impl Ready {
    /// Builds the indexes.
    pub(crate) fn new(day: Day, clock: DayClock) -> Self {
        let traffic = Traffic::new(day);
        let filed = PlanState::filed(&traffic);
        Self { traffic, filed, clock, check: OnceCell::new() }
    }

    /// The day itself.
    pub(crate) fn day(&self) -> &Day {
        &self.traffic.day
    }

    /// Turns answers about it into messages.
    pub(crate) fn answers(&self) -> Answers<'_> {
        Answers { day: &self.traffic.day, clock: self.clock }
    }
}

/// A loaded day: never changed once it is here, but for the plans kept under it.
#[derive(Debug)]
pub(crate) struct LoadedDay {
    /// Its name.
    pub(crate) name: DayName,
    /// The day under its own policy.
    pub(crate) ready: Arc<Ready>,
    /// SHA-256 of its canonical form, in hexadecimal.
    pub(crate) sha256: String,
    /// When it was loaded.
    pub(crate) loaded: SystemTime,
    /// Plans kept.
    pub(crate) plans: Shelf<PlanName, KeptPlan>,
    /// The day under other policies, the latest used last.
    pub(crate) variants: Mutex<Vec<Arc<Ready>>>,
}

impl LoadedDay {
    /// The filed day looked over; worked out once.
    pub(crate) async fn check(&self, compute: &Compute) -> Result<Arc<DayCheck>, ServiceError> {
        let ready = Arc::clone(&self.ready);
        let make = || compute.run(Work::Job, None, move |_| Arc::new(check(&ready.traffic)));
        self.ready.check.get_or_try_init(make).await.cloned()
    }

    /// The day under a policy.
    pub(crate) async fn under(
        &self,
        policy: &Policy,
        compute: &Compute,
    ) -> Result<Arc<Ready>, ServiceError> {
        if *policy == self.ready.day().policy {
            return Ok(Arc::clone(&self.ready));
        }
        let mut variants = self.variants.lock().await;
        let found = variants.iter().position(|ready| ready.day().policy == *policy);
        let ready = match found {
            Some(place) => variants.remove(place),
            None => {
                let clock = self.ready.clock;
                let day = Day { policy: policy.clone(), ..self.ready.day().clone() };
                Arc::new(compute.run(Work::Job, None, move |_| Ready::new(day, clock)).await?)
            }
        };
        variants.push(Arc::clone(&ready));
        if variants.len() > MOST_VARIANTS {
            variants.remove(0);
        }
        Ok(ready)
    }
}
