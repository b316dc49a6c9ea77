//! Samples a second of the reference, on one thread and on two, by sensor family.

mod common;

use std::hint::black_box;
use std::time::Duration;

use criterion::{BenchmarkId, Criterion, Throughput};
use gaussworthy::reference::{Sampler, SamplerSettings};
use gaussworthy::suite::Case;
use rayon::ThreadPoolBuilder;

/// Samples of one reference, a power of two so that its doublings end on the cap. The pilot's 17 blocks, 1.7 % more,
/// are taken but not counted, as in a survey.
const SAMPLES: u64 = 1 << 20;

fn samples(criterion: &mut Criterion, family: &str, case: &Case) {
    // Nothing is as precise as this: every reference goes to its cap.
    let settings = SamplerSettings { precision: 0.0, cap: SAMPLES, ..SamplerSettings::default() };
    let mut group = criterion.benchmark_group(format!("reference/{family}"));
    group.throughput(Throughput::Elements(SAMPLES)).sample_size(20).measurement_time(Duration::from_secs(4));
    for threads in [1, 2] {
        let pool = ThreadPoolBuilder::new().num_threads(threads).build().expect("a pool of threads");
        group.bench_function(BenchmarkId::new("threads", threads), |bencher| {
            bencher.iter(|| {
                pool.install(|| Sampler::new(black_box(case), settings).expect("the cap is large enough").run())
            });
        });
    }
    group.finish();
}

fn main() {
    let mut criterion = Criterion::default().configure_from_args();
    samples(&mut criterion, "range-bearing", &common::range_bearing());
    samples(&mut criterion, "two-bearings", &common::two_bearings());
    samples(&mut criterion, "quadratic", &common::quadratic());
    criterion.final_summary();
}
