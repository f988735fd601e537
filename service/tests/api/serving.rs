//! Health, reflection, and stopping.

use hyper_util::rt::TokioIo;
use rimeshift_proto::v1;
use rimeshift_proto::v1::day_service_client::DayServiceClient;
use rimeshift_service::{pipe, serve};
use tonic::transport::Endpoint;
use tonic_health::pb::HealthCheckRequest;
use tonic_health::pb::health_check_response::ServingStatus;
use tonic_health::pb::health_client::HealthClient;
use tonic_reflection::pb::v1::ServerReflectionRequest;
use tonic_reflection::pb::v1::server_reflection_client::ServerReflectionClient;
use tonic_reflection::pb::v1::server_reflection_request::MessageRequest;
use tonic_reflection::pb::v1::server_reflection_response::MessageResponse;

use crate::support::{service, small};

const SERVICES: [&str; 3] =
    ["rimeshift.v1.DayService", "rimeshift.v1.PlanService", "rimeshift.v1.TrafficService"];

#[tokio::test]
async fn health_speaks_for_every_service() {
    let mut client = HealthClient::new(service(small()).await);
    for name in SERVICES.into_iter().chain([""]) {
        let request = HealthCheckRequest { service: name.to_owned() };
        let status = client.check(request).await.unwrap().into_inner().status();
        assert_eq!(status, ServingStatus::Serving, "{name}");
    }
}

#[tokio::test]
async fn reflection_lists_every_service() {
    let mut client = ServerReflectionClient::new(service(small()).await);
    let list = ServerReflectionRequest {
        host: String::new(),
        message_request: Some(MessageRequest::ListServices(String::new())),
    };
    let stream = client.server_reflection_info(tokio_stream::iter([list])).await.unwrap();
    let answer = stream.into_inner().message().await.unwrap().unwrap();
    let Some(MessageResponse::ListServicesResponse(list)) = answer.message_response else {
        panic!("a list of services");
    };
    let names: Vec<_> = list.service.into_iter().map(|s| s.name).collect();
    for name in SERVICES {
        assert!(names.iter().any(|n| n == name), "{names:?}");
    }
}

#[tokio::test]
async fn a_service_told_to_stop_ends_and_refuses_new_connections() {
    let (connector, incoming) = pipe();
    let (tell, told) = tokio::sync::oneshot::channel::<()>();
    let stop = async move {
        let _ = told.await;
    };
    let serving = tokio::spawn(serve(incoming, small(), stop));
    let reconnect = connector.clone();
    let channel = Endpoint::from_static("http://in-memory")
        .connect_with_connector(tower::service_fn(move |_| {
            let connector = connector.clone();
            async move { connector.connect().await.map(TokioIo::new) }
        }))
        .await
        .unwrap();
    let mut client = DayServiceClient::new(channel);
    client.list_days(v1::ListDaysRequest::default()).await.unwrap();
    tell.send(()).unwrap();
    serving.await.unwrap().unwrap();
    assert!(reconnect.connect().await.is_err());
}
