//! Numbers, times and levels as reports show them.

use crate::tables::time::rfc3339_ms;
use jiff::Timestamp;

/// A count: whole numbers whole, shared-out background traffic to two decimals.
pub(crate) fn count(value: f64) -> String {
    if value.fract().abs() < 1e-9 { format!("{value:.0}") } else { format!("{value:.2}") }
}

/// A count of things, with its noun.
pub(crate) fn counted(count: impl Into<u64>, one: &str, many: &str) -> String {
    match count.into() {
        1 => format!("1 {one}"),
        count => format!("{count} {many}"),
    }
}

/// An energy or another figure of large range.
pub(crate) fn scientific(value: f64) -> String {
    if value.abs() < 1e4 { format!("{value:.0}") } else { format!("{value:.3e}") }
}

/// A figure of a unit that fits one decimal.
pub(crate) fn tenth(value: f64) -> String {
    // Negative zero reads as an error.
    let text = format!("{value:.1}");
    if text == "-0.0" { "0.0".to_owned() } else { text }
}

/// A horizontal distance of a loss, NM, rounded down: one below its minimum must not read as kept.
pub(crate) fn lost_nm(horizontal_nm: f64) -> String {
    format!("{:.2}", (horizontal_nm * 100.0).floor() / 100.0)
}

/// A vertical distance of a loss, feet, rounded down like [`lost_nm`].
pub(crate) fn lost_ft(vertical_ft: f64) -> String {
    format!("{:.0}", vertical_ft.floor())
}

/// A flight level from feet.
pub(crate) fn flight_level(level_ft: f64) -> String {
    format!("FL {}", level_ft / 100.0)
}

/// A share as percent.
pub(crate) fn percent(share: f64) -> String {
    if share > 0.0 && share < 1e-4 {
        format!("{:.1e} %", share * 100.0)
    } else {
        format!("{:.2} %", share * 100.0)
    }
}

/// A time sent by the service; `None` where it is absent or outside the calendar.
pub(crate) fn time_of(time: Option<&prost_types::Timestamp>) -> Option<Timestamp> {
    time.and_then(|time| Timestamp::new(time.seconds, time.nanos).ok())
}

/// A time for people, to the minute: `03-04 06:15`.
pub(crate) fn minute(time: Option<&prost_types::Timestamp>) -> String {
    time_of(time).map_or_else(|| "-".to_owned(), |time| time.strftime("%m-%d %H:%M").to_string())
}

/// A time for people, to the second: `03-04 06:15:30`.
pub(crate) fn second(time: Option<&prost_types::Timestamp>) -> String {
    time_of(time).map_or_else(|| "-".to_owned(), |time| time.strftime("%m-%d %H:%M:%S").to_string())
}

/// A time for programs, RFC 3339 to the millisecond.
pub(crate) fn rfc3339(time: Option<&prost_types::Timestamp>) -> Option<String> {
    time_of(time).map(rfc3339_ms)
}

/// A period for people; its end without the date where that is the same.
pub(crate) fn period(
    from: Option<&prost_types::Timestamp>,
    until: Option<&prost_types::Timestamp>,
) -> String {
    let (from, until) = (minute(from), minute(until));
    match (from.split_once(' '), until.split_once(' ')) {
        (Some((from_date, _)), Some((until_date, clock))) if from_date == until_date => {
            format!("{from}–{clock}")
        }
        _ => format!("{from}–{until}"),
    }
}

/// A date of the wire: `2031-03-04`.
pub(crate) fn date(date: Option<&rimeshift_proto::v1::Date>) -> String {
    let date = date.copied().unwrap_or_default();
    format!("{:04}-{:02}-{:02}", date.year, date.month, date.day)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn at(seconds: i64) -> prost_types::Timestamp {
        prost_types::Timestamp { seconds, nanos: 0 }
    }

    #[test]
    fn figures_are_short() {
        assert_eq!(count(12.0), "12");
        assert_eq!(count(12.345), "12.35");
        assert_eq!(tenth(-0.04), "0.0");
        assert_eq!(scientific(1.23456e15), "1.235e15");
        assert_eq!(flight_level(37_250.0), "FL 372.5");
        assert_eq!(percent(0.0123), "1.23 %");
        assert_eq!(percent(2e-8), "2.0e-6 %");
        assert_eq!(counted(1_u64, "loss", "losses"), "1 loss");
    }

    #[test]
    fn periods_name_the_second_date_only_when_it_differs() {
        assert_eq!(period(Some(&at(0)), Some(&at(3600))), "01-01 00:00–01:00");
        assert_eq!(period(Some(&at(0)), Some(&at(90_000))), "01-01 00:00–01-02 01:00");
        assert_eq!(period(None, None), "-–-");
    }
}
