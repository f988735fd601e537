//! Streams of rows from a client, bounded in memory, number and patience.

use std::sync::Arc;
use std::time::Duration;

use tokio::sync::OwnedSemaphorePermit;
use tonic::{Status, Streaming};

use crate::error::ServiceError;
use crate::handlers::Api;

/// Memory of a point and of any other row beside its bytes on the wire: decoded structs are larger
/// than their encoding, and a stream of empty rows must not be free.
const BYTES_PER_POINT: u64 = 64;
const BYTES_PER_ROW: u64 = 320;

/// What a message brings.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub(crate) struct Brought {
    /// Points of profiles.
    pub(crate) points: usize,
    /// Other rows, and what is nested in them.
    pub(crate) rows: usize,
    /// Its length on the wire.
    pub(crate) bytes: usize,
}

/// A stream of messages that bring rows.
#[derive(Debug)]
pub(crate) struct RowStream<T> {
    inner: Streaming<T>,
    idle: Duration,
    rows: u64,
    bytes: u64,
    most_rows: u64,
    most_bytes: u64,
    _place: OwnedSemaphorePermit,
}

impl<T> RowStream<T> {
    /// Begins to receive if there is a place for one more stream.
    pub(crate) fn new(inner: Streaming<T>, api: &Api) -> Result<Self, ServiceError> {
        let place =
            Arc::clone(&api.loads).try_acquire_owned().map_err(|_| ServiceError::Exhausted {
                subject: "loads",
                problem: "as many loads as allowed are under way; try again later".to_owned(),
            })?;
        Ok(Self {
            inner,
            idle: api.settings.load_idle,
            rows: 0,
            bytes: 0,
            most_rows: api.settings.max_load_rows,
            most_bytes: api.settings.max_load_bytes,
            _place: place,
        })
    }

    /// The next message; `None` at the end of the stream.
    pub(crate) async fn next(&mut self) -> Result<Option<T>, Status> {
        match tokio::time::timeout(self.idle, self.inner.message()).await {
            Ok(message) => message,
            Err(_) => Err(ServiceError::DeadlineExceeded(format!(
                "no message came for {} s",
                self.idle.as_secs()
            ))
            .into()),
        }
    }

    /// Counts what a message brings against the limits.
    pub(crate) fn count(&mut self, brought: Brought) -> Result<(), ServiceError> {
        let (points, rows) = (brought.points as u64, brought.rows as u64);
        self.rows = self.rows.saturating_add(points).saturating_add(rows);
        self.bytes = self
            .bytes
            .saturating_add(brought.bytes as u64)
            .saturating_add(points.saturating_mul(BYTES_PER_POINT))
            .saturating_add(rows.saturating_mul(BYTES_PER_ROW));
        if self.rows > self.most_rows {
            return Err(ServiceError::Exhausted {
                subject: "load_rows",
                problem: format!("more than {} rows, the most allowed", self.most_rows),
            });
        }
        if self.bytes > self.most_bytes {
            return Err(ServiceError::Exhausted {
                subject: "load_bytes",
                problem: format!("more than {} bytes, the most allowed", self.most_bytes),
            });
        }
        Ok(())
    }
}
