//! The rules by which a day is judged: one struct, and one table that says of every key what it
//! means, its unit, its default and where that comes from.
//!
//! Adding a key: a field here, its default, and one row of [`KEYS`]. Reading it from files and the
//! wire, printing it and checking its range follow from the row.

use std::fmt;

/// How losses of separation decide about a plan.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum SeparationRule {
    /// At the planned times.
    Nominal,
    /// With `buffer_s` of time error on each flight.
    Buffered,
    /// By the probability of a loss under normal time errors.
    Risk,
    /// Expected new losses are paid for in the objective.
    Priced,
}

/// What the objective adds up.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum ObjectiveRule {
    /// Contrail forcing avoided (times the forcing ratio) less the forcing of the extra CO2, J.
    NetForcing,
    /// A weighted sum of contrail kilometres and kilograms of fuel.
    Weights,
}

/// The cruising levels of each direction of flight.
#[derive(Debug, Clone, PartialEq)]
pub enum LevelDirection {
    /// ICAO Annex 2, Appendix 3, RVSM table.
    Semicircular,
    /// Any level in any direction.
    Free,
    /// A list of one's own; overlapping entries add up.
    List(Vec<DirectionLevels>),
}

/// The levels of one range of tracks.
#[derive(Debug, Clone, PartialEq)]
pub struct DirectionLevels {
    /// First track of the range, degrees, included.
    pub track_from_deg: f64,
    /// End of the range, degrees, not included.
    pub track_until_deg: f64,
    /// Levels allowed on these tracks, feet.
    pub levels_ft: Vec<f64>,
}

/// The rules by which a day is judged. Each field is the key of the same name of day files.
#[derive(Debug, Clone, PartialEq)]
#[expect(missing_docs, reason = "each field is documented by its row of KEYS")]
pub struct Policy {
    pub horizontal_nm: f64,
    pub separation_floor_fl: f64,
    pub cruise_floor_fl: f64,
    pub level_snap_ft: f64,
    pub separation: SeparationRule,
    pub buffer_s: f64,
    pub time_sigma_s: f64,
    pub max_pair_probability: f64,
    pub loss_price_j: f64,
    pub same_loss_s: f64,
    pub known_loss_margin_nm: f64,
    pub entry_step_min: f64,
    pub lasting_min: f64,
    pub min_visit_s: f64,
    pub rejoin_s: f64,
    pub level_direction: LevelDirection,
    pub variation_deg: f64,
    pub rhi_threshold: f64,
    pub contrail_night_j_per_m: f64,
    pub contrail_day_j_per_m: f64,
    pub contrail_life_h: f64,
    pub contrail_erf_ratio: f64,
    pub co2_horizon_years: f64,
    pub co2_agwp_w_yr_per_m2_kg: Option<f64>,
    pub objective: ObjectiveRule,
    pub contrail_km_weight: f64,
    pub fuel_kg_weight: f64,
    pub min_difference: f64,
    pub max_combinations: f64,
    pub max_moved_flights: Option<f64>,
    pub max_changes_per_flight: Option<f64>,
    pub max_arrival_shift_s: Option<f64>,
    pub min_grant_rate_per_operator: Option<f64>,
    pub max_share_per_operator: Option<f64>,
}

