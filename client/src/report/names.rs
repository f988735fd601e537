//! The words for what the service names by number. Every value of an enumeration has its word in
//! files and JSON (kebab case) and, where people read it, a phrase.

use crate::report::figures;
use rimeshift_proto::v1::constraint::Kind;
use rimeshift_proto::v1::hand_decision::About;
use rimeshift_proto::v1::{
    BrokenRule, ChangeRule, Constraint, FindingKind, HandDecision, LoadMeasure, LossVersion, Must,
    Place, Stopped, Verdict, place,
};

/// A measure in load rows of files and JSON.
pub(crate) fn load_column(measure: i32) -> &'static str {
    match LoadMeasure::try_from(measure).unwrap_or_default() {
        LoadMeasure::Unspecified => "unknown",
        LoadMeasure::Entries => "entries",
        LoadMeasure::Occupancy => "occupancy-max",
        LoadMeasure::Lasting => "occupancy-lasting",
        LoadMeasure::LevelChanges => "level-changes",
        LoadMeasure::Arrivals => "arrivals",
        LoadMeasure::Departures => "departures",
    }
}

/// A measure for people.
pub(crate) fn measure(measure: i32) -> &'static str {
    match LoadMeasure::try_from(measure).unwrap_or_default() {
        LoadMeasure::Unspecified => "count",
        LoadMeasure::Entries => "entries an hour",
        LoadMeasure::Occupancy => "occupancy",
        LoadMeasure::Lasting => "lasting occupancy",
        LoadMeasure::LevelChanges => "level changes an hour",
        LoadMeasure::Arrivals => "arrivals an hour",
        LoadMeasure::Departures => "departures an hour",
    }
}

/// The kind of reason that a load constraint is, in files and JSON.
fn load_reason(measure: i32) -> &'static str {
    match LoadMeasure::try_from(measure).unwrap_or_default() {
        LoadMeasure::Unspecified => "unknown",
        LoadMeasure::Entries => "sector-entries",
        LoadMeasure::Occupancy => "sector-occupancy",
        LoadMeasure::Lasting => "sector-lasting",
        LoadMeasure::LevelChanges => "sector-level-changes",
        LoadMeasure::Arrivals => "airport-arrivals",
        LoadMeasure::Departures => "airport-departures",
    }
}

/// The kind of a constraint in files and JSON.
pub(crate) fn reason_kind(constraint: &Constraint) -> &'static str {
    match &constraint.kind {
        None => "unknown",
        Some(Kind::Load(load)) => load_reason(load.measure),
        Some(Kind::Separation(_)) => "separation",
        Some(Kind::SeparationRisk(_)) => "separation-risk",
        Some(Kind::OwnChange(_)) => "own-change",
        Some(Kind::FuelLimit(_)) => "fuel-limit",
        Some(Kind::PlanLimit(_)) => "plan-limit",
        Some(Kind::BetterOption(_)) => "better-option",
        Some(Kind::NotWorthIt(_)) => "not-worth-it",
        Some(Kind::ByHand(_)) => "by-hand",
        Some(Kind::Invalid(_)) => "invalid",
    }
}

/// The name of a sector or airport; empty where there is none.
pub(crate) fn place(place: Option<&Place>) -> &str {
    match place.and_then(|place| place.place.as_ref()) {
        Some(place::Place::Sector(name) | place::Place::Airport(name)) => name,
        None => "",
    }
}

/// A verdict.
pub(crate) fn verdict(verdict: i32) -> &'static str {
    match Verdict::try_from(verdict).unwrap_or_default() {
        Verdict::Unspecified => "unknown",
        Verdict::Granted => "granted",
        Verdict::Amended => "amended",
        Verdict::Refused => "refused",
        Verdict::Invalid => "invalid",
    }
}

/// Why a search stopped.
pub(crate) fn stopped(stopped: i32) -> &'static str {
    match Stopped::try_from(stopped).unwrap_or_default() {
        Stopped::Unspecified => "unknown",
        Stopped::Optimal => "optimal",
        Stopped::Gap => "gap",
        Stopped::Work => "work",
        Stopped::Time => "time",
        Stopped::Cancelled => "cancelled",
    }
}

/// In which version of the day a loss occurs.
pub(crate) fn loss_version(version: i32) -> &'static str {
    match LossVersion::try_from(version).unwrap_or_default() {
        LossVersion::Unspecified => "unknown",
        LossVersion::Filed => "filed",
        LossVersion::Planned => "planned",
        LossVersion::Both => "both",
    }
}

/// What kind of thing an audit found.
pub(crate) fn finding_kind(kind: i32) -> &'static str {
    match FindingKind::try_from(kind).unwrap_or_default() {
        FindingKind::Unspecified => "unknown",
        FindingKind::Decision => "decision",
        FindingKind::Rule => "rule",
        FindingKind::Separation => "separation",
        FindingKind::Load => "load",
        FindingKind::PlanLimit => "plan-limit",
        FindingKind::Figure => "figure",
        FindingKind::Profile => "profile",
        FindingKind::Reason => "reason",
        FindingKind::Maximality => "maximality",
    }
}

/// A rule of level changes in files and JSON.
pub(crate) fn rule(rule: i32) -> String {
    let rule = ChangeRule::try_from(rule).unwrap_or_default();
    let name = rule.as_str_name().trim_start_matches("CHANGE_RULE_");
    name.to_lowercase().replace('_', "-")
}

