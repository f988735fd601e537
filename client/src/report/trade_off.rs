//! What plans buy for how many moved flights and how much fuel.

use super::cautions;
use super::figures::{counted, date, percent, scientific, tenth};
use super::sheet::{Sheet, first_rows, numbers, words};
use crate::screen::Layout;
use rimeshift_proto::v1::trade_off_point::Limit;
use rimeshift_proto::v1::{Day, TraceTradeOffResponse, TradeOffPoint};
use serde_json::{Value, json};

/// The curve of a day.
#[derive(Debug)]
pub(crate) struct TradeOffReport<'a> {
    /// The day.
    pub(crate) day: &'a Day,
    /// The points.
    pub(crate) curve: &'a TraceTradeOffResponse,
}

fn gap(point: &TradeOffPoint) -> Option<f64> {
    let bound = point.bound?;
    Some((bound - point.objective).max(0.0) / bound.abs().max(1e-9))
}

fn limit(point: &TradeOffPoint) -> String {
    match point.limit {
        None => "none".to_owned(),
        Some(Limit::MostMovedFlights(most)) => {
            format!("at most {}", counted(most, "flight", "flights"))
        }
        Some(Limit::MostExtraFuelKg(most)) => format!("at most {} kg", tenth(most)),
    }
}

impl TradeOffReport<'_> {
    /// The report for people.
    pub(crate) fn text(&self, layout: Layout) -> String {
        let best = self.curve.points.first().copied().unwrap_or_default();
        let first = format!(
            "{} {}: the best plan moves {} for {} km of contrails and {} kg of fuel.",
            self.day.region,
            date(self.day.date.as_ref()),
            counted(best.moved_flights, "flight", "flights"),
            tenth(best.contrail_km_avoided),
            tenth(best.extra_fuel_kg)
        );
        let mut sheet = Sheet::answer(layout, &first);
        let (rows, more) = first_rows(&self.curve.points, |point| {
            [
                limit(point),
                point.moved_flights.to_string(),
                tenth(point.contrail_km_avoided),
                tenth(point.extra_fuel_kg),
                scientific(point.objective),
                gap(point).map_or_else(|| "-".to_owned(), percent),
            ]
        });
        let columns = [
            words("limit"),
            numbers("moved"),
            numbers("km avoided"),
            numbers("extra kg"),
            numbers("net benefit"),
            numbers("gap"),
        ];
        sheet.table("The best plan under each limit", columns, rows, more);
        sheet.finish()
    }

    /// The report for programs.
    pub(crate) fn json(&self) -> String {
        let points: Vec<Value> = self
            .curve
            .points
            .iter()
            .map(|point| {
                let (moved, fuel_kg) = match point.limit {
                    None => (None, None),
                    Some(Limit::MostMovedFlights(most)) => (Some(most), None),
                    Some(Limit::MostExtraFuelKg(most)) => (None, Some(most)),
                };
                json!({
                    "most_moved_flights": moved,
                    "most_extra_fuel_kg": fuel_kg,
                    "moved_flights": point.moved_flights,
                    "contrail_km_avoided": point.contrail_km_avoided,
                    "extra_fuel_kg": point.extra_fuel_kg,
                    "objective": point.objective,
                    "bound": point.bound,
                    "gap": gap(point),
                })
            })
            .collect();
        let value = json!({
            "date": date(self.day.date.as_ref()),
            "region": self.day.region,
            "day_sha256": self.day.day_sha256,
            "points": points,
            "cautions": cautions::FULL,
        });
        format!("{value:#}\n")
    }
}
