//! `rimeshift serve`: the service on a port, as `rimeshiftd` serves it with its default limits.

use crate::exit::{Answered, Failure};
use crate::screen::Screen;
use crate::tables::findings::Problem;
use rimeshift_service::{Settings, serve};
use std::net::SocketAddr;
use tokio::net::TcpListener;
use tonic::transport::server::TcpIncoming;

/// Options of `serve`.
#[derive(Debug, clap::Args)]
pub(crate) struct ServeArgs {
    /// Address and port to listen on.
    #[arg(long, default_value = "127.0.0.1:7415")]
    listen: SocketAddr,
    /// Allow an address that other machines can reach: nobody is asked who they are.
    #[arg(long)]
    allow_remote: bool,
}

/// Serves until the process is told to stop.
///
/// # Errors
/// When the address can't be listened on.
pub(crate) async fn run(args: &ServeArgs, screen: &Screen) -> Result<Answered, Failure> {
    if !args.listen.ip().is_loopback() && !args.allow_remote {
        return Err(Failure::input(
            "--listen",
            Problem::with_hint(
                format!("{} can be reached from other machines", args.listen),
                "nobody is asked who they are; give --allow-remote if that is meant",
            ),
        ));
    }
    let listener = TcpListener::bind(args.listen).await.map_err(|error| {
        Failure::input("--listen", Problem::new(format!("{}: {error}", args.listen)))
    })?;
    let address = listener.local_addr().unwrap_or(args.listen);
    screen.say(&format!("listening on http://{address}; stop with Ctrl-C"));
    let incoming = TcpIncoming::from(listener).with_nodelay(Some(true));
    serve(incoming, Settings::default(), told_to_stop())
        .await
        .map_err(|error| Failure::NoService(Problem::new(error.to_string())))?;
    Ok(Answered::Plainly)
}

/// Resolves when the process is interrupted or told to end.
async fn told_to_stop() {
    #[cfg(unix)]
    {
        use tokio::signal::unix::{SignalKind, signal};
        if let Ok(mut terminate) = signal(SignalKind::terminate()) {
            tokio::select! {
                _ = terminate.recv() => {}
                _ = tokio::signal::ctrl_c() => {}
            }
            return;
        }
    }
    // Where no signal can be awaited, serving ends with the process.
    if tokio::signal::ctrl_c().await.is_err() {
        std::future::pending::<()>().await;
    }
}
