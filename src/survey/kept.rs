use super::SurveyPlan;
use super::case_run::{CaseResult, run_case};
use super::run::Watch;
use crate::reference::{Loaded, Sampler};
use crate::suite::Case;

/// Runs one case from what the store has of its reference, and leaves there what was sampled beyond, also when it was
/// stopped. The result is the same to the bit whatever the store holds.
pub(super) fn run_kept_case(case: &Case, index: usize, plan: &SurveyPlan, watch: &dyn Watch) -> Option<CaseResult> {
    let (mut sampler, stored) = begin(case, plan, watch)?;
    let result = run_case(case, index, plan, &mut sampler, &|| watch.stop());
    if let Some(store) = &plan.store {
        let state = sampler.state();
        if state.points() > stored
            && let Err(e) = store.save(case, &plan.sampler, &state)
        {
            watch.note(&format!("a reference is not kept for later: {e}: {}", e.source));
        }
    }
    result
}

/// A sampler, and how many samples it has from the store.
fn begin<'a>(case: &'a Case, plan: &SurveyPlan, watch: &dyn Watch) -> Option<(Sampler<'a>, u64)> {
    // The plan has checked the settings already.
    let anew = || Some((Sampler::new(case, plan.sampler).ok()?, 0));
    let unusable = |why: &str| watch.note(&format!("a stored reference is sampled anew: {why}"));
    let Some(store) = &plan.store else { return anew() };
    match store.load(case, &plan.sampler) {
        Loaded::Missing => anew(),
        Loaded::Damaged(why) => {
            unusable(&why);
            anew()
        }
        Loaded::Found(state) => {
            let points = state.points();
            match Sampler::resume(case, plan.sampler, *state) {
                Ok(sampler) => Some((sampler, points)),
                Err(e) => {
                    unusable(&format!("{}: {e}", store.path(case, &plan.sampler).display()));
                    anew()
                }
            }
        }
    }
}
