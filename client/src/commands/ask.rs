//! `rimeshift ask`: one level change, against the filed day or beside a plan.

use super::session::{LoadedDay, Session};
use crate::args::{flight_level, time};
use crate::exit::{Answered, Failure, Terms};
use crate::plan_folder;
use crate::report::ask::AskReport;
use crate::screen::Form;
use crate::tables::rows::{feet, wire_time};
use jiff::Timestamp;
use rimeshift_proto::v1::{AskChangeRequest, Change, Stretch};
use std::path::PathBuf;

/// Options of `ask`.
#[derive(Debug, clap::Args)]
pub(crate) struct AskArgs {
    /// The day folder.
    day: PathBuf,
    /// Ask beside what this plan grants, rather than against the filed day.
    #[arg(long, value_name = "DIR")]
    plan: Option<PathBuf>,
    /// The flight.
    #[arg(long)]
    flight: String,
    /// The level asked for, e.g. 370.
    #[arg(long, value_name = "FL", value_parser = flight_level)]
    level: f64,
    /// Where it is to leave its filed level, as the filed time there. Left out: from the climb.
    #[arg(long, value_name = "TIME", value_parser = time)]
    from: Option<Timestamp>,
    /// Where it is to start to return, as the filed time there. Left out: until the descent.
    #[arg(long, value_name = "TIME", value_parser = time)]
    until: Option<Timestamp>,
}

/// The fields of the question, and the options that they come from.
const OPTIONS: [(&str, &str); 4] = [
    ("change.flight", "--flight"),
    ("change.stretches[0].level_ft", "--level"),
    ("change.stretches[0].from", "--from"),
    ("change.stretches[0].until", "--until"),
];

/// Asks about one level change.
///
/// # Errors
/// When there is no answer.
pub(crate) async fn run(args: &AskArgs, session: &Session<'_>) -> Result<Answered, Failure> {
    let day = session.load_day(&args.day, None).await?;
    let asked = ask(args, session, &day).await;
    session.forget(&day).await;
    let report = asked?;
    session.screen.answer(&match session.screen.form {
        Form::Json => report.json(),
        Form::Text(layout) => report.text(layout),
    })?;
    Ok(Answered::Plainly)
}

async fn ask(args: &AskArgs, session: &Session<'_>, day: &LoadedDay) -> Result<AskReport, Failure> {
    let plan = match &args.plan {
        Some(folder) => {
            let plan = plan_folder::read(folder, &day.day.day_sha256).map_err(Failure::BadInput)?;
            plan_folder::load(session, day, plan).await?
        }
        None => String::new(),
    };
    let change = Change {
        flight: args.flight.clone(),
        stretches: vec![Stretch {
            level_ft: feet(args.level),
            from: args.from.map(wire_time),
            until: args.until.map(wire_time),
        }],
        figures: None,
    };
    let beside_plan = !plan.is_empty();
    let request = AskChangeRequest { day: day.day.name.clone(), plan, change: Some(change) };
    let response = session.plans().ask_change(request).await;
    let answer = response
        .map_err(|status| Failure::of_status(&status, Terms::Options(&OPTIONS)))?
        .into_inner()
        .answer;
    Ok(AskReport {
        flight: args.flight.clone(),
        level_fl: args.level,
        beside_plan,
        answer: answer.unwrap_or_default(),
    })
}
