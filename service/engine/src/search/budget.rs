//! Effort, counted rather than timed: the engine has no clock, and an answer must not depend on how
//! fast a machine is. One unit is about one touched term. Time enters only through the stop flag.

use std::fmt;

/// How a search is going.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Progress {
    /// Objective of the best choices so far.
    pub objective: i64,
    /// Upper bound proven so far.
    pub bound: i64,
    /// Work done so far.
    pub work: u64,
}

/// The caller's hold on a running search. Both functions may be called from several threads.
#[derive(Clone, Copy)]
pub struct Watch<'a> {
    /// Asked every few thousand units of work; once it says true the search returns what it has.
    pub stop: &'a (dyn Fn() -> bool + Sync),
    /// Told whenever the search knows more.
    pub progress: &'a (dyn Fn(Progress) + Sync),
}

impl Watch<'static> {
    /// Never stops and listens to nothing.
    #[must_use]
    pub fn unattended() -> Self {
        Self { stop: &|| false, progress: &|_| () }
    }
}

impl fmt::Debug for Watch<'_> {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.debug_struct("Watch").finish_non_exhaustive()
    }
}

/// Work between two looks at the stop flag.
const LOOK_EVERY: u64 = 1 << 14;

/// What may still be spent.
#[derive(Debug)]
pub(super) struct Budget<'a> {
    watch: Watch<'a>,
    limit: u64,
    used: u64,
    next_look: u64,
    told_to_stop: bool,
}

impl<'a> Budget<'a> {
    pub(super) fn new(limit: u64, watch: Watch<'a>) -> Self {
        let told_to_stop = (watch.stop)();
        Self { watch, limit, used: 0, next_look: LOOK_EVERY, told_to_stop }
    }

    /// A budget of its own that listens to the same caller.
    pub(super) fn share(&self, limit: u64) -> Self {
        let mut share = Self::new(limit, self.watch);
        share.told_to_stop |= self.told_to_stop;
        share
    }

    /// Adds the work that a share did.
    pub(super) fn absorb(&mut self, share: &Self) {
        self.used = self.used.saturating_add(share.used);
        self.told_to_stop |= share.told_to_stop;
    }

    /// Counts work; false once the search should end.
    pub(super) fn spend(&mut self, units: usize) -> bool {
        self.used = self.used.saturating_add(units as u64);
        if self.used >= self.next_look {
            self.next_look = self.used + LOOK_EVERY;
            self.told_to_stop |= (self.watch.stop)();
        }
        !self.is_out()
    }

    pub(super) fn is_out(&self) -> bool {
        self.told_to_stop || self.used >= self.limit
    }

    pub(super) fn told_to_stop(&self) -> bool {
        self.told_to_stop
    }

    pub(super) fn used(&self) -> u64 {
        self.used
    }

    pub(super) fn left(&self) -> u64 {
        self.limit.saturating_sub(self.used)
    }

    pub(super) fn report(&self, objective: i64, bound: i64) {
        (self.watch.progress)(Progress { objective, bound, work: self.used });
    }
}
