//! `decisions`: what was decided by hand about proposals and flights.

use crate::tables::findings::{Findings, Problem, shown};
use crate::tables::row::{Column, Row};
use crate::tables::rows::Rows;
use crate::tables::table_file::TableFile;
use rimeshift_proto::v1::hand_decision::About;
use rimeshift_proto::v1::{HandDecision, Must};

const PROPOSAL: Column = Column::text(0, "proposal").optional();
const FLIGHT: Column = Column::text(1, "flight").optional();
const MUST: Column = Column::text(2, "must");
const OPTION: Column = Column::value(3, "option").optional();

/// Reads `decisions`.
pub(super) fn read(file: Option<TableFile>, findings: &mut Findings) -> Rows<HandDecision> {
    Rows::read(file, &[PROPOSAL, FLIGHT, MUST, OPTION], findings, |row| HandDecision {
        about: about(row),
        must: must(row).into(),
        option: row.optional_ordinal(OPTION),
    })
}

fn about(row: &mut Row<'_>) -> Option<About> {
    match (row.optional_text(PROPOSAL), row.optional_text(FLIGHT)) {
        (Some(proposal), None) => Some(About::Proposal(proposal.to_owned())),
        (None, Some(flight)) => Some(About::Flight(flight.to_owned())),
        (None, None) => {
            if row.is_sound() {
                row.reject_whole(Problem::new("names neither a proposal nor a flight"));
            }
            None
        }
        (Some(_), Some(_)) => {
            row.reject_whole(Problem::with_hint(
                "names both a proposal and a flight",
                "leave one of them blank: grant and refuse are about proposals, keep about flights",
            ));
            None
        }
    }
}

fn must(row: &mut Row<'_>) -> Must {
    match row.text(MUST) {
        "grant" => Must::Grant,
        "refuse" => Must::Refuse,
        "keep" => Must::Keep,
        // A blank is a defect already.
        "" => Must::Unspecified,
        other => {
            let problem = format!("{} is not grant, refuse or keep", shown(other));
            row.reject(MUST, Problem::new(problem));
            Must::Unspecified
        }
    }
}
