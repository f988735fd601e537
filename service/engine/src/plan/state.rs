//! The day as a plan makes it: which flights are moved, what is counted then, and what one more
//! change would break.

use std::collections::BTreeMap;
use std::sync::Arc;

use super::apart::{forbids_new_losses, shift_rule};
use crate::answer::{Constraint, Loss};
use crate::change::Change;
use crate::ids::FlightId;
use crate::load::{Difference, FlightLoad, PlannedLoads, Which};
use crate::path::Changed;
use crate::separation::{
    MovedIndex, PairRisk, ShiftRule, Version, breaks_shift_rule, new_losses_in_plan,
    pair_risks_in_plan,
};
use crate::traffic::{Traffic, VersionMinima};

/// A moved flight.
#[derive(Debug, Clone)]
pub struct Moved {
    /// Its common profile.
    pub change: Change,
    /// The horizontal minima on its way.
    pub minima: VersionMinima,
    /// What it is now counted for.
    pub load: FlightLoad,
}

/// The planned day.
#[derive(Debug, Clone)]
pub struct PlanState {
    moved: BTreeMap<FlightId, Moved>,
    loads: PlannedLoads,
    /// Where the moved flights are, in the order of flights.
    index: MovedIndex,
}

impl PlanState {
    /// The filed day: nothing is moved.
    #[must_use]
    pub fn filed(traffic: &Traffic) -> Self {
        Self {
            moved: BTreeMap::new(),
            loads: PlannedLoads::new(Arc::clone(&traffic.loads)),
            index: MovedIndex::default(),
        }
    }

    /// The day with these flights moved.
    #[must_use]
    pub fn new(traffic: &Traffic, changes: impl IntoIterator<Item = (FlightId, Change)>) -> Self {
        let mut state = Self::filed(traffic);
        for (flight, change) in changes {
            let load = traffic.changed_load(flight, &change.changed);
            let filed = &traffic.filed[flight];
            state.loads.apply(&traffic.loads.differences(&traffic.day, filed, &load, Which::All));
            let minima = traffic.minima(flight, &change.changed);
            state.moved.insert(flight, Moved { change, minima, load });
        }
        state.index = MovedIndex::new(&traffic.scene, &state.versions(traffic));
        state
    }

    /// The moved flights, in the order of flights.
    pub fn moved(&self) -> impl ExactSizeIterator<Item = (FlightId, &Moved)> {
        self.moved.iter().map(|(&id, moved)| (id, moved))
    }

    /// A flight's change, if it is moved.
    #[must_use]
    pub fn moved_flight(&self, flight: FlightId) -> Option<&Moved> {
        self.moved.get(&flight)
    }

    /// What is counted in the planned day.
    #[must_use]
    pub fn loads(&self) -> &PlannedLoads {
        &self.loads
    }

    /// A flight as it is now, as separation sees it.
    #[must_use]
    pub fn version<'a>(&'a self, traffic: &'a Traffic, flight: FlightId) -> Version<'a> {
        match self.moved.get(&flight) {
            Some(moved) => traffic.version(flight, &moved.change.changed, &moved.minima),
            None => traffic.scene.filed(flight),
        }
    }

    /// The moved flights as separation sees them, in the order of flights.
    #[must_use]
    pub fn versions<'a>(&'a self, traffic: &'a Traffic) -> Vec<Version<'a>> {
        let version = |(id, moved): (FlightId, &'a Moved)| {
            traffic.version(id, &moved.change.changed, &moved.minima)
        };
        self.moved().map(version).collect()
    }

    /// By how much the planned counts would change if a flight flew `changed` instead of what it
    /// flies now.
    #[must_use]
    pub fn differences(
        &self,
        traffic: &Traffic,
        flight: FlightId,
        changed: &Changed,
    ) -> Vec<Difference> {
        let load = traffic.changed_load(flight, changed);
        let before = self.moved.get(&flight).map_or(&traffic.filed[flight], |moved| &moved.load);
        traffic.loads.differences(&traffic.day, before, &load, Which::Binding)
    }

    /// Every count that would be over what is allowed, and every new loss, if a flight flew
    /// `changed` instead of what it flies now.
    #[must_use]
    pub fn blockers(
        &self,
        traffic: &Traffic,
        flight: FlightId,
        changed: &Changed,
        differences: &[Difference],
    ) -> Vec<Constraint> {
        let over = self.loads.violations(differences).into_iter().map(|o| Constraint::Load {
            place: o.place,
            measure: o.measure,
            from_s: o.from_s,
            until_s: o.until_s,
            count: o.count,
            limit: o.limit,
        });
        let minima = traffic.minima(flight, changed);
        let version = traffic.version(flight, changed, &minima);
        over.chain(self.too_close(traffic, &version)).collect()
    }

    /// What separation has against a version of a flight beside all others as they are now, in the
    /// policy's own way.
    fn too_close(&self, traffic: &Traffic, version: &Version<'_>) -> Vec<Constraint> {
        let policy = &traffic.day.policy;
        let moved = self.versions(traffic);
        let mut found = Vec::new();
        if forbids_new_losses(policy) {
            found.extend(self.new_losses(traffic, version, &moved).into_iter().map(|loss| {
                Constraint::Separation {
                    other: if loss.first == version.flight { loss.second } else { loss.first },
                    time_s: loss.closest_s,
                    horizontal_m: loss.horizontal_m,
                    vertical_ft: loss.vertical_ft,
                }
            }));
        }
        if let Some(rule) = shift_rule(policy) {
            let risks = pair_risks_in_plan(&traffic.scene, version, &moved, &self.index);
            found.extend(risks.iter().filter_map(|risk| {
                let other = if risk.first == version.flight { risk.second } else { risk.first };
                let limit = match rule {
                    ShiftRule::Risk { max_probability } => max_probability.max(risk.filed),
                    ShiftRule::Buffered { .. } => risk.filed,
                };
                let beside = self.version(traffic, other);
                breaks_shift_rule(&traffic.scene, rule, version, &beside).then_some(
                    Constraint::SeparationRisk { other, probability: risk.planned, limit },
                )
            }));
        }
        found
    }

    /// Losses to be expected more, under the policy's time errors, if a flight flew this version
    /// beside all others as they are now, than as filed.
    #[must_use]
    pub fn expected_new_losses(&self, traffic: &Traffic, version: &Version<'_>) -> f64 {
        let moved = self.versions(traffic);
        let risks = pair_risks_in_plan(&traffic.scene, version, &moved, &self.index);
        risks.iter().map(PairRisk::added).sum()
    }

    /// New losses between a version of a flight and all other flights as they are now, by time of
    /// the closest moment.
    fn new_losses(
        &self,
        traffic: &Traffic,
        version: &Version<'_>,
        moved: &[Version<'_>],
    ) -> Vec<Loss> {
        let mut found = new_losses_in_plan(&traffic.scene, version, moved, &self.index);
        found.sort_by(|a, b| {
            a.closest_s.total_cmp(&b.closest_s).then((a.first, a.second).cmp(&(b.first, b.second)))
        });
        found
    }
}
