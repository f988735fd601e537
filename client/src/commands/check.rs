//! `rimeshift check`: what a day holds as filed.

use super::session::{LoadedDay, Session};
use crate::args::FailOn;
use crate::exit::{Answered, Failure};
use crate::report::check::CheckReport;
use crate::screen::Form;
use rimeshift_proto::v1::check_day_response::Content;
use rimeshift_proto::v1::{CheckDayRequest, ListLossesRequest, Loss};
use std::path::PathBuf;
use tonic::Status;

/// The most losses asked for at once.
const PAGE: i32 = 10_000;

/// Options of `check`.
#[derive(Debug, clap::Args)]
pub(crate) struct CheckArgs {
    /// The day folder.
    day: PathBuf,
    /// End with exit code 1 if the filed day holds this.
    #[arg(long, value_name = "WHAT")]
    fail_on: Vec<FailOn>,
}

/// Checks a day folder.
///
/// # Errors
/// When there is no answer.
pub(crate) async fn run(args: &CheckArgs, session: &Session<'_>) -> Result<Answered, Failure> {
    let day = session.load_day(&args.day, None).await?;
    let checked = check(session, &day).await;
    session.forget(&day).await;
    let report = checked?;
    show(session, &report)?;
    let fails = args.fail_on.iter().any(|what| match what {
        FailOn::Overload => report.summary.overloads > 0,
        FailOn::Loss => report.summary.losses > 0,
    });
    Ok(if fails { Answered::WithWhatFails } else { Answered::Plainly })
}

/// Writes a report in the form asked for.
///
/// # Errors
/// When standard output takes no more.
pub(super) fn show(session: &Session<'_>, report: &CheckReport) -> Result<(), Failure> {
    session.screen.answer(&match session.screen.form {
        Form::Json => report.json(),
        Form::Text(layout) => report.text(layout),
    })
}

/// Asks for a check of a loaded day, and for its losses.
///
/// # Errors
/// When the service has no answer.
pub(super) async fn check(session: &Session<'_>, day: &LoadedDay) -> Result<CheckReport, Failure> {
    let progress = session.screen.begin("checking the day");
    let report = collect(session, day).await;
    progress.finish_and_clear();
    report.map_err(|status| day.failure(&status))
}

async fn collect(session: &Session<'_>, day: &LoadedDay) -> Result<CheckReport, Status> {
    let mut report = CheckReport { day: day.day.clone(), ..CheckReport::default() };
    let request = CheckDayRequest { day: day.day.name.clone() };
    let mut answer = session.traffic().check_day(request).await?.into_inner();
    while let Some(message) = answer.message().await? {
        match message.content {
            Some(Content::Summary(summary)) => report.summary = summary,
            Some(Content::Rows(rows)) => {
                report.overloads.extend(rows.overloads);
                report.invalid_proposals.extend(rows.invalid_proposals);
            }
            None => {}
        }
    }
    report.losses = losses(session, &day.day.name).await?;
    Ok(report)
}

async fn losses(session: &Session<'_>, day: &str) -> Result<Vec<Loss>, Status> {
    let mut losses = Vec::new();
    let mut request = ListLossesRequest {
        parent: day.to_owned(),
        page_size: PAGE,
        ..ListLossesRequest::default()
    };
    loop {
        let page = session.traffic().list_losses(request.clone()).await?.into_inner();
        losses.extend(page.losses);
        if page.next_page_token.is_empty() {
            return Ok(losses);
        }
        request.page_token = page.next_page_token;
    }
}
