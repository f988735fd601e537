//! The service: at an address, or started within this process behind an in-memory pipe. Either way
//! all talk goes over the wire, by one path.

use crate::exit::Failure;
use crate::tables::findings::Problem;
use hyper_util::rt::TokioIo;
use rimeshift_service::{Settings, pipe, serve};
use std::time::Duration;
use tonic::transport::{Channel, Endpoint};

/// The longest wait for a connection.
const CONNECT_WITHIN: Duration = Duration::from_secs(10);

/// The most that the details of an error may take, bytes: a hundred defects of a day.
const HEADER_ROOM: u32 = 256 << 10;

/// Connects to the service at `server`, or to one of our own.
///
/// # Errors
/// When there is none, or the address is none.
pub(crate) async fn connect(server: Option<&str>) -> Result<Channel, Failure> {
    match server {
        Some(address) => connect_to(address).await,
        None => start_within().await,
    }
}

async fn connect_to(address: &str) -> Result<Channel, Failure> {
    let not_an_address = |problem: String| {
        Failure::input("--server", Problem::with_hint(problem, "write it as http://127.0.0.1:7415"))
    };
    if !address.starts_with("http://") {
        return Err(not_an_address(format!("{address:?} is no http address")));
    }
    let endpoint = Endpoint::from_shared(address.to_owned())
        .map_err(|error| not_an_address(format!("{address:?} is no address: {error}")))?
        .connect_timeout(CONNECT_WITHIN)
        .http2_max_header_list_size(HEADER_ROOM);
    endpoint.connect().await.map_err(|error| {
        Failure::NoService(Problem::with_hint(
            format!("no service answers at {address}: {}", deepest(&error)),
            "start one with `rimeshift serve`, or leave --server out",
        ))
    })
}

async fn start_within() -> Result<Channel, Failure> {
    let (connector, incoming) = pipe();
    tokio::spawn(serve(incoming, Settings::default(), std::future::pending()));
    // The name is never looked up: every connection is a pipe.
    Endpoint::from_static("http://rimeshift.invalid")
        .http2_max_header_list_size(HEADER_ROOM)
        .connect_with_connector(tower::service_fn(move |_| {
            let connector = connector.clone();
            async move { connector.connect().await.map(TokioIo::new) }
        }))
        .await
        .map_err(|error| {
            Failure::NoService(Problem::new(format!(
                "the service can't be started within this process: {}",
                deepest(&error)
            )))
        })
}

/// The cause at the bottom of an error.
fn deepest(error: &dyn std::error::Error) -> String {
    let mut cause = error;
    while let Some(source) = cause.source() {
        cause = source;
    }
    cause.to_string()
}
