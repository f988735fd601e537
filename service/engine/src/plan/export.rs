//! The search's model of a day as free MPS, an open text format that solvers read, with names that
//! people read; so that anyone can solve it otherwise and compare.
//!
//! A flight that asks for something is an equality (one of its candidates is flown), a candidate a
//! binary column, a clash a row of two, a limited window or minute a row. A soft clash has a column
//! of its own that takes its cost off; of an any-of, one column a row says that this row need not
//! hold. The objective is to be maximised (`OBJSENSE`), in the unit that the first line tells.

use std::collections::BTreeSet;
use std::fmt::Write as _;

use super::find::{FindOptions, PlanError, Watch, problem_of};
use super::problem::{Limit, Problem};
use crate::answer::{LoadMeasure, Place};
use crate::search::{Choice, Cost, Row};
use crate::traffic::Traffic;

/// Writes the model that [`find`](super::find()) would search.
///
/// # Errors
/// As `find`, where there is no model.
pub fn export_mps(
    traffic: &Traffic,
    options: &FindOptions,
    watch: Watch<'_>,
) -> Result<String, PlanError> {
    let (problem, _) = problem_of(traffic, options, watch)?;
    Ok(Mps::new(traffic, &problem).written())
}

/// A model on its way into text.
struct Mps<'a> {
    problem: &'a Problem,
    /// Names of candidates, by group.
    columns: Vec<Vec<String>>,
    rows: Vec<MpsRow>,
    /// Columns beside the candidates: name, cost.
    further: Vec<(String, i64)>,
    unit: f64,
    title: String,
}

struct MpsRow {
    name: String,
    /// `E` or `L`.
    kind: char,
    terms: Vec<(String, i64)>,
    right: i64,
}

impl<'a> Mps<'a> {
    fn new(traffic: &Traffic, problem: &'a Problem) -> Self {
        let mut mps = Self {
            problem,
            columns: columns(traffic, problem),
            rows: Vec::new(),
            further: Vec::new(),
            unit: problem.quantum.amount(1),
            title: word(&format!("{}-{:?}", traffic.day.region, traffic.day.date.year)),
        };
        mps.flights(traffic);
        mps.clashes();
        mps.limits(traffic);
        mps.any_ofs();
        mps
    }

    fn column(&self, of: Choice) -> String {
        self.columns[of.group as usize][of.candidate as usize].clone()
    }

    fn flights(&mut self, traffic: &Traffic) {
        for (group, asking) in self.problem.asking.iter().enumerate() {
            let terms = self.columns[group].iter().map(|name| (name.clone(), 1)).collect();
            let flight = &traffic.flight(asking.flight).name;
            let name = format!("one-{}-{group}", word(flight));
            self.rows.push(MpsRow { name, kind: 'E', terms, right: 1 });
        }
    }

    fn clashes(&mut self) {
        for (i, clash) in self.problem.model.clashes.iter().enumerate() {
            let mut terms = vec![(self.column(clash.a), 1), (self.column(clash.b), 1)];
            if let Cost::Soft(cost) = clash.cost {
                let both = format!("both-{i}");
                terms.push((both.clone(), -1));
                self.further.push((both, -cost));
            }
            self.rows.push(MpsRow { name: format!("apart-{i}"), kind: 'L', terms, right: 1 });
        }
    }

    fn limits(&mut self, traffic: &Traffic) {
        let labels = self.problem.limits.iter().zip(&self.problem.model.rows).enumerate();
        for (i, (limit, row)) in labels {
            let name = format!("{}-{i}", limit_name(traffic, limit));
            let terms = self.terms(row);
            self.rows.push(MpsRow { name, kind: 'L', terms, right: row.slack });
        }
    }

    fn terms(&self, row: &Row) -> Vec<(String, i64)> {
        row.terms.iter().map(|&(of, delta)| (self.column(of), i64::from(delta))).collect()
    }

    fn any_ofs(&mut self) {
        for (i, any_of) in self.problem.model.any_ofs.iter().enumerate() {
            let mut let_go = Vec::new();
            for (k, row) in any_of.rows.iter().enumerate() {
                let free = format!("free-{i}-{k}");
                // No choices add more than this.
                let most: i64 = row.terms.iter().map(|t| i64::from(t.1).max(0)).sum();
                let mut terms = self.terms(row);
                terms.push((free.clone(), -(most - row.slack).max(0)));
                let name = format!("lasting-{i}-{k}");
                self.rows.push(MpsRow { name, kind: 'L', terms, right: row.slack });
                self.further.push((free.clone(), 0));
                let_go.push((free, 1));
            }
            let right = any_of.rows.len() as i64 - 1;
            let name = format!("lasting-{i}");
            self.rows.push(MpsRow { name, kind: 'L', terms: let_go, right });
        }
    }

