//! What surrounds the sampling: scoring a method, and a whole suite from sampling to verdicts.

mod common;

use std::hint::black_box;
use std::time::Duration;

use criterion::Criterion;
use gaussworthy::gaussian::Moments;
use gaussworthy::method::{MethodSpec, Problem};
use gaussworthy::reference::{Sampler, SamplerSettings};
use gaussworthy::score::Scorer;
use gaussworthy::suite::Suite;
use gaussworthy::survey::{SurveyPlan, SurveySettings, Watch, survey};

/// Nobody watches.
struct Alone;

impl Watch for Alone {
    fn case_done(&self, _: u64) {}

    fn stop(&self) -> bool {
        false
    }
}

fn scores(criterion: &mut Criterion) {
    let case = common::range_bearing();
    let settings = SamplerSettings { precision: 1e-2, ..SamplerSettings::default() };
    let reference = Sampler::new(&case, settings).expect("the default cap is large enough").run();
    let (prior, noise) = (case.prior(), case.noise_or_zero());
    let method = MethodSpec::parse("taylor-1").expect("a built-in method");
    let mut moments = Moments::zeros(2, 2);
    let problem = Problem { sensor: case.sensor(), prior, noise: &noise };
    method.plan(2, 2).expect("two of two").apply(problem, &mut moments);

    let outputs = case.sensor().outputs();
    let mut group = criterion.benchmark_group("score");
    group.sample_size(20).measurement_time(Duration::from_secs(2));
    group.bench_function("scorer of a reference", |bencher| {
        bencher.iter(|| Scorer::new(black_box(prior), outputs, &reference));
    });
    let scorer = Scorer::new(prior, outputs, &reference);
    group.bench_function("one method", |bencher| bencher.iter(|| scorer.score(black_box(&moments))));
    group.finish();
}

fn smoke(criterion: &mut Criterion) {
    let suite = Suite::load("smoke", None).expect("a bundled suite");
    let plan = SurveyPlan::new(&suite, &SurveySettings::default()).expect("the suite's own settings");
    let mut group = criterion.benchmark_group("survey");
    group.sample_size(10).measurement_time(Duration::from_secs(10));
    group.bench_function("smoke, all threads, no timing", |bencher| {
        bencher.iter(|| survey(black_box(&suite), &plan, false, &Alone));
    });
    group.finish();
}

fn main() {
    let mut criterion = Criterion::default().configure_from_args();
    scores(&mut criterion);
    smoke(&mut criterion);
    criterion.final_summary();
}
