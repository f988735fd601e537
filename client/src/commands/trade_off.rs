//! `rimeshift trade-off`: what plans buy for how many moved flights and how much fuel.

use super::session::{LoadedDay, Session};
use crate::args::share;
use crate::exit::{Answered, Failure};
use crate::report::trade_off::TradeOffReport;
use crate::screen::Form;
use rimeshift_proto::v1::{TraceTradeOffRequest, TraceTradeOffResponse};
use std::path::PathBuf;

/// Options of `trade-off`.
#[derive(Debug, clap::Args)]
pub(crate) struct TradeOffArgs {
    /// The day folder.
    day: PathBuf,
    /// Points for each of the two limits.
    #[arg(long, value_name = "N", default_value_t = 8, value_parser = clap::value_parser!(u32).range(1..=50))]
    points: u32,
    /// Stop each search once it is proven to be this close to the best, e.g. 0.01.
    #[arg(long, value_name = "G", value_parser = share)]
    gap: Option<f64>,
    /// Seed of the searches.
    #[arg(long, value_name = "N", default_value_t = 1)]
    seed: u64,
}

/// Traces the curve of a day folder.
///
/// # Errors
/// When there is no answer.
pub(crate) async fn run(args: &TradeOffArgs, session: &Session<'_>) -> Result<Answered, Failure> {
    let day = session.load_day(&args.day, None).await?;
    let traced = trace(args, session, &day).await;
    session.forget(&day).await;
    let report = TradeOffReport { day: &day.day, curve: &traced? };
    session.screen.answer(&match session.screen.form {
        Form::Json => report.json(),
        Form::Text(layout) => report.text(layout),
    })?;
    Ok(Answered::Plainly)
}

async fn trace(
    args: &TradeOffArgs,
    session: &Session<'_>,
    day: &LoadedDay,
) -> Result<TraceTradeOffResponse, Failure> {
    let progress = session.screen.begin("searching plans under rising limits");
    let request = TraceTradeOffRequest {
        parent: day.day.name.clone(),
        points: Some(args.points),
        policy: Vec::new(),
        seed: args.seed,
        gap: args.gap,
    };
    let answer = session.plans().trace_trade_off(request).await;
    progress.finish_and_clear();
    Ok(answer.map_err(|status| day.failure(&status))?.into_inner())
}
