//! `plan.json` as data, to and from what the service sends.

use super::FoundPlans;
use super::hand::HandDocument;
use crate::report::figures::{date, rfc3339};
use crate::report::names;
use crate::report::policy::value_json;
use crate::tables::rows::{feet, wire_time};
use crate::tables::time::parse_utc;
use rimeshift_proto::v1::constraint::Kind;
use rimeshift_proto::v1::policy_value;
use rimeshift_proto::v1::{
    BetterOptionConstraint, BrokenRule, ByHandConstraint, ChangeRule, Constraint, Decision,
    DirectionLevels, DirectionLevelsList, Exchange, FuelLimitConstraint, LoadConstraint,
    LoadMeasure, NotWorthItConstraint, OwnChangeConstraint, Place, PlanLimitConstraint,
    PlannedStretch, PolicySetting, PolicyValue, Reason, SeparationConstraint,
    SeparationRiskConstraint, Stopped, Stretch, Verdict, place,
};
use serde::{Deserialize, Serialize};
use serde_json::Value;
use std::collections::BTreeMap;

/// `plan.json`.
#[derive(Debug, Serialize, Deserialize)]
pub(super) struct PlanDocument {
    pub(super) date: String,
    pub(super) region: String,
    pub(super) day_sha256: String,
    pub(super) program_version: String,
    pub(super) policy: BTreeMap<String, Value>,
    pub(super) seed: u64,
    pub(super) stopped: String,
    pub(super) objective: f64,
    pub(super) bound: Option<f64>,
    pub(super) gap: Option<f64>,
    pub(super) expected_new_losses: f64,
    /// Decisions by hand beside the day's own.
    #[serde(skip_serializing_if = "Vec::is_empty", default)]
    pub(super) by_hand: Vec<HandDocument>,
    /// Whether decisions by hand that can't be met were to be planned around.
    #[serde(skip_serializing_if = "std::ops::Not::not", default)]
    pub(super) around_decisions: bool,
    /// Those that were.
    #[serde(skip_serializing_if = "Vec::is_empty", default)]
    pub(super) unmet: Vec<HandDocument>,
    pub(super) plans: Vec<RankedDocument>,
}

/// One of the plans.
#[derive(Debug, Serialize, Deserialize)]
pub(super) struct RankedDocument {
    pub(super) rank: u32,
    pub(super) objective: f64,
    pub(super) decisions: Vec<DecisionDocument>,
}

/// The verdict on a proposal.
#[derive(Debug, Serialize, Deserialize)]
pub(super) struct DecisionDocument {
    pub(super) proposal: String,
    pub(super) flight: String,
    pub(super) verdict: String,
    pub(super) option: Option<u32>,
    pub(super) stretches: Vec<StretchDocument>,
    pub(super) net_benefit_j: f64,
    pub(super) contrail_km_avoided: f64,
    pub(super) extra_fuel_kg: f64,
    pub(super) arrival_shift_s: f64,
    pub(super) reasons: Vec<ReasonDocument>,
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub(super) exchange: Option<ExchangeDocument>,
}

/// A stretch with the times that it gets.
#[derive(Debug, Serialize, Deserialize)]
pub(crate) struct StretchDocument {
    level_fl: f64,
    from_time: Option<String>,
    until_time: Option<String>,
    planned_from: Option<String>,
    planned_until: Option<String>,
    #[serde(skip_serializing_if = "Option::is_none", default)]
    near_fix: Option<String>,
}

/// A reason; fields that do not apply are left out.
#[derive(Debug, Default, Serialize, Deserialize)]
#[serde(default)]
pub(crate) struct ReasonDocument {
    kind: String,
    #[serde(skip_serializing_if = "Option::is_none")]
    option: Option<u32>,
    #[serde(skip_serializing_if = "Option::is_none")]
    sector: Option<String>,
    #[serde(skip_serializing_if = "Option::is_none")]
    restriction: Option<String>,
    #[serde(skip_serializing_if = "Option::is_none")]
    airport: Option<String>,
    #[serde(skip_serializing_if = "Option::is_none")]
    from: Option<String>,
    #[serde(skip_serializing_if = "Option::is_none")]
    until: Option<String>,
    #[serde(skip_serializing_if = "Option::is_none")]
    count: Option<f64>,
    #[serde(skip_serializing_if = "Option::is_none")]
    limit: Option<f64>,
    #[serde(skip_serializing_if = "Option::is_none")]
    other_flight: Option<String>,
    #[serde(skip_serializing_if = "Option::is_none")]
    time: Option<String>,
    #[serde(skip_serializing_if = "Option::is_none")]
    horizontal_nm: Option<f64>,
    #[serde(skip_serializing_if = "Option::is_none")]
    vertical_ft: Option<f64>,
    /// The rule of level changes that is broken, or the key of the policy that limits.
    #[serde(skip_serializing_if = "Option::is_none")]
    rule: Option<String>,
}

