//! Which flights come closer than their minima, and which of that is new in a changed day.
//!
//! Two flights lose separation while both exist at or above the separation floor, their horizontal
//! distance is less than the larger of their horizontal minima (ICAO Doc 4444, 8.7.3: 5 NM) and
//! their vertical distance less than the vertical one (Doc 4444, 5.3.2). Time is continuous: within
//! two pieces the flights move along straight chords, the square of their distance is a quadratic of
//! time and their difference in level is linear, so a loss lies between roots ([`pair_losses`]).
//!
//! To find the few pairs that matter among millions, flights are cut into straight legs, listed by
//! cells of space and slots of levels in order of time. Legs that meet in a list are compared by the
//! balls around them, then as straight motions with a bound on how far the flights stray from
//! them; what is left is solved exactly. Each filter keeps whatever could be a loss, by the bounds
//! stated with it.
//!
//! A day ahead, times are uncertain. By how much one flight may be later than another so that they
//! lose separation is their shift set ([`shift_set`]), an interval for each two straight legs; the
//! normal probability of the set is that of a loss, and what changes add to it are the expected new
//! losses ([`expected_new_losses`]). The idea of conflict probability: Paielli & Erzberger 1997
//! (J. Guid. Control Dyn. 20), here with errors along the track only.

mod crossing;
mod index;
mod known;
mod leg;
mod minima;
mod moved;
mod pair;
mod parts;
mod reach;
mod risk;
mod scene;
mod shift_clashes;
mod shift_set;
#[cfg(test)]
mod tests;
mod versions;

pub use known::{is_known, new_losses};
pub use minima::{HorizontalMinimum, Minimum};
pub use moved::{MovedIndex, losses_of_moved, new_losses_in_plan};
pub use risk::{
    PairRisk, expected_new_losses, farthest_shift_s, pair_probability, pair_risks,
    pair_risks_in_plan,
};
pub use scene::{Scene, Survivors, Version, filed_losses, pair_losses, survivors};
pub use shift_clashes::{ShiftRule, breaks_shift_rule, shift_clashes};
pub use shift_set::{ShiftSet, shift_set};
pub use versions::{
    VersionPair, VersionRef, clashes, losses_against_filed, new_losses_against_filed,
};
