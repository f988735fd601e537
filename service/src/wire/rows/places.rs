//! Sectors, airports, their capacity, and restrictions.

use rimeshift_engine::day::{
    AirportCapacityParts, AirportParts, CapacityParts, RestrictionParts, SectorParts, VolumeParts,
};
use rimeshift_proto::v1;

use super::Receiving;

impl Receiving {
    pub(super) fn sector(&mut self, row: v1::Sector) {
        let path = format!("sectors[{}]", self.parts.sectors.len());
        let volumes = self.volumes(&path, row.volumes);
        self.parts.sectors.push(SectorParts {
            sector: row.sector,
            name: row.title,
            volumes,
            horizontal_nm: row.horizontal_nm,
            no_changes: row.no_changes,
        });
    }

    pub(super) fn restriction(&mut self, row: v1::Restriction) {
        let path = format!("restrictions[{}]", self.parts.restrictions.len());
        let from_s = self.required_time(|| format!("{path}.from"), row.from);
        let until_s = self.required_time(|| format!("{path}.until"), row.until);
        let volumes = self.volumes(&path, row.volumes);
        self.parts.restrictions.push(RestrictionParts {
            restriction: row.restriction,
            volumes,
            from_s,
            until_s,
            levels_allowed_ft: row.levels_allowed_ft,
            departure: row.departure,
            destination: row.destination,
        });
    }

    fn volumes(&mut self, path: &str, wire: Vec<v1::Volume>) -> Vec<VolumeParts> {
        let mut volumes = Vec::with_capacity(wire.len());
        for (v, volume) in wire.into_iter().enumerate() {
            let mut rings = Vec::with_capacity(volume.rings.len());
            for (r, ring) in volume.rings.into_iter().enumerate() {
                if ring.lon_deg.len() != ring.lat_deg.len() {
                    self.fields.push(
                        || format!("{path}.volumes[{v}].rings[{r}]"),
                        format!(
                            "has {} longitudes and {} latitudes",
                            ring.lon_deg.len(),
                            ring.lat_deg.len()
                        ),
                        "give one of each a position",
                    );
                }
                rings.push(
                    ring.lon_deg.into_iter().zip(ring.lat_deg).map(<[f64; 2]>::from).collect(),
                );
            }
            volumes.push(VolumeParts {
                rings,
                floor_ft: volume.floor_ft,
                ceiling_ft: volume.ceiling_ft,
            });
        }
        volumes
    }

    pub(super) fn capacity(&mut self, row: v1::Capacity) {
        let i = self.parts.capacities.len();
        let from_s = self.required_time(|| format!("capacities[{i}].from"), row.from);
        let until_s = self.required_time(|| format!("capacities[{i}].until"), row.until);
        self.parts.capacities.push(CapacityParts {
            sector: row.sector,
            from_s,
            until_s,
            entries_per_hour: row.entries_per_hour,
            occupancy_limit: row.occupancy_limit,
            occupancy_lasting: row.occupancy_lasting,
            level_changes_per_hour: row.level_changes_per_hour,
        });
    }

    pub(super) fn airport(&mut self, row: v1::Airport) {
        let i = self.parts.airports.len();
        let lon_deg = self.required(|| format!("airports[{i}].lon_deg"), row.lon_deg);
        let lat_deg = self.required(|| format!("airports[{i}].lat_deg"), row.lat_deg);
        self.parts.airports.push(AirportParts {
            airport: row.airport,
            lon_deg,
            lat_deg,
            name: row.title,
        });
    }

    pub(super) fn airport_capacity(&mut self, row: v1::AirportCapacity) {
        let i = self.parts.airport_capacities.len();
        let from_s = self.required_time(|| format!("airport_capacities[{i}].from"), row.from);
        let until_s = self.required_time(|| format!("airport_capacities[{i}].until"), row.until);
        self.parts.airport_capacities.push(AirportCapacityParts {
            airport: row.airport,
            from_s,
            until_s,
            arrivals_per_hour: row.arrivals_per_hour,
            departures_per_hour: row.departures_per_hour,
        });
    }
}
