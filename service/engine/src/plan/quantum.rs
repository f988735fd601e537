//! Net benefits as whole numbers, so that sums, bounds and comparisons of the search are exact.

use crate::day::{ObjectiveRule, Policy};

/// Sums of whole numbers below this are exact in an f64 too.
const EXACT: f64 = (1u64 << 52) as f64;

/// The unit in which a plan's net benefits are counted: a power of two of joules (or points), so
/// that turning counts back into amounts is exact. At least one joule, or 2^-20 points.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Quantum(f64);

impl Quantum {
    /// The smallest unit in which amounts of this total size can be added up exactly.
    pub(super) fn for_total(policy: &Policy, total: f64) -> Self {
        let mut unit: f64 = match policy.objective {
            ObjectiveRule::NetForcing => 1.0,
            ObjectiveRule::Weights => 2.0_f64.powi(-20),
        };
        while total / unit >= EXACT {
            unit *= 2.0;
        }
        Self(unit)
    }

    /// An amount in units, rounded.
    pub(crate) fn count(self, amount: f64) -> i64 {
        (amount / self.0).round() as i64
    }

    /// Units as an amount, exactly.
    pub(crate) fn amount(self, count: i64) -> f64 {
        count as f64 * self.0
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn large_totals_take_larger_units_and_come_back_exactly() {
        let policy = Policy::default();
        let small = Quantum::for_total(&policy, 1e9);
        assert_eq!((small.count(12.4), small.amount(12)), (12, 12.0));
        let large = Quantum::for_total(&policy, 3e18);
        let count = large.count(1.234_567e14);
        assert_eq!(large.count(large.amount(count)), count);
        assert!((large.amount(count) / 1.234_567e14 - 1.0).abs() < 1e-10);
    }
}
