//! The deadline that a caller sends with a call.

use std::time::{Duration, Instant};

use tonic::metadata::MetadataMap;

/// When the caller stops waiting, by the header `grpc-timeout`: up to eight digits and a unit
/// (gRPC over HTTP2, "Requests"). `None` where there is none or it can't be read.
pub(crate) fn of_call(metadata: &MetadataMap) -> Option<Instant> {
    let text = metadata.get("grpc-timeout")?.to_str().ok()?;
    Instant::now().checked_add(timeout(text)?)
}

fn timeout(text: &str) -> Option<Duration> {
    let (digits, unit) = text.split_at_checked(text.len().checked_sub(1)?)?;
    if digits.is_empty() || digits.len() > 8 || !digits.bytes().all(|b| b.is_ascii_digit()) {
        return None;
    }
    let n: u64 = digits.parse().ok()?;
    match unit {
        "H" => Some(Duration::from_secs(n * 3600)),
        "M" => Some(Duration::from_secs(n * 60)),
        "S" => Some(Duration::from_secs(n)),
        "m" => Some(Duration::from_millis(n)),
        "u" => Some(Duration::from_micros(n)),
        "n" => Some(Duration::from_nanos(n)),
        _ => None,
    }
}

/// The earlier of two deadlines that may be absent.
pub(crate) fn earlier(a: Option<Instant>, b: Option<Instant>) -> Option<Instant> {
    match (a, b) {
        (Some(a), Some(b)) => Some(a.min(b)),
        (one, other) => one.or(other),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn timeouts_are_read() {
        assert_eq!(timeout("5S"), Some(Duration::from_secs(5)));
        assert_eq!(timeout("250m"), Some(Duration::from_millis(250)));
        assert_eq!(timeout("99999999H"), Some(Duration::from_secs(99_999_999 * 3600)));
        for bad in ["", "S", "-1S", "+1S", "123456789S", "1x", "1µ", "1.5S"] {
            assert_eq!(timeout(bad), None, "{bad}");
        }
    }
}
