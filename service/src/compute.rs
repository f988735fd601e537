//! Where CPU work runs: bounded pools apart from the async threads.
//!
//! Work is stopped when the caller goes, the deadline passes or the service stops; a panic in it
//! is that call's INTERNAL and nothing else's. Questions about one change have a pool of their own,
//! so that long searches can't starve them.

use std::panic::{AssertUnwindSafe, catch_unwind};
use std::sync::atomic::{AtomicBool, AtomicUsize, Ordering};
use std::sync::{Arc, Mutex, PoisonError};
use std::time::Instant;

use rimeshift_engine::answer::Stopped;
use tokio::sync::{OwnedSemaphorePermit, Semaphore, oneshot};

use crate::error::ServiceError;
use crate::settings::Settings;

/// The pools.
#[derive(Debug)]
pub(crate) struct Compute {
    jobs: Lane,
    asks: Lane,
    stopping: Arc<AtomicBool>,
}

/// Which pool.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Work {
    /// Builds, checks, searches and audits.
    Job,
    /// One change asked about.
    Ask,
}

/// A number of pools, one for each piece of work under way: in a shared one, work that waits for a
/// part of itself could take up a long search meanwhile, and end only with it.
#[derive(Debug)]
struct Lane {
    places: Arc<Semaphore>,
    free: Arc<Mutex<Vec<Arc<rayon::ThreadPool>>>>,
    waiting: AtomicUsize,
    most_waiting: usize,
}

/// A pool that is taken, given back when dropped.
struct Place {
    pool: Arc<rayon::ThreadPool>,
    free: Arc<Mutex<Vec<Arc<rayon::ThreadPool>>>>,
    _permit: OwnedSemaphorePermit,
}

impl Drop for Place {
    fn drop(&mut self) {
        // Before the permit, which is dropped after this.
        self.free.lock().unwrap_or_else(PoisonError::into_inner).push(Arc::clone(&self.pool));
    }
}

/// Says to running work whether, and why, it is to stop.
#[derive(Debug, Clone)]
pub(crate) struct StopSign {
    caller_gone: Arc<AtomicBool>,
    stopping: Arc<AtomicBool>,
    deadline: Option<Instant>,
}

impl StopSign {
    /// Why to stop; `None`: go on.
    pub(crate) fn reason(&self) -> Option<Stopped> {
        if self.caller_gone.load(Ordering::Relaxed) || self.stopping.load(Ordering::Relaxed) {
            Some(Stopped::Cancelled)
        } else if self.deadline.is_some_and(|deadline| Instant::now() >= deadline) {
            Some(Stopped::Time)
        } else {
            None
        }
    }
}

/// Sets the sign when the future that waits for the work is dropped.
struct CallerGuard(Arc<AtomicBool>);

impl Drop for CallerGuard {
    fn drop(&mut self) {
        self.0.store(true, Ordering::Relaxed);
    }
}

/// Gives back a place in the queue.
struct Waiting<'a>(&'a AtomicUsize);

impl Drop for Waiting<'_> {
    fn drop(&mut self) {
        self.0.fetch_sub(1, Ordering::Relaxed);
    }
}

impl Compute {
    /// Starts the pools.
    ///
    /// # Errors
    /// The system gives no threads.
    pub(crate) fn start(settings: &Settings) -> Result<Self, rayon::ThreadPoolBuildError> {
        let ask_lanes = settings.ask_threads.max(1);
        Ok(Self {
            jobs: Lane::start(
                "job",
                settings.max_jobs.max(1),
                settings.search_threads,
                settings.max_waiting_jobs,
            )?,
            asks: Lane::start("ask", ask_lanes, 1, usize::MAX)?,
            stopping: Arc::new(AtomicBool::new(false)),
        })
    }

    /// Asks all work to stop; work that begins later is asked at once.
    pub(crate) fn stop_all(&self) {
        self.stopping.store(true, Ordering::Relaxed);
    }

    /// Runs work and waits for it. Dropping the future asks the work to stop.
    pub(crate) async fn run<T: Send + 'static>(
        &self,
        work: Work,
        deadline: Option<Instant>,
        job: impl FnOnce(&StopSign) -> T + Send + 'static,
    ) -> Result<T, ServiceError> {
        let lane = match work {
            Work::Job => &self.jobs,
            Work::Ask => &self.asks,
        };
        let place = lane.enter().await?;
        let sign = StopSign {
            caller_gone: Arc::new(AtomicBool::new(false)),
            stopping: Arc::clone(&self.stopping),
            deadline,
        };
        let _guard = CallerGuard(Arc::clone(&sign.caller_gone));
        let (sender, receiver) = oneshot::channel();
        let span = tracing::Span::current();
        let pool = Arc::clone(&place.pool);
        pool.spawn(move || {
            let _entered = span.enter();
            let _place = place;
            if sign.caller_gone.load(Ordering::Relaxed) {
                return;
            }
            // The job owns what it changes, so nothing half-changed is seen after a panic.
            let result = catch_unwind(AssertUnwindSafe(|| job(&sign)));
            // The receiver may have gone; then nobody wants the result.
            let _ = sender.send(result);
        });
        match receiver.await {
            Ok(Ok(value)) => Ok(value),
            Ok(Err(_panic)) => {
                tracing::error!("work panicked; its call is answered with INTERNAL");
                Err(ServiceError::Internal)
            }
            Err(_) => Err(ServiceError::Cancelled),
        }
    }
}

