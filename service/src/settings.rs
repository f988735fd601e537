//! What an operator can set about a running service.

use std::time::Duration;

/// Limits and sizes of a service. Every limit answers RESOURCE_EXHAUSTED when it is reached.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Settings {
    /// Most days held at once.
    pub max_days: usize,
    /// Most plans kept per day.
    pub max_plans_per_day: usize,
    /// Most memory that one stream of rows may fill, bytes, estimated from its messages.
    pub max_load_bytes: u64,
    /// Most rows, points included, that one stream may bring.
    pub max_load_rows: u64,
    /// Most streams of rows received at once.
    pub max_loads: usize,
    /// Longest wait for the next message of a stream of rows.
    pub load_idle: Duration,
    /// Threads of each build, check, search or audit.
    pub search_threads: usize,
    /// Threads that answer questions about one change, apart, so that a search can't starve them.
    pub ask_threads: usize,
    /// Most builds, checks, searches and audits under way at once; others wait.
    pub max_jobs: usize,
    /// Most of them waiting.
    pub max_waiting_jobs: usize,
}

impl Default for Settings {
    fn default() -> Self {
        let threads = std::thread::available_parallelism().map_or(1, usize::from);
        Self {
            max_days: 16,
            max_plans_per_day: 100,
            max_load_bytes: 2 << 30,
            max_load_rows: 20_000_000,
            max_loads: 4,
            load_idle: Duration::from_secs(60),
            search_threads: threads,
            ask_threads: threads.div_ceil(2),
            max_jobs: 2,
            max_waiting_jobs: 64,
        }
    }
}
