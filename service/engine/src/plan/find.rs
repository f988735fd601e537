//! Finding plans: the search is run, its choices become plans, and the audit has the last word.

use super::by_hand::{self, Unmet};
use super::decide::plan_of;
use super::limit_prices::limit_prices;
use super::options::TooManyCombinations;
use super::problem::Problem;
use crate::answer::{Plans, Reason, Stopped};
use crate::audit::{AuditReport, PlanUnderAudit, audit};
use crate::day::HandDecision;
use crate::search::{self, Index, RankOptions, Search, SolveOptions, State, choice};
use crate::traffic::Traffic;

/// Most findings against one plan that are logged: a mistake shows in the first few.
const MOST_LOGGED: usize = 10;

/// How to search for plans.
#[derive(Debug, Clone, PartialEq)]
pub struct FindOptions {
    /// Most plans to return, at least one is.
    pub plans: usize,
    /// Decides between otherwise equal ways.
    pub seed: u64,
    /// Most work to do, in units of about one touched term of the search's model.
    pub work: u64,
    /// Stop once the proven gap is at most this; 0 asks for the optimum.
    pub gap: f64,
    /// Decisions by hand beside those of the day.
    pub decisions: Vec<HandDecision>,
    /// What to do about those that can't be met.
    pub unmet: Unmet,
    /// For how many of the dearest limits to find exactly what one more would gain.
    pub exact_limits: usize,
}

impl Default for FindOptions {
    fn default() -> Self {
        let solve = SolveOptions::default();
        Self {
            plans: 1,
            seed: solve.seed,
            work: solve.work,
            gap: solve.gap,
            decisions: Vec::new(),
            unmet: Unmet::Refuse,
            exact_limits: 0,
        }
    }
}

/// How a search is going.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Progress {
    /// Objective of the best plan so far.
    pub objective: f64,
    /// Upper bound proven so far.
    pub bound: f64,
    /// Work done so far.
    pub work: u64,
}

/// The caller's hold on a running search. Both may be called from several threads.
#[derive(Clone, Copy)]
pub struct Watch<'a> {
    /// Asked now and then; once it gives a reason the search returns what it has.
    pub stop: &'a (dyn Fn() -> Option<Stopped> + Sync),
    /// Told whenever more is known.
    pub progress: &'a (dyn Fn(Progress) + Sync),
}

impl std::fmt::Debug for Watch<'_> {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.debug_struct("Watch").finish_non_exhaustive()
    }
}

impl Watch<'_> {
    /// Looked at between the steps that make a plan: nobody wants one any more.
    pub(super) fn wanted(&self) -> Result<(), PlanError> {
        match (self.stop)() {
            Some(Stopped::Cancelled) => Err(PlanError::Cancelled),
            _ => Ok(()),
        }
    }
}

impl Watch<'static> {
    /// Never stops and listens to nothing.
    #[must_use]
    pub fn unattended() -> Self {
        Self { stop: &|| None, progress: &|_| () }
    }
}

/// Why there is no plan.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum PlanError {
    /// The options of a flight combine in too many ways.
    #[error(transparent)]
    TooManyCombinations(#[from] TooManyCombinations),
    /// The audit found fault with a plan: a defect of this program. The plan is not handed out.
    #[error("the audit found {} faults with a plan", .0.findings.len())]
    FailedAudit(Box<AuditReport>),
    /// The search could not use the model: a defect of this program.
    #[error("the search could not use the model: {0}")]
    Model(search::Defect),
    /// A decision by hand can't be met.
    #[error("a decision by hand breaks {} limits", .breaks.len())]
    UnmetDecision {
        /// The decision.
        decision: HandDecision,
        /// What it breaks, beside the other decisions.
        breaks: Vec<Reason>,
    },
    /// No plan grants every operator the policy's `min_grant_rate_per_operator`.
    #[error("no plan was found that grants every operator its least share")]
    GrantRate,
    /// The plan given is none of this day: its grants are not, or can't be flown together.
    #[error("the plan is none of this day")]
    NotAPlan,
    /// The caller has gone before there was a plan.
    #[error("the caller has gone")]
    Cancelled,
}

