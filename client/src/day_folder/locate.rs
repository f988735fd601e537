//! From the path of a field as the service names it back to file, line and column.

use super::DayFolder;

/// One step of a path: a field and, where it is a list, the index of an entry.
#[derive(Debug, PartialEq, Eq)]
struct Step<'a> {
    field: &'a str,
    index: Option<usize>,
}

impl DayFolder {
    /// Where the field of that path stands in the folder: `flights[12].points[3].level_ft` may be
    /// `points.csv:340: column level_fl`. A path that leads to no row of the folder is given back
    /// as it is.
    pub(crate) fn place_of(&self, path: &str) -> String {
        self.locate(path).unwrap_or_else(|| path.to_owned())
    }

    /// A text of the service in which paths of rows are named as files name them.
    pub(crate) fn in_file_terms(&self, text: &str) -> String {
        let is_path = |letter: char| letter.is_ascii_alphanumeric() || "_[].".contains(letter);
        let mut out = String::with_capacity(text.len());
        let mut rest = text;
        while let Some(start) = rest.find(is_path) {
            let (before, tail) = rest.split_at(start);
            let length = tail.find(|letter| !is_path(letter)).unwrap_or(tail.len());
            let (word, after) = tail.split_at(length);
            let path = word.trim_end_matches('.');
            out.push_str(before);
            match path.contains('[').then(|| self.locate(path)).flatten() {
                Some(place) => out.push_str(&place),
                None => out.push_str(path),
            }
            out.push_str(word.get(path.len()..).unwrap_or_default());
            rest = after;
        }
        out.push_str(rest);
        out
    }

    fn locate(&self, path: &str) -> Option<String> {
        let steps: Vec<Step<'_>> =
            path.split('.').filter(|part| !part.is_empty()).map(step).collect::<Option<_>>()?;
        let steps = match steps.as_slice() {
            [Step { field: "rows" | "header" | "content", index: None }, rest @ ..] => rest,
            all => all,
        };
        let (table, rest) = steps.split_first()?;
        let Some(row) = table.index else {
            return match table.field {
                "date" | "region" => Some(format!("day.toml: key {}", table.field)),
                "policy" => self.day.policy_place_of(rest.first()?.field),
                _ => None,
            };
        };
        let column = rest.first().map(|step| column_of(step.field));
        match table.field {
            "policy" => self.day.policy_place(row),
            "sectors" => self.locate_sector(row, rest),
            "capacities" => self.capacities.place(row, column),
            "airports" => self.airports.place(row, column),
            "airport_capacities" => self.airport_capacities.place(row, column),
            "aircraft" => self.aircraft.place(row, column),
            "fuel" => self.fuel.place(row, column.filter(|column| *column != "flow")),
            "flights" => self.locate_flight(row, rest),
            "proposals" => self.locate_proposal(row, rest),
            "restrictions" => self.locate_restriction(row, rest),
            "background" => self.background.place(row, column),
            "flows" => self.flows.place(row, column),
            "decisions" => self.decisions.place(row, column),
            _ => None,
        }
    }

    fn locate_sector(&self, sector: usize, rest: &[Step<'_>]) -> Option<String> {
        match rest {
            [Step { field: "volumes", index }, inner @ ..] => {
                self.sectors.place(sector, index.unwrap_or(0), level_of_volume(inner))
            }
            [Step { field, .. }, ..] => self.sectors.place(sector, 0, Some(column_of(field))),
            [] => self.sectors.place(sector, 0, None),
        }
    }

    fn locate_restriction(&self, restriction: usize, rest: &[Step<'_>]) -> Option<String> {
        match rest {
            [Step { field: "volumes", .. }, inner @ ..] => {
                self.restrictions.place(restriction, level_of_volume(inner))
            }
            [Step { field, .. }, ..] => {
                self.restrictions.place(restriction, Some(column_of(field)))
            }
            [] => self.restrictions.place(restriction, None),
        }
    }

    fn locate_flight(&self, flight: usize, rest: &[Step<'_>]) -> Option<String> {
        match rest {
            [Step { field: "points", index: Some(point) }, inner @ ..] => {
                let column = inner.first().map(|step| column_of(step.field));
                self.point_lines.place(flight, *point, column)
            }
            [Step { field: "points", index: None }, Step { field, index: Some(point) }] => {
                self.point_lines.place(flight, *point, Some(column_of(field)))
            }
            [Step { field: "points", index: None }, ..] => self.flights.place(flight, None),
            [Step { field, .. }, ..] => self.flights.place(flight, Some(column_of(field))),
            [] => self.flights.place(flight, None),
        }
    }

    fn locate_proposal(&self, proposal: usize, rest: &[Step<'_>]) -> Option<String> {
        match rest {
            [Step { field: "options", index }, inner @ ..] => {
                let option = index.unwrap_or(0);
                match inner {
                    [Step { field: "stretches", index }, inner @ ..] => {
                        let column = inner.first().map(|step| match step.field {
                            "from" => "from_time",
                            "until" => "until_time",
                            field => column_of(field),
                        });
                        self.proposals.place(proposal, option, index.unwrap_or(0), column)
                    }
                    [Step { field: "figures", .. }, Step { field, .. }, ..] => {
                        self.proposals.place(proposal, option, 0, Some(column_of(field)))
                    }
                    [Step { field, .. }, ..] => {
                        self.proposals.place(proposal, option, 0, Some(column_of(field)))
                    }
                    [] => self.proposals.place(proposal, option, 0, None),
                }
            }
            [Step { field, .. }, ..] => {
                self.proposals.place(proposal, 0, 0, Some(column_of(field)))
            }
            [] => self.proposals.place(proposal, 0, 0, None),
        }
    }
}

/// The property in which a field of a volume stands, if it has one of its own.
fn level_of_volume(rest: &[Step<'_>]) -> Option<&'static str> {
    match rest.first()?.field {
        "floor_ft" => Some("floor_fl"),
        "ceiling_ft" => Some("ceiling_fl"),
        _ => None,
    }
}

/// The column in which a field of the wire stands.
fn column_of(field: &str) -> &str {
    match field {
        "lon_deg" => "lon",
        "lat_deg" => "lat",
        "level_ft" => "level_fl",
        "from_level_ft" => "from_level_fl",
        "to_level_ft" => "to_level_fl",
        "levels_allowed_ft" => "levels_allowed",
        "ceiling_ft" => "ceiling_fl",
        "floor_ft" => "floor_fl",
        "title" => "name",
        "time" | "seconds_after_epoch" | "time_s" => "time",
        other => other,
    }
}

/// Reads one step, `field` or `field[index]`.
fn step(part: &str) -> Option<Step<'_>> {
    match part.split_once('[') {
        None => Some(Step { field: part, index: None }),
        Some((field, tail)) => {
            let index = tail.strip_suffix(']')?.parse().ok()?;
            Some(Step { field, index: Some(index) })
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn steps_are_read_with_their_index() {
        assert_eq!(step("points[3]"), Some(Step { field: "points", index: Some(3) }));
        assert_eq!(step("level_ft"), Some(Step { field: "level_ft", index: None }));
        assert_eq!(step("points[x]"), None);
        assert_eq!(step("points[3"), None);
    }
}
