//! Times as text: RFC 3339 in UTC, in and out.

use super::findings::{Problem, shown};
use jiff::Timestamp;
use jiff::civil::{Date, DateTime, Time};
use jiff::tz::Offset;

/// Reads an RFC 3339 time in UTC, with or without a fraction of a second.
///
/// # Errors
/// Names the value when it is no such time, or stands in another offset than UTC's.
pub(crate) fn parse_utc(text: &[u8]) -> Result<Timestamp, Problem> {
    let &[y1, y2, y3, y4, b'-', m1, m2, b'-', d1, d2, b'T' | b't', ref clock @ ..] = text else {
        return Err(not_a_time(text));
    };
    let &[h1, h2, b':', n1, n2, b':', s1, s2, ref rest @ ..] = clock else {
        return Err(not_a_time(text));
    };
    let two = |tens, ones| two_digits(tens, ones).ok_or_else(|| not_a_time(text));
    let (fraction, offset) = split_fraction(rest);
    match offset {
        b"Z" | b"z" | b"+00:00" | b"-00:00" => {}
        [b'+' | b'-', _, _, b':', _, _] => return Err(not_utc(text)),
        _ => return Err(not_a_time(text)),
    }
    let nanoseconds = nanoseconds(fraction).ok_or_else(|| not_a_time(text))?;
    let year = i16::from(two(y1, y2)?) * 100 + i16::from(two(y3, y4)?);
    let date = Date::new(year, two(m1, m2)?, two(d1, d2)?);
    let time = Time::new(two(h1, h2)?, two(n1, n2)?, two(s1, s2)?, nanoseconds);
    let (Ok(date), Ok(time)) = (date, time) else {
        return Err(Problem::new(format!(
            "{} is no time of the calendar",
            shown(&String::from_utf8_lossy(text))
        )));
    };
    Offset::UTC.to_timestamp(DateTime::from_parts(date, time)).map_err(|_| not_a_time(text))
}

/// Splits what follows the seconds into the digits of the fraction, if any, and the offset.
fn split_fraction(rest: &[u8]) -> (Option<&[u8]>, &[u8]) {
    match rest {
        [b'.', tail @ ..] => {
            let length = tail.iter().take_while(|byte| byte.is_ascii_digit()).count();
            let (digits, offset) = tail.split_at(length);
            (Some(digits), offset)
        }
        _ => (None, rest),
    }
}

/// Two decimal digits as a number.
fn two_digits(tens: u8, ones: u8) -> Option<i8> {
    let digit = |byte: u8| byte.is_ascii_digit().then(|| byte.wrapping_sub(b'0'));
    i8::try_from(digit(tens)? * 10 + digit(ones)?).ok()
}

/// One to nine digits behind the point as nanoseconds; no fraction is 0.
fn nanoseconds(fraction: Option<&[u8]>) -> Option<i32> {
    let Some(digits) = fraction else { return Some(0) };
    if !(1..=9).contains(&digits.len()) {
        return None;
    }
    let read = digits.iter().fold(0, |value, byte| value * 10 + i32::from(byte - b'0'));
    Some((digits.len()..9).fold(read, |value, _| value * 10))
}

fn not_a_time(text: &[u8]) -> Problem {
    Problem::with_hint(
        format!("{} is not an RFC 3339 time", shown(&String::from_utf8_lossy(text))),
        "write times as 2031-03-04T06:15:00Z",
    )
}

fn not_utc(text: &[u8]) -> Problem {
    Problem::with_hint(
        format!("{} is not in UTC", shown(&String::from_utf8_lossy(text))),
        "convert it to UTC; every time ends in Z",
    )
}

/// A time as every file and report shows it: RFC 3339 in UTC, to the millisecond.
pub(crate) fn rfc3339_ms(time: Timestamp) -> String {
    format!("{time:.3}")
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn times_in_utc_are_read_to_the_nanosecond() {
        for (text, nanoseconds) in [
            ("1970-01-01T00:00:00Z", 0),
            ("1970-01-02T00:00:01.5z", 86_401_500_000_000),
            ("1970-01-01t00:00:00.000000001+00:00", 1),
            ("1969-12-31T23:59:59.999-00:00", -1_000_000),
        ] {
            assert_eq!(
                parse_utc(text.as_bytes()).map(|time| time.as_nanosecond()),
                Ok(nanoseconds),
                "{text}"
            );
        }
    }

    #[test]
    fn agrees_with_the_calendar_library() {
        for text in ["2031-03-04T06:15:00Z", "2032-02-29T23:59:59.25Z", "0001-01-01T00:00:00Z"] {
            assert_eq!(parse_utc(text.as_bytes()).ok(), text.parse().ok(), "{text}");
        }
    }

    #[test]
    fn anything_else_is_named() {
        for text in [
            "",
            "2031-03-04",
            "2031-03-04 06:15:00Z",
            "2031-03-04T06:15Z",
            "2031-03-04T06:15:00",
            "2031-03-04T06:15:00.Z",
            "2031-03-04T06:15:00.1234567890Z",
            "2031-02-29T06:15:00Z",
            "2031-03-04T24:00:00Z",
            "2031-03-04T06:15:60Z",
            "2031-03-04T06:15:00+02:00",
            "+031-03-04T06:15:00Z",
            "2031-03-04T06:15:00Zebra",
        ] {
            let problem = parse_utc(text.as_bytes()).expect_err(text);
            assert!(problem.text.contains(&format!("{text:?}")), "{}", problem.text);
        }
    }

    #[test]
    fn times_are_written_to_the_millisecond() {
        let time = parse_utc(b"2031-03-04T06:15:00Z").expect("a time");
        assert_eq!(rfc3339_ms(time), "2031-03-04T06:15:00.000Z");
    }
}
