//! Consecutive windows or minutes told as one.

use super::cells::{Cell, Clock, Times};
use crate::answer::{LoadMeasure, Overload, Place};

/// A count above a limit in one window or minute.
#[derive(Debug, Clone, Copy)]
pub(super) struct Excess {
    pub(super) cell: Cell,
    pub(super) count: f64,
    pub(super) limit: f64,
}

/// Merges the excesses of one series, by rising cell, into runs of consecutive windows or minutes,
/// each with its greatest count (the first of equals) and the limit there.
pub(super) fn merge_runs(
    times: Times,
    (place, measure, clock): (Place, LoadMeasure, Clock),
    excesses: impl IntoIterator<Item = Excess>,
    overloads: &mut Vec<Overload>,
) {
    let mut last: Option<i32> = None;
    for Excess { cell, count, limit } in excesses {
        let until_s = times.end_s(clock, cell.index);
        match overloads.last_mut() {
            Some(run) if last == Some(cell.index - 1) => {
                run.until_s = until_s;
                if count > run.count {
                    (run.count, run.limit) = (count, limit);
                }
            }
            _ => {
                let from_s = times.start_s(clock, cell.index);
                overloads.push(Overload { place, measure, from_s, until_s, count, limit });
            }
        }
        last = Some(cell.index);
    }
}
