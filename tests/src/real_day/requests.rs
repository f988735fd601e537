//! Proposals, one a flight, from invented ice-supersaturated regions over the country.
//!
//! Flights that stay in ice ask first, each about its longest crossing. Where more
//! proposals are wanted than flights cross ice, other flights ask for a stretch somewhere in their
//! cruise, as if a thin layer of its own lay there.

use rand::{RngExt, seq::SliceRandom};
use rand_pcg::Pcg64;
use rimeshift_demo_sectors::{
    flight::Flight,
    ice::IceRegion,
    proposals::{self, Crossing, Proposal},
};

use super::{Options, tiling};

/// Regions of ice over the country during the day.
const ICE_REGIONS: usize = 60;
/// Shortest time in ice that makes a flight ask, seconds.
const LEAST_S: f64 = 300.0;

/// Proposals and how many flights cross ice.
#[derive(Debug, Clone)]
pub struct Requests {
    /// In order of flight.
    pub proposals: Vec<Proposal>,
    /// Flights that stay in ice long enough to ask.
    pub crossings: usize,
}

/// Makes the proposals.
#[must_use]
pub fn invent(flights: &[Flight], options: &Options) -> Requests {
    let mut rng = Pcg64::new(u128::from(options.seed), 12);
    let ice: Vec<IceRegion> = (0..ICE_REGIONS)
        .map(|_| {
            let mut region = IceRegion::invent(&mut rng, &tiling::EXTENT, (320.0, 380.0));
            // The day of this country runs from 10:00 to 06:00 UTC.
            region.from_s += 28_800.0;
            region.until_s += 28_800.0;
            region
        })
        .collect();
    let mut in_ice = Vec::new();
    let mut others = Vec::new();
    for (index, flight) in flights.iter().enumerate() {
        let length_s = |c: &Crossing| c.until_s - c.from_s;
        let longest = proposals::crossings(flight, &ice, LEAST_S)
            .into_iter()
            .max_by(|a, b| length_s(a).total_cmp(&length_s(b)));
        match longest {
            Some(crossing) => in_ice.push((index, crossing)),
            None => others.push(index),
        }
    }
    let crossings = in_ice.len();
    in_ice.shuffle(&mut rng);
    others.shuffle(&mut rng);
    let mut made = Vec::new();
    for (index, crossing) in in_ice {
        if made.len() == options.proposals {
            break;
        }
        let asked = proposals::options(&flights[index], &ice, &crossing, options.options);
        if !asked.is_empty() {
            made.push(Proposal { flight: index, options: asked });
        }
    }
    for index in others {
        if made.len() == options.proposals {
            break;
        }
        let share = rng.random_range(0.2..0.8);
        let asked = own_layer(&flights[index], share)
            .map(|c| proposals::options(&flights[index], &[], &c, options.options))
            .unwrap_or_default();
        if !asked.is_empty() {
            made.push(Proposal { flight: index, options: asked });
        }
    }
    made.sort_by_key(|p| p.flight);
    Requests { proposals: made, crossings }
}

/// A part of the longest cruise run: at most 25 minutes about a place given by its share.
fn own_layer(flight: &Flight, share: f64) -> Option<Crossing> {
    let runs = flight.cruise_runs(250.0);
    let run = runs
        .into_iter()
        .max_by(|a, b| (a.until_s - a.from_s).total_cmp(&(b.until_s - b.from_s)))?;
    let middle_s = run.from_s + (run.until_s - run.from_s) * share;
    let from_s = (middle_s - 750.0).max(run.from_s).floor();
    let until_s = (middle_s + 750.0).min(run.until_s).floor();
    (until_s - from_s >= LEAST_S).then_some(Crossing { run, from_s, until_s })
}
