//! Writes the invented day to the folder named on the command line, by default
//! `demo-sectors/day`.

use std::{fs, path::Path, process::ExitCode};

use rand_pcg::Pcg64;
use rimeshift_demo_sectors::{
    fleet,
    ice::IceRegion,
    limits, region, requests,
    tables::{self, Clock, Table},
    tally, traffic,
};

/// The date, a weekday far from any real one.
const DATE: &str = "2031-03-04";
const SEED: u64 = 20_310_304;
/// Number of ice regions.
const ICE_REGIONS: usize = 42;

const DAY_TOML: &str = r#"# An invented day: nothing here is real. Written by the program in demo-sectors.
date = "2031-03-04"
region = "Oriel Reach"

[policy]
# An arrival may move by at most this much.
max_arrival_shift_s = 45
max_changes_per_flight = 2
# A controller's sector is taken as overloaded after this many minutes.
lasting_min = 8
"#;

fn main() -> ExitCode {
    let default = concat!(env!("CARGO_MANIFEST_DIR"), "/day").to_owned();
    let folder = std::env::args().nth(1).unwrap_or(default);
    match write_day(Path::new(&folder)) {
        Ok(()) => ExitCode::SUCCESS,
        Err(message) => {
            #[expect(clippy::print_stderr, reason = "the program's only way to say what failed")]
            {
                eprintln!("{message}");
            }
            ExitCode::FAILURE
        }
    }
}

fn write_day(folder: &Path) -> Result<(), String> {
    // One stream of random numbers for each part, so that a change in one leaves the others.
    let rng = |stream: u64| Pcg64::new(u128::from(SEED), u128::from(stream));
    let airports = region::airports();
    let fixes = region::fixes(&mut rng(1));
    let mut ice_rng = rng(3);
    let ice: Vec<IceRegion> = (0..ICE_REGIONS)
        .map(|_| IceRegion::invent(&mut ice_rng, &region::EXTENT, (330.0, 380.0)))
        .collect();
    let mut flights = traffic::invent(&mut rng(2), &airports, &region::gates(), &fixes);
    requests::arrive_at_edges(&mut flights, &ice, 16);
    traffic::order_and_name(&mut flights);
    let sectors = region::sectors();
    let tallies = tally::count(&flights, sectors.len(), |lon, lat, fl, here| {
        here.extend((0..sectors.len()).filter(|i| sectors[*i].contains(lon, lat, fl)));
    });
    let proposals = requests::invent(&mut rng(4), &flights, &ice, &sectors);

    let clock = Clock::of(DATE)?;
    let (airport_table, airport_capacity) =
        tables::airports(&limits::airport_rows(&airports, &flights), clock)?;
    let (.., from_s, until_s) = region::RESTRICTION;
    let restrictions = region::restrictions_geojson(&clock.utc(from_s)?, &clock.utc(until_s)?);
    fs::create_dir_all(folder).map_err(|e| format!("{}: {e}", folder.display()))?;
    let text = |name: &str, content: String| {
        let path = folder.join(name);
        fs::write(&path, content).map_err(|e| format!("{}: {e}", path.display()))
    };
    text("day.toml", DAY_TOML.to_owned())?;
    text("sectors.geojson", tables::geojson_text(&region::sectors_geojson(&sectors)))?;
    text("restrictions.geojson", tables::geojson_text(&restrictions))?;
    let capacity = limits::capacity_rows(&sectors, &tallies);
    tables::capacity(&capacity, clock)?.write(&folder.join("capacity.csv"))?;
    airport_table.write(&folder.join("airports.csv"))?;
    airport_capacity.write(&folder.join("airport_capacity.csv"))?;
    tables::flights(&flights).write(&folder.join("flights.csv"))?;
    tables::points(&flights, clock)?.write(&folder.join("points.csv"))?;
    fleet::aircraft_table().write(&folder.join("aircraft.csv"))?;
    fuel().write(&folder.join("fuel.csv"))?;
    tables::proposals(&proposals, &flights, clock)?.write(&folder.join("proposals.csv"))
}

/// Cruise fuel of the medium jet by the minute and of the heavy jet by mass.
fn fuel() -> Table {
    let mut table = Table::with_columns(&["aircraft", "level_fl", "mass_kg", "kg_per_min"]);
    for (level_fl, kg_per_min) in [
        (250, 47.2),
        (270, 45.0),
        (290, 43.1),
        (310, 41.6),
        (330, 40.5),
        (350, 40.0),
        (370, 40.1),
        (390, 41.0),
        (410, 43.2),
    ] {
        let cells =
            ["MJET".to_owned(), level_fl.to_string(), String::new(), format!("{kg_per_min}")];
        table.push(cells.to_vec());
    }
    for (mass_kg, best_fl, least_kg) in
        [(185_000, 390, 94.0), (205_000, 370, 104.0), (225_000, 350, 114.5)]
    {
        for level_fl in (250..=430).step_by(20) {
            let off = f64::from(level_fl - best_fl) / 100.0;
            let kg_per_min = least_kg * (1.0 + 0.11 * off * off);
            table.push(vec![
                "HJET".to_owned(),
                level_fl.to_string(),
                mass_kg.to_string(),
                format!("{kg_per_min:.1}"),
            ]);
        }
    }
    table
}
