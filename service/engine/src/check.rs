//! What a day holds as filed: loads and overloads, losses, and who can't be changed.

use std::sync::Arc;

use rayon::prelude::*;

use crate::answer::{DayCheck, Rule, Unchangeable};
use crate::change::{change_levels, nears_direction_boundary};
use crate::day::{Flight, Proposal};
use crate::geometry::geodesic::{GeodesicLeg, LonLat};
use crate::ids::ProposalId;
use crate::load::PlannedLoads;
use crate::traffic::Traffic;
use crate::units::fl_to_ft;

/// Looks a day over.
#[must_use]
pub fn check(traffic: &Traffic) -> DayCheck {
    let day = &traffic.day;
    let losses = traffic.scene.losses().iter();
    let loads = PlannedLoads::new(Arc::clone(&traffic.loads));
    let invalid: Vec<Option<(ProposalId, Rule)>> = day
        .proposals
        .as_slice()
        .par_iter()
        .zip(day.proposals.ids().collect::<Vec<_>>())
        .map(|(proposal, id)| Some((id, broken_rule(traffic, proposal)?)))
        .collect();
    let near_boundary = |flight: &&Flight| cruises_near_boundary(traffic, flight);
    DayCheck {
        loads: loads.load_counts(),
        overloads: loads.overloads(),
        losses: losses.map(|&l| traffic.located(l, traffic.path(l.first, None))).collect(),
        unchangeable: unchangeable(day.flights.as_slice()),
        near_direction_boundary: day.flights.as_slice().par_iter().filter(near_boundary).count()
            as u32,
        proposals: day.proposals.len() as u32,
        invalid_proposals: invalid.into_iter().flatten().collect(),
        snapped_levels: day.snapped_levels,
    }
}

fn unchangeable(flights: &[Flight]) -> Unchangeable {
    let mut counts = Unchangeable::default();
    for flight in flights {
        if !flight.movable {
            counts.not_movable += 1;
        } else if flight.profile.cruise().is_none() {
            counts.no_cruise += 1;
        }
    }
    counts
}

/// The rule that the first option breaks, if every option breaks one.
fn broken_rule(traffic: &Traffic, proposal: &Proposal) -> Option<Rule> {
    let flight = traffic.flight(proposal.flight);
    let track = &traffic.tracks[proposal.flight];
    let mut first = None;
    for alternative in &proposal.alternatives {
        let change = change_levels(&traffic.day, flight, track, &alternative.stretches);
        let rule = match change {
            Err(rule) => rule,
            Ok(change) => traffic.forbidden(proposal.flight, &change)?,
        };
        first.get_or_insert(rule);
    }
    first
}

/// Whether any cruise leg is joined on a track near the boundary between two directions.
fn cruises_near_boundary(traffic: &Traffic, flight: &Flight) -> bool {
    let policy = &traffic.day.policy;
    let floor_ft = fl_to_ft(policy.cruise_floor_fl);
    let profile = &flight.profile;
    profile.points().windows(2).enumerate().any(|(leg, w)| {
        profile.is_cruise_leg(leg, floor_ft) && {
            let place = |i: usize| LonLat { lon_deg: w[i].lon_deg, lat_deg: w[i].lat_deg };
            let track_deg = GeodesicLeg::new(place(0), place(1)).track_from_deg;
            nears_direction_boundary(policy, track_deg)
        }
    })
}
