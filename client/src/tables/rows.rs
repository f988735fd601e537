//! The rows of a day as they are sent, each with the line that it was read from.

use super::findings::Findings;
use super::row::{Column, Row};
use super::table_file::{Format, TableFile};
use super::{csv_table, parquet_table};
use jiff::Timestamp;

/// Rows of one table in the form in which they are sent, with the place of each in the file.
#[derive(Debug)]
pub(crate) struct Rows<T> {
    /// The rows in file order.
    pub(crate) rows: Vec<T>,
    /// Line (row, in Parquet) of each.
    pub(crate) lines: Vec<u32>,
    /// The file; `None` when the day has no such table.
    pub(crate) file: Option<TableFile>,
}

impl<T> Rows<T> {
    /// Reads a table whose rows stand for themselves. `row_of` may leave an unsound row's value
    /// meaningless: it is dropped.
    pub(crate) fn read(
        file: Option<TableFile>,
        layout: &[Column],
        findings: &mut Findings,
        mut row_of: impl FnMut(&mut Row<'_>) -> T,
    ) -> Rows<T> {
        let (mut rows, mut lines) = (Vec::new(), Vec::new());
        if let Some(file) = &file {
            read_table(file, layout, findings, &mut |row| {
                let value = row_of(row);
                if row.is_sound() {
                    rows.push(value);
                    lines.push(row.number());
                }
            });
        }
        Rows { rows, lines, file }
    }

    /// How an error names row `index`, or a cell of it.
    pub(crate) fn place(&self, index: usize, column: Option<&str>) -> Option<String> {
        let file = self.file.as_ref()?;
        let line = *self.lines.get(index)?;
        Some(match column {
            Some(column) => file.cell_place(line, column),
            None => file.row_place(line),
        })
    }
}

/// Reads a table of any format row by row.
pub(crate) fn read_table(
    file: &TableFile,
    layout: &[Column],
    findings: &mut Findings,
    each: &mut dyn FnMut(&mut Row<'_>),
) {
    debug_assert!(layout.iter().enumerate().all(|(index, column)| column.index == index));
    match file.format {
        Format::Parquet => parquet_table::read(file, layout, findings, each),
        _ => csv_table::read(file, layout, findings, each),
    }
}

/// A time as it is sent.
pub(crate) fn wire_time(time: Timestamp) -> prost_types::Timestamp {
    prost_types::Timestamp { seconds: time.as_second(), nanos: time.subsec_nanosecond() }
        .normalized()
}

/// Feet of a flight level.
pub(crate) fn feet(level_fl: f64) -> f64 {
    level_fl * 100.0
}
