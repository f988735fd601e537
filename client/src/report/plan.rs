//! The report of a plan.

use super::cautions;
use super::figures::{
    counted, date, flight_level, percent, period, rfc3339, scientific, second, tenth,
};
use super::names;
use super::sheet::{Sheet, first_rows, numbers, words};
use crate::plan_folder::{FoundPlan, FoundPlans, HandDocument, ReasonDocument, StretchDocument};
use crate::screen::Layout;
use rimeshift_proto::v1::constraint::Kind;
use rimeshift_proto::v1::policy_value;
use rimeshift_proto::v1::{
    Constraint, Decision, HandDecision, LimitPrice, LoadMeasure, LossVersion, PlannedStretch,
    Stopped, Verdict,
};
use serde_json::{Value, json};
use std::collections::BTreeMap;
use std::path::Path;

/// The plans found, and where they were written.
#[derive(Debug)]
pub(crate) struct PlanReport<'a> {
    /// The plans.
    pub(crate) found: &'a FoundPlans,
    /// The folder, where there is one.
    pub(crate) written_to: Option<&'a Path>,
}

/// The figures of a plan that its rows add up to.
struct Totals {
    granted: usize,
    amended: usize,
    refused: usize,
    invalid: usize,
    contrail_km: f64,
    fuel_kg: f64,
    removed_losses: usize,
    new_losses: usize,
}

