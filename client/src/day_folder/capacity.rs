//! `capacity` and `airport_capacity`: when sectors are open, and the limits of sectors and airports.

use crate::tables::findings::Findings;
use crate::tables::row::Column;
use crate::tables::rows::{Rows, wire_time};
use crate::tables::table_file::TableFile;
use rimeshift_proto::v1::{AirportCapacity, Capacity};

const FROM: Column = Column::value(1, "from");
const UNTIL: Column = Column::value(2, "until");

const SECTOR: Column = Column::text(0, "sector");
const ENTRIES: Column = Column::value(3, "entries_per_hour").optional();
const OCCUPANCY: Column = Column::value(4, "occupancy_limit").optional();
const LASTING: Column = Column::value(5, "occupancy_lasting").optional();
const LEVEL_CHANGES: Column = Column::value(6, "level_changes_per_hour").optional();

const AIRPORT: Column = Column::text(0, "airport");
const ARRIVALS: Column = Column::value(3, "arrivals_per_hour").optional();
const DEPARTURES: Column = Column::value(4, "departures_per_hour").optional();

/// Reads `capacity`.
pub(super) fn read_sectors(file: Option<TableFile>, findings: &mut Findings) -> Rows<Capacity> {
    let layout = [SECTOR, FROM, UNTIL, ENTRIES, OCCUPANCY, LASTING, LEVEL_CHANGES];
    Rows::read(file, &layout, findings, |row| Capacity {
        sector: row.text(SECTOR).to_owned(),
        from: Some(wire_time(row.time(FROM))),
        until: Some(wire_time(row.time(UNTIL))),
        entries_per_hour: row.optional_number(ENTRIES),
        occupancy_limit: row.optional_number(OCCUPANCY),
        occupancy_lasting: row.optional_number(LASTING),
        level_changes_per_hour: row.optional_number(LEVEL_CHANGES),
    })
}

/// Reads `airport_capacity`.
pub(super) fn read_airports(
    file: Option<TableFile>,
    findings: &mut Findings,
) -> Rows<AirportCapacity> {
    let layout = [AIRPORT, FROM, UNTIL, ARRIVALS, DEPARTURES];
    Rows::read(file, &layout, findings, |row| AirportCapacity {
        airport: row.text(AIRPORT).to_owned(),
        from: Some(wire_time(row.time(FROM))),
        until: Some(wire_time(row.time(UNTIL))),
        arrivals_per_hour: row.optional_number(ARRIVALS),
        departures_per_hour: row.optional_number(DEPARTURES),
    })
}
