//! The true motion, sampled: along geodesics of the filed legs, without pieces or chords.

use super::*;
use crate::geometry::geodesic::{GeodesicLeg, earth_centred_m};
use crate::geometry::motion::horizontal_m;

/// One flight at every whole second of its life.
pub(super) struct Samples {
    first_s: i64,
    at: Vec<Sample>,
}

#[derive(Clone, Copy)]
struct Sample {
    place_m: [f64; 3],
    level_ft: f64,
    level: bool,
}

pub(super) fn sample(points: &Points) -> Samples {
    let (start_s, end_s) = (points[0].0, points[points.len() - 1].0);
    let first_s = start_s.ceil() as i64;
    let mut at = Vec::new();
    let mut leg = 0;
    let geodesics: Vec<_> = points
        .windows(2)
        .map(|w| {
            let [from, to] = [w[0], w[1]].map(|p| LonLat { lon_deg: p.1, lat_deg: p.2 });
            GeodesicLeg::new(from, to)
        })
        .collect();
    for second in first_s..=end_s.floor() as i64 {
        let time_s = second as f64;
        while points[leg + 1].0 < time_s {
            leg += 1;
        }
        let (a, b) = (points[leg], points[leg + 1]);
        let share = (time_s - a.0) / (b.0 - a.0);
        at.push(Sample {
            place_m: earth_centred_m(geodesics[leg].at(share)),
            level_ft: a.3 + (b.3 - a.3) * share,
            level: a.3 == b.3,
        });
    }
    Samples { first_s, at }
}

/// Whether two flights lose separation at a second: surely, surely not, or too near to say.
fn verdict(a: &(bool, &Samples), b: &(bool, &Samples), second: i64) -> Option<bool> {
    let at = |s: &Samples| s.at[(second - s.first_s) as usize];
    let (one, other) = (at(a.1), at(b.1));
    let (a_ft, b_ft) = (one.level_ft, other.level_ft);
    // While a level is passed at which a minimum changes, it is a matter of rounding.
    let passes = |s: &Sample, step_ft: f64| !s.level && (s.level_ft - step_ft).abs() < 0.1;
    if [24_500.0, 29_000.0, 41_000.0].iter().any(|&f| passes(&one, f) || passes(&other, f)) {
        return None;
    }
    let highest = a_ft.max(b_ft);
    let wide = highest > 41_000.0 || (highest >= 29_000.0 && !(a.0 && b.0));
    let limit_ft = if wide { 2000.0 } else { 1000.0 };
    let apart_ft = (a_ft - b_ft).abs();
    if !(one.level && other.level) && (apart_ft - limit_ft).abs() < 0.01 {
        return None;
    }
    let apart_m = horizontal_m(one.place_m, other.place_m);
    if a_ft.min(b_ft) < 24_500.0 || apart_ft >= limit_ft || apart_m >= 9260.5 {
        return Some(false);
    }
    (apart_m < 9259.5).then_some(true)
}

#[test]
fn losses_of_crowds_are_those_of_the_sampled_motion() {
    let mut seen = 0;
    for (i, centre) in CENTRES.into_iter().enumerate() {
        let flights = crowd(200, centre, 40 + i as u64);
        let samples: Vec<_> =
            flights.iter().map(|(rvsm, points)| (*rvsm, sample(points))).collect();
        let day = day_of(flights, Policy::default());
        let scene = scene_of(&day);
        for a in 0..samples.len() {
            for b in a + 1..samples.len() {
                let losses = scene.losses_of(FlightId(a as u32), FlightId(b as u32));
                let (x, y) = ((samples[a].0, &samples[a].1), (samples[b].0, &samples[b].1));
                let from = x.1.first_s.max(y.1.first_s);
                let end = |s: &Samples| s.first_s + s.at.len() as i64;
                for second in from..end(x.1).min(end(y.1)) {
                    let t = second as f64;
                    let inside = |edge_s: f64| {
                        losses.iter().any(|l| l.from_s + edge_s <= t && t + edge_s <= l.until_s)
                    };
                    let agrees = match verdict(&x, &y, second) {
                        Some(true) => inside(0.0),
                        Some(false) => !inside(1e-3),
                        None => true,
                    };
                    assert!(agrees, "{a} and {b} at {t} near {centre:?}: {losses:?}");
                    seen += usize::from(inside(0.0));
                }
            }
        }
    }
    assert!(seen > 10_000, "only {seen} seconds of loss: a crowd too thin to test with");
}
