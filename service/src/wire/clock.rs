//! Timestamps of the wire to seconds of the day, and back.

use std::time::SystemTime;

use prost_types::Timestamp;
use rimeshift_engine::day::Date;
use rimeshift_proto::v1;

/// 0001-01-01T00:00:00Z and the end of the year 9999: what a protobuf timestamp may hold.
const SECONDS: std::ops::RangeInclusive<i64> = -62_135_596_800..=253_402_300_799;
const NANOS_PER_SECOND: i32 = 1_000_000_000;

/// Turns times into seconds from 00:00 UTC of one date.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) struct DayClock {
    midnight_unix_s: i64,
}

impl DayClock {
    /// The clock of a date; `None` where the calendar has no such date.
    pub(crate) fn new(date: Date) -> Option<Self> {
        let year = i16::try_from(date.year).ok().filter(|year| (1..=9999).contains(year))?;
        let (month, day) = (i8::try_from(date.month).ok()?, i8::try_from(date.day).ok()?);
        let civil = jiff::civil::Date::new(year, month, day).ok()?;
        let midnight = civil.to_datetime(jiff::civil::Time::midnight());
        let midnight = jiff::tz::TimeZone::UTC.to_timestamp(midnight).ok()?;
        Some(Self { midnight_unix_s: midnight.as_second() })
    }

    /// Seconds of the day; `None` where the timestamp holds no time of the years 1 to 9999.
    pub(crate) fn seconds(self, time: &Timestamp) -> Option<f64> {
        let good = SECONDS.contains(&time.seconds) && (0..NANOS_PER_SECOND).contains(&time.nanos);
        good.then(|| {
            (time.seconds - self.midnight_unix_s) as f64
                + f64::from(time.nanos) / f64::from(NANOS_PER_SECOND)
        })
    }

    /// The timestamp of a time, to the nanosecond; times beyond the calendar become its ends.
    pub(crate) fn timestamp(self, time_s: f64) -> Timestamp {
        let whole = time_s.floor();
        #[expect(clippy::cast_possible_truncation, reason = "`as` saturates, and so is meant to")]
        let (mut seconds, mut nanos) = (
            (whole as i64).saturating_add(self.midnight_unix_s),
            ((time_s - whole) * f64::from(NANOS_PER_SECOND)).round() as i32,
        );
        if nanos >= NANOS_PER_SECOND {
            nanos = 0;
            seconds = seconds.saturating_add(1);
        }
        Timestamp { seconds: seconds.clamp(*SECONDS.start(), *SECONDS.end()), nanos }
    }

    /// 00:00 UTC of the date.
    pub(crate) fn midnight(self) -> Timestamp {
        Timestamp { seconds: self.midnight_unix_s, nanos: 0 }
    }
}

/// A date of the wire, if its numbers can be one.
pub(crate) fn date(wire: v1::Date) -> Option<Date> {
    let date = Date {
        year: wire.year,
        month: u8::try_from(wire.month).ok()?,
        day: u8::try_from(wire.day).ok()?,
    };
    DayClock::new(date).map(|_| date)
}

/// A time of the system's clock.
pub(crate) fn system_time(time: SystemTime) -> Timestamp {
    Timestamp::from(time)
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    const DAY: Date = Date { year: 2031, month: 3, day: 4 };

    #[test]
    fn midnight_and_the_day_before() {
        let clock = DayClock::new(DAY).unwrap();
        // date -u -d 2031-03-04 +%s
        let midnight = 1_930_348_800;
        assert_eq!(clock.midnight(), Timestamp { seconds: midnight, nanos: 0 });
        assert_eq!(
            clock.seconds(&Timestamp { seconds: midnight - 1, nanos: 500_000_000 }),
            Some(-0.5)
        );
        assert_eq!(clock.timestamp(-0.5), Timestamp { seconds: midnight - 1, nanos: 500_000_000 });
    }

    #[test]
    fn what_is_no_time_is_refused() {
        let clock = DayClock::new(DAY).unwrap();
        for (seconds, nanos) in [(0, -1), (0, NANOS_PER_SECOND), (i64::MAX, 0), (i64::MIN, 0)] {
            assert_eq!(clock.seconds(&Timestamp { seconds, nanos }), None);
        }
        assert!(date(v1::Date { year: 2031, month: 2, day: 29 }).is_none());
        assert!(date(v1::Date { year: 0, month: 1, day: 1 }).is_none());
        assert!(date(v1::Date { year: 2028, month: 2, day: 29 }).is_some());
    }

    proptest! {
        #[test]
        fn times_keep_their_microsecond(micros in -259_200_000_000_i64..345_600_000_000) {
            let clock = DayClock::new(DAY).unwrap();
            let sent = Timestamp {
                seconds: clock.midnight_unix_s + micros.div_euclid(1_000_000),
                nanos: i32::try_from(micros.rem_euclid(1_000_000)).unwrap() * 1000,
            };
            prop_assert_eq!(clock.timestamp(clock.seconds(&sent).unwrap()), sent);
        }

        #[test]
        fn no_number_panics(time_s in any::<f64>()) {
            DayClock::new(DAY).unwrap().timestamp(time_s);
        }
    }
}
