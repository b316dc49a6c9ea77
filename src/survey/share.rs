use rayon::prelude::*;

use super::run::Watch;
use super::settings::SurveyPlan;
use crate::reference::{Loaded, ShareSampler, Store};
use crate::shard::Shard;
use crate::suite::{Case, Suite};

/// How far the sampling of a share of the replicates came.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct ShareResult {
    /// Cases whose share is sampled to the cap.
    pub finished: usize,
    /// Cases of the suite.
    pub asked: usize,
}

/// Samples the replicates that `share` holds, of every case, up to the plan's cap, and leaves them in `store`. Nothing is
/// judged: a later survey with the same store finds the references whole when all shares are there.
pub fn sample_share(
    suite: &Suite,
    plan: &SurveyPlan,
    share: Shard,
    store: &Store,
    watch: &dyn Watch,
) -> ShareResult {
    let sampled = |case: &Case| sample(case, plan, share, store, watch).unwrap_or(false);
    let finished = suite.cases.par_iter().with_max_len(1).filter(|case| sampled(case)).count();
    ShareResult { finished, asked: suite.cases.len() }
}

/// Whether a case's share is sampled to the cap and kept.
fn sample(case: &Case, plan: &SurveyPlan, share: Shard, store: &Store, watch: &dyn Watch) -> Option<bool> {
    let settings = plan.sampler;
    let stored = match store.load_share(case, &settings, share) {
        Loaded::Missing => None,
        Loaded::Found(state) => match ShareSampler::resume(case, settings, share, *state) {
            Ok(sampler) => Some(sampler),
            Err(e) => {
                watch.note(&format!("a stored share of case `{}` is sampled anew: {e}", case.id()));
                None
            }
        },
        Loaded::Damaged(why) => {
            watch.note(&format!("a stored share is sampled anew: {why}"));
            None
        }
    };
    // The plan has checked the settings already.
    let mut sampler = stored.or_else(|| ShareSampler::new(case, settings, share).ok())?;
    let mut stopped = watch.stop();
    while !stopped && sampler.deepen() {
        stopped = watch.stop();
    }
    let state = sampler.state();
    if state.points() == 0 {
        return Some(false);
    }
    if let Err(e) = store.save_share(case, &settings, share, &state) {
        watch.note(&format!("a share is not kept: {e}: {}", e.source));
        return Some(false);
    }
    if !stopped {
        watch.case_done(state.points());
    }
    Some(!stopped)
}
