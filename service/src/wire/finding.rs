//! What an audit found, to the wire, in plain words.

use rimeshift_engine::answer::LoadMeasure;
use rimeshift_engine::audit::{
    AuditReport, Checked, Figure, Finding, NotJudged, ReasonKind, WrittenFault,
};
use rimeshift_engine::day::HandSubject;
use rimeshift_engine::units::m_to_nm;
use rimeshift_proto::v1;
use rimeshift_proto::v1::FindingKind as Kind;

use super::answer::Answers;
use super::to_wire::count;

/// Most findings that an answer lists.
const MOST_FINDINGS: usize = 1000;

/// The report as an answer.
pub(crate) fn report(answers: Answers<'_>, report: &AuditReport) -> v1::AuditPlanResponse {
    let listed = report.findings.iter().take(MOST_FINDINGS);
    v1::AuditPlanResponse {
        findings: listed.map(|found| finding(answers, found)).collect(),
        finding_count: count(report.findings.len()),
        checked: Some(checked(report.checked)),
        not_judged: report.not_judged.iter().map(|&it| not_judged(it).into()).collect(),
    }
}

fn checked(checked: Checked) -> v1::AuditChecked {
    v1::AuditChecked {
        decisions: checked.decisions,
        options_derived: checked.options_derived,
        moved_flights: checked.moved_flights,
        pairs_followed: checked.pairs_followed,
        losses: checked.losses,
        visits: checked.visits,
        windows: checked.windows,
        minutes: checked.minutes,
        undecided_counts: checked.undecided_counts,
        figures: checked.figures,
        written_points: checked.written_points,
        options_tried: checked.options_tried,
    }
}

fn not_judged(what: NotJudged) -> v1::NotJudged {
    match what {
        NotJudged::Separation => v1::NotJudged::Separation,
        NotJudged::ShiftsBetweenSamples => v1::NotJudged::ShiftsBetweenSamples,
        NotJudged::Objective => v1::NotJudged::Objective,
        NotJudged::Maximality => v1::NotJudged::Maximality,
        NotJudged::GrantRate => v1::NotJudged::GrantRate,
        NotJudged::Fuel => v1::NotJudged::Fuel,
    }
}

/// A finding of a kind, in words; what it is about is added by the caller.
fn said(kind: Kind, message: impl Into<String>) -> v1::Finding {
    v1::Finding { kind: kind.into(), message: message.into(), ..Default::default() }
}

