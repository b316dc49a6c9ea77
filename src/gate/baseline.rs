use std::collections::BTreeMap;

use serde::{Deserialize, Serialize};
use sha2::{Digest, Sha256};

use crate::gaussian::Moments;
use crate::method::Evaluations;
use crate::reference::Soundness;
use crate::score::{Estimate, Floor, ScoreKind};
use crate::suite::{Case, Suite, hex};
use crate::survey::{Answer, CaseResult, Earlier, SurveyResult};
use crate::trust::{Limits, Standing, Trust};

/// What a survey of one suite found, in the detail that the gate compares.
#[derive(Debug, Clone, PartialEq)]
pub struct Baseline {
    /// How it was made.
    pub made: Made,
    /// Cases by name.
    pub cases: BTreeMap<String, KeptCase>,
    /// Time of a transform as a ratio to first-order Taylor, median over cases, by method; empty unless it was measured.
    pub time_ratios: BTreeMap<String, f64>,
}

/// How a baseline was made.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Made {
    /// Version of the program.
    pub version: String,
    /// Name of the suite.
    pub suite: String,
    /// SHA-256 of its text.
    pub hash: String,
    /// Seed of draws and samples.
    pub seed: u64,
    /// Standardised standard error asked.
    pub precision: f64,
    /// Most samples a case may take.
    pub cap: u64,
    /// Independent replicates of a reference.
    pub replicates: usize,
    /// Limits of the verdicts.
    pub limits: Limits,
}

/// One case.
#[derive(Debug, Clone, PartialEq)]
pub struct KeptCase {
    /// First 16 hexadecimals of the SHA-256 of [`Case::question`]: whether it is still the same question.
    pub question: String,
    /// Its reference.
    pub reference: KeptReference,
    /// By the label of the method or outside implementation.
    pub answers: BTreeMap<String, KeptAnswer>,
}

/// The reference of a case.
#[derive(Debug, Clone, PartialEq)]
pub struct KeptReference {
    /// The estimate.
    pub moments: Moments,
    /// Standard error of every entry.
    pub standard_error: Moments,
    /// How far it can be believed.
    pub soundness: Soundness,
    /// The floor, where it is a number.
    pub floor: Option<Estimate>,
    /// The floor against its limit.
    pub floor_standing: Standing,
}

/// What one method or outside implementation answered.
#[derive(Debug, Clone, PartialEq)]
pub enum KeptAnswer {
    /// The method does not serve the case.
    Skipped(String),
    /// There is no valid answer.
    Missing(String),
    /// An answer.
    Given {
        /// Its moments.
        moments: Moments,
        /// What was evaluated, where it was counted.
        evaluations: Option<Evaluations>,
        /// The verdict.
        trust: Trust,
        /// Why the answer is no Gaussian, or its scores where they are defined.
        scores: Result<BTreeMap<ScoreKind, Estimate>, String>,
    },
}

impl Baseline {
    /// What a survey found; the part of the cases that is finished.
    pub fn of(survey: &SurveyResult<'_>) -> Self {
        let (suite, plan) = (survey.suite, survey.plan);
        let labels = || plan.entrants().map(|entrant| entrant.label().to_string());
        let cases = survey.cases.iter().map(|result| {
            let case = &suite.cases[result.index];
            let answers = labels().zip(&result.answers).map(|(label, answer)| (label, KeptAnswer::of(answer)));
            let kept = KeptCase {
                question: question(case),
                reference: KeptReference::of(result),
                answers: answers.collect(),
            };
            (case.id().to_string(), kept)
        });
        let cases = cases.collect();
        let ratios = survey.timing.iter().flat_map(|timing| labels().zip(&timing.ratio));
        Self {
            made: Made {
                version: env!("CARGO_PKG_VERSION").into(),
                suite: suite.name.clone(),
                hash: suite.hash.clone(),
                seed: plan.sampler.seed,
                precision: plan.sampler.precision,
                cap: plan.sampler.cap,
                replicates: plan.sampler.replicates,
                limits: plan.limits,
            },
            cases,
            time_ratios: ratios.filter_map(|(label, ratio)| Some((label, ratio.as_ref()?.median))).collect(),
        }
    }

    /// Its answers to those cases of `suite` that are still the same question, to be given to a
    /// [`SurveyPlan`](crate::survey::SurveyPlan).
    pub fn earlier(&self, suite: &Suite) -> Earlier {
        let same = suite.cases.iter().filter_map(|case| Some((case, self.cases.get(case.id())?)));
        let same = same.filter(|(case, kept)| kept.question == question(case));
        same.flat_map(|(case, kept)| {
            kept.answers.iter().filter_map(|(label, answer)| match answer {
                KeptAnswer::Given { moments, .. } => Some((case.id().to_string(), label.clone(), moments.clone())),
                KeptAnswer::Skipped(_) | KeptAnswer::Missing(_) => None,
            })
        })
        .collect()
    }

    /// How many numbers it holds that chance has a part in.
    pub fn chances(&self) -> usize {
        let of_answer = |answer: &KeptAnswer| match answer {
            KeptAnswer::Given { scores: Ok(scores), .. } => scores.len(),
            _ => 0,
        };
        let of_case = |case: &KeptCase| {
            let Moments { mean, covariance, cross_covariance } = &case.reference.moments;
            let entries = mean.len() + covariance.len() + cross_covariance.len() + 1;
            entries + case.answers.values().map(of_answer).sum::<usize>()
        };
        self.cases.values().map(of_case).sum()
    }
}

impl KeptReference {
    fn of(result: &CaseResult) -> Self {
        Self {
            moments: result.reference.moments.clone(),
            standard_error: result.reference.standard_error.clone(),
            soundness: result.reference.soundness,
            floor: match result.floor {
                Floor::Known(estimate) => Some(estimate),
                Floor::Unbounded | Floor::Undefined | Floor::NoiseInside => None,
            },
            floor_standing: result.floor_standing,
        }
    }
}

impl KeptAnswer {
    fn of(answer: &Answer) -> Self {
        let answered = match answer {
            Ok(answered) => answered,
            Err(refusal) => return Self::Skipped(refusal.to_string()),
        };
        let moments = match &answered.moments {
            Ok(moments) => moments.clone(),
            Err(flaw) => return Self::Missing(flaw.to_string()),
        };
        let scores =
            answered.scores.as_ref().map_err(ToString::to_string).map(|scores| {
                ScoreKind::ALL.into_iter().filter_map(|kind| Some((kind, scores.get(kind)?))).collect()
            });
        Self::Given { moments, evaluations: answered.evaluations, trust: answered.verdict.trust, scores }
    }
}

/// What stands for the question of a case.
pub(super) fn question(case: &Case) -> String {
    let mut text = hex(&Sha256::digest(case.question()));
    text.truncate(16);
    text
}
