//! `proposals`: rows with the same `proposal` and `option` are the stretches of one option.
//!
//! What a row says of its option is gathered: the figures avoided and the extra fuel add up over
//! its rows, `max_extra_fuel_kg` and `priority` stand for the option and may not differ.

use crate::tables::findings::{Findings, Problem, shown};
use crate::tables::row::{Column, Row};
use crate::tables::rows::{feet, read_table, wire_time};
use crate::tables::table_file::TableFile;
use rimeshift_proto::v1::{OptionFigures, Proposal, ProposalOption, Stretch};
use std::collections::{BTreeMap, HashMap};

const PROPOSAL: Column = Column::text(0, "proposal");
const FLIGHT: Column = Column::text(1, "flight");
const LEVEL: Column = Column::value(2, "level_fl");
const FROM: Column = Column::value(3, "from_time").optional();
const UNTIL: Column = Column::value(4, "until_time").optional();
const OPTION: Column = Column::value(5, "option").optional();
const CONTRAIL_KM: Column = Column::value(6, "contrail_km_avoided").optional();
const FORCING: Column = Column::value(7, "ef_avoided_j").optional();
const FUEL: Column = Column::value(8, "extra_fuel_kg").optional();
const MOST_FUEL: Column = Column::value(9, "max_extra_fuel_kg").optional();
const PRIORITY: Column = Column::value(10, "priority").optional();

const LAYOUT: [Column; 11] =
    [PROPOSAL, FLIGHT, LEVEL, FROM, UNTIL, OPTION, CONTRAIL_KM, FORCING, FUEL, MOST_FUEL, PRIORITY];

/// The proposals of a day, with the lines of their stretches.
#[derive(Debug, Default)]
pub(super) struct Proposals {
    pub(super) rows: Vec<Proposal>,
    /// For each proposal and option, the line of each stretch.
    lines: Vec<Vec<Vec<u32>>>,
    pub(super) file: Option<TableFile>,
}

impl Proposals {
    /// How an error names a stretch, or a cell of it.
    pub(super) fn place(
        &self,
        proposal: usize,
        option: usize,
        stretch: usize,
        column: Option<&str>,
    ) -> Option<String> {
        let file = self.file.as_ref()?;
        let line = *self.lines.get(proposal)?.get(option)?.get(stretch)?;
        Some(match column {
            Some(column) => file.cell_place(line, column),
            None => file.row_place(line),
        })
    }
}

/// A proposal while its rows come in.
struct Draft {
    proposal: String,
    flight: String,
    first_line: u32,
    options: BTreeMap<u32, OptionDraft>,
}

#[derive(Default)]
struct OptionDraft {
    stretches: Vec<Stretch>,
    lines: Vec<u32>,
    figures: OptionFigures,
}

/// Reads `proposals`.
pub(super) fn read(file: Option<TableFile>, findings: &mut Findings) -> Proposals {
    let Some(file) = file else { return Proposals::default() };
    let mut drafts: Vec<Draft> = Vec::new();
    let mut by_name: HashMap<String, usize> = HashMap::new();
    let defects_before = findings.defects.count();
    read_table(&file, &LAYOUT, findings, &mut |row| {
        let name = row.text(PROPOSAL);
        let index = by_name.get(name).copied().unwrap_or(drafts.len());
        let flight = row.text(FLIGHT);
        if index == drafts.len() {
            by_name.insert(name.to_owned(), index);
            drafts.push(Draft {
                proposal: name.to_owned(),
                flight: flight.to_owned(),
                first_line: row.number(),
                options: BTreeMap::new(),
            });
        }
        if let Some(draft) = drafts.get_mut(index) {
            add_row(draft, flight, row);
        }
    });
    // Rows that could not be read may have held the option that is missed.
    if findings.defects.count() == defects_before {
        for draft in drafts.iter().filter(|draft| !draft.options.contains_key(&1)) {
            findings.defects.add_with_hint(
                file.row_place(draft.first_line),
                format!("proposal {} has no option 1", shown(&draft.proposal)),
                "option 1 is the change as asked; number the alternatives from 2",
            );
        }
    }
    finish(drafts, file)
}

/// Adds one row to its proposal.
fn add_row(draft: &mut Draft, flight: &str, row: &mut Row<'_>) {
    if !flight.is_empty() && flight != draft.flight && !draft.flight.is_empty() {
        row.reject(
            FLIGHT,
            Problem::with_hint(
                format!(
                    "proposal {} names {} here and {} before",
                    shown(&draft.proposal),
                    shown(flight),
                    shown(&draft.flight)
                ),
                "a proposal is about one flight; give the other its own",
            ),
        );
    }
    let stretch = Stretch {
        level_ft: feet(row.number_of(LEVEL)),
        from: row.optional_time(FROM).map(wire_time),
        until: row.optional_time(UNTIL).map(wire_time),
    };
    let number = row.optional_ordinal(OPTION).unwrap_or(1);
    let option = draft.options.entry(number).or_default();
    let figures = &mut option.figures;
    add_up(&mut figures.contrail_km_avoided, row.optional_number(CONTRAIL_KM));
    add_up(&mut figures.ef_avoided_j, row.optional_number(FORCING));
    add_up(&mut figures.extra_fuel_kg, row.optional_number(FUEL));
    agree(&mut figures.max_extra_fuel_kg, MOST_FUEL, row);
    agree(&mut figures.priority, PRIORITY, row);
    option.stretches.push(stretch);
    option.lines.push(row.number());
}

/// Adds a figure of one stretch to that of the option; blanks add nothing.
fn add_up(total: &mut Option<f64>, of_row: Option<f64>) {
    if let Some(of_row) = of_row {
        *total = Some(total.unwrap_or(0.0) + of_row);
    }
}

/// Takes a figure that stands for the whole option; blanks take that of the other rows.
fn agree(of_option: &mut Option<f64>, column: Column, row: &mut Row<'_>) {
    let Some(of_row) = row.optional_number(column) else { return };
    match *of_option {
        Some(before) if before.total_cmp(&of_row).is_ne() => row.reject(
            column,
            Problem::with_hint(
                format!("is {of_row} here and {before} in another row of the same option"),
                "it stands for the whole option: give it once, or the same in every row",
            ),
        ),
        _ => *of_option = Some(of_row),
    }
}

fn finish(drafts: Vec<Draft>, file: TableFile) -> Proposals {
    let (mut rows, mut lines) = (Vec::new(), Vec::new());
    for draft in drafts {
        let mut options = Vec::new();
        let mut option_lines = Vec::new();
        for (option, drafted) in draft.options {
            let figures = Some(drafted.figures);
            options.push(ProposalOption { option, stretches: drafted.stretches, figures });
            option_lines.push(drafted.lines);
        }
        rows.push(Proposal { proposal: draft.proposal, flight: draft.flight, options });
        lines.push(option_lines);
    }
    Proposals { rows, lines, file: Some(file) }
}