impl Default for Policy {
    fn default() -> Self {
        Self {
            horizontal_nm: 5.0,
            separation_floor_fl: 245.0,
            cruise_floor_fl: 245.0,
            level_snap_ft: 0.0,
            separation: SeparationRule::Nominal,
            buffer_s: 0.0,
            time_sigma_s: 300.0,
            max_pair_probability: 0.05,
            loss_price_j: 1e13,
            same_loss_s: 120.0,
            known_loss_margin_nm: 0.5,
            entry_step_min: 20.0,
            lasting_min: 10.0,
            min_visit_s: 0.0,
            rejoin_s: 0.0,
            level_direction: LevelDirection::Semicircular,
            variation_deg: 0.0,
            rhi_threshold: 1.0,
            contrail_night_j_per_m: 9e8,
            contrail_day_j_per_m: 1.3e8,
            contrail_life_h: 3.0,
            contrail_erf_ratio: 0.42,
            co2_horizon_years: 100.0,
            co2_agwp_w_yr_per_m2_kg: None,
            objective: ObjectiveRule::NetForcing,
            contrail_km_weight: 1.0,
            fuel_kg_weight: 0.0,
            min_difference: 1.0,
            max_combinations: 4096.0,
            max_moved_flights: None,
            max_changes_per_flight: None,
            max_arrival_shift_s: None,
            min_grant_rate_per_operator: None,
            max_share_per_operator: None,
        }
    }
}

/// The value of a key, as files and the wire carry it.
#[derive(Debug, Clone, PartialEq)]
pub enum PolicyValue {
    /// A number in the key's unit.
    Number(f64),
    /// A word.
    Text(String),
    /// A list of directions and their levels (`level_direction` only).
    Levels(Vec<DirectionLevels>),
    /// No limit.
    Unset,
}

impl fmt::Display for PolicyValue {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::Number(n) => write!(f, "{n}"),
            Self::Text(t) => f.write_str(t),
            Self::Levels(list) => write!(f, "a list of {} directions", list.len()),
            Self::Unset => f.write_str("no limit"),
        }
    }
}

/// What is wrong with a value given for a key.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[error("{problem}")]
pub struct PolicyError {
    /// What is wrong, naming the value.
    pub problem: String,
    /// What would be right.
    pub hint: String,
}

type Get = fn(&Policy) -> PolicyValue;
type Set = fn(&mut Policy, &PolicyValue) -> Result<(), PolicyError>;

/// One key of the policy.
#[derive(Clone, Copy)]
pub struct PolicyKey {
    /// Its name.
    pub name: &'static str,
    /// Its unit, blank where it has none.
    pub unit: &'static str,
    /// What it means.
    pub meaning: &'static str,
    /// Where its default comes from.
    pub source: &'static str,
    get: Get,
    set: Set,
}

impl fmt::Debug for PolicyKey {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.debug_struct("PolicyKey").field("name", &self.name).finish_non_exhaustive()
    }
}

impl PolicyKey {
    /// The key of that name.
    #[must_use]
    pub fn find(name: &str) -> Option<&'static Self> {
        KEYS.iter().find(|key| key.name == name)
    }

    /// Its value in a policy.
    #[must_use]
    pub fn get(&self, policy: &Policy) -> PolicyValue {
        (self.get)(policy)
    }

    /// Sets it in a policy.
    ///
    /// # Errors
    /// The value is of another kind or out of range.
    pub fn set(&self, policy: &mut Policy, value: &PolicyValue) -> Result<(), PolicyError> {
        (self.set)(policy, value)
    }
}

fn number(value: &PolicyValue, least: f64, most: f64) -> Result<f64, PolicyError> {
    let hint = || format!("a number from {least} to {most}");
    match value {
        PolicyValue::Number(n) if n.is_finite() && (least..=most).contains(n) => Ok(*n),
        other => Err(PolicyError { problem: format!("`{other}` is out of range"), hint: hint() }),
    }
}

fn whole(value: &PolicyValue, least: f64, most: f64) -> Result<f64, PolicyError> {
    let n = number(value, least, most)?;
    if n.fract() == 0.0 {
        Ok(n)
    } else {
        Err(PolicyError {
            problem: format!("`{n}` is not a whole number"),
            hint: format!("a whole number from {least} to {most}"),
        })
    }
}

fn word<T: Copy>(value: &PolicyValue, words: &[(&str, T)]) -> Result<T, PolicyError> {
    if let PolicyValue::Text(text) = value
        && let Some((_, found)) = words.iter().find(|(name, _)| name == text)
    {
        return Ok(*found);
    }
    let names: Vec<_> = words.iter().map(|(name, _)| format!("\"{name}\"")).collect();
    Err(PolicyError {
        problem: format!("`{value}` is not known here"),
        hint: format!("one of {}", names.join(", ")),
    })
}

