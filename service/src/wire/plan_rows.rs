//! Plans as they come in, message after message, to what an audit judges.

use prost::Message;
use rimeshift_engine::answer::{
    Exchange, LoadMeasure, MovedProfile, ProfilePoint, Stopped, Verdict,
};
use rimeshift_engine::audit::{
    ClaimedDecision, ClaimedReason, ClaimedStretch, PlanUnderAudit, ReasonKind,
};
use rimeshift_engine::day::{Day, Defect, PointParts};
use rimeshift_engine::ids::{FlightId, ProposalId};
use rimeshift_proto::v1;

use super::clock::DayClock;
use super::fields::Fields;
use super::rows::{append_points, optional_time};
use crate::stream::Brought;

/// What a message brings.
pub(crate) fn brought(rows: &v1::PlanRows) -> Brought {
    let points = |moved: &v1::FlightPoints| {
        moved.points.as_ref().map_or(0, |points| points.seconds_after_epoch.len())
    };
    let nested = |decision: &v1::Decision| decision.stretches.len() + decision.reasons.len();
    Brought {
        points: rows.moved_points.iter().map(points).sum(),
        rows: rows.decisions.iter().map(|d| 1 + nested(d)).sum::<usize>()
            + rows.moved_points.len()
            + rows.loads.len()
            + rows.losses.len(),
        bytes: rows.encoded_len(),
    }
}

/// A plan that is being received. Paths in its defects count rows over all messages.
#[derive(Debug)]
pub(crate) struct ReceivingPlan<'a> {
    day: &'a Day,
    clock: DayClock,
    fields: Fields,
    decisions: Vec<ClaimedDecision>,
    moved: Vec<(FlightId, Vec<PointParts>)>,
    moved_rows: usize,
}

impl<'a> ReceivingPlan<'a> {
    /// A plan of that day without rows yet. `fields` holds what is wrong with its header.
    pub(crate) fn new(day: &'a Day, clock: DayClock, fields: Fields) -> Self {
        Self { day, clock, fields, decisions: Vec::new(), moved: Vec::new(), moved_rows: 0 }
    }

    /// Adds the rows of one message.
    pub(crate) fn add(&mut self, rows: v1::PlanRows) {
        rows.decisions.into_iter().for_each(|row| self.decision(row));
        rows.moved_points.into_iter().for_each(|row| self.moved_points(row));
    }

    /// The plan, of which the header said the rest.
    pub(crate) fn finish(
        self,
        objective: f64,
        bound: Option<f64>,
        gap: Option<f64>,
    ) -> Result<PlanUnderAudit, Vec<Defect>> {
        if !self.fields.is_empty() {
            return Err(self.fields.into_defects());
        }
        let written: Vec<MovedProfile> = self.moved.into_iter().map(moved_profile).collect();
        Ok(PlanUnderAudit {
            objective,
            bound,
            gap,
            decisions: self.decisions,
            written: (!written.is_empty()).then_some(written),
            by_hand: None,
        })
    }

    fn decision(&mut self, row: v1::Decision) {
        let i = self.decisions.len();
        let at = |field: &str| format!("decisions[{i}].{field}");
        let verdict = match row.verdict() {
            v1::Verdict::Granted => Verdict::Granted,
            v1::Verdict::Amended => Verdict::Amended,
            v1::Verdict::Refused => Verdict::Refused,
            v1::Verdict::Invalid => Verdict::Invalid,
            v1::Verdict::Unspecified => {
                self.fields.push(|| at("verdict"), "is missing or unknown", "give a verdict");
                Verdict::Refused
            }
        };
        for (field, value) in [
            ("net_benefit", row.net_benefit),
            ("contrail_km_avoided", row.contrail_km_avoided),
            ("extra_fuel_kg", row.extra_fuel_kg),
            ("arrival_shift_s", row.arrival_shift_s),
        ] {
            self.finite(|| at(field), value);
        }
        let proposal = self.proposal(|| at("proposal"), &row.proposal);
        let flight = self.flight(|| at("flight"), &row.flight);
        let stretches = row.stretches.into_iter().enumerate();
        let stretches =
            stretches.map(|(s, row)| self.stretch(&at(&format!("stretches[{s}]")), row));
        let stretches = stretches.collect();
        let reasons = row.reasons.into_iter().enumerate();
        let reasons = reasons
            .filter_map(|(r, row)| {
                let kind = reason_kind(row.constraint);
                if kind.is_none() {
                    let path = || at(&format!("reasons[{r}].constraint"));
                    self.fields.push(path, "is missing or unknown", "give what keeps it out");
                }
                Some(ClaimedReason { option: Some(row.option), kind: kind? })
            })
            .collect();
        let exchange = row.exchange.map(|row| self.exchange(&at("exchange"), row));
        self.decisions.push(ClaimedDecision {
            proposal,
            flight,
            verdict,
            option: row.option,
            stretches,
            net_benefit: row.net_benefit,
            contrail_km_avoided: row.contrail_km_avoided,
            extra_fuel_kg: row.extra_fuel_kg,
            arrival_shift_s: row.arrival_shift_s,
            reasons,
            exchange,
        });
    }

    fn stretch(&mut self, path: &str, row: v1::PlannedStretch) -> ClaimedStretch {
        let stretch = row.stretch.unwrap_or_else(|| {
            self.fields.push(|| format!("{path}.stretch"), "is missing", "give the stretch");
            v1::Stretch::default()
        });
        self.finite(|| format!("{path}.stretch.level_ft"), stretch.level_ft);
        let (clock, fields) = (self.clock, &mut self.fields);
        let mut time =
            |field, time| optional_time(clock, || format!("{path}.{field}"), time, fields);
        ClaimedStretch {
            level_ft: stretch.level_ft,
            from_s: time("stretch.from", stretch.from),
            until_s: time("stretch.until", stretch.until),
            planned_from_s: time("planned_from", row.planned_from),
            planned_until_s: time("planned_until", row.planned_until),
        }
    }

