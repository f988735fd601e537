//! What was decided by hand.

use super::parts::Must;
use crate::ids::{FlightId, ProposalId};

/// A decision by hand.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub struct HandDecision {
    /// What it is about.
    pub about: HandSubject,
    /// What must become of it.
    pub must: Must,
}

/// What a decision by hand is about.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum HandSubject {
    /// A proposal.
    Proposal(ProposalId),
    /// A flight.
    Flight(FlightId),
}