impl Lane {
    fn start(
        name: &'static str,
        pools: usize,
        threads: usize,
        most_waiting: usize,
    ) -> Result<Self, rayon::ThreadPoolBuildError> {
        let pool = |p: usize| {
            let named = rayon::ThreadPoolBuilder::new().num_threads(threads.max(1));
            named.thread_name(move |t| format!("{name}-{p}-{t}")).build().map(Arc::new)
        };
        let free: Vec<_> = (0..pools).map(pool).collect::<Result<_, _>>()?;
        Ok(Self {
            places: Arc::new(Semaphore::new(free.len())),
            free: Arc::new(Mutex::new(free)),
            waiting: AtomicUsize::new(0),
            most_waiting,
        })
    }

    /// Waits for a pool.
    async fn enter(&self) -> Result<Place, ServiceError> {
        let before = self.waiting.fetch_add(1, Ordering::Relaxed);
        let _waiting = Waiting(&self.waiting);
        let permit = match Arc::clone(&self.places).try_acquire_owned() {
            Ok(permit) => permit,
            Err(_) if before >= self.most_waiting => {
                return Err(ServiceError::Exhausted {
                    subject: "jobs",
                    problem: format!("{before} calls wait for work to be done; try again later"),
                });
            }
            Err(_) => {
                let permit = Arc::clone(&self.places).acquire_owned().await;
                permit.map_err(|_| ServiceError::Cancelled)?
            }
        };
        // There are as many permits as pools.
        let pool = self.free.lock().unwrap_or_else(PoisonError::into_inner).pop();
        let pool = pool.ok_or(ServiceError::Internal)?;
        Ok(Place { pool, free: Arc::clone(&self.free), _permit: permit })
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn compute() -> Compute {
        Compute::start(&Settings {
            search_threads: 1,
            ask_threads: 1,
            max_jobs: 1,
            max_waiting_jobs: 1,
            ..Settings::default()
        })
        .unwrap()
    }

    #[tokio::test]
    async fn a_panic_is_internal_for_its_call_alone() {
        let compute = compute();
        let failed = compute.run(Work::Job, None, |_| -> u32 { panic!("on purpose") }).await;
        assert_eq!(failed, Err(ServiceError::Internal));
        assert_eq!(compute.run(Work::Job, None, |_| 7).await, Ok(7));
    }

    #[tokio::test(flavor = "multi_thread")]
    async fn work_stops_when_its_caller_goes_and_asks_go_on_meanwhile() {
        let compute = Arc::new(compute());
        let (started, has_started) = oneshot::channel();
        let (ended, has_ended) = oneshot::channel();
        let caller = tokio::spawn({
            let compute = Arc::clone(&compute);
            async move {
                compute
                    .run(Work::Job, None, |sign| {
                        let _ = started.send(());
                        while sign.reason().is_none() {
                            std::thread::yield_now();
                        }
                        let _ = ended.send(sign.reason());
                    })
                    .await
            }
        });
        has_started.await.unwrap();
        assert_eq!(compute.run(Work::Ask, None, |_| 1).await, Ok(1));
        caller.abort();
        assert_eq!(has_ended.await.unwrap(), Some(Stopped::Cancelled));
    }

    #[tokio::test(flavor = "multi_thread")]
    async fn more_work_than_may_wait_is_refused() {
        let compute = Arc::new(compute());
        let (started, has_started) = oneshot::channel();
        let (let_go, may_go) = std::sync::mpsc::channel::<()>();
        let run = |job: Box<dyn FnOnce() + Send>| {
            let compute = Arc::clone(&compute);
            tokio::spawn(async move { compute.run(Work::Job, None, move |_| job()).await })
        };
        let first = run(Box::new(move || {
            let _ = started.send(());
            let _ = may_go.recv();
        }));
        has_started.await.unwrap();
        let second = run(Box::new(|| ()));
        while compute.jobs.waiting.load(Ordering::Relaxed) == 0 {
            tokio::task::yield_now().await;
        }
        let third = run(Box::new(|| ())).await.unwrap();
        assert!(matches!(third, Err(ServiceError::Exhausted { subject: "jobs", .. })));
        let_go.send(()).unwrap();
        assert_eq!((first.await.unwrap(), second.await.unwrap()), (Ok(()), Ok(())));
    }

    #[tokio::test]
    async fn a_passed_deadline_and_a_stopping_service_are_told() {
        let compute = compute();
        let reason = |sign: &StopSign| sign.reason();
        let past = Some(Instant::now());
        assert_eq!(compute.run(Work::Job, past, reason).await, Ok(Some(Stopped::Time)));
        assert_eq!(compute.run(Work::Job, None, reason).await, Ok(None));
        compute.stop_all();
        assert_eq!(compute.run(Work::Ask, None, reason).await, Ok(Some(Stopped::Cancelled)));
    }
}
