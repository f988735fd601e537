//! A service of its own, at an address.

use crate::support::{arg, day_with, program, run};
use std::io::{BufRead, BufReader};
use std::process::{Child, ChildStderr, Stdio};

/// A served process, ended with the test.
struct Served {
    child: Child,
    address: String,
    /// Kept open: the log goes there.
    _log: BufReader<ChildStderr>,
}

impl Drop for Served {
    fn drop(&mut self) {
        // It may have ended by itself already.
        let _ = self.child.kill();
        let _ = self.child.wait();
    }
}

fn serve() -> Served {
    let mut child = program(&["serve", "--listen", "127.0.0.1:0"])
        .stderr(Stdio::piped())
        .stdout(Stdio::null())
        .spawn()
        .expect("the program runs");
    let mut log = BufReader::new(child.stderr.take().expect("standard error"));
    let mut line = String::new();
    log.read_line(&mut line).expect("a line");
    let address = line
        .strip_prefix("listening on ")
        .and_then(|rest| rest.split_once(';'))
        .map(|(address, _)| address.to_owned())
        .expect("an address");
    Served { child, address, _log: log }
}

#[test]
fn a_day_is_checked_by_a_service_elsewhere_as_by_our_own() {
    let served = serve();
    let day = day_with("");
    let own = run(&["check", arg(day.path())]);
    let there = run(&["check", arg(day.path()), "--server", &served.address]);
    assert_eq!(there.code, Some(0), "{}", there.err);
    assert_eq!(own.out, there.out);
}

#[test]
fn no_service_is_exit_code_three() {
    let day = day_with("");
    let run = run(&["check", arg(day.path()), "--server", "http://127.0.0.1:1"]);
    assert_eq!((run.code, run.out.as_str()), (Some(3), ""));
    assert!(run.err.contains("hint: start one with `rimeshift serve`"), "{}", run.err);
}

#[test]
fn an_address_that_others_can_reach_must_be_meant() {
    let run = run(&["serve", "--listen", "0.0.0.0:0"]);
    assert_eq!(run.code, Some(2));
    assert!(run.err.contains("--allow-remote"), "{}", run.err);
}