    fn exchange(&mut self, path: &str, row: v1::Exchange) -> Exchange {
        self.finite(|| format!("{path}.objective_lost"), row.objective_lost);
        let drops = row.drops.iter().enumerate();
        Exchange {
            drops: drops
                .map(|(i, name)| self.proposal(|| format!("{path}.drops[{i}]"), name))
                .collect(),
            objective_lost: row.objective_lost,
            proven: row.proven,
        }
    }

    fn moved_points(&mut self, row: v1::FlightPoints) {
        let i = self.moved_rows;
        self.moved_rows += 1;
        let path = || format!("moved_points[{i}]");
        let flight = self.flight(|| format!("{}.flight", path()), &row.flight);
        // Pieces of one profile follow each other; a profile sent twice stays apart, for the audit.
        let mut points = match self.moved.pop_if(|(last, _)| *last == flight) {
            Some((_, points)) => points,
            None => Vec::new(),
        };
        let before = points.len();
        if let Some(wire) = row.points {
            let path = || format!("{}.points", path());
            append_points(self.clock, path, wire, &mut points, &mut self.fields);
        }
        for (p, point) in points.iter().enumerate().skip(before) {
            let numbers = [point.time_s, point.lon_deg, point.lat_deg, point.level_ft];
            let on_globe = point.lon_deg.abs() <= 180.0 && point.lat_deg.abs() <= 90.0;
            if !(on_globe && numbers.iter().all(|n| n.is_finite())) {
                self.fields.push(
                    || format!("{}.points[{}]", path(), p - before),
                    "is not a place on the globe at a level and a time",
                    "finite numbers, longitude -180 to 180, latitude -90 to 90",
                );
            }
        }
        self.moved.push((flight, points));
    }

    fn finite(&mut self, path: impl FnOnce() -> String, value: f64) {
        if !value.is_finite() {
            self.fields.push(path, format!("`{value}` is no finite number"), "a finite number");
        }
    }

    fn proposal(&mut self, path: impl FnOnce() -> String, name: &str) -> ProposalId {
        self.day.find_proposal(name).unwrap_or_else(|| {
            let problem = format!("`{name}` is no proposal of this day");
            self.fields.push(path, problem, "name one of the day's proposals");
            ProposalId(0)
        })
    }

    fn flight(&mut self, path: impl FnOnce() -> String, name: &str) -> FlightId {
        self.day.find_flight(name).unwrap_or_else(|| {
            let problem = format!("`{name}` is no flight of this day");
            self.fields.push(path, problem, "name one of the day's flights");
            FlightId(0)
        })
    }
}

fn moved_profile((flight, points): (FlightId, Vec<PointParts>)) -> MovedProfile {
    let points = points.into_iter().map(|p| ProfilePoint {
        time_s: p.time_s,
        lon_deg: p.lon_deg,
        lat_deg: p.lat_deg,
        level_ft: p.level_ft,
        fix: p.fix,
    });
    MovedProfile { flight, points: points.collect() }
}

fn reason_kind(constraint: Option<v1::Constraint>) -> Option<ReasonKind> {
    use v1::constraint::Kind;
    Some(match constraint?.kind? {
        Kind::Load(load) => ReasonKind::Load(measure(load.measure())?),
        Kind::Separation(_) => ReasonKind::Separation,
        Kind::SeparationRisk(_) => ReasonKind::SeparationRisk,
        Kind::OwnChange(_) => ReasonKind::OwnChange,
        Kind::FuelLimit(_) => ReasonKind::FuelLimit,
        Kind::PlanLimit(_) => ReasonKind::PlanLimit,
        Kind::BetterOption(_) => ReasonKind::BetterOption,
        Kind::NotWorthIt(_) => ReasonKind::NotWorthIt,
        Kind::ByHand(_) => ReasonKind::ByHand,
        Kind::Invalid(_) => ReasonKind::Invalid,
    })
}

/// A measure of the wire; `None` where it is unspecified.
pub(crate) fn measure(measure: v1::LoadMeasure) -> Option<LoadMeasure> {
    match measure {
        v1::LoadMeasure::Unspecified => None,
        v1::LoadMeasure::Entries => Some(LoadMeasure::Entries),
        v1::LoadMeasure::Occupancy => Some(LoadMeasure::Occupancy),
        v1::LoadMeasure::Lasting => Some(LoadMeasure::Lasting),
        v1::LoadMeasure::LevelChanges => Some(LoadMeasure::LevelChanges),
        v1::LoadMeasure::Arrivals => Some(LoadMeasure::Arrivals),
        v1::LoadMeasure::Departures => Some(LoadMeasure::Departures),
    }
}

/// Why a search stopped; `None` where it is unspecified.
pub(crate) fn stopped(stopped: v1::Stopped) -> Option<Stopped> {
    match stopped {
        v1::Stopped::Unspecified => None,
        v1::Stopped::Optimal => Some(Stopped::Optimal),
        v1::Stopped::Gap => Some(Stopped::Gap),
        v1::Stopped::Work => Some(Stopped::Work),
        v1::Stopped::Time => Some(Stopped::Time),
        v1::Stopped::Cancelled => Some(Stopped::Cancelled),
    }
}