/// What would make room.
#[derive(Debug, Serialize, Deserialize)]
pub(super) struct ExchangeDocument {
    drops: Vec<String>,
    objective_lost_j: f64,
    proven: bool,
}

impl PlanDocument {
    /// The document of the plans found.
    pub(super) fn of(found: &FoundPlans) -> PlanDocument {
        let origin = &found.origin;
        let best = found.plans.first();
        PlanDocument {
            date: date(found.day.date.as_ref()),
            region: found.day.region.clone(),
            day_sha256: origin.day_sha256.clone(),
            program_version: origin.program_version.clone(),
            policy: origin
                .policy
                .iter()
                .map(|setting| (setting.key.clone(), value_json(setting.value.as_ref())))
                .collect(),
            seed: origin.seed,
            stopped: names::stopped(origin.stopped).to_owned(),
            objective: best.map_or(0.0, |best| best.plan.objective),
            bound: origin.bound,
            gap: origin.gap,
            expected_new_losses: best.map_or(0.0, |best| best.plan.expected_new_losses),
            by_hand: origin.decisions.iter().map(HandDocument::of).collect(),
            around_decisions: origin.around_decisions,
            unmet: origin.unmet.iter().map(HandDocument::of).collect(),
            plans: found
                .plans
                .iter()
                .map(|found| RankedDocument {
                    rank: found.plan.rank,
                    objective: found.plan.objective,
                    decisions: found.rows.decisions.iter().map(DecisionDocument::of).collect(),
                })
                .collect(),
        }
    }

    /// The policy as it is sent; the key of the first value that is none.
    pub(super) fn policy_settings(&self) -> Result<Vec<PolicySetting>, String> {
        self.policy
            .iter()
            .map(|(key, value)| {
                let value = match value {
                    Value::Null => None,
                    value => Some(PolicyValue { kind: Some(policy_kind(value).ok_or(key)?) }),
                };
                Ok(PolicySetting { key: key.clone(), value })
            })
            .collect()
    }

    /// Why the search stopped, as it is sent.
    pub(super) fn stopped_value(&self) -> i32 {
        let name = format!("STOPPED_{}", self.stopped.to_uppercase());
        Stopped::from_str_name(&name).unwrap_or_default().into()
    }
}

fn policy_kind(value: &Value) -> Option<policy_value::Kind> {
    match value {
        Value::Number(number) => number.as_f64().map(policy_value::Kind::Number),
        Value::String(word) => Some(policy_value::Kind::Text(word.clone())),
        Value::Array(entries) => {
            let directions = entries
                .iter()
                .map(|entry| {
                    Some(DirectionLevels {
                        track_from_deg: entry.get("track_from")?.as_f64()?,
                        track_until_deg: entry.get("track_until")?.as_f64()?,
                        levels_ft: entry
                            .get("levels")?
                            .as_array()?
                            .iter()
                            .map(|level| level.as_f64().map(feet))
                            .collect::<Option<_>>()?,
                    })
                })
                .collect::<Option<_>>()?;
            Some(policy_value::Kind::Levels(DirectionLevelsList { directions }))
        }
        Value::Null | Value::Bool(_) | Value::Object(_) => None,
    }
}

impl DecisionDocument {
    pub(super) fn of(decision: &Decision) -> DecisionDocument {
        DecisionDocument {
            proposal: decision.proposal.clone(),
            flight: decision.flight.clone(),
            verdict: names::verdict(decision.verdict).to_owned(),
            option: decision.option,
            stretches: decision.stretches.iter().map(StretchDocument::of).collect(),
            net_benefit_j: decision.net_benefit,
            contrail_km_avoided: decision.contrail_km_avoided,
            extra_fuel_kg: decision.extra_fuel_kg,
            arrival_shift_s: decision.arrival_shift_s,
            reasons: decision.reasons.iter().map(ReasonDocument::of_reason).collect(),
            exchange: decision.exchange.as_ref().map(|exchange| ExchangeDocument {
                drops: exchange.drops.clone(),
                objective_lost_j: exchange.objective_lost,
                proven: exchange.proven,
            }),
        }
    }

