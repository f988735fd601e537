//! Resource names: `days/{day}` and `days/{day}/plans/{plan}` (AIP-122).

use std::fmt;

use crate::error::ServiceError;

/// Longest id.
const LONGEST_ID: usize = 63;
/// Longest id that leaves room for a rank.
const LONGEST_RANKABLE: usize = 60;
const HINT: &str = "1 to 63 lower-case letters, digits and hyphens, no hyphen at either end";

/// The id of a day or plan: 1 to 63 lower-case letters, digits and hyphens (RFC 1034 but for the
/// first character, which may be a digit, as in dates).
#[derive(Debug, Clone, PartialEq, Eq, PartialOrd, Ord)]
pub(crate) struct ResourceId(String);

impl ResourceId {
    /// Checks an id given in the field `path`.
    pub(crate) fn parse(path: &str, id: &str) -> Result<Self, ServiceError> {
        let good = (1..=LONGEST_ID).contains(&id.len())
            && id.bytes().all(|b| b.is_ascii_lowercase() || b.is_ascii_digit() || b == b'-')
            && !id.starts_with('-')
            && !id.ends_with('-');
        if good {
            Ok(Self(id.to_owned()))
        } else {
            Err(ServiceError::bad_field(path, format!("`{id}` is no id"), HINT))
        }
    }

    /// Checks an id to which ranks are to be added: it must leave room for them.
    pub(crate) fn parse_rankable(path: &str, id: &str) -> Result<Self, ServiceError> {
        if id.len() > LONGEST_RANKABLE {
            let problem = format!("`{id}` is too long");
            let hint = format!("at most {LONGEST_RANKABLE} characters, as ranks are added");
            return Err(ServiceError::bad_field(path, problem, hint));
        }
        Self::parse(path, id)
    }

    /// The id of the plan of this rank: itself for the best, else with the rank behind it.
    pub(crate) fn ranked(&self, rank: usize) -> Self {
        if rank <= 1 { self.clone() } else { Self(format!("{}-{rank}", self.0)) }
    }
}

impl fmt::Display for ResourceId {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(&self.0)
    }
}

/// The name of a day.
#[derive(Debug, Clone, PartialEq, Eq, PartialOrd, Ord)]
pub(crate) struct DayName(pub(crate) ResourceId);

impl DayName {
    /// Checks a name given in the field `path`.
    pub(crate) fn parse(path: &str, name: &str) -> Result<Self, ServiceError> {
        match name.split('/').collect::<Vec<_>>().as_slice() {
            ["days", day] => Ok(Self(ResourceId::parse(path, day)?)),
            _ => Err(ServiceError::bad_field(
                path,
                format!("`{name}` is no name of a day"),
                "days/{day}",
            )),
        }
    }

    /// The name of a plan of this day.
    pub(crate) fn plan(&self, id: ResourceId) -> PlanName {
        PlanName { day: self.clone(), id }
    }
}

impl fmt::Display for DayName {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "days/{}", self.0)
    }
}

/// The name of a kept plan.
#[derive(Debug, Clone, PartialEq, Eq, PartialOrd, Ord)]
pub(crate) struct PlanName {
    /// Its day.
    pub(crate) day: DayName,
    /// Its id.
    pub(crate) id: ResourceId,
}

impl PlanName {
    /// Checks a name given in the field `path`.
    pub(crate) fn parse(path: &str, name: &str) -> Result<Self, ServiceError> {
        match name.split('/').collect::<Vec<_>>().as_slice() {
            ["days", day, "plans", plan] => Ok(Self {
                day: DayName(ResourceId::parse(path, day)?),
                id: ResourceId::parse(path, plan)?,
            }),
            _ => Err(ServiceError::bad_field(
                path,
                format!("`{name}` is no name of a plan"),
                "days/{day}/plans/{plan}",
            )),
        }
    }
}

impl fmt::Display for PlanName {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}/plans/{}", self.day, self.id)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn names_are_read_and_written() {
        for name in ["days/2031-03-04", "days/a"] {
            assert_eq!(DayName::parse("name", name).unwrap().to_string(), name);
        }
        let plan = PlanName::parse("name", "days/a/plans/night-1").unwrap();
        assert_eq!(plan.to_string(), "days/a/plans/night-1");
        assert_eq!(plan.id.ranked(1), plan.id);
        assert_eq!(plan.id.ranked(2).to_string(), "night-1-2");
    }

    #[test]
    fn anything_else_is_refused() {
        let long = format!("days/{}", "a".repeat(64));
        for name in
            ["", "days", "days/", "days/A", "days/a b", "days/-a", "days/a/", "day/a", &long]
        {
            assert!(DayName::parse("name", name).is_err(), "{name}");
        }
        for name in ["days/a", "days/a/plans/", "days/a/plans/b/c", "days//plans/b"] {
            assert!(PlanName::parse("name", name).is_err(), "{name}");
        }
    }
}