fn word_of<T: Copy + PartialEq>(value: T, words: &[(&str, T)]) -> PolicyValue {
    let name = words.iter().find(|(_, v)| *v == value).map_or("", |(name, _)| name);
    PolicyValue::Text(name.to_owned())
}

fn unset_or(value: Option<f64>) -> PolicyValue {
    value.map_or(PolicyValue::Unset, PolicyValue::Number)
}

const SEPARATIONS: &[(&str, SeparationRule)] = &[
    ("nominal", SeparationRule::Nominal),
    ("buffered", SeparationRule::Buffered),
    ("risk", SeparationRule::Risk),
    ("priced", SeparationRule::Priced),
];

const OBJECTIVES: &[(&str, ObjectiveRule)] =
    &[("net-forcing", ObjectiveRule::NetForcing), ("weights", ObjectiveRule::Weights)];

fn direction(value: &PolicyValue) -> Result<LevelDirection, PolicyError> {
    let hint = || {
        "\"semicircular\", \"free\", or a list of { track_from, track_until, levels } \
         with 0 <= track_from < track_until <= 360"
            .to_owned()
    };
    match value {
        PolicyValue::Text(text) if text == "semicircular" => Ok(LevelDirection::Semicircular),
        PolicyValue::Text(text) if text == "free" => Ok(LevelDirection::Free),
        PolicyValue::Levels(list) => {
            for entry in list {
                let range = 0.0 <= entry.track_from_deg
                    && entry.track_from_deg < entry.track_until_deg
                    && entry.track_until_deg <= 360.0;
                if !range || !entry.levels_ft.iter().all(|l| l.is_finite()) {
                    return Err(PolicyError {
                        problem: format!(
                            "the entry from {} to {} is no range of tracks with levels",
                            entry.track_from_deg, entry.track_until_deg
                        ),
                        hint: hint(),
                    });
                }
            }
            Ok(LevelDirection::List(list.clone()))
        }
        other => Err(PolicyError { problem: format!("`{other}` is not known here"), hint: hint() }),
    }
}

macro_rules! key {
    ($field:ident, $unit:literal, $least:expr, $most:expr, $source:literal, $meaning:literal) => {
        PolicyKey {
            name: stringify!($field),
            unit: $unit,
            meaning: $meaning,
            source: $source,
            get: |p| PolicyValue::Number(p.$field),
            set: |p, v| number(v, $least, $most).map(|n| p.$field = n),
        }
    };
    (whole $field:ident, $unit:literal, $least:expr, $most:expr, $source:literal, $meaning:literal) => {
        PolicyKey {
            set: |p, v| whole(v, $least, $most).map(|n| p.$field = n),
            ..key!($field, $unit, $least, $most, $source, $meaning)
        }
    };
    (limit $field:ident, $unit:literal, $least:expr, $most:expr, $source:literal, $meaning:literal) => {
        PolicyKey {
            name: stringify!($field),
            unit: $unit,
            meaning: $meaning,
            source: $source,
            get: |p| unset_or(p.$field),
            set: |p, v| {
                p.$field = match v {
                    PolicyValue::Unset => None,
                    given => Some(number(given, $least, $most)?),
                };
                Ok(())
            },
        }
    };
}