    /// The decision as it is sent; what is wrong with it otherwise.
    pub(super) fn decision(&self) -> Result<Decision, String> {
        let verdict = Verdict::from_str_name(&format!("VERDICT_{}", self.verdict.to_uppercase()))
            .ok_or_else(|| format!("{:?} is no verdict", self.verdict))?;
        Ok(Decision {
            proposal: self.proposal.clone(),
            flight: self.flight.clone(),
            verdict: verdict.into(),
            option: self.option,
            stretches: self
                .stretches
                .iter()
                .map(StretchDocument::stretch)
                .collect::<Result<_, _>>()?,
            net_benefit: self.net_benefit_j,
            contrail_km_avoided: self.contrail_km_avoided,
            extra_fuel_kg: self.extra_fuel_kg,
            arrival_shift_s: self.arrival_shift_s,
            reasons: self
                .reasons
                .iter()
                .map(|reason| reason.reason(self.option))
                .collect::<Result<_, _>>()?,
            exchange: self.exchange.as_ref().map(|exchange| Exchange {
                drops: exchange.drops.clone(),
                objective_lost: exchange.objective_lost_j,
                proven: exchange.proven,
            }),
        })
    }
}

impl StretchDocument {
    pub(crate) fn of(planned: &PlannedStretch) -> StretchDocument {
        let stretch = planned.stretch.unwrap_or_default();
        StretchDocument {
            level_fl: stretch.level_ft / 100.0,
            from_time: rfc3339(stretch.from.as_ref()),
            until_time: rfc3339(stretch.until.as_ref()),
            planned_from: rfc3339(planned.planned_from.as_ref()),
            planned_until: rfc3339(planned.planned_until.as_ref()),
            near_fix: Some(planned.near_fix.clone()).filter(|fix| !fix.is_empty()),
        }
    }

    fn stretch(&self) -> Result<PlannedStretch, String> {
        Ok(PlannedStretch {
            stretch: Some(Stretch {
                level_ft: feet(self.level_fl),
                from: wire(self.from_time.as_deref())?,
                until: wire(self.until_time.as_deref())?,
            }),
            planned_from: wire(self.planned_from.as_deref())?,
            planned_until: wire(self.planned_until.as_deref())?,
            near_fix: self.near_fix.clone().unwrap_or_default(),
        })
    }
}

/// A time as it is sent; what is wrong with it otherwise.
fn wire(time: Option<&str>) -> Result<Option<prost_types::Timestamp>, String> {
    time.map(|text| parse_utc(text.as_bytes()).map(wire_time).map_err(|problem| problem.text))
        .transpose()
}

impl ReasonDocument {
    pub(crate) fn of_reason(reason: &Reason) -> ReasonDocument {
        let constraint = reason.constraint.clone().unwrap_or_default();
        ReasonDocument { option: Some(reason.option), ..ReasonDocument::of(&constraint) }
    }

    /// A constraint, without the option that it is about.
    pub(crate) fn of(constraint: &Constraint) -> ReasonDocument {
        let reason = ReasonDocument {
            kind: names::reason_kind(constraint).to_owned(),
            ..ReasonDocument::default()
        };
        match &constraint.kind {
            None
            | Some(
                Kind::OwnChange(_) | Kind::BetterOption(_) | Kind::NotWorthIt(_) | Kind::ByHand(_),
            ) => reason,
            Some(Kind::Load(load)) => {
                let name = names::place(load.place.as_ref()).to_owned();
                let at_airport = matches!(
                    load.place.as_ref().and_then(|place| place.place.as_ref()),
                    Some(place::Place::Airport(_))
                );
                let (sector, airport) =
                    if at_airport { (None, Some(name)) } else { (Some(name), None) };
                ReasonDocument {
                    sector,
                    airport,
                    from: rfc3339(load.from.as_ref()),
                    until: rfc3339(load.until.as_ref()),
                    count: Some(load.count),
                    limit: Some(load.limit),
                    ..reason
                }
            }
            Some(Kind::Separation(loss)) => ReasonDocument {
                other_flight: Some(loss.other_flight.clone()),
                time: rfc3339(loss.time.as_ref()),
                horizontal_nm: Some(loss.horizontal_nm),
                vertical_ft: Some(loss.vertical_ft),
                ..reason
            },
            Some(Kind::SeparationRisk(risk)) => ReasonDocument {
                other_flight: Some(risk.other_flight.clone()),
                count: Some(risk.probability),
                limit: Some(risk.limit),
                ..reason
            },
            Some(Kind::FuelLimit(fuel)) => ReasonDocument {
                count: Some(fuel.extra_fuel_kg),
                limit: Some(fuel.limit_kg),
                ..reason
            },
            Some(Kind::PlanLimit(limit)) => ReasonDocument {
                rule: Some(limit.key.clone()),
                count: Some(limit.count),
                limit: Some(limit.limit),
                ..reason
            },
            Some(Kind::Invalid(broken)) => ReasonDocument {
                rule: Some(names::rule(broken.rule)),
                sector: broken.sector.clone(),
                restriction: broken.restriction.clone(),
                time: rfc3339(broken.time.as_ref()),
                limit: broken.level_ft.map(|feet| feet / 100.0),
                ..reason
            },
        }
    }

