use serde::Serialize;

use crate::gaussian::Moments;
use crate::method::{Evaluations, Refusal};
use crate::outside::Flaw;
use crate::reference::{Reference, Sampler, Soundness};
use crate::score::{Floor, Invalid, Scorer, Scores};
use crate::suite::Case;
use crate::trust::{Standing, Trust, Verdict};

use super::SurveyPlan;
use super::cause::leading_cause;
use super::entrant::Candidate;
use super::regime::{Indices, OpinionsOf, Panel, indices};

/// What a survey found on one case.
#[derive(Debug, Clone)]
pub struct CaseResult {
    /// Its place in the suite.
    pub index: usize,
    /// Its reference (the replicates are dropped once everything is scored).
    pub reference: Reference,
    /// Why sampling ended.
    pub stop: Stop,
    /// How far the true law is from any Gaussian.
    pub floor: Floor,
    /// The floor against its limit.
    pub floor_standing: Standing,
    /// Where the case lies.
    pub indices: Indices,
    /// One an entrant, in the plan's order.
    pub answers: Vec<Answer>,
}

/// Why the sampling of a case ended.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub enum Stop {
    /// Every moment is as precise as asked, and every verdict that more samples could decide is decided.
    Decided,
    /// The cap was reached first.
    Cap,
    /// The reference is refused; more samples would not mend it.
    Refused,
}

/// A method's answer, or why it gave none.
pub type Answer = Result<Answered, Refusal>;

/// A method's answer on one case.
#[derive(Debug, Clone)]
pub struct Answered {
    /// Its moments of the whole state, or why an outside implementation has none.
    pub moments: Result<Moments, Flaw>,
    /// What richer rules say of it.
    pub opinions: OpinionsOf,
    /// What it evaluated, counted; `None` for an outside implementation.
    pub evaluations: Option<Evaluations>,
    /// Its scores, or why it has none.
    pub scores: Result<Scores, Invalid>,
    /// The verdict.
    pub verdict: Verdict,
    /// The leading cause of a rejection, in one sentence.
    pub cause: Option<String>,
    /// By how much its scores differ from those of its answer in an earlier survey, both on this reference; see
    /// [`SurveyPlan::earlier`].
    pub change: Option<Scores>,
}

/// Samples, scores and judges one case: deepens the reference until it is as precise as asked and every
/// verdict is decided, or the cap is reached. `None` when `stop` came first; `sampler` keeps what was sampled.
pub(super) fn run_case(
    case: &Case,
    index: usize,
    plan: &SurveyPlan,
    sampler: &mut Sampler<'_>,
    stop: &dyn Fn() -> bool,
) -> Option<CaseResult> {
    let candidates: Vec<Result<Candidate, Refusal>> = plan.entrants().map(|e| e.candidate(case, index)).collect();
    loop {
        if stop() {
            return None;
        }
        let more = sampler.deepen();
        let reference = sampler.reference();
        if reference.soundness == Soundness::Wide && more {
            continue;
        }
        let refused = reference.soundness == Soundness::Refused;
        let scorer = Scorer::new(case.prior(), case.sensor().outputs(), &reference);
        let judged: Vec<Result<_, Refusal>> = candidates
            .iter()
            .map(|c| c.as_ref().map(|c| judge(&scorer, &c.moments, plan)).map_err(Refusal::clone))
            .collect();
        let floor = if case.noise_inside().is_some() { Floor::NoiseInside } else { scorer.floor(case.noise()) };
        let floor_standing = plan.judge.floor(&floor);
        // More points cannot define what is undefined, nor mend a refused reference.
        let undecided = judged
            .iter()
            .flatten()
            .any(|(_, v)| v.trust == Trust::Undecided && v.finding.is_some_and(|f| f.estimate.is_some()))
            || (floor_standing == Standing::Open && matches!(floor, Floor::Known(_)));
        if undecided && more && !refused {
            continue;
        }
        let reference = sampler.witnessed(reference);
        // What no verdict can rest on says nothing, of the case no more than of a method.
        let doubt = reference.reason.as_ref().map(|reason| format!("no verdict rests on this reference: {reason}"));
        let floor_standing = if doubt.is_some() { Standing::Open } else { floor_standing };
        let panel = Panel::of(case);
        let answers = candidates
            .into_iter()
            .zip(judged)
            .zip(plan.entrants())
            .map(|((candidate, judged), entrant)| {
                let Candidate { moments, evaluations } = candidate?;
                let (scores, verdict) = judged?;
                // That there is no answer needs no reference.
                let doubt = doubt.clone().filter(|_| moments.is_ok());
                let verdict = doubt.map_or(verdict, self::undecided);
                let opinions = moments.as_ref().map(|m| panel.on(case, entrant.label(), m)).unwrap_or_default();
                let cause = match (&verdict, &moments) {
                    (Verdict { trust: Trust::Rejected, finding: Some(finding), .. }, Ok(moments)) => {
                        leading_cause(case, &reference, moments, finding)
                    }
                    _ => None,
                };
                let earlier = plan.earlier.get(case.id(), entrant.label());
                let change = match (&moments, earlier) {
                    (Ok(now), Some(before)) if now != before => scorer.difference(now, before),
                    _ => None,
                };
                Ok(Answered { moments, opinions, evaluations, scores, verdict, cause, change })
            })
            .collect();
        let stop = match reference.soundness {
            _ if refused => Stop::Refused,
            Soundness::Wide => Stop::Cap,
            _ if undecided => Stop::Cap,
            _ => Stop::Decided,
        };
        let reference = Reference { replicates: Vec::new(), ..reference };
        let indices = indices(case);
        return Some(CaseResult { index, reference, stop, floor, floor_standing, indices, answers });
    }
}

