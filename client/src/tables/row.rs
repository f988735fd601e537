//! One row of a table, whatever the format: each cell is read as what its column holds, and what
//! can't be is a defect with file, line and column.

use super::cell::Cell;
use super::findings::{Defects, Problem};
use super::parquet_table::StoredColumn;
use super::table_file::TableFile;
use csv::ByteRecord;
use jiff::Timestamp;

/// What a column stores, as far as a reader of typed files must know.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Holds {
    /// Names, which some writers store as numbers.
    Text,
    /// Numbers, times or truth values.
    Value,
}

/// Whether a table can be without a column.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Need {
    /// A table without it is an error, and so is a blank cell.
    Required,
    /// The column may be missing and its cells blank.
    Optional,
}

/// One column of a table's layout.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Column {
    /// Its place in the layout.
    pub(crate) index: usize,
    pub(crate) name: &'static str,
    pub(crate) holds: Holds,
    pub(crate) need: Need,
}

impl Column {
    /// A column of names.
    pub(crate) const fn text(index: usize, name: &'static str) -> Column {
        Column { index, name, holds: Holds::Text, need: Need::Required }
    }

    /// A column of numbers, times or truth values.
    pub(crate) const fn value(index: usize, name: &'static str) -> Column {
        Column { index, name, holds: Holds::Value, need: Need::Required }
    }

    /// The same column, which may be missing.
    pub(crate) const fn optional(self) -> Column {
        Column { need: Need::Optional, ..self }
    }
}

/// Where a row's cells come from.
#[derive(Debug, Clone, Copy)]
pub(crate) enum Cells<'a> {
    /// A record of a text table, and the field of each column in it.
    Text { record: &'a ByteRecord, fields: &'a [Option<usize>] },
    /// A row of a batch of a typed table, column by column.
    Typed { columns: &'a [StoredColumn], index: usize },
}

/// One row of a table.
#[derive(Debug)]
pub(crate) struct Row<'a> {
    cells: Cells<'a>,
    /// Line of the file, or row from 1 where there are no lines.
    number: u32,
    file: &'a TableFile,
    defects: &'a mut Defects,
    sound: bool,
}

impl<'a> Row<'a> {
    pub(crate) fn new(
        cells: Cells<'a>,
        number: u32,
        file: &'a TableFile,
        defects: &'a mut Defects,
    ) -> Row<'a> {
        Row { cells, number, file, defects, sound: true }
    }

    /// Line of the file, or row from 1 where there are no lines.
    pub(crate) fn number(&self) -> u32 {
        self.number
    }

    /// Whether nothing that was read so far is wrong. The values of an unsound row mean nothing.
    pub(crate) fn is_sound(&self) -> bool {
        self.sound
    }

    /// Adds a defect of one of the row's cells.
    pub(crate) fn reject(&mut self, column: Column, problem: Problem) {
        self.sound = false;
        self.defects.add_problem(self.file.cell_place(self.number, column.name), problem);
    }

    /// Adds a defect of the row as a whole.
    pub(crate) fn reject_whole(&mut self, problem: Problem) {
        self.sound = false;
        self.defects.add_problem(self.file.row_place(self.number), problem);
    }

    /// Text that must be there; empty where it is not.
    pub(crate) fn text(&mut self, column: Column) -> &'a str {
        let value = self.read(column, Cell::text);
        self.demand(column, value).unwrap_or_default()
    }

    /// Text that may be blank.
    pub(crate) fn optional_text(&mut self, column: Column) -> Option<&'a str> {
        self.read(column, Cell::text).flatten()
    }

    /// A finite number that must be there; 0 where it is not.
    pub(crate) fn number_of(&mut self, column: Column) -> f64 {
        let value = self.read(column, Cell::number);
        self.demand(column, value).unwrap_or_default()
    }

    /// A finite number that may be blank.
    pub(crate) fn optional_number(&mut self, column: Column) -> Option<f64> {
        self.read(column, Cell::number).flatten()
    }

    /// A whole number from 1 that may be blank.
    pub(crate) fn optional_ordinal(&mut self, column: Column) -> Option<u32> {
        self.read(column, Cell::ordinal).flatten()
    }

    /// A time that must be there; the epoch where it is not.
    pub(crate) fn time(&mut self, column: Column) -> Timestamp {
        let value = self.read(column, Cell::time);
        self.demand(column, value).unwrap_or_default()
    }

    /// A time that may be blank.
    pub(crate) fn optional_time(&mut self, column: Column) -> Option<Timestamp> {
        self.read(column, Cell::time).flatten()
    }

    /// A truth value that may be blank.
    pub(crate) fn optional_flag(&mut self, column: Column) -> Option<bool> {
        self.read(column, Cell::flag).flatten()
    }

    /// Reads a cell; `None` where it can't be read, which is then a defect.
    fn read<T>(
        &mut self,
        column: Column,
        as_kind: impl FnOnce(Cell<'a>) -> Result<Option<T>, Problem>,
    ) -> Option<Option<T>> {
        match as_kind(self.cell(column)) {
            Ok(value) => Some(value),
            Err(problem) => {
                self.reject(column, problem);
                None
            }
        }
    }

    /// Adds a defect where a cell that was read is blank.
    fn demand<T>(&mut self, column: Column, value: Option<Option<T>>) -> Option<T> {
        if let Some(None) = value {
            self.reject(column, Problem::new("is blank, and a value is required"));
        }
        value.flatten()
    }

    fn cell(&self, column: Column) -> Cell<'a> {
        match self.cells {
            Cells::Text { record, fields } => {
                let field = fields.get(column.index).copied().flatten();
                match field.and_then(|field| record.get(field)) {
                    None | Some(b"") => Cell::Blank,
                    Some(bytes) => Cell::Text(bytes),
                }
            }
            Cells::Typed { columns, index } => {
                columns.get(column.index).map_or(Cell::Blank, |stored| stored.cell(index))
            }
        }
    }
}

/// Matches the columns that a file has with those of a layout: for each column of the layout, its
/// place in the file. Missing required columns and repeated ones are defects, unknown ones one
/// warning. `None` when the file can't be read by this layout.
pub(crate) fn match_columns(
    file: &TableFile,
    present: &[String],
    layout: &[Column],
    findings: &mut super::findings::Findings,
) -> Option<Vec<Option<usize>>> {
    let known = |name: &str| layout.iter().any(|column| column.name == name);
    let unknown: Vec<&str> =
        present.iter().map(String::as_str).filter(|name| !known(name)).collect();
    let mut usable = true;
    let mut places = Vec::with_capacity(layout.len());
    for column in layout {
        let mut at = present.iter().enumerate().filter(|(_, name)| *name == column.name);
        let first = at.next().map(|(place, _)| place);
        if at.next().is_some() {
            usable = false;
            findings.defects.add(&file.shown, format!("has the column {} twice", column.name));
        }
        if first.is_none() && column.need == Need::Required {
            usable = false;
            let problem = format!("has no column {}", column.name);
            match super::findings::nearest(column.name, unknown.iter().copied()) {
                Some(near) => findings.defects.add_with_hint(
                    &file.shown,
                    problem,
                    format!("was {near:?} meant to be {}?", column.name),
                ),
                None => findings.defects.add(&file.shown, problem),
            }
        }
        places.push(first);
    }
    if !unknown.is_empty() {
        let names = unknown.join(", ");
        findings.warnings.push(format!("{}: columns that are not used: {names}", file.shown));
    }
    usable.then_some(places)
}
