//! One transform of every default method, planned beforehand as an estimator would.

mod common;

use std::hint::black_box;
use std::time::Duration;

use criterion::{BenchmarkId, Criterion};
use gaussworthy::gaussian::Moments;
use gaussworthy::method::{Problem, default_methods};
use gaussworthy::suite::Case;

fn transforms(criterion: &mut Criterion, name: &str, case: &Case) {
    let (prior, noise) = (case.marginal().law(), case.noise_or_zero());
    let (a, p) = (prior.dimension(), case.sensor().outputs().len());
    let mut group = criterion.benchmark_group(format!("transform/{name}"));
    group.sample_size(20).warm_up_time(Duration::from_millis(500)).measurement_time(Duration::from_secs(1));
    for method in default_methods() {
        let Ok(mut transform) = method.plan(a, p) else { continue };
        let mut moments = Moments::zeros(a, p);
        group.bench_function(BenchmarkId::from_parameter(method.label()), |bencher| {
            bencher.iter(|| {
                let problem = Problem { sensor: case.sensor(), prior, noise: &noise };
                transform.apply(black_box(problem), &mut moments);
                black_box(&moments);
            });
        });
    }
    group.finish();
}

fn main() {
    let mut criterion = Criterion::default().configure_from_args();
    transforms(&mut criterion, "range-bearing-2d", &common::range_bearing());
    transforms(&mut criterion, "quadratic-6d", &common::quadratic());
    criterion.final_summary();
}
