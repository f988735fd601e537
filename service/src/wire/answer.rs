//! The engine's answers to the wire: ids become names, seconds of the day become timestamps,
//! metres between flights become nautical miles.

use prost_types::Timestamp;
use rimeshift_engine::answer::{
    AskAnswer, AskVerdict, Constraint, DayCheck, Decision, Exchange, LimitPrice, LoadCount,
    LoadMeasure, Loss, LossIn, MovedProfile, Overload, Place, PlanLoss, PlannedStretch, Reason,
    Rule, Stopped, TradeOff, TradeOffLimit, Verdict, Why,
};
use rimeshift_engine::day::Day;
use rimeshift_engine::ids::{FlightId, ProposalId, RestrictionId, SectorId};
use rimeshift_engine::units::m_to_nm;
use rimeshift_proto::v1;

use super::clock::DayClock;
use super::to_wire::count;

/// Points of a profile in one message; longer profiles go in pieces.
const POINTS_PER_PIECE: usize = 10_000;

/// Answers about one day.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Answers<'a> {
    /// The day whose ids the answers use.
    pub(crate) day: &'a Day,
    /// Its clock.
    pub(crate) clock: DayClock,
}

impl Answers<'_> {
    pub(crate) fn time(&self, time_s: f64) -> Option<Timestamp> {
        Some(self.clock.timestamp(time_s))
    }

    pub(crate) fn flight(&self, id: FlightId) -> String {
        self.day.flights.get(id).map_or_else(String::new, |flight| flight.name.clone())
    }

    pub(crate) fn proposal(&self, id: ProposalId) -> String {
        self.day.proposals.get(id).map_or_else(String::new, |proposal| proposal.name.clone())
    }

    pub(super) fn sector(&self, id: SectorId) -> String {
        self.day.sectors.get(id).map_or_else(String::new, |sector| sector.name.clone())
    }

    pub(crate) fn limit_prices(&self, prices: &[LimitPrice]) -> v1::LimitPrices {
        use v1::limit_price::Limit;
        let prices = prices.iter().map(|price| v1::LimitPrice {
            limit: match (price.place, price.policy_key) {
                (Some(place), _) => Some(Limit::Place(self.place(place))),
                (None, key) => key.map(|key| Limit::PolicyKey(key.to_owned())),
            },
            measure: price.measure.map_or(v1::LoadMeasure::Unspecified, measure).into(),
            from: price.place.and_then(|_| self.time(price.from_s)),
            until: price.place.and_then(|_| self.time(price.until_s)),
            estimate: price.estimate,
            exact: price.exact,
        });
        v1::LimitPrices { prices: prices.collect() }
    }

    pub(crate) fn trade_off(&self, curve: &TradeOff) -> v1::TraceTradeOffResponse {
        use v1::trade_off_point::Limit;
        let points = curve.points.iter().map(|point| v1::TradeOffPoint {
            limit: match point.limit {
                TradeOffLimit::None => None,
                TradeOffLimit::MovedFlights(most) => Some(Limit::MostMovedFlights(most)),
                TradeOffLimit::ExtraFuelKg(most) => Some(Limit::MostExtraFuelKg(most)),
            },
            moved_flights: point.moved_flights,
            contrail_km_avoided: point.contrail_km_avoided,
            extra_fuel_kg: point.extra_fuel_kg,
            objective: point.objective,
            bound: point.bound,
        });
        v1::TraceTradeOffResponse { points: points.collect() }
    }

    pub(crate) fn why(&self, why: &Why) -> v1::ExplainRefusalResponse {
        let names = |ids: &[ProposalId]| ids.iter().map(|&id| self.proposal(id)).collect();
        v1::ExplainRefusalResponse {
            granted: why.granted,
            reasons: why.reasons.iter().map(|reason| self.reason(reason)).collect(),
            relax: why.relax.iter().map(|limit| self.constraint(limit)).collect(),
            objective_lost: why.loss,
            least_objective_lost: why.least_loss,
            drops: names(&why.goes),
            adds: names(&why.comes),
        }
    }

    fn restriction(&self, id: RestrictionId) -> String {
        self.day
            .restrictions
            .get(id)
            .map_or_else(String::new, |restriction| restriction.name.clone())
    }

    pub(crate) fn place(&self, place: Place) -> v1::Place {
        use v1::place::Place as Wire;
        let place = match place {
            Place::Sector(id) => Wire::Sector(self.sector(id)),
            Place::Airport(id) => Wire::Airport(
                self.day.airports.get(id).map_or_else(String::new, |airport| airport.code.clone()),
            ),
        };
        v1::Place { place: Some(place) }
    }

    pub(crate) fn load_count(&self, load: &LoadCount) -> v1::LoadCount {
        v1::LoadCount {
            place: Some(self.place(load.place)),
            measure: measure(load.measure).into(),
            window_start: self.time(load.window_start_s),
            filed: load.filed,
            planned: load.planned,
            limit: load.limit,
        }
    }

    pub(crate) fn overload(&self, overload: &Overload) -> v1::Overload {
        v1::Overload {
            place: Some(self.place(overload.place)),
            measure: measure(overload.measure).into(),
            from: self.time(overload.from_s),
            until: self.time(overload.until_s),
            count: overload.count,
            limit: overload.limit,
        }
    }

    pub(crate) fn loss(&self, loss: &Loss) -> v1::Loss {
        v1::Loss {
            first_flight: self.flight(loss.first),
            second_flight: self.flight(loss.second),
            from: self.time(loss.from_s),
            until: self.time(loss.until_s),
            closest_time: self.time(loss.closest_s),
            horizontal_nm: m_to_nm(loss.horizontal_m),
            vertical_ft: loss.vertical_ft,
            sector: loss.sector.map(|id| self.sector(id)).unwrap_or_default(),
        }
    }

    pub(crate) fn plan_loss(&self, loss: &PlanLoss) -> v1::PlanLoss {
        let version = match loss.version {
            LossIn::Filed => v1::LossVersion::Filed,
            LossIn::Planned => v1::LossVersion::Planned,
            LossIn::Both => v1::LossVersion::Both,
        };
        v1::PlanLoss {
            loss: Some(self.loss(&loss.loss)),
            version: version.into(),
            is_new: loss.new,
        }
    }

    pub(crate) fn check_summary(&self, check: &DayCheck) -> v1::DayCheckSummary {
        v1::DayCheckSummary {
            flights: count(self.day.flights.len()),
            overloads: count(check.overloads.len()),
            losses: count(check.losses.len()),
            not_movable: check.unchangeable.not_movable,
            no_cruise: check.unchangeable.no_cruise,
            near_direction_boundary: check.near_direction_boundary,
            proposals: check.proposals,
            invalid_proposals: count(check.invalid_proposals.len()),
            snapped_levels: check.snapped_levels,
        }
    }

    pub(crate) fn rule(&self, rule: &Rule) -> v1::BrokenRule {
        use v1::ChangeRule as Wire;
        let plain = |rule: Wire| v1::BrokenRule { rule: rule.into(), ..Default::default() };
        match rule {
            Rule::NotMovable => plain(Wire::NotMovable),
            Rule::NoCruise => plain(Wire::NoCruise),
            Rule::FromNotInCruise => plain(Wire::FromNotInCruise),
            Rule::UntilNotInCruise => plain(Wire::UntilNotInCruise),
            Rule::OutsideFlight => plain(Wire::OutsideFlight),
            Rule::EndsBeforeItBegins => plain(Wire::EndsBeforeItBegins),
            Rule::BeginsInCruise => plain(Wire::BeginsInCruise),
            Rule::EndsInCruise => plain(Wire::EndsInCruise),
            Rule::NotPassedInClimb => plain(Wire::NotPassedInClimb),
            Rule::NotPassedInDescent => plain(Wire::NotPassedInDescent),
            Rule::NoRoomToReach => plain(Wire::NoRoomToReach),
            Rule::NoRoomToReturn => plain(Wire::NoRoomToReturn),
            Rule::StretchesOverlap => plain(Wire::StretchesOverlap),
            Rule::SameLevel => plain(Wire::SameLevel),
            Rule::NotRvsm => plain(Wire::NotRvsm),
            Rule::AboveCeiling { ceiling_ft } => {
                v1::BrokenRule { level_ft: Some(*ceiling_ft), ..plain(Wire::AboveCeiling) }
            }
            Rule::BelowFloor { floor_ft } => {
                v1::BrokenRule { level_ft: Some(*floor_ft), ..plain(Wire::BelowFloor) }
            }
            Rule::WrongDirection { track_deg } => {
                v1::BrokenRule { track_deg: Some(*track_deg), ..plain(Wire::WrongDirection) }
            }
            Rule::NoChangesSector { sector, time_s } => v1::BrokenRule {
                sector: Some(self.sector(*sector)),
                time: self.time(*time_s),
                ..plain(Wire::NoChangesSector)
            },
            Rule::Restriction { restriction, time_s } => v1::BrokenRule {
                restriction: Some(self.restriction(*restriction)),
                time: self.time(*time_s),
                ..plain(Wire::Restriction)
            },
        }
    }

    pub(crate) fn constraint(&self, constraint: &Constraint) -> v1::Constraint {
        use v1::constraint::Kind;
        let kind = match constraint {
            Constraint::Load { place, measure: counted, from_s, until_s, count, limit } => {
                Kind::Load(v1::LoadConstraint {
                    place: Some(self.place(*place)),
                    measure: measure(*counted).into(),
                    from: self.time(*from_s),
                    until: self.time(*until_s),
                    count: *count,
                    limit: *limit,
                })
            }
            Constraint::Separation { other, time_s, horizontal_m, vertical_ft } => {
                Kind::Separation(v1::SeparationConstraint {
                    other_flight: self.flight(*other),
                    time: self.time(*time_s),
                    horizontal_nm: m_to_nm(*horizontal_m),
                    vertical_ft: *vertical_ft,
                })
            }
            Constraint::SeparationRisk { other, probability, limit } => {
                Kind::SeparationRisk(v1::SeparationRiskConstraint {
                    other_flight: self.flight(*other),
                    probability: *probability,
                    limit: *limit,
                })
            }
            Constraint::OwnChange => Kind::OwnChange(v1::OwnChangeConstraint {}),
            Constraint::FuelLimit { extra_fuel_kg, limit_kg } => {
                Kind::FuelLimit(v1::FuelLimitConstraint {
                    extra_fuel_kg: *extra_fuel_kg,
                    limit_kg: *limit_kg,
                })
            }
            Constraint::PlanLimit { key, count, limit } => {
                Kind::PlanLimit(v1::PlanLimitConstraint {
                    key: (*key).to_owned(),
                    count: *count,
                    limit: *limit,
                })
            }
            Constraint::BetterOption { taken } => {
                Kind::BetterOption(v1::BetterOptionConstraint { taken: *taken })
            }
            Constraint::NotWorthIt => Kind::NotWorthIt(v1::NotWorthItConstraint {}),
            Constraint::ByHand => Kind::ByHand(v1::ByHandConstraint {}),
            Constraint::Invalid(rule) => Kind::Invalid(self.rule(rule)),
        };
        v1::Constraint { kind: Some(kind) }
    }

    pub(crate) fn decision(&self, decision: &Decision) -> v1::Decision {
        v1::Decision {
            proposal: self.proposal(decision.proposal),
            flight: self.flight(decision.flight),
            verdict: verdict(decision.verdict).into(),
            option: decision.option,
            stretches: decision.stretches.iter().map(|s| self.stretch(s)).collect(),
            net_benefit: decision.net_benefit,
            contrail_km_avoided: decision.contrail_km_avoided,
            extra_fuel_kg: decision.extra_fuel_kg,
            arrival_shift_s: decision.arrival_shift_s,
            reasons: decision.reasons.iter().map(|r| self.reason(r)).collect(),
            exchange: decision.exchange.as_ref().map(|e| self.exchange(e)),
        }
    }

    fn reason(&self, reason: &Reason) -> v1::Reason {
        v1::Reason { option: reason.option, constraint: Some(self.constraint(&reason.constraint)) }
    }

    fn exchange(&self, exchange: &Exchange) -> v1::Exchange {
        v1::Exchange {
            drops: exchange.drops.iter().map(|&id| self.proposal(id)).collect(),
            objective_lost: exchange.objective_lost,
            proven: exchange.proven,
        }
    }

    fn stretch(&self, stretch: &PlannedStretch) -> v1::PlannedStretch {
        let time = |time_s: Option<f64>| time_s.map(|s| self.clock.timestamp(s));
        v1::PlannedStretch {
            stretch: Some(v1::Stretch {
                level_ft: stretch.level_ft,
                from: time(stretch.from_s),
                until: time(stretch.until_s),
            }),
            planned_from: time(stretch.planned_from_s),
            planned_until: time(stretch.planned_until_s),
            near_fix: stretch.near_fix.clone().unwrap_or_default(),
        }
    }

    /// A new profile, in pieces where it is long.
    pub(crate) fn moved_points(
        self,
        moved: &MovedProfile,
    ) -> impl Iterator<Item = v1::FlightPoints> {
        moved.points.chunks(POINTS_PER_PIECE).map(move |piece| {
            let column = |of: fn(&rimeshift_engine::answer::ProfilePoint) -> f64| {
                piece.iter().map(of).collect::<Vec<f64>>()
            };
            let named = piece.iter().any(|p| p.fix.is_some());
            let fixes = piece.iter().map(|p| p.fix.clone().unwrap_or_default());
            v1::FlightPoints {
                flight: self.flight(moved.flight),
                points: Some(v1::Points {
                    epoch: Some(self.clock.midnight()),
                    seconds_after_epoch: column(|p| p.time_s),
                    lon_deg: column(|p| p.lon_deg),
                    lat_deg: column(|p| p.lat_deg),
                    level_ft: column(|p| p.level_ft),
                    fix: if named { fixes.collect() } else { Vec::new() },
                }),
            }
        })
    }

    pub(crate) fn ask_answer(&self, answer: &AskAnswer) -> v1::ChangeAnswer {
        let (verdict, constraints, broken_rule) = match &answer.verdict {
            AskVerdict::Yes => (v1::ChangeVerdict::Yes, Vec::new(), None),
            AskVerdict::No(constraints) => {
                let constraints = constraints.iter().map(|c| self.constraint(c)).collect();
                (v1::ChangeVerdict::No, constraints, None)
            }
            AskVerdict::Invalid(rule) => {
                (v1::ChangeVerdict::Invalid, Vec::new(), Some(self.rule(rule)))
            }
        };
        v1::ChangeAnswer {
            verdict: verdict.into(),
            constraints,
            broken_rule,
            net_benefit: answer.net_benefit,
            contrail_km_avoided: answer.contrail_km_avoided,
            extra_fuel_kg: answer.extra_fuel_kg,
            arrival_shift_s: answer.arrival_shift_s,
            expected_new_losses: answer.expected_new_losses,
            least_slack: answer.least_slack,
            stretches: answer.stretches.iter().map(|s| self.stretch(s)).collect(),
        }
    }
}

