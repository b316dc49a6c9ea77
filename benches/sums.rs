//! A sample of a whole replicate where next to nothing but the sums is done: a linear sensor of `n` inputs and
//! `n` outputs, by level of vector instructions. The normals are included; the bench `net` times them alone.

use std::hint::black_box;
use std::time::Duration;

use criterion::{Criterion, Throughput};
use gaussworthy::lanes::Level;
use gaussworthy::reference::{Sampler, SamplerSettings};
use gaussworthy::suite::Case;
use rayon::ThreadPoolBuilder;
use serde_json::{Value, json};

/// Samples of one reference, beside which its pilot is small.
const SAMPLES: u64 = 1 << 19;

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

fn main() {
    let mut criterion = Criterion::default().configure_from_args();
    let pool = ThreadPoolBuilder::new().num_threads(1).build().expect("a pool of one thread");
    for n in [2, 6] {
        let case = linear(n);
        let mut group = criterion.benchmark_group(format!("sums/{n} inputs, {n} outputs"));
        group.throughput(Throughput::Elements(SAMPLES)).sample_size(10).measurement_time(Duration::from_secs(3));
        for level in Level::available() {
            // Nothing is as precise as this: every reference goes to its cap.
            let settings = SamplerSettings { precision: -1.0, cap: SAMPLES, level, ..SamplerSettings::default() };
            group.bench_function(level.to_string(), |bencher| {
                bencher.iter(|| {
                    pool.install(|| {
                        Sampler::new(black_box(&case), settings).expect("the cap is large enough").run()
                    })
                });
            });
        }
        group.finish();
    }
    criterion.final_summary();
}
