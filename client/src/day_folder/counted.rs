//! `background` and `flows`: traffic known only as counts.

use crate::tables::findings::Findings;
use crate::tables::row::Column;
use crate::tables::rows::{Rows, feet, wire_time};
use crate::tables::table_file::TableFile;
use rimeshift_proto::v1::{Background, Flow};

const SECTOR: Column = Column::text(0, "sector");
const FROM: Column = Column::value(1, "from");
const UNTIL: Column = Column::value(2, "until");
const AIRCRAFT: Column = Column::value(3, "aircraft");
const LEVEL: Column = Column::value(4, "level_fl").optional();
const ENTRIES: Column = Column::value(5, "entries").optional();

const FROM_SECTOR: Column = Column::text(0, "from_sector");
const FROM_LEVEL: Column = Column::value(1, "from_level_fl");
const TO_SECTOR: Column = Column::text(2, "to_sector");
const TO_LEVEL: Column = Column::value(3, "to_level_fl");
const FLOW_FROM: Column = Column::value(4, "from");
const FLOW_UNTIL: Column = Column::value(5, "until");
const FLOW_AIRCRAFT: Column = Column::value(6, "aircraft");

/// Reads `background`.
pub(super) fn read_background(
    file: Option<TableFile>,
    findings: &mut Findings,
) -> Rows<Background> {
    let layout = [SECTOR, FROM, UNTIL, AIRCRAFT, LEVEL, ENTRIES];
    Rows::read(file, &layout, findings, |row| Background {
        sector: row.text(SECTOR).to_owned(),
        from: Some(wire_time(row.time(FROM))),
        until: Some(wire_time(row.time(UNTIL))),
        aircraft: Some(row.number_of(AIRCRAFT)),
        level_ft: row.optional_number(LEVEL).map(feet),
        entries: row.optional_number(ENTRIES),
    })
}

/// Reads `flows`.
pub(super) fn read_flows(file: Option<TableFile>, findings: &mut Findings) -> Rows<Flow> {
    let layout =
        [FROM_SECTOR, FROM_LEVEL, TO_SECTOR, TO_LEVEL, FLOW_FROM, FLOW_UNTIL, FLOW_AIRCRAFT];
    Rows::read(file, &layout, findings, |row| Flow {
        from_sector: row.text(FROM_SECTOR).to_owned(),
        from_level_ft: Some(feet(row.number_of(FROM_LEVEL))),
        to_sector: row.text(TO_SECTOR).to_owned(),
        to_level_ft: Some(feet(row.number_of(TO_LEVEL))),
        from: Some(wire_time(row.time(FLOW_FROM))),
        until: Some(wire_time(row.time(FLOW_UNTIL))),
        aircraft: Some(row.number_of(FLOW_AIRCRAFT)),
    })
}
