//! Policy settings of the wire to a policy, and back.

use rimeshift_engine::day::{DirectionLevels, KEYS, Policy, PolicyKey, PolicyValue};
use rimeshift_proto::v1;

use super::fields::Fields;

/// Sets the given keys in a policy. `refused` are keys that may not be given here, and why.
pub(crate) fn apply(
    settings: Vec<v1::PolicySetting>,
    policy: &mut Policy,
    refused: &[(&str, &str)],
    fields: &mut Fields,
) {
    let mut given: Vec<&str> = Vec::new();
    for (i, setting) in settings.into_iter().enumerate() {
        let Some(key) = PolicyKey::find(&setting.key) else {
            fields.push(
                || format!("policy[{i}].key"),
                format!("`{}` is no key of the policy", setting.key),
                "ListPolicyKeys names all keys",
            );
            continue;
        };
        if given.contains(&key.name) {
            fields.push(
                || format!("policy.{}", key.name),
                "is given twice",
                "give each key at most once",
            );
        }
        given.push(key.name);
        if let Some((_, why)) = refused.iter().find(|(name, _)| *name == key.name) {
            fields.push(|| format!("policy.{}", key.name), "can't be given here", *why);
            continue;
        }
        let value = value_from_wire(setting.value);
        if let Err(error) = key.set(policy, &value) {
            fields.push(|| format!("policy.{}", key.name), error.problem, error.hint);
        }
    }
}

/// Adds what contradicts itself between keys.
pub(crate) fn contradictions(policy: &Policy, fields: &mut Fields) {
    for (key, error) in policy.contradictions() {
        fields.push(|| format!("policy.{key}"), error.problem, error.hint);
    }
}

/// Whether a key has another value in one policy than in another.
pub(crate) fn differs(key: &str, a: &Policy, b: &Policy) -> bool {
    PolicyKey::find(key).is_some_and(|key| key.get(a) != key.get(b))
}

fn value_from_wire(value: Option<v1::PolicyValue>) -> PolicyValue {
    use v1::policy_value::Kind;
    match value.and_then(|value| value.kind) {
        None => PolicyValue::Unset,
        Some(Kind::Number(n)) => PolicyValue::Number(n),
        Some(Kind::Text(text)) => PolicyValue::Text(text),
        Some(Kind::Levels(list)) => PolicyValue::Levels(
            list.directions
                .into_iter()
                .map(|d| DirectionLevels {
                    track_from_deg: d.track_from_deg,
                    track_until_deg: d.track_until_deg,
                    levels_ft: d.levels_ft,
                })
                .collect(),
        ),
    }
}

fn value_to_wire(value: PolicyValue) -> Option<v1::PolicyValue> {
    use v1::policy_value::Kind;
    let kind = match value {
        PolicyValue::Unset => return None,
        PolicyValue::Number(n) => Kind::Number(n),
        PolicyValue::Text(text) => Kind::Text(text),
        PolicyValue::Levels(list) => Kind::Levels(v1::DirectionLevelsList {
            directions: list
                .into_iter()
                .map(|d| v1::DirectionLevels {
                    track_from_deg: d.track_from_deg,
                    track_until_deg: d.track_until_deg,
                    levels_ft: d.levels_ft,
                })
                .collect(),
        }),
    };
    Some(v1::PolicyValue { kind: Some(kind) })
}

/// Every key with its value.
pub(crate) fn settings(policy: &Policy) -> Vec<v1::PolicySetting> {
    KEYS.iter()
        .map(|key| v1::PolicySetting {
            key: key.name.to_owned(),
            value: value_to_wire(key.get(policy)),
        })
        .collect()
}

/// Every key with all that is known about it.
pub(crate) fn keys(policy: &Policy) -> Vec<v1::PolicyKey> {
    let defaults = Policy::default();
    KEYS.iter()
        .map(|key| v1::PolicyKey {
            key: key.name.to_owned(),
            unit: key.unit.to_owned(),
            meaning: key.meaning.to_owned(),
            source: key.source.to_owned(),
            value: value_to_wire(key.get(policy)),
            default_value: value_to_wire(key.get(&defaults)),
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_setting_survives_the_wire() {
        let mut changed = Policy::default();
        let levels = PolicyValue::Levels(vec![DirectionLevels {
            track_from_deg: 0.0,
            track_until_deg: 360.0,
            levels_ft: vec![31_000.0],
        }]);
        PolicyKey::find("level_direction").unwrap().set(&mut changed, &levels).unwrap();
        changed.max_moved_flights = Some(3.0);
        let mut back = Policy::default();
        let mut fields = Fields::default();
        apply(settings(&changed), &mut back, &[], &mut fields);
        assert!(fields.is_empty());
        assert_eq!(back, changed);
    }

    #[test]
    fn unknown_repeated_and_refused_keys_are_named() {
        let number = |key: &str, n: f64| v1::PolicySetting {
            key: key.to_owned(),
            value: value_to_wire(PolicyValue::Number(n)),
        };
        let given = vec![
            number("horizontal_miles", 5.0),
            number("buffer_s", 5.0),
            number("buffer_s", 6.0),
            number("time_sigma_s", f64::NAN),
            number("level_snap_ft", 50.0),
        ];
        let mut fields = Fields::default();
        apply(given, &mut Policy::default(), &[("level_snap_ft", "why")], &mut fields);
        let paths: Vec<_> = fields.into_defects().into_iter().map(|d| d.path).collect();
        assert_eq!(
            paths,
            ["policy[0].key", "policy.buffer_s", "policy.time_sigma_s", "policy.level_snap_ft"]
        );
    }
}