    /// The reason as it is sent; what is wrong with it otherwise.
    fn reason(&self, taken: Option<u32>) -> Result<Reason, String> {
        let (count, limit) = (self.count.unwrap_or(0.0), self.limit.unwrap_or(0.0));
        let other_flight = self.other_flight.clone().unwrap_or_default();
        let time = wire(self.time.as_deref())?;
        let kind = match self.kind.as_str() {
            "separation" => Kind::Separation(SeparationConstraint {
                other_flight,
                time,
                horizontal_nm: self.horizontal_nm.unwrap_or(0.0),
                vertical_ft: self.vertical_ft.unwrap_or(0.0),
            }),
            "separation-risk" => Kind::SeparationRisk(SeparationRiskConstraint {
                other_flight,
                probability: count,
                limit,
            }),
            "own-change" => Kind::OwnChange(OwnChangeConstraint {}),
            "fuel-limit" => {
                Kind::FuelLimit(FuelLimitConstraint { extra_fuel_kg: count, limit_kg: limit })
            }
            "plan-limit" => Kind::PlanLimit(PlanLimitConstraint {
                key: self.rule.clone().unwrap_or_default(),
                count,
                limit,
            }),
            "better-option" => {
                Kind::BetterOption(BetterOptionConstraint { taken: taken.unwrap_or(0) })
            }
            "not-worth-it" => Kind::NotWorthIt(NotWorthItConstraint {}),
            "by-hand" => Kind::ByHand(ByHandConstraint {}),
            "invalid" => Kind::Invalid(self.broken_rule(time)),
            kind => Kind::Load(self.load(load_measure(kind)?)?),
        };
        Ok(Reason {
            option: self.option.unwrap_or(1),
            constraint: Some(Constraint { kind: Some(kind) }),
        })
    }

    fn broken_rule(&self, time: Option<prost_types::Timestamp>) -> BrokenRule {
        let name = self.rule.as_deref().unwrap_or_default().to_uppercase().replace('-', "_");
        let rule = ChangeRule::from_str_name(&format!("CHANGE_RULE_{name}")).unwrap_or_default();
        BrokenRule {
            rule: rule.into(),
            level_ft: self.limit.map(feet),
            track_deg: None,
            sector: self.sector.clone(),
            time,
            restriction: self.restriction.clone(),
        }
    }

    fn load(&self, measure: LoadMeasure) -> Result<LoadConstraint, String> {
        let place = match (&self.sector, &self.airport) {
            (Some(sector), _) => Some(place::Place::Sector(sector.clone())),
            (None, Some(airport)) => Some(place::Place::Airport(airport.clone())),
            (None, None) => None,
        };
        Ok(LoadConstraint {
            place: Some(Place { place }),
            measure: measure.into(),
            from: wire(self.from.as_deref())?,
            until: wire(self.until.as_deref())?,
            count: self.count.unwrap_or(0.0),
            limit: self.limit.unwrap_or(0.0),
        })
    }
}

fn load_measure(kind: &str) -> Result<LoadMeasure, String> {
    match kind {
        "sector-entries" => Ok(LoadMeasure::Entries),
        "sector-occupancy" => Ok(LoadMeasure::Occupancy),
        "sector-lasting" => Ok(LoadMeasure::Lasting),
        "sector-level-changes" => Ok(LoadMeasure::LevelChanges),
        "airport-arrivals" => Ok(LoadMeasure::Arrivals),
        "airport-departures" => Ok(LoadMeasure::Departures),
        other => Err(format!("{other:?} is no kind of reason")),
    }
}
