//! The number of losses among random straight tracks, against the two-dimensional gas model.

use super::*;

/// At one level, with flights spread evenly and independently, encounters begin at a rate of
/// n²/2 · 2 s · E|v| per area, n flights per area, s the minimum, E|v| the mean relative speed, 4 v/π
/// at equal speeds v in all directions (the gas model of collision risk; textbook, no single
/// source). Counted in the inner part, into which the emptiness outside can't spread meanwhile.
#[test]
fn as_many_losses_as_the_gas_model_expects() {
    const LASTS_S: f64 = 1200.0;
    const SPEED_MPS: f64 = 230.0;
    const INNER_DEG: f64 = 4.0;
    let metres_per_deg = 6_371_008.8_f64.to_radians();
    let outer_deg = INNER_DEG + 2.0 * (LASTS_S * SPEED_MPS + 20_000.0) / metres_per_deg;
    let (mut counted, mut expected) = (0_u32, 0.0);
    for seed in 0..4 {
        let mut random = random(500 + seed);
        let count = 700;
        let flights: Vec<(bool, Points)> = (0..count)
            .map(|_| {
                let mut along = || random.random_range(-outer_deg / 2.0..outer_deg / 2.0);
                let from = LonLat { lon_deg: along(), lat_deg: along() };
                let to = step(from, random.random_range(0.0..360.0), LASTS_S * SPEED_MPS);
                let at = |t: f64, p: LonLat| (t, p.lon_deg, p.lat_deg, 35e3);
                (true, vec![at(0.0, from), at(LASTS_S, to)])
            })
            .collect();
        let day = day_of(flights.clone(), Policy::default());
        let inner = |p: f64| p.abs() < INNER_DEG / 2.0;
        counted += scene_of(&day)
            .losses()
            .iter()
            .filter(|loss| loss.from_s > 0.0)
            .filter(|loss| {
                let share = loss.from_s / LASTS_S;
                let place = |f: FlightId| {
                    let p = &flights[f.0 as usize].1;
                    [p[0].1 + (p[1].1 - p[0].1) * share, p[0].2 + (p[1].2 - p[0].2) * share]
                };
                let (a, b) = (place(loss.first), place(loss.second));
                inner((a[0] + b[0]) / 2.0) && inner((a[1] + b[1]) / 2.0)
            })
            .count() as u32;
        let pairs = f64::from(count * (count - 1)) / 2.0;
        let outer_m2 = (outer_deg * metres_per_deg).powi(2);
        let inner_m2 = (INNER_DEG * metres_per_deg).powi(2);
        let relative_mps = 4.0 * SPEED_MPS / std::f64::consts::PI;
        expected += pairs * 2.0 * 9260.0 * relative_mps * LASTS_S * inner_m2 / outer_m2.powi(2);
    }
    let error = f64::from(counted) - expected;
    assert!(expected > 1000.0, "{expected}: too few to test with");
    assert!(error.abs() < 4.0 * expected.sqrt(), "{counted} losses, {expected} expected");
}