impl PlanReport<'_> {
    fn best(&self) -> FoundPlan {
        self.found.plans.first().cloned().unwrap_or_default()
    }

    /// Windows of the planned day with a count above its limit. Departures never bind.
    pub(crate) fn planned_overloads(&self) -> usize {
        let binds = |measure: i32| measure != i32::from(LoadMeasure::Departures);
        self.best()
            .rows
            .loads
            .iter()
            .filter(|load| binds(load.measure))
            .filter(|load| load.limit.is_some_and(|limit| load.planned > limit + 1e-9))
            .count()
    }

    /// Losses of separation that the planned day holds, known ones included.
    pub(crate) fn planned_losses(&self) -> usize {
        let filed = i32::from(LossVersion::Filed);
        self.best().rows.losses.iter().filter(|loss| loss.version != filed).count()
    }

    fn totals(best: &FoundPlan) -> Totals {
        let of = |verdict: Verdict| {
            let verdict = i32::from(verdict);
            best.rows.decisions.iter().filter(|decision| decision.verdict == verdict).count()
        };
        let taken = || best.rows.decisions.iter().filter(|decision| decision.option.is_some());
        Totals {
            granted: of(Verdict::Granted),
            amended: of(Verdict::Amended),
            refused: of(Verdict::Refused),
            invalid: of(Verdict::Invalid),
            contrail_km: taken().map(|decision| decision.contrail_km_avoided).sum(),
            fuel_kg: taken().map(|decision| decision.extra_fuel_kg).sum(),
            removed_losses: best.plan.counts.map_or(0, |counts| counts.removed_losses as usize),
            new_losses: best.rows.losses.iter().filter(|loss| loss.is_new).count(),
        }
    }

    /// The unit of the objective.
    fn unit(&self) -> &'static str {
        let weighted = self.found.origin.policy.iter().any(|setting| {
            let kind = setting.value.as_ref().and_then(|value| value.kind.as_ref());
            setting.key == "objective"
                && matches!(kind, Some(policy_value::Kind::Text(word)) if word == "weights")
        });
        if weighted { "weighted points" } else { "J" }
    }

    /// How good the plan is proven to be, in one clause.
    fn proof(&self) -> String {
        let origin = &self.found.origin;
        let stopped = Stopped::try_from(origin.stopped).unwrap_or_default();
        match (stopped, origin.gap) {
            (Stopped::Optimal, _) => "proven to be the best there is".to_owned(),
            (_, Some(gap)) => format!("proven to be within {} of the best", percent(gap)),
            (_, None) => "no bound is proven".to_owned(),
        }
    }

    /// The report for people.
    pub(crate) fn text(&self, layout: Layout) -> String {
        let best = self.best();
        let totals = PlanReport::totals(&best);
        let proposals = best.rows.decisions.len();
        let mut sheet = Sheet::answer(
            layout,
            &format!(
                "{} {}: {} of {} granted, {}.",
                self.found.day.region,
                date(self.found.day.date.as_ref()),
                totals.granted + totals.amended,
                counted(proposals as u64, "proposal", "proposals"),
                self.proof()
            ),
        );
        self.reasons(&mut sheet, &best, &totals);
        let taken: Vec<&Decision> =
            best.rows.decisions.iter().filter(|decision| decision.option.is_some()).collect();
        let (rows, more) = first_rows(&taken, |decision| granted_row(decision));
        let columns = [
            words("proposal"),
            words("flight"),
            words("option"),
            words("level"),
            words("leaves"),
            words("returns"),
            numbers("km avoided"),
            numbers("extra kg"),
            numbers("shift s"),
        ];
        sheet.table("Granted", columns, rows, more);
        let refused: Vec<&Decision> = best
            .rows
            .decisions
            .iter()
            .filter(|decision| decision.verdict == i32::from(Verdict::Refused))
            .collect();
        let (rows, more) = first_rows(&refused, |decision| refused_row(decision));
        let columns =
            [words("proposal"), words("flight"), words("why not"), words("what would make room")];
        sheet.table("Refused", columns, rows, more);
        let (rows, more) = first_rows(&self.found.limit_prices, limit_price_row);
        let columns =
            [words("limit"), words("counted"), words("when"), numbers("about"), numbers("exactly")];
        sheet.table("What one more would gain", columns, rows, more);
        self.others(&mut sheet);
        if let Some(folder) = self.written_to {
            sheet.heading(&format!("Written to {}", folder.display()));
        }
        sheet.finish()
    }

    fn reasons(&self, sheet: &mut Sheet, best: &FoundPlan, totals: &Totals) {
        let origin = &self.found.origin;
        let bound = origin.bound.map_or_else(String::new, |bound| {
            format!(" (proven bound {} {})", scientific(bound), self.unit())
        });
        sheet.line(&format!(
            "Net benefit {} {}{bound}; {} km of contrails avoided; {} kg of extra fuel.",
            scientific(best.plan.objective),
            self.unit(),
            tenth(totals.contrail_km),
            tenth(totals.fuel_kg)
        ));
        sheet.line(&format!(
            "Granted as asked {}, amended {}, refused {}, invalid {}.",
            totals.granted, totals.amended, totals.refused, totals.invalid
        ));
        if !matches!(
            Stopped::try_from(origin.stopped).unwrap_or_default(),
            Stopped::Optimal | Stopped::Gap
        ) {
            sheet.line(&format!("The search stopped early ({}).", names::stopped(origin.stopped)));
        }
        sheet.line(&format!(
            "New losses of separation: {}; filed losses removed: {}; expected new losses: {:.3}.",
            totals.new_losses, totals.removed_losses, best.plan.expected_new_losses
        ));
        sheet.line(cautions::LOSSES);
        for unmet in &origin.unmet {
            sheet.line(&format!(
                "Decided by hand, but can't be met, and planned around: {}.",
                names::hand_decision(unmet)
            ));
        }
        let why: Vec<String> = reason_counts(best)
            .into_iter()
            .map(|(kind, count)| format!("{kind} {count}"))
            .collect();
        if !why.is_empty() {
            sheet.line(&format!("Refusals by reason (one may have several): {}.", why.join(", ")));
        }
    }

    fn others(&self, sheet: &mut Sheet) {
        let others: Vec<&FoundPlan> = self.found.plans.iter().skip(1).collect();
        let (rows, more) = first_rows(&others, |found| {
            let totals = PlanReport::totals(found);
            [
                found.plan.rank.to_string(),
                scientific(found.plan.objective),
                (totals.granted + totals.amended).to_string(),
                format!("{:.3}", found.plan.expected_new_losses),
            ]
        });
        let columns = [
            numbers("rank"),
            numbers("net benefit"),
            numbers("granted"),
            numbers("expected new losses"),
        ];
        sheet.table("Other plans", columns, rows, more);
    }

    /// The report for programs.
    pub(crate) fn json(&self) -> String {
        let best = self.best();
        let totals = PlanReport::totals(&best);
        let origin = &self.found.origin;
        let decisions: Vec<Value> = best
            .rows
            .decisions
            .iter()
            .map(|decision| {
                json!({
                    "proposal": decision.proposal,
                    "flight": decision.flight,
                    "verdict": names::verdict(decision.verdict),
                    "option": decision.option,
                    "net_benefit": decision.net_benefit,
                    "reasons": decision.reasons.iter().map(|reason| {
                        reason.constraint.as_ref().map(constraint_json)
                    }).collect::<Vec<_>>(),
                })
            })
            .collect();
        let value = json!({
            "date": date(self.found.day.date.as_ref()),
            "region": self.found.day.region,
            "day_sha256": origin.day_sha256,
            "stopped": names::stopped(origin.stopped),
            "objective": best.plan.objective,
            "bound": origin.bound,
            "gap": origin.gap,
            "granted": totals.granted,
            "amended": totals.amended,
            "refused": totals.refused,
            "invalid": totals.invalid,
            "contrail_km_avoided": totals.contrail_km,
            "extra_fuel_kg": totals.fuel_kg,
            "planned_overloads": self.planned_overloads(),
            "planned_losses": self.planned_losses(),
            "new_losses": totals.new_losses,
            "removed_losses": totals.removed_losses,
            "expected_new_losses": best.plan.expected_new_losses,
            "limit_prices": self.found.limit_prices.iter().map(limit_price_json).collect::<Vec<_>>(),
            "written_to": self.written_to.map(|folder| folder.display().to_string()),
            "around_decisions": origin.around_decisions,
            "unmet": origin.unmet.iter().map(hand_json).collect::<Vec<_>>(),
            "decisions": decisions,
            "cautions": [cautions::LOSSES, cautions::FULL],
        });
        format!("{value:#}\n")
    }
}

