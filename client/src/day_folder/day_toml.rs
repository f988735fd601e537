//! `day.toml`: the date, the region, other names for files, and the policy.

use crate::tables::findings::{Findings, Problem, nearest, shown};
use crate::tables::rows::feet;
use crate::tables::whole_file::read_text;
use jiff::civil::Date;
use rimeshift_proto::v1::policy_value::Kind;
use rimeshift_proto::v1::{DirectionLevels, DirectionLevelsList, PolicySetting, PolicyValue};
use std::collections::BTreeMap;
use std::path::Path;
use toml::Spanned;
use toml::de::{DeTable, DeValue};

/// The file's name.
pub(super) const FILE: &str = "day.toml";

/// The tables that `[files]` may rename.
pub(super) const TABLES: [&str; 13] = [
    "sectors",
    "capacity",
    "airports",
    "airport_capacity",
    "flights",
    "points",
    "restrictions",
    "aircraft",
    "fuel",
    "proposals",
    "decisions",
    "background",
    "flows",
];

/// What `day.toml` says.
#[derive(Debug, Default)]
pub(super) struct DayToml {
    pub(super) date: Option<Date>,
    pub(super) region: String,
    pub(super) files: BTreeMap<String, String>,
    /// Settings in the order of the file.
    pub(super) policy: Vec<PolicySetting>,
    /// The line of each setting.
    pub(super) policy_lines: Vec<usize>,
}

impl DayToml {
    /// How an error names a setting of the policy.
    pub(super) fn policy_place(&self, index: usize) -> Option<String> {
        let line = *self.policy_lines.get(index)?;
        let key = &self.policy.get(index)?.key;
        Some(format!("{FILE}:{line}: key policy.{key}"))
    }

    /// The same, by the setting's key.
    pub(super) fn policy_place_of(&self, key: &str) -> Option<String> {
        self.policy_place(self.policy.iter().position(|setting| setting.key == key)?)
    }
}

/// Reads `day.toml`. A policy key that is not one of `policy_keys` is a defect.
pub(super) fn read(folder: &Path, policy_keys: &[String], findings: &mut Findings) -> DayToml {
    let mut day = DayToml::default();
    let Some(text) = read_text(&folder.join(FILE), FILE, &mut findings.defects) else {
        return day;
    };
    let mut reader = Reader { text: &text, findings, policy_keys };
    match DeTable::parse(&text) {
        Ok(table) => reader.day(table.get_ref(), &mut day),
        Err(error) => {
            let line = error.span().map_or(1, |span| line_of(&text, span.start));
            let problem = format!("is not TOML: {}", error.message());
            reader.findings.defects.add(format!("{FILE}:{line}"), problem);
        }
    }
    day
}

/// The line of a place in the text, from 1.
fn line_of(text: &str, offset: usize) -> usize {
    1 + text.bytes().take(offset).filter(|byte| *byte == b'\n').count()
}

struct Reader<'a> {
    text: &'a str,
    findings: &'a mut Findings,
    policy_keys: &'a [String],
}

type Key<'i> = Spanned<std::borrow::Cow<'i, str>>;

impl Reader<'_> {
    fn day(&mut self, table: &DeTable<'_>, day: &mut DayToml) {
        for (key, value) in in_file_order(table) {
            match key.get_ref().as_ref() {
                "date" => day.date = self.date(key, value.get_ref()),
                "region" => match value.get_ref().as_str() {
                    Some(region) => day.region = region.to_owned(),
                    None => self.reject(key, "", Problem::new("is not text")),
                },
                "files" => self.files(key, value.get_ref(), day),
                "policy" => self.policy(key, value.get_ref(), day),
                unknown => {
                    let problem = unknown_key(unknown, ["date", "region", "files", "policy"]);
                    self.reject(key, "", problem);
                }
            }
        }
        for (missing, absent, hint) in [
            ("date", day.date.is_none() && !table.contains_key("date"), "date = 2031-03-04"),
            ("region", !table.contains_key("region"), "region = \"…\""),
        ] {
            if absent {
                let problem = Problem::with_hint(format!("has no {missing}"), hint);
                self.findings.defects.add_problem(FILE, problem);
            }
        }
    }

    fn date(&mut self, key: &Key<'_>, value: &DeValue<'_>) -> Option<Date> {
        let text = match value {
            DeValue::String(text) => text.to_string(),
            DeValue::Datetime(time) => time.to_string(),
            other => describe(other),
        };
        let date = text.parse().ok().filter(|_| text.len() == "2031-03-04".len());
        if date.is_none() {
            let problem = format!("{} is no date", shown(&text));
            self.reject(key, "", Problem::with_hint(problem, "date = 2031-03-04"));
        }
        date
    }

    fn files(&mut self, key: &Key<'_>, value: &DeValue<'_>, day: &mut DayToml) {
        let Some(table) = value.as_table() else {
            return self.reject(key, "", Problem::new("is no table"));
        };
        for (key, value) in in_file_order(table) {
            let name = key.get_ref().as_ref();
            match value.get_ref().as_str() {
                _ if !TABLES.contains(&name) => {
                    self.reject(key, "files.", unknown_key(name, TABLES));
                }
                Some(file) if !file.is_empty() => {
                    day.files.insert(name.to_owned(), file.to_owned());
                }
                _ => self.reject(key, "files.", Problem::new("is no file name")),
            }
        }
    }

    fn policy(&mut self, key: &Key<'_>, value: &DeValue<'_>, day: &mut DayToml) {
        let Some(table) = value.as_table() else {
            return self.reject(key, "", Problem::new("is no table"));
        };
        for (key, value) in in_file_order(table) {
            let name = key.get_ref().as_ref();
            if !self.policy_keys.iter().any(|known| known == name) {
                let known = self.policy_keys.iter().map(String::as_str);
                self.reject(key, "policy.", unknown_key(name, known));
                continue;
            }
            match policy_value(value.get_ref()) {
                Ok(kind) => {
                    let value = Some(PolicyValue { kind: Some(kind) });
                    day.policy.push(PolicySetting { key: name.to_owned(), value });
                    day.policy_lines.push(line_of(self.text, key.span().start));
                }
                Err(problem) => self.reject(key, "policy.", problem),
            }
        }
    }

    fn reject(&mut self, key: &Key<'_>, within: &str, problem: Problem) {
        let line = line_of(self.text, key.span().start);
        let place = format!("{FILE}:{line}: key {within}{}", key.get_ref());
        self.findings.defects.add_problem(place, problem);
    }
}

