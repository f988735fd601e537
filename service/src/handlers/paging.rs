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
