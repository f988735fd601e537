//! `rimeshift completions`: a completion script for a shell.

use crate::args::Args;
use crate::exit::{Answered, Failure};
use crate::screen::Screen;
use clap::CommandFactory;
use clap_complete::Shell;

/// Options of `completions`.
#[derive(Debug, clap::Args)]
pub(crate) struct CompletionsArgs {
    /// The shell.
    shell: Shell,
}

/// Writes the script.
///
/// # Errors
/// When standard output takes no more.
pub(crate) fn run(args: &CompletionsArgs, screen: &Screen) -> Result<Answered, Failure> {
    let mut script = Vec::new();
    clap_complete::generate(args.shell, &mut Args::command(), "rimeshift", &mut script);
    screen.answer(&String::from_utf8_lossy(&script))?;
    Ok(Answered::Plainly)
}
