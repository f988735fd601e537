//! Tables as text: RFC 4180 with a header row, UTF-8, lines ended by LF or CRLF.
//!
//! A record may not be longer than [`LONGEST_RECORD`], so that no file, packed ones included, can
//! fill the memory with one line or one open quote.

use super::findings::{Findings, Problem, shown};
use super::row::{Cells, Column, Row, match_columns};
use super::table_file::{TableFile, io_problem};
use csv::ByteRecord;
use std::cell::Cell;
use std::io::{self, Read};
use std::rc::Rc;

/// The longest record that is read, in bytes.
const LONGEST_RECORD: usize = 1 << 20;

/// How much is read at a time.
const BUFFER: usize = 64 << 10;

/// Reads a text table row by row.
pub(crate) fn read(
    file: &TableFile,
    layout: &[Column],
    findings: &mut Findings,
    each: &mut dyn FnMut(&mut Row<'_>),
) {
    let source = match file.open_text() {
        Ok(source) => source,
        Err(error) => return findings.defects.add_problem(&file.shown, io_problem(&error)),
    };
    let mut records = Records::new(source);
    let header = match records.next() {
        Ok(true) => header_names(&records.record),
        Ok(false) => {
            return findings.defects.add_with_hint(
                &file.shown,
                "is empty",
                format!("its first line names the columns: {}", names(layout)),
            );
        }
        Err(problem) => return findings.defects.add_problem(&file.shown, problem),
    };
    let header = match header {
        Ok(header) => header,
        Err(problem) => {
            return findings.defects.add_problem(file.row_place(records.line), problem);
        }
    };
    let Some(fields) = match_columns(file, &header, layout, findings) else { return };
    loop {
        match records.next() {
            Ok(true) => {}
            Ok(false) => return,
            Err(problem) => {
                return findings.defects.add_problem(file.row_place(records.line), problem);
            }
        }
        let cells = Cells::Text { record: &records.record, fields: &fields };
        let mut row = Row::new(cells, records.line, file, &mut findings.defects);
        if records.record.len() == header.len() {
            each(&mut row);
        } else {
            row.reject_whole(Problem::new(format!(
                "has {} cells where the header names {}",
                records.record.len(),
                header.len()
            )));
        }
    }
}

fn names(layout: &[Column]) -> String {
    layout.iter().map(|column| column.name).collect::<Vec<_>>().join(",")
}

/// The header's cells as text.
fn header_names(record: &ByteRecord) -> Result<Vec<String>, Problem> {
    record
        .iter()
        .map(|cell| match std::str::from_utf8(cell) {
            // A byte order mark that the text reader saw only in pieces.
            Ok(name) => Ok(name.trim_start_matches('\u{feff}').to_owned()),
            Err(_) => Err(Problem::with_hint(
                format!("the header {} is not UTF-8 text", shown(&String::from_utf8_lossy(cell))),
                "save the file as UTF-8",
            )),
        })
        .collect()
}

/// The records of a text table with the line on which each begins.
struct Records {
    csv: csv::Reader<Metered>,
    left: Rc<Cell<usize>>,
    record: ByteRecord,
    line: u32,
}

impl Records {
    fn new(source: Box<dyn Read>) -> Records {
        let left = Rc::new(Cell::new(LONGEST_RECORD));
        let metered = Metered { source, left: Rc::clone(&left), last: b'\n', ended: false };
        let csv = csv::ReaderBuilder::new()
            .has_headers(false)
            .flexible(true)
            // CR is taken off by hand: then each record ends with its line, and lines are counted
            // right in files with CRLF.
            .terminator(csv::Terminator::Any(b'\n'))
            .buffer_capacity(BUFFER)
            .from_reader(metered);
        Records { csv, left, record: ByteRecord::new(), line: 1 }
    }

    /// Reads the next record that is not blank; false at the end.
    fn next(&mut self) -> Result<bool, Problem> {
        loop {
            self.left.set(LONGEST_RECORD + BUFFER);
            let begun = self.csv.position().line();
            let read = self.csv.read_byte_record(&mut self.record);
            let next_line = self.csv.position().line();
            let inner = self.record.as_slice().iter().filter(|byte| **byte == b'\n').count() as u64;
            let line = next_line.saturating_sub(1 + inner).max(1);
            self.line = u32::try_from(line).unwrap_or(u32::MAX);
            match read {
                Ok(true) => {}
                Ok(false) => return Ok(false),
                Err(error) => {
                    self.line = u32::try_from(begun).unwrap_or(u32::MAX);
                    return Err(csv_problem(error));
                }
            }
            trim_carriage_return(&mut self.record);
            if self.record.len() > 1 || !self.record.as_slice().is_empty() {
                return Ok(true);
            }
        }
    }
}

/// Takes the CR of a CRLF off the last cell.
fn trim_carriage_return(record: &mut ByteRecord) {
    if record.as_slice().last() != Some(&b'\r') {
        return;
    }
    let last = record.len() - 1;
    let trimmed: ByteRecord = record
        .iter()
        .enumerate()
        .map(|(index, cell)| match cell {
            [head @ .., b'\r'] if index == last => head,
            _ => cell,
        })
        .collect();
    *record = trimmed;
}

fn csv_problem(error: csv::Error) -> Problem {
    match error.into_kind() {
        csv::ErrorKind::Io(error) => match error.get_ref() {
            Some(inner) if inner.is::<TooLong>() => Problem::with_hint(
                format!("the record that begins here is longer than {LONGEST_RECORD} bytes"),
                "is a closing quote missing, or is this no CSV?",
            ),
            _ => io_problem(&error),
        },
        other => Problem::new(format!("is not CSV: {other:?}")),
    }
}

/// A reader that gives at most so many bytes to each record, and ends the last line if the file
/// does not.
struct Metered {
    source: Box<dyn Read>,
    left: Rc<Cell<usize>>,
    last: u8,
    ended: bool,
}

/// The error of a record that is too long.
#[derive(Debug, thiserror::Error)]
#[error("record too long")]
struct TooLong;

impl Read for Metered {
    fn read(&mut self, buffer: &mut [u8]) -> io::Result<usize> {
        let most = buffer.len().min(self.left.get());
        if most == 0 {
            return Err(io::Error::other(TooLong));
        }
        let Some(target) = buffer.get_mut(..most) else { return Ok(0) };
        let count = if self.ended { 0 } else { self.source.read(target)? };
        if let Some(last) = target.get(..count).and_then(<[u8]>::last) {
            self.last = *last;
        } else {
            self.ended = true;
            if self.last != b'\n'
                && let Some(first) = target.first_mut()
            {
                *first = b'\n';
                self.last = b'\n';
                return Ok(1);
            }
        }
        self.left.set(self.left.get() - count);
        Ok(count)
    }
}
