//! The report of a check: what a day holds as filed.

use super::cautions;
use super::figures::{count, counted, date, lost_ft, lost_nm, period, rfc3339, second};
use super::names;
use super::sheet::{Sheet, first_rows, numbers, words};
use crate::screen::Layout;
use rimeshift_proto::v1::{Day, DayCheckSummary, InvalidProposal, Loss, Overload};
use serde_json::{Value, json};

/// The answer to a check.
#[derive(Debug, Default)]
pub(crate) struct CheckReport {
    /// The day.
    pub(crate) day: Day,
    /// Counts.
    pub(crate) summary: DayCheckSummary,
    /// Counts above their limit.
    pub(crate) overloads: Vec<Overload>,
    /// Losses of separation.
    pub(crate) losses: Vec<Loss>,
    /// Proposals that can't be granted whatever else is.
    pub(crate) invalid_proposals: Vec<InvalidProposal>,
}

impl CheckReport {
    /// The report for people.
    pub(crate) fn text(&self, layout: Layout) -> String {
        let summary = &self.summary;
        let mut sheet = Sheet::answer(
            layout,
            &format!(
                "{} {}: as filed, {} and {} of separation among {}.",
                self.day.region,
                date(self.day.date.as_ref()),
                counted(summary.overloads, "overload", "overloads"),
                counted(summary.losses, "loss", "losses"),
                counted(summary.flights, "flight", "flights"),
            ),
        );
        sheet.line(cautions::LOSSES);
        sheet.line("No flight is moved here, so no new losses are expected.");
        self.notes(&mut sheet);
        let (rows, more) = first_rows(&self.overloads, |overload| {
            [
                names::place(overload.place.as_ref()).to_owned(),
                names::measure(overload.measure).to_owned(),
                period(overload.from.as_ref(), overload.until.as_ref()),
                count(overload.count),
                count(overload.limit),
            ]
        });
        let columns =
            [words("where"), words("counted"), words("when"), numbers("count"), numbers("limit")];
        sheet.table("Overloads", columns, rows, more);
        let (rows, more) = first_rows(&self.losses, |loss| {
            [
                loss.first_flight.clone(),
                loss.second_flight.clone(),
                second(loss.closest_time.as_ref()),
                lost_nm(loss.horizontal_nm),
                lost_ft(loss.vertical_ft),
                loss.sector.clone(),
            ]
        });
        let columns = [
            words("flight"),
            words("other flight"),
            words("closest at"),
            numbers("NM"),
            numbers("ft"),
            words("sector"),
        ];
        sheet.table("Losses of separation at filed times", columns, rows, more);
        let (rows, more) = first_rows(&self.invalid_proposals, |invalid| {
            let why = invalid.broken_rule.as_ref().map_or_else(String::new, names::broken_rule);
            [invalid.proposal.clone(), why]
        });
        sheet.table("Proposals that break a rule", [words("proposal"), words("why")], rows, more);
        sheet.finish()
    }

    fn notes(&self, sheet: &mut Sheet) {
        let summary = &self.summary;
        for (count, one, many) in [
            (
                summary.invalid_proposals,
                "proposal breaks a rule of level changes with every option",
                "proposals break a rule of level changes with every option",
            ),
            (summary.not_movable, "flight is marked not movable", "flights are marked not movable"),
            (
                summary.no_cruise,
                "movable flight has no cruise and can't be changed",
                "movable flights have no cruise and can't be changed",
            ),
            (
                summary.near_direction_boundary,
                "flight cruises within 10° of the boundary between the directions of flight",
                "flights cruise within 10° of the boundary between the directions of flight",
            ),
            (
                summary.snapped_levels,
                "recorded level was taken as the multiple of 500 ft next to it",
                "recorded levels were taken as the multiple of 500 ft next to them",
            ),
        ] {
            if count > 0 {
                sheet.line(&format!("{}.", counted(count, one, many)));
            }
        }
    }

    /// The report for programs.
    pub(crate) fn json(&self) -> String {
        let summary = &self.summary;
        let value = json!({
            "date": date(self.day.date.as_ref()),
            "region": self.day.region,
            "day_sha256": self.day.day_sha256,
            "flights": summary.flights,
            "proposals": summary.proposals,
            "not_movable": summary.not_movable,
            "no_cruise": summary.no_cruise,
            "near_direction_boundary": summary.near_direction_boundary,
            "snapped_levels": summary.snapped_levels,
            "overloads": self.overloads.iter().map(overload_json).collect::<Vec<_>>(),
            "expected_new_losses": 0.0,
            "losses": self.losses.iter().map(loss_json).collect::<Vec<_>>(),
            "invalid_proposals": self.invalid_proposals.iter().map(|invalid| json!({
                "proposal": invalid.proposal,
                "rule": invalid.broken_rule.as_ref().map(|broken| names::rule(broken.rule)),
                "why": invalid.broken_rule.as_ref().map(names::broken_rule),
            })).collect::<Vec<_>>(),
            "cautions": [cautions::LOSSES, cautions::FULL],
        });
        format!("{value:#}\n")
    }
}

fn overload_json(overload: &Overload) -> Value {
    json!({
        "place": names::place(overload.place.as_ref()),
        "measure": names::load_column(overload.measure),
        "from": rfc3339(overload.from.as_ref()),
        "until": rfc3339(overload.until.as_ref()),
        "count": overload.count,
        "limit": overload.limit,
    })
}

fn loss_json(loss: &Loss) -> Value {
    json!({
        "first_flight": loss.first_flight,
        "second_flight": loss.second_flight,
        "from": rfc3339(loss.from.as_ref()),
        "until": rfc3339(loss.until.as_ref()),
        "closest_time": rfc3339(loss.closest_time.as_ref()),
        "horizontal_nm": loss.horizontal_nm,
        "vertical_ft": loss.vertical_ft,
        "sector": loss.sector,
    })
}
