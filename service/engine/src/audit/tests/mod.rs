//! Sound plans pass, and every kind of planted fault is found; crossings, losses and times against
//! closed forms and plain sampling.

mod counts;
mod faults;
mod looks;
mod losses;
mod retiming;
mod rules;
mod support;
