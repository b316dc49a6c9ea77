//! A whole case: samples a second of the reference, pilot included, on one thread and on two, by sensor family.

mod common;

use std::time::Duration;

use common::Model;
use criterion::{BenchmarkId, Criterion, Throughput};
use gaussworthy::reference::SamplerSettings;
use rayon::ThreadPoolBuilder;

/// Samples of one reference, a power of two so that its doublings end on the cap. The pilot's 65 blocks, 1.6 % more,
/// are taken but not counted, and so is its choice of control variates: as in a survey.
const SAMPLES: u64 = 1 << 20;

fn samples(criterion: &mut Criterion, family: &str, model: &Model) {
    // No error is below zero: every reference goes to its cap.
    let settings = SamplerSettings { precision: -1.0, cap: SAMPLES, ..SamplerSettings::default() };
    let mut group = criterion.benchmark_group(format!("reference/{family}"));
    group.throughput(Throughput::Elements(SAMPLES)).sample_size(20).measurement_time(Duration::from_secs(4));
    for threads in [1, 2] {
        let pool = ThreadPoolBuilder::new().num_threads(threads).build().expect("a pool of threads");
        group.bench_function(BenchmarkId::new("threads", threads), |bencher| {
            bencher.iter(|| pool.install(|| model.sampler(settings).run()));
        });
    }
    group.finish();
}

fn main() {
    let mut criterion = Criterion::default().configure_from_args();
    let families = ["range-bearing", "two-bearings", "quadratic", "range-azimuth-elevation"];
    for (name, family) in Model::NAMES.into_iter().zip(families) {
        samples(&mut criterion, family, &Model::new(name));
    }
    criterion.final_summary();
}
