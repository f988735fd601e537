//! Small files that are read whole.

use super::findings::{Defects, Problem};
use super::table_file::io_problem;
use std::fs::File;
use std::io::Read;
use std::path::Path;

/// The longest such file that is read, in bytes.
const LONGEST: u64 = 256 << 20;

/// Reads a file as UTF-8 text, without a byte order mark. `None` when that can't be done, which is
/// then a defect.
pub(crate) fn read_text(path: &Path, shown: &str, defects: &mut Defects) -> Option<String> {
    let mut bytes = Vec::new();
    let read = File::open(path).and_then(|file| file.take(LONGEST + 1).read_to_end(&mut bytes));
    let problem = match read {
        Err(error) => io_problem(&error),
        Ok(0) => Problem::new("is empty"),
        Ok(length) if length as u64 > LONGEST => {
            Problem::new(format!("is longer than {LONGEST} bytes"))
        }
        Ok(_) => match String::from_utf8(bytes) {
            Ok(text) => return Some(text.trim_start_matches('\u{feff}').to_owned()),
            Err(error) => {
                let valid = error.utf8_error().valid_up_to();
                let line = 1 + error.as_bytes().iter().take(valid).filter(|b| **b == b'\n').count();
                Problem::with_hint(
                    format!("line {line} holds bytes that are not UTF-8 text"),
                    "save the file as UTF-8",
                )
            }
        },
    };
    defects.add_problem(shown, problem);
    None
}
