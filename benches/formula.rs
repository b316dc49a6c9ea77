//! What a sensor written out as formulas costs beside the built-in one: references of range and bearing, one thread.

use std::time::Duration;

use criterion::{Criterion, Throughput};
use gaussworthy::reference::{Sampler, SamplerSettings};
use gaussworthy::suite::Case;
use rayon::ThreadPoolBuilder;
use serde_json::{Value, json};

const SAMPLES: u64 = 1 << 20;

fn case(sensor: Value) -> Case {
    Case::from_json(json!({
        "case": "ferry", "sensor": sensor,
        "prior": {"mean": [3000, 1000], "covariance": [[2500, 100], [100, 40000]]},
        "noise": {"covariance": [[100, 0], [0, 2.7e-5]]},
    }))
    .expect("a case")
}

fn main() {
    let mut criterion = Criterion::default().configure_from_args();
    let cases = [
        ("built-in", case(json!({"kind": "range-bearing", "station": [20, -5]}))),
        (
            "formulas",
            case(json!({
                "state": ["x", "y"], "parameters": {"sx": 20, "sy": -5},
                "definitions": {"east": "x - sx", "north": "y - sy"},
                "outputs": [
                    {"name": "range", "formula": "hypot(east, north)", "unit": "m"},
                    {"name": "bearing", "formula": "atan2(north, east)", "angular": true},
                ],
            })),
        ),
    ];
    // No error is below zero: every reference goes to its cap.
    let settings = SamplerSettings { precision: -1.0, cap: SAMPLES, ..SamplerSettings::default() };
    let pool = ThreadPoolBuilder::new().num_threads(1).build().expect("a pool of threads");
    let mut group = criterion.benchmark_group("formula/range-bearing");
    group.throughput(Throughput::Elements(SAMPLES)).sample_size(20).measurement_time(Duration::from_secs(4));
    for (name, case) in &cases {
        group.bench_function(*name, |bencher| {
            bencher.iter(|| pool.install(|| Sampler::new(case, settings).expect("the cap is large enough").run()));
        });
    }
    group.finish();
    criterion.final_summary();
}