/// Finds the best plans of a day, best first.
///
/// # Errors
/// A flight's options combine in too many ways; decisions by hand or what operators are owed can't
/// be met; or a defect of this program is found out.
pub fn find(
    traffic: &Traffic,
    options: &FindOptions,
    watch: Watch<'_>,
) -> Result<Plans, PlanError> {
    let (problem, unmet) = problem_of(traffic, options, watch)?;
    watch.wanted()?;
    let amount = |count| problem.quantum.amount(count);
    let progress = |p: search::Progress| {
        let (objective, bound) = (amount(p.objective), amount(p.bound));
        (watch.progress)(Progress { objective, bound, work: p.work });
    };
    let stop = || (watch.stop)().is_some();
    let rank_options = RankOptions {
        plans: options.plans.max(1),
        min_difference: traffic.day.policy.min_difference as usize,
        solve: SolveOptions {
            seed: options.seed,
            work: options.work,
            gap: options.gap,
            ..SolveOptions::default()
        },
    };
    let search_watch = search::Watch { stop: &stop, progress: &progress };
    let mut search = Search::new(&problem.model).map_err(PlanError::Model)?;
    let solutions = search.rank_maximal(&rank_options, search_watch).map_err(PlanError::Model)?;
    tracing::debug!("searched");
    if solutions.first().is_none_or(|best| !best.violations.is_empty()) {
        // All else holds where nothing is flown but what was decided by hand, which was tried.
        return Err(PlanError::GrantRate);
    }
    let index = Index::new(&problem.model).map_err(PlanError::Model)?;
    let best = solutions.first();
    let bound = best.and_then(|s| s.bound).map(amount);
    let mut plans = Vec::with_capacity(solutions.len());
    for solution in &solutions {
        let choices = without_idle_grants(&problem, &index, &solution.choices);
        watch.wanted()?;
        let plan = plan_of(traffic, &problem, &index, &choices);
        watch.wanted()?;
        tracing::debug!("plan made");
        let mut claim = PlanUnderAudit::of(&plan, bound.filter(|_| plans.is_empty()));
        claim.by_hand = Some(problem.by_hand.clone());
        let report = audit(&traffic.day, &claim);
        tracing::debug!("plan audited");
        if !report.passed() {
            let some = &report.findings[..report.findings.len().min(MOST_LOGGED)];
            tracing::error!(findings = report.findings.len(), ?some, "a plan failed its audit");
            return Err(PlanError::FailedAudit(Box::new(report)));
        }
        plans.push(plan);
    }
    let stopped = match best.map(|s| s.stopped) {
        Some(search::Stopped::Optimal) => Stopped::Optimal,
        Some(search::Stopped::Gap) => Stopped::Gap,
        Some(search::Stopped::Asked) => (watch.stop)().unwrap_or(Stopped::Cancelled),
        Some(search::Stopped::Work | search::Stopped::Infeasible) | None => Stopped::Work,
    };
    let limit_prices = match best {
        Some(best) => limit_prices(traffic, &problem, best, options, watch)?,
        None => Vec::new(),
    };
    Ok(Plans { plans, bound, stopped, unmet, limit_prices })
}

/// The problem that is searched, and the decisions by hand that it leaves out.
pub(super) fn problem_of(
    traffic: &Traffic,
    options: &FindOptions,
    watch: Watch<'_>,
) -> Result<(Problem, Vec<HandDecision>), PlanError> {
    let mut problem = Problem::new(traffic, watch)?;
    let mut decisions = traffic.day.decisions.clone();
    decisions.extend(&options.decisions);
    decisions.sort_unstable();
    decisions.dedup();
    let unmet = by_hand::fix(traffic, &mut problem, &decisions, options.unmet)?;
    tracing::debug!(
        groups = problem.model.groups.len(),
        rows = problem.model.rows.len(),
        clashes = problem.model.clashes.len(),
        "model made"
    );
    Ok((problem, unmet))
}

/// Takes away grants that gain nothing, where the plan stays feasible without them: an option whose
/// net benefit is not positive is granted only where it makes room for others.
fn without_idle_grants(problem: &Problem, index: &Index, choices: &[u32]) -> Vec<u32> {
    let Some(mut state) = State::new(index, choices) else { return choices.to_vec() };
    loop {
        let before = state.choices();
        for (group, &candidate) in (0u32..).zip(&before) {
            let Some(now) = problem.combination(choice(group, candidate)) else { continue };
            let fewer = (0..problem.model.groups[group as usize].candidates.len() as u32)
                .map(|candidate| choice(group, candidate))
                .filter(|&fewer| {
                    let grants = problem.combination(fewer).map_or(&[][..], |c| &c.grants);
                    grants.len() < now.grants.len() && grants.iter().all(|g| now.grants.contains(g))
                })
                .find(|&fewer| state.gain(fewer) >= 0 && state.allows(fewer));
            if let Some(fewer) = fewer {
                state.switch(fewer);
            }
        }
        if state.choices() == before {
            return before;
        }
    }
}