    fn written(&self) -> String {
        // Writing to a string can't fail.
        let mut text = String::new();
        let _ = writeln!(text, "* net benefits are counted in units of {:e}", self.unit);
        let _ = writeln!(text, "NAME {}\nOBJSENSE\n MAX\nROWS\n N net-benefit", self.title);
        for row in &self.rows {
            let _ = writeln!(text, " {} {}", row.kind, row.name);
        }
        let mut terms: Vec<(&str, usize, i64)> = Vec::new();
        for (r, row) in self.rows.iter().enumerate() {
            terms.extend(row.terms.iter().map(|(name, delta)| (name.as_str(), r, *delta)));
        }
        terms.sort_unstable();
        let _ = writeln!(text, "COLUMNS\n MARK MARKER INTORG");
        let mut bounds = String::new();
        for (name, value, allowed) in self.all_columns() {
            // A column must be told of, whether or not it is in any row.
            let _ = writeln!(text, " {name} net-benefit {value}");
            let first = terms.partition_point(|term| term.0 < name);
            let own = terms[first..].iter().take_while(|term| term.0 == name);
            let own: Vec<_> = own.collect();
            for same in own.chunk_by(|a, b| a.1 == b.1) {
                let delta: i64 = same.iter().map(|term| term.2).sum();
                let _ = writeln!(text, " {name} {} {delta}", self.rows[same[0].1].name);
            }
            let _ = match allowed {
                true => writeln!(bounds, " BV BND {name}"),
                false => writeln!(bounds, " FX BND {name} 0"),
            };
        }
        let _ = writeln!(text, " MARK MARKER INTEND\nRHS");
        for row in self.rows.iter().filter(|row| row.right != 0) {
            let _ = writeln!(text, " RHS {} {}", row.name, row.right);
        }
        let _ = write!(text, "BOUNDS\n{bounds}ENDATA\n");
        text
    }

    /// Every column with its value, and whether it may be chosen.
    fn all_columns(&self) -> impl Iterator<Item = (&str, i64, bool)> {
        let groups = self.columns.iter().zip(&self.problem.model.groups);
        let candidates = groups.flat_map(|(names, group)| {
            names.iter().zip(&group.candidates).map(|(name, c)| (name.as_str(), c.value, c.allowed))
        });
        candidates.chain(self.further.iter().map(|(name, cost)| (name.as_str(), *cost, true)))
    }
}

/// Names of all candidates, each once.
fn columns(traffic: &Traffic, problem: &Problem) -> Vec<Vec<String>> {
    let mut taken = BTreeSet::new();
    let mut unique = |name: String| {
        let mut once = name.clone();
        let mut again = 2;
        while !taken.insert(once.clone()) {
            once = format!("{name}~{again}");
            again += 1;
        }
        once
    };
    let of = |asking: &super::options::Asking| {
        let flight = word(&traffic.flight(asking.flight).name);
        let grants = asking.combinations.iter().map(|combination| {
            let each = combination.grants.iter().map(|grant| {
                let proposal = &traffic.day.proposals[grant.proposal];
                let option = proposal.alternatives[grant.alternative as usize].option;
                format!("{}.{option}", word(&proposal.name))
            });
            format!("{flight}={}", each.collect::<Vec<_>>().join("+"))
        });
        std::iter::once(format!("{flight}=filed")).chain(grants).collect::<Vec<_>>()
    };
    let all: Vec<Vec<String>> = problem.asking.iter().map(of).collect();
    all.into_iter().map(|names| names.into_iter().map(&mut unique).collect()).collect()
}

fn limit_name(traffic: &Traffic, limit: &Limit) -> String {
    match limit {
        Limit::Policy(key) => (*key).to_owned(),
        Limit::Cell(cell) => {
            let loads = &traffic.loads;
            let place = match loads.place(*cell) {
                Place::Sector(id) => &traffic.day.sectors[id].name,
                Place::Airport(id) => &traffic.day.airports[id].code,
            };
            let measure = match loads.measure(*cell) {
                LoadMeasure::Entries => "entries",
                LoadMeasure::Occupancy => "occupancy",
                LoadMeasure::Lasting => "lasting",
                LoadMeasure::LevelChanges => "level-changes",
                LoadMeasure::Arrivals => "arrivals",
                LoadMeasure::Departures => "departures",
            };
            let minutes = (loads.start_s(*cell) / 60.0).floor();
            let (hour, minute) = ((minutes / 60.0).floor(), minutes.rem_euclid(60.0));
            format!("{measure}-{}-{hour:02.0}:{minute:02.0}", word(place))
        }
    }
}

/// A name without anything that would end it.
fn word(name: &str) -> String {
    let kept = |c: char| if c.is_ascii_graphic() && !"=+~*".contains(c) { c } else { '_' };
    let word: String = name.chars().take(60).map(kept).collect();
    if word.is_empty() { "_".to_owned() } else { word }
}
