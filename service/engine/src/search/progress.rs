//! How far the whole has come while its parts are searched, each perhaps split into parts again.

use std::sync::Mutex;
use std::sync::atomic::{AtomicU64, Ordering};

use super::budget::{Progress, Watch};

/// Best objective (none while nothing feasible is known) and least bound.
type Pair = (Option<i64>, i64);

/// Adds up what is known of the parts of something, and tells what it is a part of.
#[derive(Debug)]
pub(super) struct Ledger<'a> {
    above: Above<'a>,
    sums: Mutex<Sums>,
}

#[derive(Debug, Clone, Copy)]
enum Above<'a> {
    Caller { watch: Watch<'a>, work: &'a AtomicU64 },
    Part(Place<'a>),
}

#[derive(Debug)]
struct Sums {
    settled: i64,
    parts: Vec<Pair>,
    closed: usize,
    /// The best of what was known before the split and of what the parts add up to.
    best: Pair,
}

impl<'a> Ledger<'a> {
    /// The ledger of a whole model, of which this is known at first.
    pub(super) fn of_whole(
        watch: Watch<'a>,
        work: &'a AtomicU64,
        settled: i64,
        parts: Vec<Pair>,
    ) -> Self {
        let best = total(settled, &parts);
        Self::new(Above::Caller { watch, work }, settled, parts, best)
    }

    /// The ledger of one part that is split again.
    pub(super) fn of_part(place: Place<'a>, settled: i64, parts: Vec<Pair>, best: Pair) -> Self {
        Self::new(Above::Part(place), settled, parts, best)
    }

    fn new(above: Above<'a>, settled: i64, parts: Vec<Pair>, best: Pair) -> Self {
        Self { above, sums: Mutex::new(Sums { settled, parts, closed: 0, best }) }
    }

    fn update(&self, part: usize, now: Pair) {
        let Ok(mut sums) = self.sums.lock() else { return };
        let Some(known) = sums.parts.get(part).copied() else { return };
        let better = (known.0.max(now.0), known.1.min(now.1));
        if better == known {
            return;
        }
        let is_closed = |pair: Pair| pair.0.is_some_and(|objective| objective >= pair.1);
        sums.closed += usize::from(is_closed(better) && !is_closed(known));
        sums.parts[part] = better;
        let sum = total(sums.settled, &sums.parts);
        let best = (sums.best.0.max(sum.0), sums.best.1.min(sum.1));
        let changed = best != sums.best;
        sums.best = best;
        match self.above {
            Above::Part(place) if changed => {
                drop(sums);
                place.tell(best.0, best.1);
            }
            Above::Part(_) => {}
            Above::Caller { watch, work } => {
                // Told while locked, so that what is told only ever gets better.
                if let Some(objective) = best.0 {
                    (watch.progress)(Progress {
                        objective,
                        bound: best.1,
                        components: sums.parts.len(),
                        components_closed: sums.closed,
                        work: work.load(Ordering::Relaxed),
                    });
                }
            }
        }
    }
}

fn total(settled: i64, parts: &[Pair]) -> Pair {
    let objective = parts.iter().try_fold(settled, |sum, part| Some(sum.saturating_add(part.0?)));
    let bound = parts.iter().fold(settled, |sum, part| sum.saturating_add(part.1));
    (objective, bound)
}

/// One part's place in a ledger.
#[derive(Debug, Clone, Copy)]
pub(super) struct Place<'a> {
    pub(super) whole: &'a Ledger<'a>,
    pub(super) part: usize,
}

impl Place<'_> {
    /// Enters what is known of the part now.
    pub(super) fn tell(&self, objective: Option<i64>, bound: i64) {
        self.whole.update(self.part, (objective, bound));
    }
}
