//! A text report: lines and tables, laid out for a terminal or plainly.

use super::cautions;
use crate::screen::Layout;
use comfy_table::presets::{NOTHING, UTF8_HORIZONTAL_ONLY};
use comfy_table::{CellAlignment, ContentArrangement, Table};

/// A width that lines are broken at.
const TEXT_WIDTH: usize = 100;

/// The most rows of a table in a text report; JSON and the plan folder hold all of them.
pub(crate) const MOST_ROWS: usize = 20;

/// A text report while it is written.
#[derive(Debug)]
pub(crate) struct Sheet {
    layout: Layout,
    text: String,
}

impl Sheet {
    /// A report that begins with its answer.
    pub(crate) fn answer(layout: Layout, answer: &str) -> Sheet {
        let text = match layout {
            Layout::Terminal { bold: true } => format!("\u{1b}[1m{answer}\u{1b}[0m\n"),
            _ => format!("{answer}\n"),
        };
        Sheet { layout, text }
    }

    /// A line, or a paragraph broken into lines.
    pub(crate) fn line(&mut self, line: &str) {
        let mut length = 0;
        for (index, word) in line.split(' ').enumerate() {
            let width = word.chars().count();
            if index > 0 && length + 1 + width > TEXT_WIDTH {
                self.text.push('\n');
                length = 0;
            } else if index > 0 {
                self.text.push(' ');
                length += 1;
            }
            self.text.push_str(word);
            length += width;
        }
        self.text.push('\n');
    }

    /// A heading over a part of the report.
    pub(crate) fn heading(&mut self, heading: &str) {
        self.text.push('\n');
        self.text.push_str(heading);
        self.text.push('\n');
    }

    /// A table under a heading, without one where it has no rows; `more` rows are only counted.
    pub(crate) fn table<const N: usize>(
        &mut self,
        heading: &str,
        columns: [Column; N],
        rows: Vec<[String; N]>,
        more: usize,
    ) {
        if rows.is_empty() {
            return;
        }
        self.heading(heading);
        let mut table = Table::new();
        match self.layout {
            Layout::Terminal { .. } => {
                table.load_style(UTF8_HORIZONTAL_ONLY);
                table.set_content_arrangement(ContentArrangement::Dynamic);
            }
            Layout::Plain => {
                table.load_style(NOTHING);
                table.force_no_tty();
            }
        }
        table.set_header(columns.iter().map(|column| column.name));
        for row in rows {
            table.add_row(row);
        }
        for (index, column) in columns.iter().enumerate() {
            if column.right
                && let Some(column) = table.column_mut(index)
            {
                column.set_cell_alignment(CellAlignment::Right);
            }
        }
        for line in table.lines() {
            self.text.push_str(line.trim_end());
            self.text.push('\n');
        }
        if more > 0 {
            self.line(&format!("… and {more} more; --json lists all"));
        }
    }

    /// The report, closed by what it is not.
    pub(crate) fn finish(mut self) -> String {
        self.text.push('\n');
        self.line(cautions::FULL);
        self.text
    }
}

/// A column of a table.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Column {
    name: &'static str,
    right: bool,
}

/// A column of words.
pub(crate) const fn words(name: &'static str) -> Column {
    Column { name, right: false }
}

/// A column of numbers.
pub(crate) const fn numbers(name: &'static str) -> Column {
    Column { name, right: true }
}

/// The first rows that a text report shows, and how many it leaves out.
pub(crate) fn first_rows<T, R>(all: &[T], row: impl Fn(&T) -> R) -> (Vec<R>, usize) {
    let rows: Vec<R> = all.iter().take(MOST_ROWS).map(row).collect();
    let more = all.len() - rows.len();
    (rows, more)
}
