//! Pages of lists (AIP-158).

use crate::error::ServiceError;

/// The size of a page asked for; 0 means `default`, and at most `most` is given.
pub(super) fn page_size(asked: i32, default: usize, most: usize) -> Result<usize, ServiceError> {
    match usize::try_from(asked) {
        Ok(0) => Ok(default),
        Ok(n) => Ok(n.min(most)),
        Err(_) => {
            Err(ServiceError::bad_field("page_size", format!("`{asked}` is negative"), "0 or more"))
        }
    }
}

/// A page's rows, of which one more than the page holds was asked for, and the token of the next
/// page, made of the page's last row.
pub(super) fn cut<T>(
    mut rows: Vec<T>,
    size: usize,
    token: impl FnOnce(&T) -> String,
) -> (Vec<T>, String) {
    if rows.len() <= size {
        return (rows, String::new());
    }
    rows.truncate(size);
    let next = rows.last().map(token).unwrap_or_default();
    (rows, next)
}

/// The token of the page after a row of a list that belongs to a day.
pub(super) fn token(row: usize, day_sha256: &str) -> String {
    format!("{row}-{day_sha256}")
}

/// The row after the one that a token names; 0 for an empty token.
pub(super) fn row_after(token: &str, day_sha256: &str) -> Result<usize, ServiceError> {
    if token.is_empty() {
        return Ok(0);
    }
    let row = token.split_once('-').filter(|(_, sha256)| *sha256 == day_sha256);
    let row = row.and_then(|(row, _)| row.parse::<usize>().ok()?.checked_add(1));
    row.ok_or_else(|| {
        let hint = "begin again without a token; the day may have been replaced";
        ServiceError::bad_field("page_token", format!("`{token}` is no token of this day"), hint)
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_token_names_its_row_and_day() {
        assert_eq!(row_after("", "ab"), Ok(0));
        assert_eq!(row_after(&token(7, "ab"), "ab"), Ok(8));
        for bad in ["7", "7-", "7-cd", "x-ab", "-ab", "99999999999999999999-ab"] {
            assert!(row_after(bad, "ab").is_err(), "{bad}");
        }
        assert!(row_after(&format!("{}-ab", usize::MAX), "ab").is_err());
    }
}
