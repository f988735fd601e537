//! The commands, one file each.

pub(crate) mod ask;
pub(crate) mod audit;
pub(crate) mod by_hand;
pub(crate) mod check;
pub(crate) mod compare;
pub(crate) mod completions;
pub(crate) mod demo;
pub(crate) mod export;
pub(crate) mod new;
pub(crate) mod plan;
pub(crate) mod policy;
pub(crate) mod serve;
pub(crate) mod session;
pub(crate) mod trade_off;
pub(crate) mod why;

use crate::args::{Args, Command};
use crate::exit::{Answered, Failure};
use crate::screen::Screen;
use crate::tables::findings::Problem;
use session::Session;
use tracing_subscriber::EnvFilter;

/// Runs the command asked for.
///
/// # Errors
/// When it has no answer.
pub(crate) fn run(args: Args, screen: &Screen) -> Result<Answered, Failure> {
    match args.command {
        Command::Completions(args) => completions::run(&args, screen),
        Command::New(args) => new::run(&args, screen),
        Command::Serve(args) => block_on(async {
            log("info");
            serve::run(&args, screen).await
        }),
        command => block_on(async {
            log("error");
            let session = Session::open(args.global.server.as_deref(), screen).await?;
            match command {
                Command::Demo(args) => demo::run(&args, &session).await,
                Command::Check(args) => check::run(&args, &session).await,
                Command::Ask(args) => ask::run(&args, &session).await,
                Command::Plan(args) => plan::run(&args, &session).await,
                Command::Compare(args) => compare::run(&args, &session).await,
                Command::Export(args) => export::run(&args, &session).await,
                Command::Why(args) => why::run(&args, &session).await,
                Command::TradeOff(args) => trade_off::run(&args, &session).await,
                Command::Audit(args) => audit::run(&args, &session).await,
                Command::Policy(args) => policy::run(&args, &session).await,
                Command::Completions(_) | Command::New(_) | Command::Serve(_) => {
                    Ok(Answered::Plainly)
                }
            }
        }),
    }
}

/// Writes to standard error what the service in this process logs: as `RUST_LOG` says, or from a
/// level on.
fn log(otherwise: &str) {
    let filter = EnvFilter::try_from_default_env().unwrap_or_else(|_| EnvFilter::new(otherwise));
    let log = tracing_subscriber::fmt().with_env_filter(filter).with_writer(std::io::stderr);
    // Whoever has set a log up before has decided where it goes.
    let _ = log.try_init();
}

fn block_on(command: impl Future<Output = Result<Answered, Failure>>) -> Result<Answered, Failure> {
    match tokio::runtime::Runtime::new() {
        Ok(runtime) => runtime.block_on(command),
        Err(error) => Err(Failure::NoService(Problem::new(format!(
            "no threads can be started for the service: {error}"
        )))),
    }
}
