//! What a method does where its result is not one: it says so by its numbers, and never panics.

use gaussworthy::gaussian::{Gaussian, Moments};
use gaussworthy::method::{MethodSpec, Problem};
use gaussworthy::sensor::{Number, Output, RangeBearing};
use nalgebra::{DMatrix, dmatrix, dvector};

use crate::cases::{Polynomial, Shape, Shaped, assert_close, methods, methods_for, moments, sensors, standard};

#[test]
fn an_indefinite_covariance_comes_out_as_it_is() {
    // y = z'z on N(0, I): d = a + kappa at every outer point and 0 at the centre, e = a, so the rule's variance
    // is kappa / (a + kappa) a^2 + a / (a + kappa) kappa^2 = a kappa, negative with kappa (the truth is 2a).
    for (label, a, kappa) in [("unscented", 6, -3.0), ("unscented", 4, -1.0), ("unscented:kappa=-3.9", 4, -3.9)] {
        let method = MethodSpec::parse(label).unwrap();
        let squares = (0..a).map(|i| (1.0, (0..a).map(|k| if i == k { 2 } else { 0 }).collect())).collect();
        let got = moments(&method, &Polynomial::new(a, vec![squares]), &standard(a), &dmatrix![0.25]);
        let variance = a as f64 * kappa;
        assert_close(got.mean[0], a as f64, 1e-12, a as f64, label);
        assert_close(got.covariance[(0, 0)], variance + 0.25, 1e-12, variance.abs() * 40.0, label);
        assert!(got.covariance[(0, 0)] < 0.0);
        assert!(got.conditional(&standard(a), &dvector![1.0]).is_none());
    }
}

#[test]
fn a_kappa_that_leaves_no_distance_is_refused_with_the_reason() {
    let refusal = |label: &str, a| MethodSpec::parse(label).unwrap().plan(a, 1).unwrap_err().0;
    assert_eq!(
        refusal("unscented:kappa=-2", 2),
        "a + kappa is 2 + -2 = 0, which has no square root to place points at; kappa must be above -2"
    );
    assert!(refusal("unscented-scaled:kappa=-3", 2).starts_with("a + kappa is 2 + -3 = -1"));
    assert!(refusal("unscented-scaled:alpha=1e-200", 2).starts_with("the squared distance of the points"));
    assert!(refusal("unscented-scaled:alpha=1e200", 2).starts_with("the squared distance of the points"));
    for method in methods() {
        assert!(method.plan(0, 1).unwrap_err().0.contains("reads no state component"));
    }
}

#[test]
fn a_station_on_the_mean_gives_taylor_no_number_and_no_panic() {
    let sensor = RangeBearing::new(vec![[3.0, 4.0]], [0, 1], 2).unwrap();
    let prior = Gaussian::new(dvector![3.0, 4.0], dmatrix![1.0, 0.2; 0.2, 2.0]).unwrap();
    for method in methods_for(&sensor) {
        let got = moments(&method, &sensor, &prior, &DMatrix::zeros(2, 2));
        let is_taylor = method.kind().unwrap().id.starts_with("taylor");
        assert_eq!(got.is_finite(), !is_taylor, "{}: {got:?}", method.label());
    }
}

#[derive(Debug)]
struct Root;

impl Shape for Root {
    fn evaluate<T: Number>(x: &[T]) -> T {
        x[0].sqrt()
    }
}

#[derive(Debug)]
struct Inverse;

impl Shape for Inverse {
    fn evaluate<T: Number>(x: &[T]) -> T {
        T::constant(1.0) / x[0]
    }
}

