//! Cruising levels by direction of flight: ICAO Annex 2, Appendix 3 (RVSM), on true track.

/// Levels in feet for true tracks in [0°, 180°).
const EASTBOUND_FL: [u32; 18] =
    [110, 130, 150, 170, 190, 210, 230, 250, 270, 290, 310, 330, 350, 370, 390, 410, 450, 490];
/// Levels in feet for true tracks in [180°, 360°).
const WESTBOUND_FL: [u32; 17] =
    [120, 140, 160, 180, 200, 220, 240, 260, 280, 300, 320, 340, 360, 380, 400, 430, 470];

/// Flight levels of the direction of a true track in degrees (any range).
#[must_use]
pub fn of_track(track_deg: f64) -> &'static [u32] {
    if track_deg.rem_euclid(360.0) < 180.0 { &EASTBOUND_FL } else { &WESTBOUND_FL }
}

/// Whether a level is one of the direction of a true track.
#[must_use]
pub fn suits(level_fl: u32, track_deg: f64) -> bool {
    of_track(track_deg).contains(&level_fl)
}

/// The level of the direction that is nearest to the wished one, the lower of two.
#[must_use]
pub fn nearest(wished_fl: u32, track_deg: f64) -> u32 {
    of_track(track_deg).iter().copied().min_by_key(|fl| fl.abs_diff(wished_fl)).unwrap_or(wished_fl)
}

/// The level `steps` above (or, negative, below) a level in the table of a direction.
#[must_use]
pub fn stepped(level_fl: u32, steps: i32, track_deg: f64) -> Option<u32> {
    let table = of_track(track_deg);
    let here = table.iter().position(|fl| *fl == level_fl)?;
    let there = here.checked_add_signed(isize::try_from(steps).ok()?)?;
    table.get(there).copied()
}
