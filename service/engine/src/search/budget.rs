//! Effort, counted rather than timed: the engine has no clock, and an answer must not depend on how
//! fast a machine is. One unit is about one touched term. Time enters only through the stop flag.

use std::fmt;
use std::sync::atomic::{AtomicU64, Ordering};

use super::progress::{Ledger, Place};

/// How a search is going.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Progress {
    /// Objective of the best choices so far.
    pub objective: i64,
    /// Upper bound proven so far.
    pub bound: i64,
    /// Parts that what presolving left falls into, with no constraint between them.
    pub components: usize,
    /// How many of those are solved to proven optimality.
    pub components_closed: usize,
    /// Work done so far, about.
    pub work: u64,
}

/// The caller's hold on a running search. Both functions may be called from several threads.
#[derive(Clone, Copy)]
pub struct Watch<'a> {
    /// Asked every few thousand units of work; once it says true the search returns what it has.
    pub stop: &'a (dyn Fn() -> bool + Sync),
    /// Told whenever the search knows more, once something feasible is known. When and how often
    /// depends on the number of threads, unlike the answer.
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
    meter: &'a AtomicU64,
    place: Option<Place<'a>>,
}

impl<'a> Budget<'a> {
    /// `meter` counts the work of all shares as it is done.
    pub(super) fn new(limit: u64, watch: Watch<'a>, meter: &'a AtomicU64) -> Self {
        let told_to_stop = (watch.stop)();
        Self { watch, limit, used: 0, next_look: LOOK_EVERY, told_to_stop, meter, place: None }
    }

    /// A budget of its own for a part, which listens to the same caller.
    pub(super) fn share<'b>(&self, limit: u64, place: Place<'b>) -> Budget<'b>
    where
        'a: 'b,
    {
        let mut share = Budget::new(limit, self.watch, self.meter);
        share.told_to_stop |= self.told_to_stop;
        share.place = Some(place);
        share
    }

    /// A budget of its own for a piece of the same work.
    pub(super) fn portion(&self, limit: u64) -> Self {
        let mut portion = Self::new(limit, self.watch, self.meter);
        portion.told_to_stop |= self.told_to_stop;
        portion.place = self.place;
        portion
    }

    /// A ledger for the parts of what this budget is spent on.
    pub(super) fn ledger(
        &self,
        settled: i64,
        parts: Vec<(Option<i64>, i64)>,
        best: (Option<i64>, i64),
    ) -> Ledger<'_> {
        match self.place {
            Some(place) => Ledger::of_part(place, settled, parts, best),
            None => Ledger::of_whole(self.watch, self.meter, settled, parts),
        }
    }

    /// Tells what is known of the part that this budget is spent on.
    pub(super) fn tell(&self, objective: Option<i64>, bound: i64) {
        if let Some(place) = self.place {
            place.tell(objective, bound);
        }
    }

    /// Adds the work that a share did.
    pub(super) fn absorb(&mut self, used: u64, told_to_stop: bool) {
        self.used = self.used.saturating_add(used);
        self.told_to_stop |= told_to_stop;
    }

    /// Counts work; false once the search should end.
    pub(super) fn spend(&mut self, units: usize) -> bool {
        self.used = self.used.saturating_add(units as u64);
        if self.used >= self.next_look {
            self.meter.fetch_add(self.used + LOOK_EVERY - self.next_look, Ordering::Relaxed);
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
}
