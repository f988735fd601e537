//! Tables as Apache Parquet, with the same columns as the text tables; columns keep their types,
//! and where a writer stored numbers or times as text they are read as text is.

use super::cell::Cell;
use super::findings::{Findings, Problem};
use super::row::{Cells, Column, Holds, Row, match_columns};
use super::table_file::{TableFile, io_problem};
use arrow_array::cast::AsArray;
use arrow_array::types::{Float64Type, Int64Type};
use arrow_array::{
    Array, ArrayRef, BooleanArray, Float64Array, Int64Array, RecordBatch, StringArray,
};
use arrow_cast::cast;
use arrow_schema::{DataType, TimeUnit};
use jiff::Timestamp;
use parquet::arrow::ProjectionMask;
use parquet::arrow::arrow_reader::ParquetRecordBatchReaderBuilder;
use std::fs::File;

/// A column of one batch in one of the few forms that a cell can have.
#[derive(Debug)]
pub(crate) enum StoredColumn {
    /// The file does not have it.
    Absent,
    /// Text.
    Text(StringArray),
    /// Numbers.
    Numbers(Float64Array),
    /// Truth values.
    Flags(BooleanArray),
    /// Times since 1970 in units of which a second has so many.
    Times(Int64Array, i64),
}

impl StoredColumn {
    /// The cell of row `index` of the batch.
    pub(crate) fn cell(&self, index: usize) -> Cell<'_> {
        match self {
            StoredColumn::Text(array) if !array.is_null(index) => match array.value(index) {
                "" => Cell::Blank,
                text => Cell::Text(text.as_bytes()),
            },
            StoredColumn::Numbers(array) if !array.is_null(index) => {
                Cell::Number(array.value(index))
            }
            StoredColumn::Flags(array) if !array.is_null(index) => Cell::Flag(array.value(index)),
            StoredColumn::Times(array, per_second) if !array.is_null(index) => {
                time_cell(array.value(index), *per_second)
            }
            _ => Cell::Blank,
        }
    }
}

/// A stored time, or text that no time can be read from where the calendar does not reach so far.
fn time_cell(value: i64, per_second: i64) -> Cell<'static> {
    let nanoseconds = value.rem_euclid(per_second) * (1_000_000_000 / per_second);
    i32::try_from(nanoseconds)
        .ok()
        .and_then(|nanosecond| Timestamp::new(value.div_euclid(per_second), nanosecond).ok())
        .map_or(Cell::Text(b"a time outside the calendar"), Cell::Time)
}

/// Reads a Parquet table row by row.
pub(crate) fn read(
    file: &TableFile,
    layout: &[Column],
    findings: &mut Findings,
    each: &mut dyn FnMut(&mut Row<'_>),
) {
    let source = match File::open(&file.path) {
        Ok(source) => source,
        Err(error) => return findings.defects.add_problem(&file.shown, io_problem(&error)),
    };
    if let Err(problem) = read_batches(source, file, layout, findings, each) {
        findings.defects.add_problem(&file.shown, problem);
    }
}

fn read_batches(
    source: File,
    file: &TableFile,
    layout: &[Column],
    findings: &mut Findings,
    each: &mut dyn FnMut(&mut Row<'_>),
) -> Result<(), Problem> {
    let builder = ParquetRecordBatchReaderBuilder::try_new(source).map_err(unreadable)?;
    let present: Vec<String> =
        builder.schema().fields().iter().map(|field| field.name().clone()).collect();
    let Some(places) = match_columns(file, &present, layout, findings) else { return Ok(()) };
    let wanted = ProjectionMask::roots(builder.parquet_schema(), places.iter().copied().flatten());
    let batches = builder.with_projection(wanted).build().map_err(unreadable)?;
    let mut number = 0_u32;
    for batch in batches {
        let batch = batch.map_err(unreadable)?;
        let columns = store_columns(&batch, layout)?;
        for index in 0..batch.num_rows() {
            number = number.saturating_add(1);
            let cells = Cells::Typed { columns: &columns, index };
            each(&mut Row::new(cells, number, file, &mut findings.defects));
        }
    }
    Ok(())
}

fn unreadable(error: impl std::fmt::Display) -> Problem {
    Problem::with_hint(
        format!("is not readable Parquet: {error}"),
        "the file may be cut short or damaged",
    )
}

fn store_columns(batch: &RecordBatch, layout: &[Column]) -> Result<Vec<StoredColumn>, Problem> {
    layout
        .iter()
        .map(|column| match batch.column_by_name(column.name) {
            None => Ok(StoredColumn::Absent),
            Some(array) => store(array, column.holds)
                .map_err(|why| Problem::new(format!("column {}: {why}", column.name))),
        })
        .collect()
}

/// Turns a column of any stored type into one of the few forms.
fn store(array: &ArrayRef, holds: Holds) -> Result<StoredColumn, String> {
    let of = array.data_type();
    let cast_to = |to: &DataType| cast(array, to).map_err(|error| error.to_string());
    let is_whole = of.is_integer();
    match of {
        DataType::Utf8 | DataType::LargeUtf8 | DataType::Utf8View | DataType::Dictionary(_, _) => {
            Ok(StoredColumn::Text(cast_to(&DataType::Utf8)?.as_string::<i32>().clone()))
        }
        _ if is_whole && holds == Holds::Text => {
            Ok(StoredColumn::Text(cast_to(&DataType::Utf8)?.as_string::<i32>().clone()))
        }
        DataType::Boolean => Ok(StoredColumn::Flags(array.as_boolean().clone())),
        DataType::Timestamp(unit, _) => {
            let per_second = match unit {
                TimeUnit::Second => 1,
                TimeUnit::Millisecond => 1_000,
                TimeUnit::Microsecond => 1_000_000,
                TimeUnit::Nanosecond => 1_000_000_000,
            };
            let values = cast_to(&DataType::Int64)?;
            Ok(StoredColumn::Times(values.as_primitive::<Int64Type>().clone(), per_second))
        }
        _ if of.is_numeric() => {
            let values = cast_to(&DataType::Float64)?;
            Ok(StoredColumn::Numbers(values.as_primitive::<Float64Type>().clone()))
        }
        other => {
            Err(format!("is stored as {other}, which is no text, number, time or truth value"))
        }
    }
}
