//! One cell of a table, whatever the format it was stored in, read as what its column holds.

use super::findings::{Problem, shown};
use super::time::parse_utc;
use jiff::Timestamp;

/// A cell as it was stored: CSV knows only text, Parquet keeps types.
#[derive(Debug, Clone, Copy)]
pub(crate) enum Cell<'a> {
    /// Nothing there.
    Blank,
    /// Bytes that should be UTF-8.
    Text(&'a [u8]),
    /// A number.
    Number(f64),
    /// A truth value.
    Flag(bool),
    /// A point in time.
    Time(Timestamp),
}

impl<'a> Cell<'a> {
    /// The cell as text; `None` when blank.
    pub(crate) fn text(self) -> Result<Option<&'a str>, Problem> {
        match self {
            Cell::Blank => Ok(None),
            Cell::Text(bytes) => std::str::from_utf8(bytes)
                .map(Some)
                .map_err(|_| Problem::new("holds bytes that are not UTF-8 text")),
            other => Err(other.not_a("text")),
        }
    }

    /// The cell as a finite number; `None` when blank.
    pub(crate) fn number(self) -> Result<Option<f64>, Problem> {
        let value = match self {
            Cell::Blank => return Ok(None),
            Cell::Number(value) => value,
            Cell::Text(bytes) => std::str::from_utf8(bytes)
                .ok()
                .and_then(|text| text.parse().ok())
                .ok_or_else(|| self.not_a("a number"))?,
            _ => return Err(self.not_a("a number")),
        };
        if value.is_finite() { Ok(Some(value)) } else { Err(self.not_a("a finite number")) }
    }

    /// The cell as a whole number from 1; `None` when blank.
    pub(crate) fn ordinal(self) -> Result<Option<u32>, Problem> {
        let Some(value) = self.number()? else { return Ok(None) };
        #[expect(
            clippy::cast_possible_truncation,
            clippy::cast_sign_loss,
            reason = "saturates, and is compared with the value"
        )]
        let whole = value as u32;
        if whole >= 1 && f64::from(whole).total_cmp(&value).is_eq() {
            Ok(Some(whole))
        } else {
            Err(self.not_a("a whole number from 1"))
        }
    }

    /// The cell as a time; `None` when blank.
    pub(crate) fn time(self) -> Result<Option<Timestamp>, Problem> {
        match self {
            Cell::Blank => Ok(None),
            Cell::Time(time) => Ok(Some(time)),
            Cell::Text(bytes) => parse_utc(bytes).map(Some),
            other => Err(other.not_a("a time")),
        }
    }

    /// The cell as true or false; `None` when blank.
    pub(crate) fn flag(self) -> Result<Option<bool>, Problem> {
        match self {
            Cell::Blank => Ok(None),
            Cell::Flag(flag) => Ok(Some(flag)),
            Cell::Text(bytes) if bytes.eq_ignore_ascii_case(b"true") => Ok(Some(true)),
            Cell::Text(bytes) if bytes.eq_ignore_ascii_case(b"false") => Ok(Some(false)),
            other => Err(other.not_a("true or false")),
        }
    }

    fn not_a(self, expected: &str) -> Problem {
        let value = match self {
            Cell::Blank => "a blank".to_owned(),
            Cell::Text(bytes) => shown(&String::from_utf8_lossy(bytes)),
            Cell::Number(value) => value.to_string(),
            Cell::Flag(flag) => flag.to_string(),
            Cell::Time(time) => time.to_string(),
        };
        Problem::new(format!("{value} is not {expected}"))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_must_be_finite() {
        assert_eq!(Cell::Text(b"-0.125").number(), Ok(Some(-0.125)));
        assert_eq!(Cell::Text(b"1e3").number(), Ok(Some(1000.0)));
        for text in ["NaN", "inf", "-infinity", "1e999"] {
            let problem = Cell::Text(text.as_bytes()).number().expect_err(text);
            assert_eq!(problem.text, format!("{text:?} is not a finite number"));
        }
        assert!(Cell::Text(b"1,5").number().is_err());
        assert!(Cell::Text(b" 5").number().is_err());
        assert!(Cell::Number(f64::NAN).number().is_err());
    }

    #[test]
    fn ordinals_are_whole_and_start_at_one() {
        assert_eq!(Cell::Number(2.0).ordinal(), Ok(Some(2)));
        for text in ["0", "-1", "1.5", "4294967296", "one"] {
            assert!(Cell::Text(text.as_bytes()).ordinal().is_err(), "{text}");
        }
    }

    #[test]
    fn flags_are_true_or_false() {
        assert_eq!(Cell::Text(b"True").flag(), Ok(Some(true)));
        assert_eq!(
            Cell::Text(b"yes").flag().expect_err("yes").text,
            "\"yes\" is not true or false"
        );
    }

    #[test]
    fn text_must_be_utf8() {
        assert!(Cell::Text(b"\xff\xfe").text().is_err());
    }
}