/// How many refused proposals have a reason of each kind.
fn reason_counts(best: &FoundPlan) -> BTreeMap<&'static str, usize> {
    let mut counts = BTreeMap::new();
    for decision in &best.rows.decisions {
        if decision.verdict != i32::from(Verdict::Refused) {
            continue;
        }
        let kinds = decision.reasons.iter().filter_map(|reason| reason.constraint.as_ref());
        let kinds: std::collections::BTreeSet<_> = kinds.map(names::reason_kind).collect();
        for kind in kinds {
            *counts.entry(kind).or_insert(0) += 1;
        }
    }
    counts
}

fn limit_price_row(price: &LimitPrice) -> [String; 5] {
    use rimeshift_proto::v1::limit_price::Limit;
    let (limit, counted, when) = match &price.limit {
        Some(Limit::Place(place)) => (
            names::place(Some(place)).to_owned(),
            names::measure(price.measure).to_owned(),
            period(price.from.as_ref(), price.until.as_ref()),
        ),
        Some(Limit::PolicyKey(key)) => (key.clone(), "policy".to_owned(), "-".to_owned()),
        None => Default::default(),
    };
    let exact = price.exact.map_or_else(|| "-".to_owned(), scientific);
    [limit, counted, when, scientific(price.estimate), exact]
}

fn limit_price_json(price: &LimitPrice) -> Value {
    use rimeshift_proto::v1::limit_price::Limit;
    let (place, key) = match &price.limit {
        Some(Limit::Place(place)) => (Some(names::place(Some(place))), None),
        Some(Limit::PolicyKey(key)) => (None, Some(key.as_str())),
        None => (None, None),
    };
    json!({
        "place": place,
        "policy_key": key,
        "measure": place.map(|_| names::measure(price.measure)),
        "from": rfc3339(price.from.as_ref()),
        "until": rfc3339(price.until.as_ref()),
        "estimate": price.estimate,
        "exact": price.exact,
    })
}

fn granted_row(decision: &Decision) -> [String; 9] {
    let each = |show: &dyn Fn(&PlannedStretch) -> String| {
        decision.stretches.iter().map(show).collect::<Vec<_>>().join(", ")
    };
    [
        decision.proposal.clone(),
        decision.flight.clone(),
        decision.option.map_or_else(String::new, |option| option.to_string()),
        each(&|planned| flight_level(planned.stretch.map_or(0.0, |stretch| stretch.level_ft))),
        each(&|planned| second(planned.planned_from.as_ref())),
        each(&|planned| second(planned.planned_until.as_ref())),
        tenth(decision.contrail_km_avoided),
        tenth(decision.extra_fuel_kg),
        tenth(decision.arrival_shift_s),
    ]
}

fn refused_row(decision: &Decision) -> [String; 4] {
    let mut why = decision
        .reasons
        .first()
        .and_then(|reason| reason.constraint.as_ref())
        .map_or_else(String::new, names::constraint);
    let further = decision.reasons.len().saturating_sub(1);
    if further > 0 {
        why.push_str(&format!(" (and {further} more)"));
    }
    let room = decision.exchange.as_ref().map_or_else(String::new, |exchange| {
        let proven = if exchange.proven { "" } else { ", not proven cheapest" };
        format!(
            "without {} (loses {}{proven})",
            exchange.drops.join(", "),
            scientific(exchange.objective_lost)
        )
    });
    [decision.proposal.clone(), decision.flight.clone(), why, room]
}

/// A constraint for programs, as plan.json holds it.
pub(crate) fn constraint_json(constraint: &Constraint) -> Value {
    let mut value = serde_json::to_value(ReasonDocument::of(constraint)).unwrap_or(Value::Null);
    if let (Some(Kind::Invalid(broken)), Some(object)) = (&constraint.kind, value.as_object_mut()) {
        object.insert("why".to_owned(), json!(names::broken_rule(broken)));
    }
    value
}

/// A decision by hand for programs, as plan.json holds it.
fn hand_json(decision: &HandDecision) -> Value {
    serde_json::to_value(HandDocument::of(decision)).unwrap_or(Value::Null)
}

/// A stretch for programs, as plan.json holds it.
pub(crate) fn stretch_json(planned: &PlannedStretch) -> Value {
    serde_json::to_value(StretchDocument::of(planned)).unwrap_or(Value::Null)
}
