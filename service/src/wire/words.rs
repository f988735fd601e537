//! Decisions by hand and reasons in words, for errors.

use rimeshift_engine::answer::{Constraint, LoadMeasure, Place, Reason};
use rimeshift_engine::day::{HandDecision, HandSubject, Must};
use rimeshift_engine::units::m_to_nm;

use super::answer::Answers;

impl Answers<'_> {
    /// A decision by hand, in words.
    pub(crate) fn hand_decision(&self, decision: &HandDecision) -> String {
        let about = match decision.about {
            HandSubject::Proposal(id) => format!("proposal `{}`", self.proposal(id)),
            HandSubject::Flight(id) => format!("flight `{}`", self.flight(id)),
        };
        match decision.must {
            Must::Grant { option: Some(option) } => format!("grant {about} with option {option}"),
            Must::Grant { option: None } => format!("grant {about}"),
            Must::Refuse => format!("refuse {about}"),
            Must::Keep => format!("keep {about} as filed"),
        }
    }

    /// A reason, in words.
    pub(crate) fn in_words(&self, reason: &Reason) -> String {
        let what = match &reason.constraint {
            Constraint::Load { place, measure, from_s, count, limit, .. } => {
                let place = match *place {
                    Place::Sector(id) => format!("sector `{}`", self.sector(id)),
                    Place::Airport(id) => {
                        self.day.airports.get(id).map_or_else(String::new, |airport| {
                            format!("airport `{}`", airport.code)
                        })
                    }
                };
                format!(
                    "{} of {place} from {} would be {count} where {limit} is allowed",
                    measure_in_words(*measure),
                    clock_time(*from_s)
                )
            }
            Constraint::Separation { other, time_s, horizontal_m, vertical_ft } => format!(
                "a loss of separation with flight `{}` at {} ({:.2} NM, {:.0} ft)",
                self.flight(*other),
                clock_time(*time_s),
                m_to_nm(*horizontal_m),
                vertical_ft.floor()
            ),
            Constraint::SeparationRisk { other, probability, limit } => format!(
                "a loss with flight `{}` would have probability {probability:.3} where {limit:.3} \
                 is allowed",
                self.flight(*other)
            ),
            Constraint::OwnChange => "another grant of the same flight".to_owned(),
            Constraint::FuelLimit { extra_fuel_kg, limit_kg } => {
                format!("{extra_fuel_kg:.1} kg of extra fuel where {limit_kg:.1} kg is accepted")
            }
            Constraint::PlanLimit { key, count, limit } => {
                format!("policy key `{key}`: {count} where {limit} is allowed")
            }
            Constraint::BetterOption { taken } => format!("option {taken} is taken"),
            Constraint::NotWorthIt => "its net benefit is not positive".to_owned(),
            Constraint::ByHand => "other decisions by hand".to_owned(),
            Constraint::Invalid(rule) => {
                let name = self.rule(rule).rule().as_str_name().to_lowercase().replace('_', " ");
                let name = name.trim_start_matches("change rule ");
                format!("it breaks a rule of level changes ({name})")
            }
        };
        format!("option {}: {what}", reason.option)
    }
}

fn measure_in_words(measure: LoadMeasure) -> &'static str {
    match measure {
        LoadMeasure::Entries => "entries an hour",
        LoadMeasure::Occupancy => "occupancy",
        LoadMeasure::Lasting => "lasting occupancy",
        LoadMeasure::LevelChanges => "level changes an hour",
        LoadMeasure::Arrivals => "arrivals an hour",
        LoadMeasure::Departures => "departures an hour",
    }
}

/// A time of the day, `06:15:30`.
fn clock_time(time_s: f64) -> String {
    let part = |size_s: f64, of: f64| (time_s / size_s).floor().rem_euclid(of);
    let hours = (time_s / 3600.0).floor();
    format!("{hours:02.0}:{:02.0}:{:02.0}", part(60.0, 60.0), part(1.0, 60.0))
}