/// One finding. A single match without a wildcard, so that the compiler points here when the audit
/// learns to find something else.
fn finding(answers: Answers<'_>, finding: &Finding) -> v1::Finding {
    let about = |id| Some(answers.proposal(id));
    let of = |proposal, kind, message: String| v1::Finding {
        proposal: answers.proposal(proposal),
        ..said(kind, message)
    };
    let flies = |flight, kind, message: String| v1::Finding {
        flight: answers.flight(flight),
        ..said(kind, message)
    };
    match finding {
        Finding::DecisionMissing { proposal } => {
            of(*proposal, Kind::Decision, "the proposal has no decision".into())
        }
        Finding::DecisionRepeated { proposal } => {
            of(*proposal, Kind::Decision, "the proposal has several decisions".into())
        }
        Finding::UnknownProposal { proposal } => {
            of(*proposal, Kind::Decision, "the day has no such proposal".into())
        }
        Finding::WrongFlight { proposal, claimed, flight } => v1::Finding {
            flight: answers.flight(*claimed),
            ..of(
                *proposal,
                Kind::Decision,
                format!("the proposal is about flight `{}`", answers.flight(*flight)),
            )
        },
        Finding::VerdictMismatch { proposal, .. } => {
            of(*proposal, Kind::Decision, "verdict and option contradict each other".into())
        }
        Finding::UnknownOption { proposal, option } => {
            of(*proposal, Kind::Decision, format!("the proposal has no option {option}"))
        }
        Finding::StretchesDiffer { proposal } => {
            of(*proposal, Kind::Decision, "the stretches are not those of the option".into())
        }
        Finding::BreaksRule { proposal, option, rule } => {
            let rule = answers.rule(rule);
            let message = format!("option {option} is granted and breaks the rule {}", word(&rule));
            with_rule(of(*proposal, Kind::Rule, message), rule)
        }
        Finding::OwnChangesOverlap { flight } => {
            flies(*flight, Kind::Rule, "grants of the flight exclude each other".into())
        }
        Finding::ChangedWhereForbidden { flight, rule } => {
            let rule = answers.rule(rule);
            let message = format!("the changed flight breaks the rule {}", word(&rule));
            with_rule(flies(*flight, Kind::Rule, message), rule)
        }
        Finding::NotInvalid { proposal, option } => of(
            *proposal,
            Kind::Decision,
            format!("it is called invalid, but option {option} keeps every rule"),
        ),
        Finding::ShouldBeInvalid { proposal, rule } => {
            let rule = answers.rule(rule);
            let message =
                format!("every option breaks a rule (the first: {}): it is invalid", word(&rule));
            with_rule(of(*proposal, Kind::Decision, message), rule)
        }
        Finding::NewLoss {
            first, second, shift_s, closest_s, horizontal_m, vertical_ft, ..
        } => {
            let nm = m_to_nm(*horizontal_m);
            let shifted = match *shift_s == 0.0 {
                true => String::new(),
                false => format!(" with the other flight {shift_s:.0} s late"),
            };
            v1::Finding {
                other_flight: answers.flight(*second),
                time: answers.time(*closest_s),
                found: Some(nm),
                ..flies(
                    *first,
                    Kind::Separation,
                    format!("a new loss: {nm:.2} NM and {vertical_ft:.0} ft apart{shifted}"),
                )
            }
        }
        Finding::Overload { place, measure, from_s, count, filed, limit, .. } => v1::Finding {
            place: Some(answers.place(*place)),
            time: answers.time(*from_s),
            claimed: Some(limit.max(*filed)),
            found: Some(*count),
            ..said(
                Kind::Load,
                format!(
                    "{} {count:.6} with {filed:.6} filed and a limit of {limit:.6}",
                    measure_word(*measure)
                ),
            )
        },
        Finding::PolicyLimit { key, flight, proposal, value, limit } => v1::Finding {
            flight: flight.map(|id| answers.flight(id)).unwrap_or_default(),
            proposal: proposal.and_then(about).unwrap_or_default(),
            claimed: Some(*limit),
            found: Some(*value),
            ..said(Kind::PlanLimit, format!("{key} is {limit}, and the plan has {value}"))
        },
        Finding::NotAsDecided { decision } => v1::Finding {
            proposal: match decision.about {
                HandSubject::Proposal(id) => about(id).unwrap_or_default(),
                HandSubject::Flight(_) => String::new(),
            },
            flight: match decision.about {
                HandSubject::Flight(id) => answers.flight(id),
                HandSubject::Proposal(_) => String::new(),
            },
            ..said(Kind::PlanLimit, "a decision by hand was not kept".to_owned())
        },
        Finding::FuelLimit { proposal, extra_fuel_kg, limit_kg } => v1::Finding {
            claimed: Some(*limit_kg),
            found: Some(*extra_fuel_kg),
            ..of(
                *proposal,
                Kind::PlanLimit,
                format!("{extra_fuel_kg:.1} kg of extra fuel, {limit_kg:.1} kg accepted"),
            )
        },
        Finding::WrongFigure { figure, proposal, claimed, found } => v1::Finding {
            proposal: proposal.and_then(about).unwrap_or_default(),
            claimed: *claimed,
            found: Some(*found),
            ..said(Kind::Figure, wrong_figure(*figure, *claimed, *found))
        },
        Finding::BoundBelowObjective { bound, objective } => v1::Finding {
            claimed: Some(*bound),
            found: Some(*objective),
            ..said(
                Kind::Figure,
                format!("the bound {bound:e} is below the objective {objective:e}"),
            )
        },
        Finding::WrittenMissing { flight } => {
            flies(*flight, Kind::Profile, "the moved flight has no written profile".into())
        }
        Finding::WrittenUnexpected { flight } => flies(
            *flight,
            Kind::Profile,
            "a profile is written twice, or of a flight that is not moved".into(),
        ),
        Finding::WrittenOff { flight, fault, time_s, off } => v1::Finding {
            time: answers.time(*time_s),
            found: Some(*off),
            ..flies(*flight, Kind::Profile, written_fault(*fault, *off))
        },
        Finding::CouldAdd { proposal, option, gain } => v1::Finding {
            found: Some(*gain),
            ..of(
                *proposal,
                Kind::Maximality,
                format!("option {option} could be added alone and would gain {gain:e}"),
            )
        },
        Finding::CouldSwitch { proposal, option, gain } => v1::Finding {
            found: Some(*gain),
            ..of(
                *proposal,
                Kind::Maximality,
                format!("option {option} instead would gain {gain:e}"),
            )
        },
        Finding::CouldDrop { proposal, net_benefit } => v1::Finding {
            found: Some(*net_benefit),
            ..of(
                *proposal,
                Kind::Maximality,
                format!("it gains {net_benefit:e} and makes room for nothing"),
            )
        },
        Finding::ReasonMissing { proposal } => of(
            *proposal,
            Kind::Reason,
            "nothing says why the option as asked was left aside".into(),
        ),
        Finding::FalseReason { proposal, option, kind } => of(
            *proposal,
            Kind::Reason,
            format!("the reason `{}` for option {option} is not true", reason_word(*kind)),
        ),
        Finding::ExchangeDropsNothing { proposal, dropped } => of(
            *proposal,
            Kind::Reason,
            format!("the exchange drops `{}`, which is not granted", answers.proposal(*dropped)),
        ),
    }
}

