//! An in-memory connection, so that a client can start the service within itself and still talk to
//! it over the wire, without a port.

use std::io;
use std::pin::Pin;
use std::task::{Context, Poll};

use tokio::io::DuplexStream;
use tokio::sync::mpsc;
use tokio_stream::Stream;

/// What one direction of a connection holds at most, bytes.
const PIPE_BYTES: usize = 1 << 20;

/// The client's end: makes connections.
#[derive(Debug, Clone)]
pub struct PipeConnector(mpsc::Sender<DuplexStream>);

/// The service's end: connections as they are made.
#[derive(Debug)]
pub struct PipeIncoming(mpsc::Receiver<DuplexStream>);

/// A connector and what [`serve`](crate::serve) is to serve. The incoming end is over when every
/// connector is gone.
#[must_use]
pub fn pipe() -> (PipeConnector, PipeIncoming) {
    let (sender, receiver) = mpsc::channel(16);
    (PipeConnector(sender), PipeIncoming(receiver))
}

impl PipeConnector {
    /// A new connection.
    ///
    /// # Errors
    /// The service has stopped.
    pub async fn connect(&self) -> io::Result<DuplexStream> {
        let (ours, theirs) = tokio::io::duplex(PIPE_BYTES);
        let gone = |_| io::Error::new(io::ErrorKind::ConnectionRefused, "the service has stopped");
        self.0.send(theirs).await.map_err(gone)?;
        Ok(ours)
    }
}

impl Stream for PipeIncoming {
    type Item = io::Result<DuplexStream>;

    fn poll_next(self: Pin<&mut Self>, context: &mut Context<'_>) -> Poll<Option<Self::Item>> {
        self.get_mut().0.poll_recv(context).map(|connection| connection.map(Ok))
    }
}