#[test]
fn values_that_are_not_numbers_pass_through() {
    // sqrt(x) around -1 is NaN at the mean and beside it; 1 / x around 0 is infinite at the mean, which only
    // the rules without a point there do not see.
    let below = Gaussian::new(dvector![-1.0], dmatrix![1.0]).unwrap();
    for output in [Output::plain("y", ""), Output::angle("y")] {
        let root = Shaped::<Root>::new(1, output.clone());
        let inverse = Shaped::<Inverse>::new(1, output.clone());
        for method in methods_for(&root) {
            assert!(!moments(&method, &root, &below, &dmatrix![1.0]).is_finite(), "{}", method.label());
            let sees_the_mean = match method.method().point_set(1).unwrap() {
                Some(set) => set.points().iter().any(|&z| z == 0.0),
                None => true,
            };
            // The chart of an angle is centred at h(m), so there every method sees it.
            let finite = !sees_the_mean && !output.angular;
            let got = moments(&method, &inverse, &standard(1), &dmatrix![1.0]);
            assert_eq!(got.is_finite(), finite, "{}: {got:?}", method.label());
        }
    }
    let blind = ["cubature-3", "gauss-hermite:order=2", "gauss-hermite:order=4", "simplex", "monte-carlo"];
    for label in blind {
        let set = MethodSpec::parse(label).unwrap().method().point_set(1).unwrap().unwrap();
        assert!(set.points().iter().all(|&z| z != 0.0), "{label}");
    }
}

#[test]
fn the_workspace_carries_nothing_over() {
    // Once on a sensor that leaves NaN everywhere, then on a sound one: the same bits as from a fresh plan,
    // with the root given, made by Cholesky, or by eigenvalues.
    for (sensor, prior) in sensors() {
        let sensor = sensor.sensor();
        let (a, p) = (prior.dimension(), sensor.outputs().len());
        // Rank one, and a root that is not triangular.
        let sd = prior.covariance().diagonal().map(f64::sqrt);
        let singular = Gaussian::new(prior.mean().clone(), &sd * sd.transpose()).unwrap();
        let root = DMatrix::from_fn(a, a, |i, j| sd[i] * if i + j + 1 == a { 0.8 } else { 0.2 });
        let rooted = Gaussian::from_root(prior.mean().clone(), root).unwrap();
        let noise = DMatrix::from_diagonal_element(p, p, 0.01);
        for method in methods_for(sensor) {
            let mut transform = method.plan(a, p).unwrap();
            let mut got = Moments::zeros(a, p);
            for prior in [&prior, &singular, &rooted, &prior] {
                got.mean.fill(f64::NAN);
                got.covariance.fill(f64::NAN);
                got.cross_covariance.fill(f64::NAN);
                let poison = Poison { reads: (0..a).collect(), outputs: sensor.outputs().to_vec() };
                transform.apply(Problem { sensor: &poison, prior, noise: &noise }, &mut got);
                assert!(!got.is_finite());
                transform.apply(Problem { sensor, prior, noise: &noise }, &mut got);
                assert_eq!(got, moments(&method, sensor, prior, &noise), "{}", method.label());
                assert!(got.is_finite(), "{}", method.label());
                assert_eq!(got.covariance, got.covariance.transpose(), "{}", method.label());
            }
        }
    }
}

/// A sensor whose every output is NaN.
#[derive(Debug)]
struct Poison {
    reads: Vec<usize>,
    outputs: Vec<Output>,
}

impl gaussworthy::sensor::Formula for Poison {
    fn reads(&self) -> &[usize] {
        &self.reads
    }

    fn outputs(&self) -> &[Output] {
        &self.outputs
    }

    fn evaluate<T: Number>(&self, x: &[T], y: &mut [T]) {
        y.fill(x[0] * T::constant(f64::NAN));
    }
}

#[test]
fn noise_is_added_to_the_covariance_and_to_nothing_else() {
    for (sensor, prior) in sensors() {
        let p = sensor.sensor().outputs().len();
        let root = DMatrix::from_fn(p, p, |i, j| 1.0 + i as f64 - 0.3 * j as f64);
        let noise = &root * root.transpose();
        for method in methods_for(sensor.sensor()) {
            let without = moments(&method, sensor.sensor(), &prior, &DMatrix::zeros(p, p));
            let with = moments(&method, sensor.sensor(), &prior, &noise);
            assert_eq!((&with.mean, &with.cross_covariance), (&without.mean, &without.cross_covariance));
            let scale = with.covariance.amax();
            let difference = (with.covariance - without.covariance - &noise).amax();
            assert_close(difference, 0.0, 1e-15, scale, method.label());
        }
    }
}
