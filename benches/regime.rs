//! What each regime index costs beside first-order Taylor, and a second opinion beside the rule that gives it, on one
//! range-bearing case as an estimator on board would compute it.

use criterion::{BenchmarkId, Criterion, criterion_group, criterion_main};
use gaussworthy::gaussian::{Gaussian, Moments};
use gaussworthy::method::{MethodSpec, Problem};
use gaussworthy::sensor::{Derivatives, RangeBearing, Sensor};
use gaussworthy::trust::{OPINIONS, bend_over_noise, curvature, information, second_opinion};
use nalgebra::{dmatrix, dvector};
use std::hint::black_box;

fn regime(c: &mut Criterion) {
    let sensor = RangeBearing::new(vec![[0.0, 0.0]], [0, 1], 2).expect("a radar");
    let prior = Gaussian::new(dvector![3000.0, 1000.0], dmatrix![2500.0, 300.0; 300.0, 4e4]).expect("a prior");
    let noise = dmatrix![100.0, 0.0; 0.0, 2.7e-5];
    let mut at = Derivatives::zeros(2, 2);
    let answer = |label: &str| {
        let mut moments = Moments::zeros(2, 2);
        let mut transform = MethodSpec::parse(label).expect("a method").plan(2, 2).expect("two of two");
        transform.apply(Problem { sensor: &sensor, prior: &prior, noise: &noise }, &mut moments);
        moments
    };
    let first_order = answer("taylor-1");
    let mut group = c.benchmark_group("regime");
    for label in std::iter::once("taylor-1").chain(OPINIONS) {
        let mut transform = MethodSpec::parse(label).expect("a method").plan(2, 2).expect("two of two");
        let mut moments = Moments::zeros(2, 2);
        group.bench_function(BenchmarkId::new("transform", label), |b| {
            b.iter(|| {
                transform.apply(black_box(Problem { sensor: &sensor, prior: &prior, noise: &noise }), &mut moments)
            });
        });
    }
    group.bench_function("derivatives", |b| {
        b.iter(|| sensor.hessians(black_box(prior.mean().as_slice()), &mut at));
    });
    sensor.hessians(prior.mean().as_slice(), &mut at);
    let p = prior.covariance();
    group.bench_function("curvature", |b| b.iter(|| curvature(black_box(&at), p, &noise)));
    group.bench_function("bend over noise", |b| b.iter(|| bend_over_noise(black_box(&at), p, &noise)));
    group.bench_function("information", |b| b.iter(|| information(black_box(&at), p, &noise)));
    group.bench_function("spread", |b| b.iter(|| Sensor::natural_spread(&sensor, black_box(&prior))));
    let richer = answer("gauss-hermite:order=3");
    group.bench_function("second opinion, without its rule", |b| {
        b.iter(|| second_opinion(&prior, Sensor::outputs(&sensor), black_box(&richer), &first_order));
    });
    group.finish();
}

criterion_group!(benches, regime);
criterion_main!(benches);
