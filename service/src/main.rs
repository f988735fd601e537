//! `rimeshiftd`: the Rimeshift service on a TCP port.

use std::net::SocketAddr;
use std::process::ExitCode;
use std::time::Duration;

use clap::{Parser, ValueEnum};
use rimeshift_service::{Settings, serve};
use tokio::net::TcpListener;
use tokio::signal::unix::{SignalKind, signal};
use tonic::transport::server::TcpIncoming;
use tracing_subscriber::EnvFilter;

/// Serves Rimeshift's gRPC API. It has no authentication: keep it on the loopback interface, or
/// behind a proxy that admits only whom you trust.
#[derive(Debug, Parser)]
#[command(name = "rimeshiftd", version)]
struct Args {
    /// Address and port to listen on.
    #[arg(long, default_value = "127.0.0.1:7415")]
    listen: SocketAddr,
    /// Allow an address that other machines can reach.
    #[arg(long)]
    allow_remote: bool,
    /// Form of the log, on standard error. RUST_LOG chooses what is logged (default: info).
    #[arg(long, value_enum, default_value_t = LogForm::Text)]
    log: LogForm,
    #[command(flatten)]
    limits: Limits,
}

/// Flags that are absent keep the library's settings.
#[derive(Debug, clap::Args)]
struct Limits {
    /// Most days held at once [default: 16].
    #[arg(long)]
    max_days: Option<usize>,
    /// Most plans kept per day [default: 100].
    #[arg(long)]
    max_plans_per_day: Option<usize>,
    /// Most memory that one load may fill, MiB [default: 2048].
    #[arg(long, value_parser = clap::value_parser!(u64).range(1..=1 << 40))]
    max_load_mib: Option<u64>,
    /// Most rows, points included, that one load may bring [default: 20000000].
    #[arg(long)]
    max_load_rows: Option<u64>,
    /// Most loads received at once [default: 4].
    #[arg(long)]
    max_loads: Option<usize>,
    /// Longest wait for the next message of a load, s [default: 60].
    #[arg(long)]
    load_idle_s: Option<u64>,
    /// Threads of each build, check, search or audit [default: as many as processors].
    #[arg(long)]
    search_threads: Option<usize>,
    /// Threads for single questions [default: half the processors].
    #[arg(long)]
    ask_threads: Option<usize>,
    /// Most builds, checks, searches and audits under way at once [default: 2].
    #[arg(long)]
    max_jobs: Option<usize>,
    /// Most of them waiting [default: 64].
    #[arg(long)]
    max_waiting_jobs: Option<usize>,
}

#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
enum LogForm {
    /// Lines for people.
    Text,
    /// One JSON object a line.
    Json,
}

impl Limits {
    fn settings(&self) -> Settings {
        let default = Settings::default();
        Settings {
            max_days: self.max_days.unwrap_or(default.max_days),
            max_plans_per_day: self.max_plans_per_day.unwrap_or(default.max_plans_per_day),
            max_load_bytes: self.max_load_mib.map_or(default.max_load_bytes, |mib| mib << 20),
            max_load_rows: self.max_load_rows.unwrap_or(default.max_load_rows),
            max_loads: self.max_loads.unwrap_or(default.max_loads),
            load_idle: self.load_idle_s.map_or(default.load_idle, Duration::from_secs),
            search_threads: self.search_threads.unwrap_or(default.search_threads),
            ask_threads: self.ask_threads.unwrap_or(default.ask_threads),
            max_jobs: self.max_jobs.unwrap_or(default.max_jobs),
            max_waiting_jobs: self.max_waiting_jobs.unwrap_or(default.max_waiting_jobs),
        }
    }
}

fn main() -> ExitCode {
    let args = Args::parse();
    start_log(args.log);
    match run(&args) {
        Ok(()) => ExitCode::SUCCESS,
        Err(error) => {
            tracing::error!("{error}");
            ExitCode::FAILURE
        }
    }
}

#[tokio::main]
async fn run(args: &Args) -> Result<(), Box<dyn std::error::Error>> {
    if !args.listen.ip().is_loopback() && !args.allow_remote {
        return Err(format!(
            "{} can be reached from other machines, and nobody is asked who they are; \
             give --allow-remote if that is meant",
            args.listen
        )
        .into());
    }
    let (mut terminate, mut interrupt) =
        (signal(SignalKind::terminate())?, signal(SignalKind::interrupt())?);
    let stop = async move {
        tokio::select! {
            _ = terminate.recv() => {}
            _ = interrupt.recv() => {}
        }
    };
    let listener = TcpListener::bind(args.listen)
        .await
        .map_err(|error| format!("can't listen on {}: {error}", args.listen))?;
    tracing::info!(address = %listener.local_addr()?, "listening");
    let incoming = TcpIncoming::from(listener).with_nodelay(Some(true));
    serve(incoming, args.limits.settings(), stop).await?;
    Ok(())
}

fn start_log(form: LogForm) {
    let filter = EnvFilter::try_from_default_env().unwrap_or_else(|_| EnvFilter::new("info"));
    let log = tracing_subscriber::fmt().with_env_filter(filter).with_writer(std::io::stderr);
    match form {
        LogForm::Text => log.init(),
        LogForm::Json => log.json().init(),
    }
    std::panic::set_hook(Box::new(|panic| tracing::error!("panic: {panic}")));
}
