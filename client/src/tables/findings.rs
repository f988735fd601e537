//! What reading found wrong, and where: every defect is kept with its place and none stops the
//! reading of what follows it.

use std::fmt;

/// The largest number of defects that are spelled out; those beyond it are counted.
pub(crate) const MOST_LISTED: usize = 100;

/// One thing wrong with input: where it is, what is wrong, and what would be right.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(crate) struct Defect {
    /// The file, with line and column where there are any: `flights.csv:12: column mach`.
    pub(crate) place: String,
    /// What is wrong there; names the value.
    pub(crate) problem: String,
    /// What to do about it, where that is not plain from the problem.
    pub(crate) hint: Option<String>,
}

impl fmt::Display for Defect {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        if self.place.is_empty() {
            write!(f, "{}", self.problem)?;
        } else {
            write!(f, "{}: {}", self.place, self.problem)?;
        }
        match &self.hint {
            Some(hint) => write!(f, "\n  hint: {hint}"),
            None => Ok(()),
        }
    }
}

/// Defects in the order in which they were met, the first [`MOST_LISTED`] of them in words.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub(crate) struct Defects {
    listed: Vec<Defect>,
    unlisted: u64,
}

impl Defects {
    /// Adds a defect.
    pub(crate) fn add(&mut self, place: impl fmt::Display, problem: impl Into<String>) {
        self.push(place, problem.into(), None);
    }

    /// Adds a defect with a remedy.
    pub(crate) fn add_with_hint(
        &mut self,
        place: impl fmt::Display,
        problem: impl Into<String>,
        hint: impl Into<String>,
    ) {
        self.push(place, problem.into(), Some(hint.into()));
    }

    /// Adds a problem that may carry a remedy.
    pub(crate) fn add_problem(&mut self, place: impl fmt::Display, problem: Problem) {
        self.push(place, problem.text, problem.hint);
    }

    fn push(&mut self, place: impl fmt::Display, problem: String, hint: Option<String>) {
        if self.listed.len() < MOST_LISTED {
            self.listed.push(Defect { place: place.to_string(), problem, hint });
        } else {
            self.unlisted += 1;
        }
    }

    /// Whether nothing is wrong.
    pub(crate) fn is_empty(&self) -> bool {
        self.listed.is_empty()
    }

    /// How many defects there are, those that are not spelled out included.
    pub(crate) fn count(&self) -> u64 {
        self.listed.len() as u64 + self.unlisted
    }

    /// The defects in words.
    pub(crate) fn listed(&self) -> &[Defect] {
        &self.listed
    }
}

impl fmt::Display for Defects {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        for (index, defect) in self.listed.iter().enumerate() {
            if index > 0 {
                writeln!(f)?;
            }
            write!(f, "{defect}")?;
        }
        match self.unlisted {
            0 => Ok(()),
            more => write!(f, "\n… and {more} more"),
        }
    }
}

/// What is wrong with a value, before it is known where the value stands.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(crate) struct Problem {
    /// What is wrong; names the value.
    pub(crate) text: String,
    /// What would be right.
    pub(crate) hint: Option<String>,
}

impl Problem {
    /// A problem that speaks for itself.
    pub(crate) fn new(text: impl Into<String>) -> Problem {
        Problem { text: text.into(), hint: None }
    }

    /// A problem with a remedy.
    pub(crate) fn with_hint(text: impl Into<String>, hint: impl Into<String>) -> Problem {
        Problem { text: text.into(), hint: Some(hint.into()) }
    }
}

/// What reading a folder found: defects, which make it unusable, and warnings, which do not.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub(crate) struct Findings {
    /// What is wrong.
    pub(crate) defects: Defects,
    /// What is worth knowing.
    pub(crate) warnings: Vec<String>,
}

/// A value as it is shown inside an error: quoted, cut when long, control characters escaped.
pub(crate) fn shown(value: &str) -> String {
    const MOST_SHOWN: usize = 60;
    let mut cut: String = value.chars().take(MOST_SHOWN).collect();
    if cut.len() < value.len() {
        cut.push('…');
    }
    format!("{cut:?}")
}

/// The known name nearest to `unknown`, if it is near enough to have been meant.
pub(crate) fn nearest<'a>(
    unknown: &str,
    known: impl IntoIterator<Item = &'a str>,
) -> Option<&'a str> {
    let unknown = unknown.trim().to_lowercase();
    let tolerance = (unknown.chars().count() / 3).max(1);
    known
        .into_iter()
        .filter_map(|name| {
            let lower = name.to_lowercase();
            let distance = edit_distance(&unknown, &lower);
            let near =
                distance <= tolerance || begins(&lower, &unknown) || begins(&unknown, &lower);
            near.then_some((distance, name))
        })
        .min_by_key(|(distance, _)| *distance)
        .map(|(_, name)| name)
}

/// Whether `start` is a telling beginning of `word`.
fn begins(word: &str, start: &str) -> bool {
    start.len() >= 3 && word.starts_with(start)
}

/// The number of single-letter insertions, removals and replacements from `a` to `b`
/// (Levenshtein 1966).
fn edit_distance(a: &str, b: &str) -> usize {
    let b: Vec<char> = b.chars().collect();
    let mut previous: Vec<usize> = (0..=b.len()).collect();
    for (row, letter) in a.chars().enumerate() {
        let mut current = Vec::with_capacity(previous.len());
        current.push(row + 1);
        let mut left = row + 1;
        for ((diagonal, above), other) in previous.iter().zip(previous.iter().skip(1)).zip(&b) {
            let replaced = diagonal + usize::from(letter != *other);
            left = replaced.min(above + 1).min(left + 1);
            current.push(left);
        }
        previous = current;
    }
    previous.last().copied().unwrap_or(0)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_misspelt_name_finds_its_neighbour() {
        let known = ["buffer_s", "rejoin_s", "horizontal_nm"];
        assert_eq!(nearest("bufer_s", known), Some("buffer_s"));
        assert_eq!(nearest("Horizontal_NM", known), Some("horizontal_nm"));
        assert_eq!(nearest("latitude", ["lon", "lat"]), Some("lat"));
        assert_eq!(nearest("colour", known), None);
    }

    #[test]
    fn only_the_first_hundred_are_spelled_out() {
        let mut defects = Defects::default();
        for line in 0..130 {
            defects.add(format!("a.csv:{line}"), "is wrong");
        }
        assert_eq!(defects.listed().len(), MOST_LISTED);
        assert_eq!(defects.count(), 130);
        assert!(defects.to_string().ends_with("… and 30 more"));
    }

    #[test]
    fn a_long_value_is_cut_and_escaped() {
        assert_eq!(shown("a\nb"), r#""a\nb""#);
        assert_eq!(shown(&"x".repeat(100)).chars().count(), 63);
    }
}
