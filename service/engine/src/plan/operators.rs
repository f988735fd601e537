//! What the policy asks between operators: a largest share of all grants, and a smallest share of
//! its own proposals that each gets granted. Flights without an operator are nobody's.

use std::collections::BTreeMap;

use super::options::{Asking, Judged};
use crate::day::Day;
use crate::ids::{IdVec, ProposalId};
use crate::search::{Row, choice};

/// Shares are counted in this many parts, so that rows are whole numbers.
const PARTS: f64 = 1e6;
/// Products of shares and counts may be off by rounding.
const ROUNDING: f64 = 1e-9;

/// The rows of the policy's two keys about operators, each with its key.
pub(super) fn rows(
    day: &Day,
    judged: &IdVec<ProposalId, Vec<Judged>>,
    asking: &[Asking],
) -> Vec<(&'static str, Row)> {
    let mut rows = Vec::new();
    let operators = by_operator(day, asking);
    if let Some(most) = day.policy.max_share_per_operator {
        // Grants of the operator less its share of all grants: at most 0.
        let share = (most * PARTS + ROUNDING).floor() as i32;
        for groups in operators.values() {
            let terms = (0u32..).zip(asking).flat_map(|(group, asking)| {
                let own = if groups.contains(&group) { PARTS as i32 } else { 0 };
                (1u32..).zip(&asking.combinations).map(move |(candidate, combination)| {
                    let grants = combination.grants.len() as i32;
                    (choice(group, candidate), grants * (own - share))
                })
            });
            let terms = terms.filter(|term| term.1 != 0).collect();
            rows.push(("max_share_per_operator", Row { slack: 0, terms }));
        }
    }
    if let Some(least) = day.policy.min_grant_rate_per_operator {
        for groups in operators.values() {
            let own = || groups.iter().map(|&group| (group, &asking[group as usize]));
            let valid = |id: &&ProposalId| judged[**id].iter().any(|j| j.flown.is_ok());
            let proposals: usize =
                own().map(|(_, asking)| asking.proposals.iter().filter(valid).count()).sum();
            let wanted = (least * proposals as f64 - ROUNDING).ceil() as i64;
            let terms = own().flat_map(|(group, asking)| {
                (1u32..).zip(&asking.combinations).map(move |(candidate, combination)| {
                    (choice(group, candidate), -(combination.grants.len() as i32))
                })
            });
            let row = Row { slack: -wanted, terms: terms.collect() };
            rows.push(("min_grant_rate_per_operator", row));
        }
    }
    rows
}

/// The groups of each operator, by its name.
fn by_operator<'d>(day: &'d Day, asking: &[Asking]) -> BTreeMap<&'d str, Vec<u32>> {
    let mut operators: BTreeMap<&str, Vec<u32>> = BTreeMap::new();
    for (group, asking) in (0u32..).zip(asking) {
        if let Some(operator) = &day.flights[asking.flight].operator {
            operators.entry(operator).or_default().push(group);
        }
    }
    operators
}
