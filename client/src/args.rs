//! What can be asked on the command line.

use crate::commands::{
    ask, audit, check, compare, completions, demo, export, new, plan, policy, serve, trade_off, why,
};
use crate::report::cautions;
use crate::tables::time::parse_utc;
use clap::{Parser, Subcommand, ValueEnum};
use jiff::Timestamp;

/// Plans level changes that keep aircraft out of the cold, ice-supersaturated air in which
/// contrails last, within separation minima and sector capacities.
#[derive(Debug, Parser)]
#[command(name = "rimeshift", version, max_term_width = 100, after_help = cautions::FULL)]
pub(crate) struct Args {
    #[command(flatten)]
    pub(crate) global: Global,
    #[command(subcommand)]
    pub(crate) command: Command,
}

/// Options of every command.
#[derive(Debug, clap::Args)]
pub(crate) struct Global {
    /// Ask the service at this address, e.g. http://127.0.0.1:7415, rather than one started within
    /// this process.
    #[arg(long, global = true, value_name = "URL")]
    pub(crate) server: Option<String>,
    /// Answer in JSON.
    #[arg(long, global = true)]
    pub(crate) json: bool,
}

/// The commands.
#[derive(Debug, Subcommand)]
pub(crate) enum Command {
    /// Check and plan an invented day that comes with the program.
    Demo(demo::DemoArgs),
    /// Write a commented day folder to begin from.
    New(new::NewArgs),
    /// Find the overloads and losses of separation that a day holds as filed.
    Check(check::CheckArgs),
    /// Ask whether one level change can be granted, and if not, what blocks it.
    Ask(ask::AskArgs),
    /// Find the best set of proposals that can be granted together.
    Plan(plan::PlanArgs),
    /// Tell why a plan leaves a proposal out, and what it would take to let it in.
    Why(why::WhyArgs),
    /// Find what plans buy for how many moved flights and how much fuel.
    TradeOff(trade_off::TradeOffArgs),
    /// Write the search's model of a day as free MPS, for other solvers.
    Export(export::ExportArgs),
    /// Judge a plan by code that shares none of the search's shortcuts.
    Audit(audit::AuditArgs),
    /// Tell what differs between two plans of a day.
    Compare(compare::CompareArgs),
    /// Show every key of the policy with its unit, value, default and source.
    Policy(policy::PolicyArgs),
    /// Serve the gRPC API on a port.
    Serve(serve::ServeArgs),
    /// Write a completion script for a shell.
    Completions(completions::CompletionsArgs),
}

/// What may turn an answer into exit code 1.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub(crate) enum FailOn {
    /// A count above its limit.
    Overload,
    /// A loss of separation.
    Loss,
}

/// Reads a time of the command line.
///
/// # Errors
/// When it is not RFC 3339 in UTC.
pub(crate) fn time(text: &str) -> Result<Timestamp, String> {
    parse_utc(text.as_bytes()).map_err(|problem| match problem.hint {
        Some(hint) => format!("{}; {hint}", problem.text),
        None => problem.text,
    })
}

/// Reads a flight level of the command line, with or without FL before it.
///
/// # Errors
/// When it is no finite number.
pub(crate) fn flight_level(text: &str) -> Result<f64, String> {
    let digits = text.trim_start_matches(['F', 'f', 'L', 'l']).trim_start();
    match digits.parse::<f64>() {
        Ok(level_fl) if level_fl.is_finite() => Ok(level_fl),
        _ => Err(format!("{text:?} is no flight level; write 370 for FL 370")),
    }
}

/// Reads a share from 0 to 1.
///
/// # Errors
/// When it is none.
pub(crate) fn share(text: &str) -> Result<f64, String> {
    match text.parse::<f64>() {
        Ok(share) if (0.0..=1.0).contains(&share) => Ok(share),
        _ => Err(format!("{text:?} is no number from 0 to 1; write 0.01 for 1 %")),
    }
}

/// Reads a number of seconds above 0.
///
/// # Errors
/// When it is none.
pub(crate) fn seconds(text: &str) -> Result<std::time::Duration, String> {
    let parsed = text.parse::<f64>().ok().filter(|seconds| *seconds > 0.0);
    parsed
        .and_then(|seconds| std::time::Duration::try_from_secs_f64(seconds).ok())
        .ok_or_else(|| format!("{text:?} is no number of seconds above 0"))
}

#[cfg(test)]
mod tests {
    use super::*;
    use clap::CommandFactory;

    #[test]
    fn the_command_line_is_well_formed() {
        Args::command().debug_assert();
    }

    #[test]
    fn values_are_read_or_refused() {
        assert_eq!(flight_level("FL370"), Ok(370.0));
        assert_eq!(flight_level("372.5"), Ok(372.5));
        assert!(flight_level("FLnan").is_err());
        assert!(flight_level("high").is_err());
        assert_eq!(share("0.01"), Ok(0.01));
        assert!(share("1 %").is_err());
        assert!(share("NaN").is_err());
        assert_eq!(seconds("1.5").map(|time| time.as_millis()), Ok(1500));
        for wrong in ["0", "-1", "inf", "1e30", "soon"] {
            assert!(seconds(wrong).is_err(), "{wrong}");
        }
        assert!(time("2031-03-04T06:15:00Z").is_ok());
        assert!(time("06:15").is_err());
    }
}
