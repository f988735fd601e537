//! Where a table lies and how it is packed.

use super::findings::{Defects, Problem};
use std::fs::{self, File};
use std::io::{self, Read};
use std::path::{Path, PathBuf};

/// How a table is stored.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Format {
    /// RFC 4180 text.
    Csv,
    /// The same, gzip-packed (RFC 1952).
    CsvGzip,
    /// The same, Zstandard-packed (RFC 8878).
    CsvZstd,
    /// Apache Parquet.
    Parquet,
}

/// The endings by which a format is told.
const ENDINGS: [(&str, Format); 4] = [
    (".csv", Format::Csv),
    (".csv.gz", Format::CsvGzip),
    (".csv.zst", Format::CsvZstd),
    (".parquet", Format::Parquet),
];

/// One table's file.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(crate) struct TableFile {
    pub(crate) path: PathBuf,
    /// Its name as errors show it: relative to the day folder where it lies in one.
    pub(crate) shown: String,
    pub(crate) format: Format,
}

impl TableFile {
    /// The file at `path`, whose format its ending tells.
    ///
    /// # Errors
    /// When the ending tells none.
    pub(crate) fn at(path: &Path, shown: &str) -> Result<TableFile, Problem> {
        let format = ENDINGS
            .iter()
            .rfind(|(ending, _)| shown.ends_with(ending))
            .map(|(_, format)| *format)
            .ok_or_else(|| {
                Problem::with_hint(
                    "is no table by its name",
                    "a table's name ends in .csv, .csv.gz, .csv.zst or .parquet",
                )
            })?;
        Ok(TableFile { path: path.to_owned(), shown: shown.to_owned(), format })
    }

    /// How an error names a row: by line in text, by row number (from 1) in Parquet.
    pub(crate) fn row_place(&self, row: u32) -> String {
        match self.format {
            Format::Parquet => format!("{}: row {row}", self.shown),
            _ => format!("{}:{row}", self.shown),
        }
    }

    /// How an error names a cell.
    pub(crate) fn cell_place(&self, row: u32, column: &str) -> String {
        format!("{}: column {column}", self.row_place(row))
    }

    /// Opens a text table, unpacking it on the way.
    pub(crate) fn open_text(&self) -> io::Result<Box<dyn Read>> {
        let file = File::open(&self.path)?;
        Ok(match self.format {
            Format::CsvGzip => {
                Box::new(flate2::read::MultiGzDecoder::new(io::BufReader::new(file)))
            }
            Format::CsvZstd => Box::new(zstd::Decoder::new(file)?),
            Format::Csv | Format::Parquet => Box::new(file),
        })
    }
}

/// Finds the file of `table` in a folder: the one named in `[files]`, else the table's name with
/// any of the endings. `None` when there is none; more than one is a defect.
pub(crate) fn find(
    folder: &Path,
    table: &str,
    named: Option<&str>,
    defects: &mut Defects,
) -> Option<TableFile> {
    if let Some(shown) = named {
        return match TableFile::at(&folder.join(shown), shown) {
            Ok(file) => Some(file),
            Err(problem) => {
                defects.add_problem(shown, problem);
                None
            }
        };
    }
    let present: Vec<TableFile> = ENDINGS
        .iter()
        .map(|(ending, format)| {
            let shown = format!("{table}{ending}");
            TableFile { path: folder.join(&shown), shown, format: *format }
        })
        .filter(|file| fs::symlink_metadata(&file.path).is_ok())
        .collect();
    if let [first, second, ..] = present.as_slice() {
        defects.add_with_hint(
            &first.shown,
            format!("the folder holds {} too", second.shown),
            format!("keep one of them, or name one under [files] in day.toml: {table} = \"…\""),
        );
        return None;
    }
    present.into_iter().next()
}

/// What an input/output error means for a reader of a table.
pub(crate) fn io_problem(error: &io::Error) -> Problem {
    match error.kind() {
        io::ErrorKind::NotFound => Problem::new("there is no such file"),
        io::ErrorKind::PermissionDenied => Problem::new("may not be read: permission denied"),
        io::ErrorKind::IsADirectory => Problem::new("is a folder, not a file"),
        io::ErrorKind::UnexpectedEof => {
            Problem::new("ends too early: the packed data is cut short")
        }
        _ => Problem::new(format!("can't be read: {error}")),
    }
}
