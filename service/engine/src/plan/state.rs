//! The day as a plan makes it: which flights are moved, what is counted then, and what one more
//! change would break.

use std::collections::BTreeMap;
use std::sync::Arc;

use crate::answer::{Constraint, Loss};
use crate::change::Change;
use crate::ids::FlightId;
use crate::load::{Difference, FlightLoad, PlannedLoads, Which};
use crate::path::Changed;
use crate::separation::{Version, new_losses, new_losses_against_filed};
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
}

impl PlanState {
    /// The filed day: nothing is moved.
    #[must_use]
    pub fn filed(traffic: &Traffic) -> Self {
        Self { moved: BTreeMap::new(), loads: PlannedLoads::new(Arc::clone(&traffic.loads)) }
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
        let losses = self.new_losses(traffic, flight, changed).into_iter();
        over.chain(losses.map(|loss| Constraint::Separation {
            other: if loss.first == flight { loss.second } else { loss.first },
            time_s: loss.closest_s,
            horizontal_m: loss.horizontal_m,
            vertical_ft: loss.vertical_ft,
        }))
        .collect()
    }

    /// New losses between a flight that flies `changed` and all other flights as they are now, by
    /// time of the closest moment.
    #[must_use]
    pub fn new_losses(&self, traffic: &Traffic, flight: FlightId, changed: &Changed) -> Vec<Loss> {
        let minima = traffic.minima(flight, changed);
        let version = traffic.version(flight, changed, &minima);
        let scene = &traffic.scene;
        let other_of = |l: &Loss| if l.first == flight { l.second } else { l.first };
        let mut found: Vec<Loss> = new_losses_against_filed(scene, &version);
        found.retain(|loss| !self.moved.contains_key(&other_of(loss)));
        for (other, moved) in self.moved().filter(|(other, _)| *other != flight) {
            let other = traffic.version(other, &moved.change.changed, &moved.minima);
            found.extend(new_losses(scene, &version, &other));
        }
        found.sort_by(|a, b| {
            a.closest_s.total_cmp(&b.closest_s).then((a.first, a.second).cmp(&(b.first, b.second)))
        });
        found
    }
}
