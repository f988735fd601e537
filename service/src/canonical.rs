//! The hash of a day in a canonical form: the same for the same day, in whatever order its rows
//! came and whichever program sent them.
//!
//! The form: the tables of a built day in one fixed order, each sorted by name as the day keeps
//! them, volumes of a sector by their own bytes; every text and list led by its length (u64,
//! little-endian), every number as an IEEE 754 double (little-endian, -0 as 0), every optional
//! value led by a byte 0 or 1. The policy belongs to it, key by key, so a default given outright
//! changes nothing.

use std::fmt::Write as _;

use rimeshift_engine::day::{
    Day, Flight, FuelFlow, FuelTable, KEYS, Period, PolicyValue, Proposal, Sector, Volume,
};
use sha2::{Digest, Sha256};

/// Names the form, so that a change of it changes every hash.
const FORM: &str = "rimeshift day 1";

/// SHA-256 of the day's canonical form, 64 lower-case hexadecimal digits.
pub(crate) fn day_sha256(day: &Day) -> String {
    let mut form = Form(Sha256::new());
    form.text(FORM);
    for part in [day.date.year, i32::from(day.date.month), i32::from(day.date.day)] {
        form.number(f64::from(part));
    }
    form.text(&day.region);
    for key in KEYS {
        form.text(key.name);
        form.policy_value(&key.get(&day.policy));
    }
    form.list(day.sectors.as_slice(), Form::sector);
    form.list(day.airports.as_slice(), |form, airport| {
        form.text(&airport.code);
        form.optional_text(airport.title.as_deref());
        form.numbers(&[airport.lon_deg, airport.lat_deg]);
        form.periods(&airport.periods, |l| vec![l.arrivals_per_hour, l.departures_per_hour]);
    });
    form.list(day.classes.as_slice(), |form, class| {
        form.text(&class.code);
        form.optional(class.ceiling_ft);
        form.numbers(&[class.climb_fpm, class.descent_fpm, class.contrail_factor]);
    });
    form.fuel(&day.fuel);
    form.list(day.flights.as_slice(), Form::flight);
    form.list(day.proposals.as_slice(), |form, proposal| form.proposal(day, proposal));
    let mut hex = String::with_capacity(64);
    for byte in form.0.finalize() {
        // Writing to a string can't fail.
        let _ = write!(hex, "{byte:02x}");
    }
    hex
}

struct Form(Sha256);

impl Form {
    fn count(&mut self, n: usize) {
        self.0.update((n as u64).to_le_bytes());
    }

    fn flag(&mut self, flag: bool) {
        self.0.update([u8::from(flag)]);
    }

    fn text(&mut self, text: &str) {
        self.count(text.len());
        self.0.update(text.as_bytes());
    }

    fn optional_text(&mut self, text: Option<&str>) {
        self.flag(text.is_some());
        self.text(text.unwrap_or_default());
    }

    fn number(&mut self, number: f64) {
        // Adding 0 turns -0 into 0.
        self.0.update((number + 0.0).to_le_bytes());
    }

    fn numbers(&mut self, numbers: &[f64]) {
        numbers.iter().for_each(|&n| self.number(n));
    }

    fn optional(&mut self, number: Option<f64>) {
        self.flag(number.is_some());
        self.number(number.unwrap_or_default());
    }

    fn list<T>(&mut self, items: &[T], mut each: impl FnMut(&mut Self, &T)) {
        self.count(items.len());
        items.iter().for_each(|item| each(self, item));
    }

    fn policy_value(&mut self, value: &PolicyValue) {
        match value {
            PolicyValue::Unset => self.count(0),
            PolicyValue::Number(n) => {
                self.count(1);
                self.number(*n);
            }
            PolicyValue::Text(text) => {
                self.count(2);
                self.text(text);
            }
            PolicyValue::Levels(list) => {
                self.count(3);
                self.list(list, |form, entry| {
                    form.numbers(&[entry.track_from_deg, entry.track_until_deg]);
                    form.list(&entry.levels_ft, |form, &level| form.number(level));
                });
            }
        }
    }

    fn periods<L>(&mut self, periods: &[Period<L>], limits: impl Fn(&L) -> Vec<Option<f64>>) {
        self.list(periods, |form, period| {
            form.numbers(&[period.from_s, period.until_s]);
            form.list(&limits(&period.limits), |form, &limit| form.optional(limit));
        });
    }

    fn sector(&mut self, sector: &Sector) {
        self.text(&sector.name);
        self.optional_text(sector.title.as_deref());
        self.optional(sector.horizontal_nm);
        self.flag(sector.no_changes);
        // Volumes have no name to be sorted by.
        let mut volumes: Vec<_> = sector.volumes.iter().map(volume_digest).collect();
        volumes.sort_unstable();
        self.list(&volumes, |form, digest| form.0.update(digest));
        self.periods(&sector.open, |l| {
            vec![
                l.entries_per_hour,
                l.occupancy_limit,
                l.occupancy_lasting,
                l.level_changes_per_hour,
            ]
        });
    }

    fn fuel(&mut self, tables: &[FuelTable]) {
        self.list(tables, |form, table| {
            form.text(&table.aircraft);
            form.optional(table.mass_kg);
            form.list(&table.rows, |form, row| {
                let (kind, flow) = match row.flow {
                    FuelFlow::KgPerMin(kg) => (false, kg),
                    FuelFlow::KgPerNm(kg) => (true, kg),
                };
                form.flag(kind);
                form.numbers(&[row.level_ft, flow]);
            });
        });
    }

    fn flight(&mut self, flight: &Flight) {
        self.text(&flight.name);
        for text in [&flight.departure, &flight.destination, &flight.aircraft] {
            self.text(text);
        }
        self.optional_text(flight.callsign.as_deref());
        self.optional_text(flight.operator.as_deref());
        self.optional(flight.mach);
        self.optional(flight.mass_kg);
        self.flag(flight.rvsm);
        self.flag(flight.movable);
        self.list(flight.profile.points(), |form, point| {
            form.numbers(&[point.time_s, point.lon_deg, point.lat_deg, point.level_ft]);
            form.optional_text(point.fix.as_deref());
        });
    }

    fn proposal(&mut self, day: &Day, proposal: &Proposal) {
        self.text(&proposal.name);
        self.text(day.flights.get(proposal.flight).map_or("", |flight| &flight.name));
        self.list(&proposal.alternatives, |form, alternative| {
            form.count(alternative.option as usize);
            form.list(&alternative.stretches, |form, stretch| {
                form.number(stretch.level_ft);
                form.optional(stretch.from_s);
                form.optional(stretch.until_s);
            });
            form.optional(alternative.contrail_km_avoided);
            form.optional(alternative.ef_avoided_j);
            form.optional(alternative.extra_fuel_kg);
            form.optional(alternative.max_extra_fuel_kg);
            form.number(alternative.priority);
        });
    }
}

fn volume_digest(volume: &Volume) -> [u8; 32] {
    let mut form = Form(Sha256::new());
    form.numbers(&[volume.floor_ft, volume.ceiling_ft]);
    form.list(volume.polygon.rings(), |form, ring| {
        form.list(ring, |form, position| form.numbers(position));
    });
    form.0.finalize().into()
}