/// The entries of a table as they follow each other in the file.
fn in_file_order<'t, 'i>(table: &'t DeTable<'i>) -> Vec<(&'t Key<'i>, &'t Spanned<DeValue<'i>>)> {
    let mut entries: Vec<_> = table.iter().collect();
    entries.sort_by_key(|(key, _)| key.span().start);
    entries
}

fn unknown_key<'k>(key: &str, known: impl IntoIterator<Item = &'k str>) -> Problem {
    let text = "is no key that is known here".to_owned();
    Problem { text, hint: nearest(key, known).map(|near| format!("was {near} meant?")) }
}

/// A policy value as it is sent: a number, a word, or levels by direction.
fn policy_value(value: &DeValue<'_>) -> Result<Kind, Problem> {
    match value {
        DeValue::String(word) => Ok(Kind::Text(word.to_string())),
        DeValue::Array(entries) => {
            let directions = entries
                .iter()
                .map(|entry| direction_levels(entry.get_ref()))
                .collect::<Result<_, _>>()?;
            Ok(Kind::Levels(DirectionLevelsList { directions }))
        }
        other => Ok(Kind::Number(number(other)?)),
    }
}

fn direction_levels(value: &DeValue<'_>) -> Result<DirectionLevels, Problem> {
    let hint = "a list of {track_from = 0, track_until = 180, levels = [310, 330]}";
    let table = value
        .as_table()
        .ok_or_else(|| Problem::with_hint(format!("{} is no such entry", describe(value)), hint))?;
    let field = |name: &str| {
        table
            .get(name)
            .map(Spanned::get_ref)
            .ok_or_else(|| Problem::with_hint(format!("an entry has no {name}"), hint))
    };
    let levels =
        field("levels")?.as_array().ok_or_else(|| Problem::with_hint("levels is no list", hint))?;
    if table.len() != 3 {
        return Err(Problem::with_hint("an entry has keys that are not known", hint));
    }
    Ok(DirectionLevels {
        track_from_deg: number(field("track_from")?)?,
        track_until_deg: number(field("track_until")?)?,
        levels_ft: levels
            .iter()
            .map(|level| number(level.get_ref()).map(feet))
            .collect::<Result<_, _>>()?,
    })
}

fn number(value: &DeValue<'_>) -> Result<f64, Problem> {
    let parsed = match value {
        DeValue::Float(float) => float.as_str().replace('_', "").parse().ok(),
        DeValue::Integer(integer) => {
            let digits = integer.as_str().replace('_', "");
            #[expect(clippy::cast_precision_loss, reason = "no key needs more than 53 bits")]
            i64::from_str_radix(&digits, integer.radix()).ok().map(|whole| whole as f64)
        }
        _ => None,
    };
    match parsed {
        Some(number) if f64::is_finite(number) => Ok(number),
        _ => Err(Problem::new(format!("{} is no finite number", describe(value)))),
    }
}

fn describe(value: &DeValue<'_>) -> String {
    match value {
        DeValue::String(text) => shown(text),
        DeValue::Integer(integer) => integer.as_str().to_owned(),
        DeValue::Float(float) => float.as_str().to_owned(),
        DeValue::Boolean(flag) => flag.to_string(),
        DeValue::Datetime(time) => time.to_string(),
        DeValue::Array(_) => "a list".to_owned(),
        DeValue::Table(_) => "a table".to_owned(),
    }
}