fn judge(
    scorer: &Scorer<'_>,
    moments: &Result<Moments, Flaw>,
    plan: &SurveyPlan,
) -> (Result<Scores, Invalid>, Verdict) {
    let moments = match moments {
        Ok(moments) => moments,
        Err(flaw) => {
            let scores = Err(Invalid::NoAnswer(flaw.to_string()));
            let verdict = plan.judge.verdict(&scores);
            return (scores, verdict);
        }
    };
    let scores = scorer.score(moments);
    let verdict = if !scorer.is_defined() {
        undecided("the covariance of the measurement is singular: add noise or drop an output".into())
    } else if !scorer.has_update() {
        undecided("the prior knows the state exactly: no measurement updates it".into())
    } else {
        plan.judge.verdict(&scores)
    };
    (scores, verdict)
}

fn undecided(reason: String) -> Verdict {
    Verdict { trust: Trust::Undecided, finding: None, reason }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::suite::Suite;
    use crate::survey::SurveySettings;

    #[test]
    fn on_a_refused_reference_nothing_is_said_of_method_or_case() {
        // A bearing from the middle of its prior: every direction is as likely. Scores and a floor of several nats could
        // be computed, and would mean nothing.
        let text = "[sensor]\nkind = \"bearing-only\"\nstation = [0, 0]\n[prior]\nmean = [0, 0]\nsd = [1, 1]\n\
            [noise]\nsd = \"0.5 deg\"\n";
        let suite = Suite::from_text("around", "around.toml", text, None).unwrap();
        let plan = SurveyPlan::new(&suite, &SurveySettings { cap: Some(1 << 17), ..Default::default() }).unwrap();
        let mut sampler = Sampler::new(&suite.cases[0], plan.sampler).unwrap();
        let result = run_case(&suite.cases[0], 0, &plan, &mut sampler, &|| false).unwrap();
        assert_eq!(result.reference.soundness, Soundness::Refused);
        assert!(matches!(result.floor, Floor::Known(e) if e.value > 1.0), "{:?}", result.floor);
        assert_eq!(result.floor_standing, Standing::Open);
        for answer in &result.answers {
            let verdict = &answer.as_ref().unwrap().verdict;
            assert_eq!(verdict.trust, Trust::Undecided);
            assert!(verdict.reason.starts_with("no verdict rests on this reference: "), "{}", verdict.reason);
        }
    }
}
