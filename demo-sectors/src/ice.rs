//! Invented ice-supersaturated regions: ellipses over ground in a layer of about 500 m that drift
//! with the wind for some hours. They are what makes flights ask for another level; the day's
//! files do not hold them.

use rand::RngExt;
use rand_pcg::Pcg64;

/// Box in which regions are made.
#[derive(Debug, Clone, Copy)]
pub struct Extent {
    /// Western edge, degrees.
    pub west_deg: f64,
    /// Eastern edge, degrees.
    pub east_deg: f64,
    /// Southern edge, degrees.
    pub south_deg: f64,
    /// Northern edge, degrees.
    pub north_deg: f64,
}

/// One region of ice supersaturation.
#[derive(Debug, Clone, Copy)]
pub struct IceRegion {
    /// Centre at `from_s`: longitude and latitude in degrees.
    pub centre_deg: (f64, f64),
    /// Drift in metres per second, east and north.
    pub drift_mps: (f64, f64),
    /// Semi-axes in metres, along and across `turn_deg`.
    pub semi_axes_m: (f64, f64),
    /// Direction of the first axis, degrees counter-clockwise from east.
    pub turn_deg: f64,
    /// Base of the layer in FL.
    pub base_fl: f64,
    /// Top of the layer in FL.
    pub top_fl: f64,
    /// Start, seconds from 00:00.
    pub from_s: f64,
    /// End, seconds from 00:00.
    pub until_s: f64,
}

const METRES_PER_DEG: f64 = 111_200.0;

impl IceRegion {
    /// Whether a place, level and time lie in the region.
    #[must_use]
    pub fn contains(&self, time_s: f64, lon_deg: f64, lat_deg: f64, level_fl: f64) -> bool {
        if level_fl < self.base_fl
            || level_fl >= self.top_fl
            || time_s < self.from_s
            || time_s >= self.until_s
        {
            return false;
        }
        let age_s = time_s - self.from_s;
        let north_m = (lat_deg - self.centre_deg.1) * METRES_PER_DEG - self.drift_mps.1 * age_s;
        let per_lon_m = METRES_PER_DEG * self.centre_deg.1.to_radians().cos();
        let east_m = (lon_deg - self.centre_deg.0) * per_lon_m - self.drift_mps.0 * age_s;
        let (sin, cos) = self.turn_deg.to_radians().sin_cos();
        let along = (east_m * cos + north_m * sin) / self.semi_axes_m.0;
        let across = (north_m * cos - east_m * sin) / self.semi_axes_m.1;
        along * along + across * across < 1.0
    }

    /// Makes a region somewhere in the extent, with its layer's middle in a range of FL.
    pub fn invent(rng: &mut Pcg64, extent: &Extent, middle_fl: (f64, f64)) -> Self {
        let middle = rng.random_range(middle_fl.0..middle_fl.1);
        let half_fl = rng.random_range(7.0..11.0);
        let from_s = rng.random_range(-7200.0..72_000.0);
        let along_m = rng.random_range(140_000.0..320_000.0);
        Self {
            centre_deg: (
                rng.random_range(extent.west_deg..extent.east_deg),
                rng.random_range(extent.south_deg..extent.north_deg),
            ),
            drift_mps: (rng.random_range(8.0..22.0), rng.random_range(-6.0..6.0)),
            semi_axes_m: (along_m, along_m * rng.random_range(0.4..0.8)),
            turn_deg: rng.random_range(0.0..180.0),
            base_fl: middle - half_fl,
            top_fl: middle + half_fl,
            from_s,
            until_s: from_s + rng.random_range(18_000.0..36_000.0),
        }
    }
}

/// Whether any of the regions contains a place, level and time.
#[must_use]
pub fn any_contains(
    ice: &[IceRegion],
    time_s: f64,
    lon_deg: f64,
    lat_deg: f64,
    level_fl: f64,
) -> bool {
    ice.iter().any(|region| region.contains(time_s, lon_deg, lat_deg, level_fl))
}