pub(crate) fn measure(measure: LoadMeasure) -> v1::LoadMeasure {
    match measure {
        LoadMeasure::Entries => v1::LoadMeasure::Entries,
        LoadMeasure::Occupancy => v1::LoadMeasure::Occupancy,
        LoadMeasure::Lasting => v1::LoadMeasure::Lasting,
        LoadMeasure::LevelChanges => v1::LoadMeasure::LevelChanges,
        LoadMeasure::Arrivals => v1::LoadMeasure::Arrivals,
        LoadMeasure::Departures => v1::LoadMeasure::Departures,
    }
}

pub(crate) fn verdict(verdict: Verdict) -> v1::Verdict {
    match verdict {
        Verdict::Granted => v1::Verdict::Granted,
        Verdict::Amended => v1::Verdict::Amended,
        Verdict::Refused => v1::Verdict::Refused,
        Verdict::Invalid => v1::Verdict::Invalid,
    }
}

pub(crate) fn stopped(stopped: Stopped) -> v1::Stopped {
    match stopped {
        Stopped::Optimal => v1::Stopped::Optimal,
        Stopped::Gap => v1::Stopped::Gap,
        Stopped::Work => v1::Stopped::Work,
        Stopped::Time => v1::Stopped::Time,
        Stopped::Cancelled => v1::Stopped::Cancelled,
    }
}