/// The rule's name without its prefix, in lower case: `above-ceiling`.
fn word(rule: &v1::BrokenRule) -> String {
    rule.rule().as_str_name().trim_start_matches("CHANGE_RULE_").to_lowercase().replace('_', "-")
}

fn with_rule(finding: v1::Finding, rule: v1::BrokenRule) -> v1::Finding {
    let place =
        rule.sector.map(|sector| v1::Place { place: Some(v1::place::Place::Sector(sector)) });
    v1::Finding { place, time: rule.time, ..finding }
}

fn measure_word(measure: LoadMeasure) -> &'static str {
    match measure {
        LoadMeasure::Entries => "entries",
        LoadMeasure::Occupancy => "occupancy",
        LoadMeasure::Lasting => "lasting occupancy",
        LoadMeasure::LevelChanges => "level changes",
        LoadMeasure::Arrivals => "arrivals",
        LoadMeasure::Departures => "departures",
    }
}

fn reason_word(kind: ReasonKind) -> &'static str {
    match kind {
        ReasonKind::Load(measure) => measure_word(measure),
        ReasonKind::Separation => "separation",
        ReasonKind::SeparationRisk => "separation-risk",
        ReasonKind::OwnChange => "own-change",
        ReasonKind::FuelLimit => "fuel-limit",
        ReasonKind::PlanLimit => "plan-limit",
        ReasonKind::BetterOption => "better-option",
        ReasonKind::NotWorthIt => "not-worth-it",
        ReasonKind::ByHand => "by-hand",
        ReasonKind::Invalid => "invalid",
    }
}

fn wrong_figure(figure: Figure, claimed: Option<f64>, found: f64) -> String {
    let (name, unit) = match figure {
        Figure::NetBenefit => ("net benefit", ""),
        Figure::ContrailKm => ("contrail kilometres avoided", " km"),
        Figure::ExtraFuel => ("extra fuel", " kg"),
        Figure::ArrivalShift => ("arrival shift", " s"),
        Figure::PlannedFrom => ("planned start of a stretch", " s of the day"),
        Figure::PlannedUntil => ("planned end of a stretch", " s of the day"),
        Figure::Objective => ("objective", ""),
        Figure::ObjectiveLost => ("net benefit lost by an exchange", ""),
        Figure::Gap => ("gap", ""),
    };
    match claimed {
        Some(claimed) => format!("the {name} is said to be {claimed}{unit} and is {found}{unit}"),
        None => format!("the {name} is not said and is {found}{unit}"),
    }
}

fn written_fault(fault: WrittenFault, off: f64) -> String {
    match fault {
        WrittenFault::TooFewPoints => "the written profile has fewer than two points".to_owned(),
        WrittenFault::TimeOrder => "times of the written profile do not increase".to_owned(),
        WrittenFault::Ends => format!("the written profile begins or ends {off:.3} s off"),
        WrittenFault::Place => format!("the written profile is {off:.1} m off"),
        WrittenFault::Level => format!("the written profile is {off:.1} ft off"),
    }
}
