//! The engine against tables of standards, handbooks and reference libraries.

use std::fs;
use std::path::Path;

use rimeshift_engine::air::isa::speed_of_sound_at_mps;
use rimeshift_engine::geometry::geodesic::{GeodesicLeg, LonLat};
use rimeshift_engine::units::mps_to_kt;

/// Geodesics of WGS 84 by the Python package `geographiclib`: distance, track, place half-way.
#[test]
fn geodesics_agree_with_geographiclib() {
    let file = Path::new(env!("CARGO_MANIFEST_DIR")).join("data/standards/geodesics.csv");
    let table = fs::read_to_string(file).expect("the table");
    let mut rows = 0;
    for line in table.lines().skip(1) {
        let n: Vec<f64> = line.split(',').map(|n| n.parse().expect("a number")).collect();
        let place = |lat: usize| LonLat { lat_deg: n[lat], lon_deg: n[lat + 1] };
        let leg = GeodesicLeg::new(place(0), place(2));
        assert!((leg.length_m - n[4]).abs() < 1e-3, "{line}: {}", leg.length_m);
        let off_track = (leg.track_from_deg - n[5]).abs();
        assert!(off_track.min(360.0 - off_track) < 1e-6, "{line}: {}", leg.track_from_deg);
        let off_m = GeodesicLeg::new(leg.at(0.5), place(6)).length_m;
        assert!(off_m < 1e-3, "{line}: half-way is {off_m} m off");
        rows += 1;
    }
    assert_eq!(rows, 20);
}

/// True airspeed at Mach 0.78 in the standard atmosphere, ICAO Doc 7488 (ISO 2533), solved from its
/// formulas in double precision.
#[test]
fn true_airspeed_at_constant_mach_number() {
    for (fl, tas_kt) in [
        (245.0, 470.49),
        (290.0, 461.66),
        (310.0, 457.68),
        (330.0, 453.66),
        (350.0, 449.61),
        (370.0, 447.38),
        (430.0, 447.38),
    ] {
        let computed_kt = 0.78 * mps_to_kt(speed_of_sound_at_mps(fl * 100.0));
        assert!((computed_kt - tas_kt).abs() < 0.006, "FL {fl}: {computed_kt}");
    }
}