/// Every key of the policy, in the order in which they are shown.
pub const KEYS: &[PolicyKey] = &[
    key!(
        horizontal_nm,
        "NM",
        0.0,
        200.0,
        "ICAO Doc 4444, 8.7.3",
        "horizontal separation minimum; a sector may set its own"
    ),
    key!(
        separation_floor_fl,
        "FL",
        -20.0,
        660.0,
        "ours",
        "losses are looked for where both flights are at or above this level"
    ),
    key!(
        cruise_floor_fl,
        "FL",
        -20.0,
        660.0,
        "ours",
        "level flight at or above this level is cruise; no change goes below it"
    ),
    key!(
        level_snap_ft,
        "ft",
        0.0,
        250.0,
        "ours",
        "recorded levels this close to a multiple of 500 ft are taken as that level"
    ),
    PolicyKey {
        name: "separation",
        unit: "",
        meaning: "how losses decide: nominal, buffered, risk or priced",
        source: "ours",
        get: |p| word_of(p.separation, SEPARATIONS),
        set: |p, v| word(v, SEPARATIONS).map(|rule| p.separation = rule),
    },
    key!(buffer_s, "s", 0.0, 3600.0, "ours", "time error allowed to each flight (buffered)"),
    key!(
        time_sigma_s,
        "s",
        1.0,
        7200.0,
        "ours, from Paielli & Erzberger 1997 and the European slot window of -5/+10 min",
        "standard deviation of each flight's time error a day ahead"
    ),
    key!(max_pair_probability, "", 0.0, 1.0, "ours", "largest probability of a loss (risk)"),
    key!(loss_price_j, "J", 0.0, 1e18, "ours", "price of one expected new loss (priced)"),
    key!(
        same_loss_s,
        "s",
        0.0,
        86_400.0,
        "ours",
        "a planned loss this close in time to a filed one of the same pair may be the known one"
    ),
    key!(
        known_loss_margin_nm,
        "NM",
        0.0,
        200.0,
        "ours",
        "a known loss may come this much closer than the filed one"
    ),
    key!(whole entry_step_min, "min", 1.0, 60.0, "common practice; (EU) 2019/317, annex I, 3",
        "60-minute windows start at every multiple of this"),
    key!(whole lasting_min, "min", 1.0, 240.0, "ours",
        "occupancy above its lasting limit at this many minutes before too is an overload"),
    key!(min_visit_s, "s", 0.0, 3600.0, "ours", "visits shorter than this are not counted"),
    key!(rejoin_s, "s", 0.0, 3600.0, "ours", "visits less than this apart count as one"),
    PolicyKey {
        name: "level_direction",
        unit: "",
        meaning: "levels by direction of flight: semicircular, free, or a list of one's own",
        source: "ICAO Annex 2, Appendix 3 (RVSM)",
        get: |p| match &p.level_direction {
            LevelDirection::Semicircular => PolicyValue::Text("semicircular".to_owned()),
            LevelDirection::Free => PolicyValue::Text("free".to_owned()),
            LevelDirection::List(list) => PolicyValue::Levels(list.clone()),
        },
        set: |p, v| direction(v).map(|rule| p.level_direction = rule),
    },
    key!(
        variation_deg,
        "deg",
        -180.0,
        180.0,
        "ours",
        "magnetic variation, east positive; magnetic track is true track less this"
    ),
    key!(
        rhi_threshold,
        "",
        0.5,
        2.0,
        "ours",
        "relative humidity over ice from which a contrail persists"
    ),
    key!(
        contrail_night_j_per_m,
        "J/m",
        -1e12,
        1e12,
        "ours, crude: from the global mean (Teoh et al. 2024; Stuber et al. 2006)",
        "energy forcing of a metre of persistent contrail by night"
    ),
    key!(
        contrail_day_j_per_m,
        "J/m",
        -1e12,
        1e12,
        "ours, crude: from the global mean (Teoh et al. 2024; Stuber et al. 2006)",
        "energy forcing of a metre of persistent contrail by day; may be negative"
    ),
    key!(
        contrail_life_h,
        "h",
        0.0,
        48.0,
        "ours",
        "hours over which night and day of a contrail are weighed"
    ),
    key!(
        contrail_erf_ratio,
        "",
        0.0,
        5.0,
        "Lee et al. 2021, from memory; widely spread",
        "effective over instantaneous forcing of contrails"
    ),
    key!(whole co2_horizon_years, "yr", 20.0, 100.0, "IPCC AR6, from memory",
        "horizon of the CO2 warming: 20 or 100 years"),
    key!(limit co2_agwp_w_yr_per_m2_kg, "W yr/(m2 kg)", 0.0, 1e-10, "IPCC AR6, from memory",
        "the CO2's absolute global warming potential outright; else by horizon"),
    PolicyKey {
        name: "objective",
        unit: "",
        meaning: "what a plan adds up: net-forcing or weights",
        source: "ours",
        get: |p| word_of(p.objective, OBJECTIVES),
        set: |p, v| word(v, OBJECTIVES).map(|rule| p.objective = rule),
    },
    key!(contrail_km_weight, "1/km", 0.0, 1e9, "ours", "worth of a contrail kilometre (weights)"),
    key!(fuel_kg_weight, "1/kg", 0.0, 1e9, "ours", "cost of a kilogram of fuel (weights)"),
    key!(whole min_difference, "", 1.0, 1e6, "ours",
        "flights in which each further plan differs from every better one"),
    key!(whole max_combinations, "", 1.0, 1e6, "ours",
        "most compatible combinations of options of one flight"),
    key!(limit max_moved_flights, "", 0.0, 1e7, "ours", "most flights that a plan may move"),
    key!(limit max_changes_per_flight, "", 0.0, 1e6, "ours", "most granted options of one flight"),
    key!(limit max_arrival_shift_s, "s", 0.0, 86_400.0, "ours",
        "largest arrival shift, early or late, of an option"),
    key!(limit min_grant_rate_per_operator, "", 0.0, 1.0, "ours",
        "smallest share of each operator's proposals that a plan grants"),
    key!(limit max_share_per_operator, "", 0.0, 1.0, "ours",
        "largest share of all grants that one operator may have"),
];

