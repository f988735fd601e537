//! The day as a plan makes it: which flights are moved, what is counted then, and what one more
//! change would break.

use std::collections::BTreeMap;
use std::sync::Arc;

use crate::answer::{Constraint, Loss};
use crate::change::Change;
use crate::ids::FlightId;
use crate::load::{Difference, FlightLoad, PlannedLoads, Which};
use crate::path::{Changed, Path};
use crate::separation::{Version, new_losses, new_losses_against_filed};
use crate::traffic::{Traffic, VersionMinima};

/// What is added to the widest minimum before a pair is passed over, metres: far more than any
/// tolerance of the exact test.
const NEAR_M: f64 = 1000.0;

/// A moved flight.
#[derive(Debug, Clone)]
pub struct Moved {
    /// Its common profile.
    pub change: Change,
    /// The horizontal minima on its way.
    pub minima: VersionMinima,
    /// What it is now counted for.
    pub load: FlightLoad,
    span: Span,
}

/// When and where a path is at most: a cheap test of whether two flights can meet.
#[derive(Debug, Clone, Copy)]
struct Span {
    from_s: f64,
    until_s: f64,
    low_m: [f64; 3],
    high_m: [f64; 3],
}

impl Span {
    fn of(path: &Path<'_>) -> Self {
        let mut span = Self {
            from_s: path.start_s(),
            until_s: path.end_s(),
            low_m: [f64::INFINITY; 3],
            high_m: [f64::NEG_INFINITY; 3],
        };
        // Between two knots a path is a straight chord, hence in the box of its knots.
        for knot in path.knots_from(0) {
            for k in 0..3 {
                span.low_m[k] = span.low_m[k].min(knot.position_m[k]);
                span.high_m[k] = span.high_m[k].max(knot.position_m[k]);
            }
        }
        span
    }

    /// Whether two paths may be within a distance of each other at one time.
    fn meets(&self, other: &Self, within_m: f64) -> bool {
        self.from_s <= other.until_s
            && other.from_s <= self.until_s
            && (0..3).all(|k| {
                self.low_m[k] - within_m <= other.high_m[k]
                    && other.low_m[k] - within_m <= self.high_m[k]
            })
    }
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
            let span = Span::of(&traffic.path(flight, Some(&change.changed)));
            state.moved.insert(flight, Moved { change, minima, load, span });
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
        let span = Span::of(&version.path);
        let within_m = traffic.widest_minimum_m() + NEAR_M;
        let near = |moved: &Moved| span.meets(&moved.span, within_m);
        for (other, moved) in self.moved().filter(|(other, m)| *other != flight && near(m)) {
            let other = traffic.version(other, &moved.change.changed, &moved.minima);
            found.extend(new_losses(scene, &version, &other));
        }
        found.sort_by(|a, b| {
            a.closest_s.total_cmp(&b.closest_s).then((a.first, a.second).cmp(&(b.first, b.second)))
        });
        found
    }
}