/// A decision by hand, in words.
pub(crate) fn hand_decision(decision: &HandDecision) -> String {
    let about = match &decision.about {
        Some(About::Proposal(name)) => format!("proposal {name}"),
        Some(About::Flight(name)) => format!("flight {name}"),
        None => "?".to_owned(),
    };
    match (Must::try_from(decision.must).unwrap_or_default(), decision.option) {
        (Must::Unspecified, _) => about,
        (Must::Grant, Some(option)) => format!("grant {about} with option {option}"),
        (Must::Grant, None) => format!("grant {about}"),
        (Must::Refuse, _) => format!("refuse {about}"),
        (Must::Keep, _) => format!("keep {about} as filed"),
    }
}

/// A broken rule for people.
pub(crate) fn broken_rule(broken: &BrokenRule) -> String {
    let level = broken.level_ft.map_or_else(String::new, figures::flight_level);
    match ChangeRule::try_from(broken.rule).unwrap_or_default() {
        ChangeRule::Unspecified => "it breaks a rule that this version does not know".to_owned(),
        ChangeRule::NotMovable => "the flight is marked not movable".to_owned(),
        ChangeRule::NoCruise => "the flight has no cruise".to_owned(),
        ChangeRule::FromNotInCruise => {
            "it would begin where the flight is not in cruise".to_owned()
        }
        ChangeRule::UntilNotInCruise => "it would end where the flight is not in cruise".to_owned(),
        ChangeRule::OutsideFlight => "a time lies outside the filed profile".to_owned(),
        ChangeRule::EndsBeforeItBegins => "it ends before it begins".to_owned(),
        ChangeRule::BeginsInCruise => {
            "it is to begin from the climb, but the flight's first point is in cruise".to_owned()
        }
        ChangeRule::EndsInCruise => {
            "it is to last until the descent, but the flight's last point is in cruise".to_owned()
        }
        ChangeRule::NotPassedInClimb => "the filed climb never passes this level".to_owned(),
        ChangeRule::NotPassedInDescent => "the filed descent never passes this level".to_owned(),
        ChangeRule::NoRoomToReach => {
            "the level can't be reached before the return would begin".to_owned()
        }
        ChangeRule::NoRoomToReturn => {
            "the return would not end while the flight still cruises".to_owned()
        }
        ChangeRule::StretchesOverlap => "two stretches overlap".to_owned(),
        ChangeRule::AboveCeiling => format!("the aircraft's ceiling is {level}"),
        ChangeRule::BelowFloor => format!("the cruise floor is {level}"),
        ChangeRule::SameLevel => "it is the level filed there".to_owned(),
        ChangeRule::WrongDirection => match broken.track_deg {
            Some(track_deg) => {
                format!("it is no level of the direction of flight ({track_deg:.0}°)")
            }
            None => "it is no level of the direction of flight".to_owned(),
        },
        ChangeRule::NotRvsm => {
            "the flight is not approved for RVSM and may not be moved to FL 290–410".to_owned()
        }
        ChangeRule::NoChangesSector => format!(
            "it would be off its filed level in sector {} at {}, which is marked no_changes",
            broken.sector.as_deref().unwrap_or("?"),
            figures::second(broken.time.as_ref())
        ),
        ChangeRule::Restriction => format!(
            "it would be inside restriction {} at {}, where the flight is not as filed",
            broken.restriction.as_deref().unwrap_or("?"),
            figures::second(broken.time.as_ref())
        ),
    }
}

/// A constraint for people, in one line.
pub(crate) fn constraint(constraint: &Constraint) -> String {
    match &constraint.kind {
        None => "something that this version does not know".to_owned(),
        Some(Kind::Load(load)) => format!(
            "{} {} {}: {} where {} is allowed",
            place(load.place.as_ref()),
            measure(load.measure),
            figures::period(load.from.as_ref(), load.until.as_ref()),
            figures::count(load.count),
            figures::count(load.limit)
        ),
        Some(Kind::Separation(loss)) => format!(
            "a loss of separation with {} at {}: {} NM, {} ft",
            loss.other_flight,
            figures::second(loss.time.as_ref()),
            figures::lost_nm(loss.horizontal_nm),
            figures::lost_ft(loss.vertical_ft)
        ),
        Some(Kind::SeparationRisk(risk)) => format!(
            "the probability of a loss with {}: {:.3} where {:.3} is allowed",
            risk.other_flight, risk.probability, risk.limit
        ),
        Some(Kind::OwnChange(_)) => "another grant of the same flight".to_owned(),
        Some(Kind::FuelLimit(fuel)) => format!(
            "extra fuel of {:.1} kg where its sender accepts {:.1} kg",
            fuel.extra_fuel_kg, fuel.limit_kg
        ),
        Some(Kind::PlanLimit(limit)) => format!(
            "policy {}: {} where {} is allowed",
            limit.key,
            figures::count(limit.count),
            figures::count(limit.limit)
        ),
        Some(Kind::BetterOption(better)) => {
            format!("option {} is better for the plan", better.taken)
        }
        Some(Kind::NotWorthIt(_)) => "its net benefit is not positive".to_owned(),
        Some(Kind::ByHand(_)) => "it was decided so by hand".to_owned(),
        Some(Kind::Invalid(broken)) => broken_rule(broken),
    }
}