impl Policy {
    /// Absolute global warming potential of CO2 in force, W yr m⁻² kg⁻¹.
    ///
    /// IPCC AR6 values, from memory: 8.95e-14 over 100 years, 2.43e-14 over 20.
    #[must_use]
    pub fn co2_agwp(&self) -> f64 {
        self.co2_agwp_w_yr_per_m2_kg.unwrap_or(if self.co2_horizon_years < 50.0 {
            2.43e-14
        } else {
            8.95e-14
        })
    }

    /// Length of a slice, and step from one 60-minute window to the next, seconds.
    #[must_use]
    pub fn entry_step_s(&self) -> f64 {
        self.entry_step_min * crate::units::SECONDS_PER_MINUTE
    }

    /// What contradicts itself between keys that are each in range.
    #[must_use]
    pub fn contradictions(&self) -> Vec<(&'static str, PolicyError)> {
        let mut found = Vec::new();
        if self.co2_horizon_years != 20.0 && self.co2_horizon_years != 100.0 {
            found.push((
                "co2_horizon_years",
                PolicyError {
                    problem: format!("no value is known for {} years", self.co2_horizon_years),
                    hint: "20 or 100, or give co2_agwp_w_yr_per_m2_kg".to_owned(),
                },
            ));
        }
        found
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_default_is_accepted_by_its_own_key() {
        let defaults = Policy::default();
        let mut copy = Policy { horizontal_nm: 9.0, ..Policy::default() };
        for key in KEYS {
            let value = key.get(&defaults);
            assert_eq!(key.set(&mut copy, &value), Ok(()), "{}", key.name);
        }
        assert_eq!(copy, defaults);
        assert!(defaults.contradictions().is_empty());
    }

    #[test]
    fn a_value_out_of_range_is_named() {
        let key = PolicyKey::find("horizontal_nm").unwrap();
        let error = key.set(&mut Policy::default(), &PolicyValue::Number(f64::NAN)).unwrap_err();
        assert!(error.problem.contains("NaN"), "{error}");
        assert!(
            PolicyKey::find("separation")
                .unwrap()
                .set(&mut Policy::default(), &PolicyValue::Text("none".into()))
                .is_err()
        );
    }
}
