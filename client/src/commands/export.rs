//! `rimeshift export`: the search's model of a day, so that anyone can solve it otherwise.

use super::session::{LoadedDay, Session};
use crate::exit::{Answered, Failure, Terms};
use crate::screen::Form;
use rimeshift_proto::v1::ExportModelRequest;
use std::io::Write;
use std::path::{Path, PathBuf};

/// Options of `export`.
#[derive(Debug, clap::Args)]
pub(crate) struct ExportArgs {
    /// The day folder.
    day: PathBuf,
    /// The file to write, free MPS; a file that is there is replaced.
    #[arg(long, value_name = "FILE")]
    out: PathBuf,
    /// A table of proposals that takes the place of the day's.
    #[arg(long, value_name = "FILE")]
    proposals: Option<PathBuf>,
}

/// Exports the model of a day folder.
///
/// # Errors
/// When there is no answer, or it can't be written.
pub(crate) async fn run(args: &ExportArgs, session: &Session<'_>) -> Result<Answered, Failure> {
    let day = session.load_day(&args.day, args.proposals.as_deref()).await?;
    let exported = export(args, session, &day).await;
    session.forget(&day).await;
    let bytes = exported?;
    let out = args.out.display();
    session.screen.answer(&match session.screen.form {
        Form::Json => serde_json::json!({ "file": out.to_string(), "bytes": bytes }).to_string(),
        Form::Text(_) => {
            format!("The model of {} is written to {out} ({bytes} bytes).\n", day.day.region)
        }
    })?;
    Ok(Answered::Plainly)
}

async fn export(
    args: &ExportArgs,
    session: &Session<'_>,
    day: &LoadedDay,
) -> Result<usize, Failure> {
    let failed = |error: &std::io::Error| Failure::writing(&args.out, error);
    // Beside its place, so that the file is there whole or not at all.
    let parent = match args.out.parent() {
        Some(parent) if parent != Path::new("") => parent,
        _ => Path::new("."),
    };
    let mut file = tempfile::NamedTempFile::new_in(parent).map_err(|error| failed(&error))?;
    let request = ExportModelRequest { parent: day.day.name.clone(), policy: Vec::new() };
    let failure = |status| Failure::of_status(&status, Terms::Folder(&day.folder));
    let mut pieces = session.plans().export_model(request).await.map_err(failure)?.into_inner();
    let mut bytes = 0;
    while let Some(piece) = pieces.message().await.map_err(failure)? {
        file.write_all(piece.text.as_bytes()).map_err(|error| failed(&error))?;
        bytes += piece.text.len();
    }
    file.as_file().sync_all().map_err(|error| failed(&error))?;
    file.persist(&args.out).map_err(|error| failed(&error.error))?;
    Ok(bytes)
}
