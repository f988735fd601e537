//! Time zones of United States airports, by state and, where a state has two, by place.
//!
//! The borders inside a state are straight lines between the airports that the timetable of 2001
//! serves, good for those and not for every town. Indiana kept standard time in 2001, which the
//! tz database knows.

/// Name of the tz database zone at a place.
#[must_use]
pub fn of_state(state: &str, lon_deg: f64, lat_deg: f64) -> &'static str {
    const EASTERN: &str = "America/New_York";
    const CENTRAL: &str = "America/Chicago";
    const MOUNTAIN: &str = "America/Denver";
    const PACIFIC: &str = "America/Los_Angeles";
    match state {
        "AK" if lon_deg < -169.5 => "America/Adak",
        "AK" => "America/Anchorage",
        "HI" => "Pacific/Honolulu",
        "PR" => "America/Puerto_Rico",
        "VI" => "America/St_Thomas",
        "AZ" => "America/Phoenix",
        "IN" if lon_deg < -87.3 => CENTRAL,
        "IN" => "America/Indiana/Indianapolis",
        "FL" if lon_deg < -85.0 => CENTRAL,
        "KY" if lon_deg < -86.3 => CENTRAL,
        "MI" if lon_deg < -87.6 => CENTRAL,
        "TN" if lon_deg < -85.5 => CENTRAL,
        "ND" if lon_deg < -102.0 => MOUNTAIN,
        "NE" | "SD" | "KS" if lon_deg < -101.0 => MOUNTAIN,
        "TX" if lon_deg < -105.0 => MOUNTAIN,
        "ID" if lat_deg > 45.5 => PACIFIC,
        "CO" | "ID" | "MT" | "NM" | "UT" | "WY" => MOUNTAIN,
        "CA" | "NV" | "OR" | "WA" => PACIFIC,
        "AL" | "AR" | "IA" | "IL" | "KS" | "LA" | "MN" | "MO" | "MS" | "ND" | "NE" | "OK"
        | "SD" | "TX" | "WI" => CENTRAL,
        "CT" | "DC" | "DE" | "FL" | "GA" | "KY" | "MA" | "MD" | "ME" | "MI" | "NC" | "NH"
        | "NJ" | "NY" | "OH" | "PA" | "RI" | "SC" | "TN" | "VA" | "VT" | "WV" => EASTERN,
        // A few airports have no state in the table.
        _ if lon_deg > -87.6 => EASTERN,
        _ if lon_deg > -101.5 => CENTRAL,
        _ if lon_deg > -114.5 => MOUNTAIN,
        _ => PACIFIC,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Well-known places on both sides of the borders inside states (from memory).
    #[test]
    fn states_with_two_zones() {
        for (state, lon, lat, zone) in [
            ("TN", -86.7, 36.1, "America/Chicago"),
            ("TN", -84.0, 35.8, "America/New_York"),
            ("TX", -106.4, 31.8, "America/Denver"),
            ("TX", -102.2, 31.9, "America/Chicago"),
            ("FL", -87.2, 30.5, "America/Chicago"),
            ("FL", -84.35, 30.4, "America/New_York"),
            ("ID", -116.2, 43.6, "America/Denver"),
            ("ID", -117.0, 46.4, "America/Los_Angeles"),
            ("SD", -103.1, 44.0, "America/Denver"),
            ("SD", -96.7, 43.6, "America/Chicago"),
        ] {
            assert_eq!(of_state(state, lon, lat), zone, "{state} {lon}");
        }
    }
}
