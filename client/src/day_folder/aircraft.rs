//! `aircraft` and `fuel`: the user's own aircraft classes and cruise fuel.

use crate::tables::findings::{Findings, Problem};
use crate::tables::row::Column;
use crate::tables::rows::{Rows, feet};
use crate::tables::table_file::TableFile;
use rimeshift_proto::v1::fuel_row::Flow;
use rimeshift_proto::v1::{AircraftClass, FuelRow};

const AIRCRAFT: Column = Column::text(0, "aircraft");

const CEILING: Column = Column::value(1, "ceiling_fl").optional();
const CLIMB: Column = Column::value(2, "climb_fpm").optional();
const DESCENT: Column = Column::value(3, "descent_fpm").optional();
const CONTRAIL_FACTOR: Column = Column::value(4, "contrail_factor").optional();

const LEVEL: Column = Column::value(1, "level_fl");
const PER_MINUTE: Column = Column::value(2, "kg_per_min").optional();
const PER_MILE: Column = Column::value(3, "kg_per_nm").optional();
const MASS: Column = Column::value(4, "mass_kg").optional();

/// Reads `aircraft`.
pub(super) fn read_classes(
    file: Option<TableFile>,
    findings: &mut Findings,
) -> Rows<AircraftClass> {
    let layout = [AIRCRAFT, CEILING, CLIMB, DESCENT, CONTRAIL_FACTOR];
    Rows::read(file, &layout, findings, |row| AircraftClass {
        aircraft: row.text(AIRCRAFT).to_owned(),
        ceiling_ft: row.optional_number(CEILING).map(feet),
        climb_fpm: row.optional_number(CLIMB),
        descent_fpm: row.optional_number(DESCENT),
        contrail_factor: row.optional_number(CONTRAIL_FACTOR),
    })
}

/// Reads `fuel`.
pub(super) fn read_fuel(file: Option<TableFile>, findings: &mut Findings) -> Rows<FuelRow> {
    Rows::read(file, &[AIRCRAFT, LEVEL, PER_MINUTE, PER_MILE, MASS], findings, |row| {
        let aircraft = row.text(AIRCRAFT).to_owned();
        let level_ft = Some(feet(row.number_of(LEVEL)));
        let flow = match (row.optional_number(PER_MINUTE), row.optional_number(PER_MILE)) {
            (Some(flow), None) => Some(Flow::KgPerMin(flow)),
            (None, Some(flow)) => Some(Flow::KgPerNm(flow)),
            (None, None) => {
                row.reject_whole(Problem::new("has neither kg_per_min nor kg_per_nm"));
                None
            }
            (Some(_), Some(_)) => {
                row.reject_whole(Problem::with_hint(
                    "has both kg_per_min and kg_per_nm",
                    "leave one of them blank",
                ));
                None
            }
        };
        FuelRow { aircraft, level_ft, flow, mass_kg: row.optional_number(MASS) }
    })
}
