//! A whole replicate where the sums weigh most, by level of vector instructions: a linear sensor of n inputs and n
//! outputs, which asks for no control variates, and quadratic forms in 6 states with the sums of 209 of them. The
//! normals are included; the bench `net` times them alone.

mod common;

use std::time::Duration;

use criterion::{Criterion, Throughput};
use gaussworthy::lanes::Level;
use gaussworthy::reference::{Sampler, SamplerSettings};
use gaussworthy::suite::Case;
use rayon::ThreadPoolBuilder;
use serde_json::{Value, json};

/// Samples of one reference, beside which its pilot is small.
const SAMPLES: u64 = 1 << 20;

fn identity(n: usize) -> Value {
    json!((0..n).map(|i| (0..n).map(|k| f64::from(u8::from(i == k))).collect()).collect::<Vec<Vec<f64>>>())
}

fn linear(n: usize) -> Case {
    Case::from_json(json!({
        "case": "gauges",
        "sensor": {"kind": "linear", "H": identity(n)},
        "prior": {"mean": vec![0.0; n], "covariance": identity(n)},
        "noise": {"covariance": 1.0},
    }))
    .expect("a case of ours is a case")
}

fn sums(criterion: &mut Criterion, name: &str, case: &Case) {
    let pool = ThreadPoolBuilder::new().num_threads(1).build().expect("a pool of one thread");
    let mut group = criterion.benchmark_group(format!("sums/{name}"));
    group.throughput(Throughput::Elements(SAMPLES)).sample_size(10).measurement_time(Duration::from_secs(3));
    for level in Level::available() {
        // No error is below zero: every reference goes to its cap.
        let settings = SamplerSettings { precision: -1.0, cap: SAMPLES, level, ..SamplerSettings::default() };
        group.bench_function(level.to_string(), |bencher| {
            bencher.iter(|| pool.install(|| Sampler::new(case, settings).expect("the cap is large enough").run()));
        });
    }
    group.finish();
}

fn main() {
    let mut criterion = Criterion::default().configure_from_args();
    sums(&mut criterion, "linear, 2 to 2", &linear(2));
    sums(&mut criterion, "linear, 6 to 6", &linear(6));
    sums(&mut criterion, "quadratic, 6 to 2 with control variates", &common::quadratic());
    criterion.final_summary();
}
