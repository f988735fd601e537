//! Writes a plan folder, whole or not at all.

use super::document::PlanDocument;
use super::tables::{write_loads, write_losses, write_points};
use super::{DOCUMENT, FoundPlans, points_name};
use crate::exit::Failure;
use crate::tables::findings::Problem;
use std::ffi::OsStr;
use std::fs::{self, File};
use std::io::{self, BufWriter, Write};
use std::path::{Path, PathBuf};

/// What to do about a plan that is there already.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Existing {
    /// Leave it, and say so.
    Keep,
    /// Put the new plan in its place.
    Replace,
}

/// Finds out whether a plan may be written there, before time is spent on finding it.
///
/// # Errors
/// When something is there that may not be replaced.
pub(crate) fn check_place(folder: &Path, existing: Existing) -> Result<(), Failure> {
    let refuse = |text: &str, hint: &str| {
        Err(Failure::input(folder.display(), Problem::with_hint(text, hint)))
    };
    if folder.file_name().is_none() {
        return refuse("is no name for a folder", "give the folder that the plan is to be");
    }
    let entries: Vec<_> = match fs::read_dir(folder) {
        Ok(entries) => entries.flatten().map(|entry| entry.file_name()).collect(),
        Err(error) if error.kind() == io::ErrorKind::NotFound => return Ok(()),
        Err(error) if error.kind() == io::ErrorKind::NotADirectory => {
            return refuse("is a file", "give a folder that does not exist yet");
        }
        Err(error) => return Err(Failure::writing(folder, &error)),
    };
    let is_plan = entries.iter().any(|name| name == DOCUMENT);
    if entries.is_empty() {
        Ok(())
    } else if !is_plan || !entries.iter().all(|name| is_ours(name)) {
        refuse("holds something else than a plan", "give a folder that does not exist yet")
    } else if existing == Existing::Keep {
        refuse("holds a plan already", "give another folder, or --replace")
    } else {
        Ok(())
    }
}

/// Whether a file of that name is one that a plan folder has.
fn is_ours(name: &OsStr) -> bool {
    let Some(name) = name.to_str() else { return false };
    let ranked = |name: &str| {
        let rank = name.strip_prefix("points-").and_then(|rest| rest.strip_suffix(".csv"));
        rank.is_some_and(|rank| rank.parse::<u32>().is_ok())
    };
    [DOCUMENT, "points.csv", "loads.csv", "losses.csv"].contains(&name) || ranked(name)
}

/// Writes the plans that a search found as one folder. Whatever happens on the way, the folder
/// holds either all of them or what it held before.
///
/// # Errors
/// When something is there that may not be replaced, or the disk takes no more.
pub(crate) fn write(folder: &Path, found: &FoundPlans, existing: Existing) -> Result<(), Failure> {
    check_place(folder, existing)?;
    write_beside(folder, found).map_err(|error| Failure::writing(folder, &error))
}

fn write_beside(folder: &Path, found: &FoundPlans) -> io::Result<()> {
    let parent = match folder.parent() {
        Some(parent) if parent != Path::new("") => parent,
        _ => Path::new("."),
    };
    fs::create_dir_all(parent)?;
    let name = folder.file_name().unwrap_or_default().to_string_lossy();
    let beside = |suffix: &str| {
        tempfile::Builder::new().prefix(&format!(".{name}.{suffix}-")).tempdir_in(parent)
    };
    let unfinished = beside("unfinished")?;
    write_files(unfinished.path(), found)?;
    File::open(unfinished.path())?.sync_all()?;
    make_readable(unfinished.path())?;
    let holds_a_plan = fs::read_dir(folder).is_ok_and(|mut entries| entries.next().is_some());
    if !holds_a_plan {
        fs::rename(unfinished.path(), folder)?;
        // Nothing is left there to be removed.
        let _: PathBuf = unfinished.keep();
    } else if !swap(unfinished.path(), folder) {
        // A folder can't be renamed over one that is not empty: the old plan is first set aside.
        let aside = beside("replaced")?;
        let old = aside.path().join("plan");
        fs::rename(folder, &old)?;
        if let Err(error) = fs::rename(unfinished.path(), folder) {
            fs::rename(&old, folder)?;
            return Err(error);
        }
        let _: PathBuf = unfinished.keep();
    }
    File::open(parent)?.sync_all()
}

/// Puts one folder in the place of another and that one in its place, in one step, so that there is
/// a whole plan at every moment; `false` where the system can't do that.
fn swap(one: &Path, other: &Path) -> bool {
    #[cfg(target_os = "linux")]
    {
        use rustix::fs::{CWD, RenameFlags, renameat_with};
        renameat_with(CWD, one, CWD, other, RenameFlags::EXCHANGE).is_ok()
    }
    #[cfg(not(target_os = "linux"))]
    {
        let _ = (one, other);
        false
    }
}

/// Temporary folders are for their owner alone; a plan is a folder like any other.
fn make_readable(folder: &Path) -> io::Result<()> {
    #[cfg(unix)]
    {
        use std::os::unix::fs::PermissionsExt;
        fs::set_permissions(folder, fs::Permissions::from_mode(0o755))?;
    }
    Ok(())
}

fn write_files(folder: &Path, found: &FoundPlans) -> io::Result<()> {
    write_file(&folder.join(DOCUMENT), |out| {
        serde_json::to_writer_pretty(&mut *out, &PlanDocument::of(found))?;
        out.write_all(b"\n")
    })?;
    for (index, plan) in found.plans.iter().enumerate() {
        let path = folder.join(points_name(index + 1));
        write_file(&path, |out| write_points(out, &plan.rows.moved_points))?;
    }
    let best = found.plans.first().map(|best| &best.rows);
    let loads = best.map_or(&[][..], |rows| &rows.loads);
    write_file(&folder.join("loads.csv"), |out| write_loads(out, loads))?;
    let losses = best.map_or(&[][..], |rows| &rows.losses);
    write_file(&folder.join("losses.csv"), |out| write_losses(out, losses))
}

fn write_file(
    path: &Path,
    content: impl FnOnce(&mut dyn Write) -> io::Result<()>,
) -> io::Result<()> {
    let mut out = BufWriter::new(File::create(path)?);
    content(&mut out)?;
    out.into_inner().map_err(io::IntoInnerError::into_error)?.sync_all()
}
