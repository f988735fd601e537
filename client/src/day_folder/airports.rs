//! `airports`: those whose arrivals and departures are counted.

use crate::tables::findings::Findings;
use crate::tables::row::Column;
use crate::tables::rows::Rows;
use crate::tables::table_file::TableFile;
use rimeshift_proto::v1::Airport;

const AIRPORT: Column = Column::text(0, "airport");
const LON: Column = Column::value(1, "lon");
const LAT: Column = Column::value(2, "lat");
const NAME: Column = Column::text(3, "name").optional();

/// Reads `airports`.
pub(super) fn read(file: Option<TableFile>, findings: &mut Findings) -> Rows<Airport> {
    Rows::read(file, &[AIRPORT, LON, LAT, NAME], findings, |row| Airport {
        airport: row.text(AIRPORT).to_owned(),
        lon_deg: Some(row.number_of(LON)),
        lat_deg: Some(row.number_of(LAT)),
        title: row.optional_text(NAME).map(str::to_owned),
    })
}
