//! Tables and other files from outside, read to their end whatever is wrong in them.
//!
//! What: CSV and Parquet by one layout of columns, each row handed on with its line, and every
//! defect collected with file, line and column.
//!
//! How: [`rows::read_table`] picks the reader by the file's ending; [`row::Row`] reads a cell as
//! what its column holds. Records, files and lists of defects are bounded, so that nothing from
//! outside fills the memory.
//!
//! Sources: RFC 4180 (CSV), RFC 3339 (times), RFC 1952 (gzip), RFC 8878 (Zstandard), Apache Parquet.

mod cell;
mod csv_table;
pub(crate) mod findings;
mod parquet_table;
pub(crate) mod row;
pub(crate) mod rows;
pub(crate) mod table_file;
pub(crate) mod time;
pub(crate) mod whole_file;
