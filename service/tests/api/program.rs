//! `rimeshiftd` as an operator meets it.

use std::io::{BufRead, BufReader};
use std::process::{Command, Stdio};

use rimeshift_proto::v1;
use rimeshift_proto::v1::day_service_client::DayServiceClient;

fn program() -> Command {
    let mut command = Command::new(env!("CARGO_BIN_EXE_rimeshiftd"));
    command.stderr(Stdio::piped()).env_remove("RUST_LOG");
    command
}

/// Starts on a free port, says which in its log, answers, and ends well when it is told to.
#[tokio::test]
async fn it_serves_on_tcp_until_it_is_told_to_stop() {
    let mut child = program().args(["--listen", "127.0.0.1:0", "--log", "json"]).spawn().unwrap();
    let mut log = BufReader::new(child.stderr.take().unwrap());
    let mut line = String::new();
    log.read_line(&mut line).unwrap();
    let start = line.find("127.0.0.1:").unwrap();
    let address: String = line[start..].chars().take_while(|c| *c != '"').collect();
    let mut client = DayServiceClient::connect(format!("http://{address}")).await.unwrap();
    let days = client.list_days(v1::ListDaysRequest::default()).await.unwrap().into_inner().days;
    assert_eq!(days, []);
    let id = child.id().to_string();
    assert!(Command::new("kill").args(["-TERM", &id]).status().unwrap().success());
    assert!(child.wait().unwrap().success());
}

#[test]
fn it_refuses_an_address_that_others_can_reach_unless_told() {
    let output = program().args(["--listen", "0.0.0.0:0"]).output().unwrap();
    assert_eq!(output.status.code(), Some(1));
    let log = String::from_utf8(output.stderr).unwrap();
    assert!(log.contains("--allow-remote"), "{log}");
}
