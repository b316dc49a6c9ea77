use std::time::{Duration, Instant, SystemTime};

use rayon::prelude::*;

use super::case_run::CaseResult;
use super::kept::run_kept_case;
use super::settings::SurveyPlan;
use super::timing::{Timing, time_methods};
use crate::suite::Suite;

/// Who watches a survey: progress goes out, the wish to stop comes in.
pub trait Watch: Sync {
    /// A case is finished after so many samples.
    fn case_done(&self, points: u64);

    /// Whether the survey should stop; what is finished stays.
    fn stop(&self) -> bool;

    /// Something went otherwise than the user might think, and the survey goes on; nothing is done with it unless this
    /// is written.
    fn note(&self, _text: &str) {}
}

/// Nobody watches: the survey runs to its end.
#[derive(Debug, Clone, Copy, Default)]
pub struct Unwatched;

impl Watch for Unwatched {
    fn case_done(&self, _points: u64) {}

    fn stop(&self) -> bool {
        false
    }
}

/// What a survey of one suite found.
#[derive(Debug)]
pub struct SurveyResult<'a> {
    /// The suite.
    pub suite: &'a Suite,
    /// What was done.
    pub plan: &'a SurveyPlan,
    /// The finished cases, in the suite's order.
    pub cases: Vec<CaseResult>,
    /// What the methods cost, if that was asked for.
    pub timing: Option<Timing>,
    /// When it began.
    pub started: SystemTime,
    /// How long sampling, scoring and judging took.
    pub sampling_time: Duration,
    /// How long timing took.
    pub timing_time: Duration,
}

impl SurveyResult<'_> {
    /// How many cases there were to do: the suite's, or this part's share of them.
    pub fn asked(&self) -> usize {
        let cases = self.suite.cases.len();
        self.plan.shard.map_or(cases, |shard| shard.share(cases))
    }

    /// Whether every one of them was finished.
    pub fn is_complete(&self) -> bool {
        self.cases.len() == self.asked()
    }

    /// Samples taken in all cases.
    pub fn points(&self) -> u64 {
        self.cases.iter().map(|c| c.reference.points).sum()
    }
}

/// Surveys a suite on rayon's current threads: samples, scores and judges its cases in parallel, then (when
/// `timed` and not stopped) times the methods with nothing else running.
///
/// Everything but the times is the same to the bit on any number of threads, and whatever the plan's store holds. A part
/// of a survey is not timed: parts may run on different machines, whose times do not compare.
pub fn survey<'a>(suite: &'a Suite, plan: &'a SurveyPlan, timed: bool, watch: &dyn Watch) -> SurveyResult<'a> {
    let started = SystemTime::now();
    let clock = Instant::now();
    let cases: Vec<CaseResult> = suite
        .cases
        .par_iter()
        .enumerate()
        // One case at a time: some take a thousand times longer than others.
        .with_max_len(1)
        .filter_map(|(index, case)| {
            if plan.shard.is_some_and(|shard| !shard.holds(index)) {
                return None;
            }
            let result = run_kept_case(case, index, plan, watch)?;
            watch.case_done(result.reference.points);
            Some(result)
        })
        .collect();
    let sampling_time = clock.elapsed();
    let clock = Instant::now();
    let timing = (timed && plan.shard.is_none() && !watch.stop()).then(|| time_methods(suite, &plan.methods));
    SurveyResult { suite, plan, cases, timing, started, sampling_time, timing_time: clock.elapsed() }
}
