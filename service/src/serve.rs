//! Serves the API on any kind of connection until it is told to stop.

use std::future::Future;
use std::time::Duration;

use rimeshift_proto::v1;
use rimeshift_proto::v1::day_service_server::DayServiceServer;
use rimeshift_proto::v1::plan_service_server::PlanServiceServer;
use rimeshift_proto::v1::traffic_service_server::TrafficServiceServer;
use tokio::io::{AsyncRead, AsyncWrite};
use tokio_stream::Stream;
use tonic::transport::Server;
use tonic::transport::server::Connected;

use crate::handlers::Api;
use crate::settings::Settings;

/// How long calls under way may go on after the service is told to stop.
const GRACE: Duration = Duration::from_secs(10);

/// Why a service could not be served.
#[derive(Debug, thiserror::Error)]
pub enum ServeError {
    /// The system gives no threads for the pools.
    #[error("no threads can be started: {0}")]
    Threads(#[from] rayon::ThreadPoolBuildError),
    /// The descriptors of the API can't be read.
    #[error("reflection can't be served: {0}")]
    Reflection(#[from] tonic_reflection::server::Error),
    /// The connections failed.
    #[error("connections failed: {0}")]
    Transport(#[from] tonic::transport::Error),
}

/// Serves connections until `stop` resolves or there are no more to come.
///
/// Searches under way are then asked to stop, and calls have ten seconds to end. Health
/// (grpc.health.v1) and reflection (v1 and v1alpha) are always served.
///
/// # Errors
/// Threads can't be started, or the connections failed.
pub async fn serve<I, IO, IE>(
    incoming: I,
    settings: Settings,
    stop: impl Future<Output = ()> + Send,
) -> Result<(), ServeError>
where
    I: Stream<Item = Result<IO, IE>>,
    IO: AsyncRead + AsyncWrite + Connected + Unpin + Send + 'static,
    IE: Into<Box<dyn std::error::Error + Send + Sync>>,
{
    let api = Api::start(settings)?;
    let (health, health_service) = tonic_health::server::health_reporter();
    health.set_serving::<DayServiceServer<Api>>().await;
    health.set_serving::<TrafficServiceServer<Api>>().await;
    health.set_serving::<PlanServiceServer<Api>>().await;

    let (told, is_told) = tokio::sync::oneshot::channel();
    let compute = std::sync::Arc::clone(&api.compute);
    let stopping = async move {
        stop.await;
        tracing::info!("stopping");
        compute.stop_all();
        // Fails only when serving has ended already.
        let _ = told.send(());
    };
    let serving = Server::builder()
        .http2_keepalive_interval(Some(Duration::from_secs(30)))
        .add_service(health_service)
        .add_service(reflection()?.build_v1()?)
        .add_service(reflection()?.build_v1alpha()?)
        .add_service(DayServiceServer::new(api.clone()))
        .add_service(TrafficServiceServer::new(api.clone()))
        .add_service(PlanServiceServer::new(api))
        .serve_with_incoming_shutdown(incoming, stopping);
    tokio::select! {
        served = serving => Ok(served?),
        () = grace(is_told) => {
            tracing::warn!("calls under way did not end in time and are dropped");
            Ok(())
        }
    }
}

/// Resolves when the grace period after the stop is over; never without a stop.
async fn grace(is_told: tokio::sync::oneshot::Receiver<()>) {
    if is_told.await.is_err() {
        std::future::pending::<()>().await;
    }
    tokio::time::sleep(GRACE).await;
}

fn reflection() -> Result<tonic_reflection::server::Builder<'static>, ServeError> {
    Ok(tonic_reflection::server::Builder::configure()
        .register_encoded_file_descriptor_set(v1::FILE_DESCRIPTOR_SET)
        .register_encoded_file_descriptor_set(tonic_health::pb::FILE_DESCRIPTOR_SET))
}
