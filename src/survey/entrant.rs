//! Who answers in a survey: the built-in methods of a plan, and behind them the implementations outside of it. From here on
//! there is no difference between the two, but that outside answers are neither counted nor timed.

use super::SurveyPlan;
use crate::gaussian::Moments;
use crate::method::{Counted, Evaluations, MethodSpec, Problem, Refusal};
use crate::outside::{Flaw, Outside};
use crate::suite::Case;

/// One that answers.
#[derive(Debug, Clone, Copy)]
pub enum Entrant<'a> {
    /// A method that is run.
    Method(&'a MethodSpec),
    /// Answers that are there already.
    Outside(&'a Outside),
}

/// The answer to one case, yet to be scored.
pub(crate) struct Candidate {
    /// Of the whole state.
    pub moments: Result<Moments, Flaw>,
    /// What was evaluated, where it could be counted.
    pub evaluations: Option<Evaluations>,
}

impl SurveyPlan {
    /// Everyone who answers, in the order of rows: methods, then outside implementations.
    pub fn entrants(&self) -> impl Iterator<Item = Entrant<'_>> {
        self.methods.iter().map(Entrant::Method).chain(self.outside.iter().map(Entrant::Outside))
    }
}

impl<'a> Entrant<'a> {
    /// What it is called in tables and files.
    pub fn label(self) -> &'a str {
        match self {
            Self::Method(method) => method.label(),
            Self::Outside(outside) => outside.name(),
        }
    }

    /// Its answer to the case at `index` in the suite.
    pub(super) fn candidate(self, case: &Case, index: usize) -> Result<Candidate, Refusal> {
        match self {
            Self::Method(method) => transformed(case, method),
            Self::Outside(outside) => Ok(Candidate { moments: outside.answer(index).cloned(), evaluations: None }),
        }
    }
}

/// The moments of a case by a method, of the whole state.
pub(crate) fn transformed(case: &Case, method: &MethodSpec) -> Result<Candidate, Refusal> {
    let prior = case.marginal().law();
    let (a, p) = (prior.dimension(), case.sensor().outputs().len());
    method.method().serves(case.sensor())?;
    let mut transform = method.plan(a, p)?;
    let counted = Counted::new(case.sensor());
    let noise = case.noise_or_zero();
    let mut moments = Moments::zeros(a, p);
    transform.apply(Problem { sensor: &counted, prior, noise: &noise }, &mut moments);
    moments.cross_covariance = case.marginal().lift(moments.cross_covariance);
    Ok(Candidate { moments: Ok(moments), evaluations: Some(counted.evaluations()) })
}
