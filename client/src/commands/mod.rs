//! The commands, one file each.

pub(crate) mod ask;
pub(crate) mod audit;
pub(crate) mod check;
pub(crate) mod completions;
pub(crate) mod demo;
pub(crate) mod plan;
pub(crate) mod policy;
pub(crate) mod serve;
pub(crate) mod session;

use crate::args::{Args, Command};
use crate::exit::{Answered, Failure};
use crate::screen::Screen;
use crate::tables::findings::Problem;
use session::Session;

/// Runs the command asked for.
///
/// # Errors
/// When it has no answer.
pub(crate) fn run(args: Args, screen: &Screen) -> Result<Answered, Failure> {
    match args.command {
        Command::Completions(args) => completions::run(&args, screen),
        Command::Serve(args) => block_on(serve::run(&args, screen)),
        command => block_on(async {
            let session = Session::open(args.global.server.as_deref(), screen).await?;
            match command {
                Command::Demo(args) => demo::run(&args, &session).await,
                Command::Check(args) => check::run(&args, &session).await,
                Command::Ask(args) => ask::run(&args, &session).await,
                Command::Plan(args) => plan::run(&args, &session).await,
                Command::Audit(args) => audit::run(&args, &session).await,
                Command::Policy(args) => policy::run(&args, &session).await,
                Command::Completions(_) | Command::Serve(_) => Ok(Answered::Plainly),
            }
        }),
    }
}

fn block_on(command: impl Future<Output = Result<Answered, Failure>>) -> Result<Answered, Failure> {
    match tokio::runtime::Runtime::new() {
        Ok(runtime) => runtime.block_on(command),
        Err(error) => Err(Failure::NoService(Problem::new(format!(
            "no threads can be started for the service: {error}"
        )))),
    }
}
