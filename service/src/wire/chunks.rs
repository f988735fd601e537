//! Divides rows into messages well under the 4 MiB that gRPC takes by default.

use prost::Message;

/// What a message of rows may hold, bytes.
pub(crate) const CHUNK_BYTES: usize = 1 << 20;

/// Rows in runs whose encoded size is at most [`CHUNK_BYTES`], each of at least one row.
pub(crate) fn chunks<T: Message>(
    rows: impl IntoIterator<Item = T>,
) -> impl Iterator<Item = Vec<T>> {
    let mut rows = rows.into_iter().peekable();
    std::iter::from_fn(move || {
        let mut chunk = vec![rows.next()?];
        let mut bytes = row_bytes(chunk.first()?);
        while let Some(next) = rows.peek() {
            bytes += row_bytes(next);
            if bytes > CHUNK_BYTES {
                break;
            }
            chunk.extend(rows.next());
        }
        Some(chunk)
    })
}

/// A row's size with its tag and length.
fn row_bytes<T: Message>(row: &T) -> usize {
    row.encoded_len() + 8
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn rows_keep_their_order_and_fit() {
        let rows: Vec<String> = (0..100).map(|i| "x".repeat(i * 1000)).collect();
        let runs: Vec<Vec<String>> = chunks(rows.clone()).collect();
        assert!(runs.len() > 1);
        for run in &runs {
            assert!(run.iter().map(row_bytes).sum::<usize>() <= CHUNK_BYTES);
        }
        assert_eq!(runs.concat(), rows);
        assert_eq!(chunks(Vec::<String>::new()).count(), 0);
    }

    #[test]
    fn a_large_row_stands_alone() {
        let large = "x".repeat(2 * CHUNK_BYTES);
        let runs: Vec<_> = chunks(vec!["a".to_owned(), large.clone(), "b".to_owned()]).collect();
        assert_eq!(runs, [vec!["a".to_owned()], vec![large], vec!["b".to_owned()]]);
    }
}
