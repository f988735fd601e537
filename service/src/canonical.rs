//! The hash of a day in a canonical form: the same for the same day, in whatever order its rows
//! came and whichever program sent them.
//!
//! The form: the tables of a built day in one fixed order, each sorted by name as the day keeps
//! them, what has no unique name (volumes, restrictions) by its own digest; every text and list led by its length (u64,
//! little-endian), every number as an IEEE 754 double (little-endian, -0 as 0), every optional
//! value led by a byte 0 or 1. The policy belongs to it, key by key, so a default given outright
//! changes nothing.

use std::fmt::Write as _;

use rimeshift_engine::day::{
    Background, Day, Flight, Flow, FuelFlow, FuelTable, HandDecision, HandSubject, KEYS, Must,
    Period, PolicyValue, Proposal, Restriction, Sector, Volume,
};
use sha2::{Digest, Sha256};

/// Names the form, so that a change of it changes every hash.
const FORM: &str = "rimeshift day 2";

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
    form.unordered(day.restrictions.as_slice(), Form::restriction);
    form.unordered(&day.background, |form, row| form.background(day, row));
    form.unordered(&day.flows, |form, row| form.flow(day, row));
    form.unordered(&day.decisions, |form, decision| form.decision(day, decision));
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

    /// Items that nothing but their content puts in order.
    fn unordered<T>(&mut self, items: &[T], each: impl Fn(&mut Self, &T)) {
        let digest = |item| -> [u8; 32] {
            let mut form = Form(Sha256::new());
            each(&mut form, item);
            form.0.finalize().into()
        };
        let mut digests: Vec<_> = items.iter().map(digest).collect();
        digests.sort_unstable();
        self.list(&digests, |form, digest| form.0.update(digest));
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
        self.unordered(&sector.volumes, Form::volume);
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

    fn volume(&mut self, volume: &Volume) {
        self.numbers(&[volume.floor_ft, volume.ceiling_ft]);
        self.list(volume.polygon.rings(), |form, ring| {
            form.list(ring, |form, position| form.numbers(position));
        });
    }

    fn restriction(&mut self, restriction: &Restriction) {
        self.text(&restriction.name);
        self.unordered(&restriction.volumes, Form::volume);
        self.numbers(&[restriction.from_s, restriction.until_s]);
        self.list(&restriction.levels_allowed_ft, |form, &level_ft| form.number(level_ft));
        self.optional_text(restriction.departure.as_deref());
        self.optional_text(restriction.destination.as_deref());
    }

    fn background(&mut self, day: &Day, row: &Background) {
        self.text(day.sectors.get(row.sector).map_or("", |sector| &sector.name));
        self.numbers(&[row.from_s, row.until_s, row.aircraft]);
        self.optional(row.level_ft);
        self.optional(row.entries);
    }

    fn flow(&mut self, day: &Day, row: &Flow) {
        for (sector, level_ft) in [row.from, row.to] {
            self.text(day.sectors.get(sector).map_or("", |sector| &sector.name));
            self.number(level_ft);
        }
        self.numbers(&[row.from_s, row.until_s, row.aircraft]);
    }

    fn decision(&mut self, day: &Day, decision: &HandDecision) {
        let (is_flight, name) = match decision.about {
            HandSubject::Proposal(id) => (false, day.proposals.get(id).map(|p| &p.name)),
            HandSubject::Flight(id) => (true, day.flights.get(id).map(|f| &f.name)),
        };
        self.flag(is_flight);
        self.text(name.map_or("", String::as_str));
        let (must, option) = match decision.must {
            Must::Grant { option } => (1, option),
            Must::Refuse => (2, None),
            Must::Keep => (3, None),
        };
        self.count(must);
        self.optional(option.map(f64::from));
    }
}
