//! The one rule of what a plan's count may be: no worse than the larger of the limit and the filed
//! day.

/// Counts may be real numbers (traffic known only as counts); comparisons forgive this much.
const TOLERANCE: f64 = 1e-9;

/// The largest count that a plan may have where the filed day has `filed`.
pub(super) fn allowed(limit: f64, filed: f64) -> f64 {
    limit.max(filed)
}

/// Whether a count is above a limit.
pub(super) fn exceeds(count: f64, limit: f64) -> bool {
    count > limit + TOLERANCE
}

/// How many more flights fit between a count and what is allowed; negative where it is exceeded.
pub(super) fn room(count: f64, most: f64) -> i64 {
    (most - count + TOLERANCE).floor() as i64
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_count_at_its_limit_is_allowed_and_the_filed_count_always_is() {
        assert_eq!(room(3.0, allowed(3.0, 3.0)), 0);
        assert_eq!(room(5.0, allowed(3.0, 5.0)), 0);
        assert_eq!(room(2.0, allowed(3.0, 2.0)), 1);
        assert!(!exceeds(3.0, 3.0) && exceeds(4.0, 3.0));
    }

    #[test]
    fn fractions_leave_room_for_whole_flights_only() {
        assert_eq!(room(2.0, 3.5), 1);
        assert_eq!(room(2.6, 3.5), 0);
        // Three times 0.1 is a little more than 0.3 in binary.
        assert_eq!(room(0.1 + 0.1 + 0.1, 1.3), 1);
        assert!(!exceeds(0.1 + 0.1 + 0.1, 0.3));
    }
}
