use std::collections::BTreeMap;

use super::run::SurveyResult;
use super::timing::Quartiles;
use crate::method::Evaluations;
use crate::reference::{PointSource, Soundness};
use crate::score::Floor;
use crate::trust::{Standing, Trust};

/// A survey of one suite in a few numbers.
#[derive(Debug, Clone, PartialEq)]
pub struct Summary {
    /// Cases finished.
    pub cases: usize,
    /// Cases in which the floor is above its limit: no Gaussian should be trusted there.
    pub beyond_gaussian: usize,
    /// Cases whose floor is kept: there a Gaussian will do.
    pub gaussian: usize,
    /// Cases in which it cannot be told whether the floor is above its limit.
    pub floor_open: usize,
    /// Cases whose reference fell short of the asked precision at the cap.
    pub wide: usize,
    /// Largest standardised standard error of a reference that bears verdicts; `None` if none does.
    pub worst_error: Option<f64>,
    /// Cases whose reference is refused: a moment does not exist, or cannot be had by sampling.
    pub refused: usize,
    /// Cases whose reference an independent plain estimate disputes.
    pub disputed: usize,
    /// Cases whose reference has a tail so heavy that no standard error can be believed.
    pub heavy_tailed: usize,
    /// Cases without noise: R = 0, and none inside.
    pub noiseless: usize,
    /// Cases with noise inside h, where the floor is not defined.
    pub noise_inside: usize,
    /// Cases sampled by plain streams, for want of nets in so many dimensions.
    pub streamed: usize,
    /// One an entrant, in the plan's order.
    pub methods: Vec<MethodSummary>,
}

/// How one method or outside implementation fared in a suite.
#[derive(Debug, Clone, PartialEq)]
pub struct MethodSummary {
    /// The method's label.
    pub label: String,
    /// What a transform evaluates at the least and at the most; `None` if it was skipped everywhere, or is
    /// outside and not counted.
    pub evaluations: Option<(Evaluations, Evaluations)>,
    /// Time of a transform as a ratio to first-order Taylor, quartiles over cases.
    pub time_ratio: Option<Quartiles>,
    /// Cases in which it is trusted.
    pub trusted: usize,
    /// Those of them whose floor is kept.
    pub trusted_where_gaussian: usize,
    /// Most work of a transform, see [`Evaluations::work`]; `None` where evaluations are.
    pub work: Option<u64>,
    /// Cases in which it is rejected.
    pub rejected: usize,
    /// Cases in which the reference cannot tell.
    pub undecided: usize,
    /// Cases that it cannot serve.
    pub skipped: usize,
    /// Why, of the first of those.
    pub skip_reason: Option<String>,
    /// What is broken by the largest factor most often, and in how many of the rejected cases.
    pub breaks_first: Option<(&'static str, usize)>,
}

impl Summary {
    /// Of the methods that are trusted in every case whose floor is kept the one of least work; `None` where there is no such
    /// case, or no such method.
    pub fn cheapest_where_gaussian(&self) -> Option<&MethodSummary> {
        let everywhere =
            self.methods.iter().filter(|m| self.gaussian > 0 && m.trusted_where_gaussian == self.gaussian);
        everywhere.filter(|m| m.work.is_some()).min_by_key(|m| m.work)
    }
}

impl MethodSummary {
    /// Cases that it could serve.
    pub fn served(&self) -> usize {
        self.trusted + self.rejected + self.undecided
    }
}

/// Counts a survey's verdicts.
pub fn summarise(survey: &SurveyResult<'_>) -> Summary {
    let count = |holds: &dyn Fn(&super::CaseResult) -> bool| survey.cases.iter().filter(|c| holds(c)).count();
    Summary {
        cases: survey.cases.len(),
        beyond_gaussian: count(&|c| c.floor_standing == Standing::Broken),
        gaussian: count(&|c| c.floor_standing == Standing::Kept),
        floor_open: count(&|c| c.floor_standing == Standing::Open && c.floor != Floor::NoiseInside),
        wide: count(&|c| c.reference.soundness == Soundness::Wide),
        worst_error: survey
            .cases
            .iter()
            .filter(|c| c.reference.soundness.bears_verdicts())
            .map(|c| c.reference.worst_error)
            .max_by(f64::total_cmp),
        refused: count(&|c| c.reference.soundness == Soundness::Refused),
        disputed: count(&|c| c.reference.soundness == Soundness::Disputed),
        heavy_tailed: count(&|c| c.reference.soundness == Soundness::HeavyTailed),
        noiseless: count(&|c| survey.suite.cases[c.index].noise().is_none() && c.floor != Floor::NoiseInside),
        noise_inside: count(&|c| c.floor == Floor::NoiseInside),
        streamed: count(&|c| c.reference.source == PointSource::Streams),
        methods: survey.plan.entrants().enumerate().map(|(m, e)| summarise_method(survey, m, e.label())).collect(),
    }
}

fn summarise_method(survey: &SurveyResult<'_>, m: usize, label: &str) -> MethodSummary {
    let mut summary = MethodSummary {
        label: label.into(),
        evaluations: None,
        time_ratio: survey.timing.as_ref().and_then(|t| t.ratio.get(m).copied().flatten()),
        trusted: 0,
        trusted_where_gaussian: 0,
        work: None,
        rejected: 0,
        undecided: 0,
        skipped: 0,
        skip_reason: None,
        breaks_first: None,
    };
    let mut faults: BTreeMap<&'static str, usize> = BTreeMap::new();
    for case in &survey.cases {
        let answered = match &case.answers[m] {
            Ok(answered) => answered,
            Err(refusal) => {
                summary.skipped += 1;
                summary.skip_reason.get_or_insert_with(|| refusal.to_string());
                continue;
            }
        };
        if let Some(here) = answered.evaluations {
            let (least, most) = summary.evaluations.unwrap_or((here, here));
            summary.evaluations = Some((
                if here.values < least.values { here } else { least },
                if here.values > most.values { here } else { most },
            ));
        }
        let inputs = survey.suite.cases[case.index].marginal().law().dimension();
        summary.work = summary.work.max(answered.evaluations.map(|e| e.work(inputs)));
        match answered.verdict.trust {
            Trust::Trusted => {
                summary.trusted += 1;
                summary.trusted_where_gaussian += usize::from(case.floor_standing == Standing::Kept);
            }
            Trust::Undecided => summary.undecided += 1,
            Trust::Rejected => {
                summary.rejected += 1;
                let fault = match (&answered.verdict.finding, &answered.moments) {
                    (Some(finding), _) => finding.fault(),
                    (None, Ok(_)) => "no Gaussian",
                    (None, Err(_)) => "no valid answer",
                };
                *faults.entry(fault).or_default() += 1;
            }
        }
    }
    summary.breaks_first = faults.into_iter().max_by_key(|&(_, count)| count);
    summary
}
