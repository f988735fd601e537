//! The report of the policy.

use super::cautions;
use super::figures::counted;
use super::sheet::{Sheet, words};
use crate::screen::Layout;
use rimeshift_proto::v1::policy_value::Kind;
use rimeshift_proto::v1::{PolicyKey, PolicyValue};
use serde_json::{Value, json};

/// The keys of a policy.
#[derive(Debug)]
pub(crate) struct PolicyReport {
    /// Whether the values are those of a day.
    pub(crate) of_day: bool,
    /// The keys in the order in which they are best shown.
    pub(crate) keys: Vec<PolicyKey>,
}

impl PolicyReport {
    /// The report for people.
    pub(crate) fn text(&self, layout: Layout) -> String {
        let changed = self.keys.iter().filter(|key| key.value != key.default_value).count() as u64;
        let of = if self.of_day {
            format!("{} set by the day", counted(changed, "value", "values"))
        } else {
            "the defaults".to_owned()
        };
        let keys = self.keys.len() as u64;
        let mut sheet = Sheet::answer(
            layout,
            &format!("{}: {of}.", counted(keys, "policy key", "policy keys")),
        );
        let rows = self
            .keys
            .iter()
            .map(|key| {
                [
                    key.key.clone(),
                    key.unit.clone(),
                    shown(key.value.as_ref()),
                    shown(key.default_value.as_ref()),
                    key.meaning.clone(),
                    key.source.clone(),
                ]
            })
            .collect();
        let columns = [
            words("key"),
            words("unit"),
            words("value"),
            words("default"),
            words("meaning"),
            words("source of the default"),
        ];
        sheet.table("Policy", columns, rows, 0);
        sheet.finish()
    }

    /// The report for programs.
    pub(crate) fn json(&self) -> String {
        let keys: Vec<Value> = self
            .keys
            .iter()
            .map(|key| {
                json!({
                    "key": key.key,
                    "unit": key.unit,
                    "value": value_json(key.value.as_ref()),
                    "default": value_json(key.default_value.as_ref()),
                    "meaning": key.meaning,
                    "source": key.source,
                })
            })
            .collect();
        format!("{:#}\n", json!({"policy": keys, "cautions": [cautions::FULL]}))
    }
}

/// A value as files hold it; null where there is no limit.
pub(crate) fn value_json(value: Option<&PolicyValue>) -> Value {
    match value.and_then(|value| value.kind.as_ref()) {
        None => Value::Null,
        Some(Kind::Number(number)) => json!(number),
        Some(Kind::Text(word)) => json!(word),
        Some(Kind::Levels(list)) => list
            .directions
            .iter()
            .map(|entry| {
                json!({
                    "track_from": entry.track_from_deg,
                    "track_until": entry.track_until_deg,
                    "levels": entry.levels_ft.iter().map(|feet| feet / 100.0).collect::<Vec<_>>(),
                })
            })
            .collect(),
    }
}

fn shown(value: Option<&PolicyValue>) -> String {
    match value.and_then(|value| value.kind.as_ref()) {
        None => "not set".to_owned(),
        Some(Kind::Number(number)) if number.abs() >= 1e6 => format!("{number:e}"),
        Some(Kind::Number(number)) => number.to_string(),
        Some(Kind::Text(word)) => word.clone(),
        Some(Kind::Levels(list)) => list
            .directions
            .iter()
            .map(|entry| {
                let levels: Vec<String> =
                    entry.levels_ft.iter().map(|feet| (feet / 100.0).to_string()).collect();
                format!(
                    "{}°–{}°: {}",
                    entry.track_from_deg,
                    entry.track_until_deg,
                    levels.join(" ")
                )
            })
            .collect::<Vec<_>>()
            .join("; "),
    }
}
