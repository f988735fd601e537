//! What differs between two plans of one day.

use super::cautions;
use super::figures::{counted, date, scientific, tenth};
use super::names;
use super::sheet::{Sheet, first_rows, numbers, words};
use crate::plan_folder::FoundPlan;
use crate::screen::Layout;
use rimeshift_proto::v1::{Day, Decision};
use serde_json::{Value, json};

/// Two plans of one day.
#[derive(Debug)]
pub(crate) struct CompareReport<'a> {
    /// The day.
    pub(crate) day: &'a Day,
    /// A plan.
    pub(crate) one: &'a FoundPlan,
    /// The other one.
    pub(crate) other: &'a FoundPlan,
}

/// What one plan adds up to.
struct Sums {
    objective: f64,
    taken: usize,
    contrail_km: f64,
    extra_fuel_kg: f64,
    expected_new_losses: f64,
}

impl Sums {
    fn of(plan: &FoundPlan) -> Sums {
        let taken = || plan.rows.decisions.iter().filter(|decision| decision.option.is_some());
        Sums {
            objective: plan.plan.objective,
            taken: taken().count(),
            contrail_km: taken().map(|decision| decision.contrail_km_avoided).sum(),
            extra_fuel_kg: taken().map(|decision| decision.extra_fuel_kg).sum(),
            expected_new_losses: plan.plan.expected_new_losses,
        }
    }

    fn json(&self) -> Value {
        json!({
            "objective": self.objective,
            "granted_or_amended": self.taken,
            "contrail_km_avoided": self.contrail_km,
            "extra_fuel_kg": self.extra_fuel_kg,
            "expected_new_losses": self.expected_new_losses,
        })
    }
}

/// A verdict with the option taken.
fn outcome(decision: &Decision) -> String {
    match decision.option {
        Some(option) => format!("{}, option {option}", names::verdict(decision.verdict)),
        None => names::verdict(decision.verdict).to_owned(),
    }
}

impl CompareReport<'_> {
    /// Decisions on the same proposal that are not the same, by proposal.
    fn differences(&self) -> Vec<(&Decision, &Decision)> {
        let other = &self.other.rows.decisions;
        let same = |a: &Decision, b: &Decision| (a.verdict, a.option) == (b.verdict, b.option);
        let pair = |one| {
            let other = other.iter().find(|other: &&Decision| other.proposal == one_name(one))?;
            (!same(one, other)).then_some((one, other))
        };
        self.one.rows.decisions.iter().filter_map(pair).collect()
    }

    /// The report for people.
    pub(crate) fn text(&self, layout: Layout) -> String {
        let differences = self.differences();
        let (one, other) = (Sums::of(self.one), Sums::of(self.other));
        let day = format!("{} {}", self.day.region, date(self.day.date.as_ref()));
        let found = match differences.len() {
            0 => "the two plans decide alike".to_owned(),
            n => {
                let more = other.objective - one.objective;
                let which = if more >= 0.0 { "more" } else { "less" };
                format!(
                    "{} decided otherwise; the second plan is worth {} {which}",
                    counted(n as u64, "proposal is", "proposals are"),
                    scientific(more.abs())
                )
            }
        };
        let mut sheet = Sheet::answer(layout, &format!("{day}: {found}."));
        let row = |what: &str, a: String, b: String| [what.to_owned(), a, b];
        let rows = vec![
            row("objective", scientific(one.objective), scientific(other.objective)),
            row("granted or amended", one.taken.to_string(), other.taken.to_string()),
            row("contrail km avoided", tenth(one.contrail_km), tenth(other.contrail_km)),
            row("extra fuel, kg", tenth(one.extra_fuel_kg), tenth(other.extra_fuel_kg)),
            row(
                "expected new losses",
                format!("{:.3}", one.expected_new_losses),
                format!("{:.3}", other.expected_new_losses),
            ),
        ];
        let columns = [words("in all"), numbers("first"), numbers("second")];
        sheet.table("Figures", columns, rows, 0);
        let (rows, more) = first_rows(&differences, |(one, other)| {
            [
                one.proposal.clone(),
                one.flight.clone(),
                outcome(one),
                outcome(other),
                scientific(other.net_benefit - one.net_benefit),
            ]
        });
        let columns = [
            words("proposal"),
            words("flight"),
            words("first"),
            words("second"),
            numbers("net benefit"),
        ];
        sheet.table("What differs", columns, rows, more);
        sheet.finish()
    }

    /// The report for programs.
    pub(crate) fn json(&self) -> String {
        let differences: Vec<Value> = self
            .differences()
            .into_iter()
            .map(|(one, other)| {
                json!({
                    "proposal": one.proposal,
                    "flight": one.flight,
                    "first": { "verdict": names::verdict(one.verdict), "option": one.option },
                    "second": { "verdict": names::verdict(other.verdict), "option": other.option },
                    "net_benefit_j": other.net_benefit - one.net_benefit,
                })
            })
            .collect();
        let value = json!({
            "date": date(self.day.date.as_ref()),
            "region": self.day.region,
            "day_sha256": self.day.day_sha256,
            "first": Sums::of(self.one).json(),
            "second": Sums::of(self.other).json(),
            "differences": differences,
            "cautions": cautions::FULL,
        });
        format!("{value:#}\n")
    }
}

fn one_name(decision: &Decision) -> &str {
    &decision.proposal
}
