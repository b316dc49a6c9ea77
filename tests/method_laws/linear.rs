//! Every method is exact on a linear sensor.

use gaussworthy::gaussian::{Gaussian, wrap};
use gaussworthy::method::MethodSpec;
use gaussworthy::sensor::{Linear, Output, Sensor};
use nalgebra::{DMatrix, DVector, dmatrix, dvector};

use crate::cases::{
    Dice, Polynomial, Shape, Shaped, TIGHT, assert_close, has_tiny_alpha, is_exact_on_linear, methods_for, moments,
    tolerance,
};

/// Those that are exact on linear sensors and serve this one: all but samples and Bayesian quadrature.
fn exact_methods(sensor: &dyn Sensor) -> impl Iterator<Item = MethodSpec> {
    methods_for(sensor).into_iter().filter(is_exact_on_linear)
}

/// mu = H m + o, S = H P H' + R, C = P H' (Kalman 1960), relative to the sizes of what is summed.
fn assert_exact_on_linear(h: &DMatrix<f64>, o: &DVector<f64>, prior: &Gaussian, r: &DMatrix<f64>) {
    let rows = h.row_iter().map(|row| row.iter().copied().collect()).collect();
    let sensor = Linear::new(rows, o.as_slice().to_vec(), prior.dimension()).unwrap();
    for method in exact_methods(&sensor) {
        assert_moments_are_exact(&method, &sensor, (h, o), prior, r);
    }
}

fn assert_moments_are_exact(
    method: &MethodSpec,
    sensor: &Linear,
    (h, o): (&DMatrix<f64>, &DVector<f64>),
    prior: &Gaussian,
    r: &DMatrix<f64>,
) {
    let got = moments(method, sensor, prior, r);
    let mean = h * prior.mean() + o;
    let cross = prior.covariance() * h.transpose();
    let covariance = h * &cross + r;
    let sd = prior.covariance().diagonal().map(f64::sqrt);
    // Output j is a sum of terms of this size.
    let size = h.abs() * (prior.mean().abs() + &sd) + o.abs();
    let what = format!(
        "{} on {} components of rank {:?}",
        method.label(),
        sd.len(),
        sd.iter().filter(|&&s| s > 0.0).count()
    );
    for j in 0..o.len() {
        assert_close(got.mean[j], mean[j], tolerance(method), size[j], &what);
        for l in 0..o.len() {
            let scale = size[j] * size[l] + r[(j, j)].max(r[(l, l)]);
            assert_close(got.covariance[(j, l)], covariance[(j, l)], TIGHT, scale, &what);
        }
        for i in (0..sd.len()).filter(|&i| sd[i] > 0.0) {
            let scale = sd[i] * size[j];
            assert_close(got.cross_covariance[(i, j)], cross[(i, j)], TIGHT, scale, &what);
        }
    }
}

#[test]
fn every_method_is_exact_on_linear_sensors() {
    let mut dice = Dice::new(20_001);
    for a in 1..=6 {
        for p in 1..=3 {
            let (h, o, r) = (dice.matrix(p, a), dice.matrix(p, 1).column(0).into_owned(), dice.covariance(p));
            let prior = dice.law(a, a);
            assert_exact_on_linear(&h, &o, &prior, &r);
            assert_exact_on_linear(&h, &o, &prior, &DMatrix::zeros(p, p));
        }
    }
}

#[test]
fn every_method_is_exact_on_linear_sensors_when_the_prior_is_singular() {
    let mut dice = Dice::new(20_002);
    for a in 2..=6 {
        for rank in 1..a {
            let (h, o, r) = (dice.matrix(2, a), dice.matrix(2, 1).column(0).into_owned(), dice.covariance(2));
            let prior = dice.law(a, rank);
            assert_exact_on_linear(&h, &o, &prior, &r);
        }
    }
    // A component known exactly, and nothing unknown at all.
    let known =
        Gaussian::new(dvector![1.0, 2.0, 3.0], dmatrix![4.0, 0.0, 1.0; 0.0, 0.0, 0.0; 1.0, 0.0, 9.0]).unwrap();
    let certain = Gaussian::new(dvector![1.0, 2.0, 3.0], DMatrix::zeros(3, 3)).unwrap();
    let (h, o) = (dmatrix![1.0, -2.0, 0.5; 3.0, 1.0, -1.0], dvector![10.0, -3.0]);
    assert_exact_on_linear(&h, &o, &known, &dmatrix![1.0, 0.2; 0.2, 2.0]);
    assert_exact_on_linear(&h, &o, &certain, &dmatrix![1.0, 0.2; 0.2, 2.0]);
}

#[test]
fn a_given_root_is_the_one_that_is_used() {
    // Exactness does not depend on the root; the points do. A root that is not triangular and has a column
    // of the wrong sign gives the same moments of a linear sensor.
    let mut dice = Dice::new(20_003);
    for a in 1..=6 {
        let root = dice.matrix(a, a);
        let prior = Gaussian::from_root(dice.matrix(a, 1).column(0).into(), root).unwrap();
        let (h, o, r) = (dice.matrix(2, a), dice.matrix(2, 1).column(0).into_owned(), dice.covariance(2));
        assert_exact_on_linear(&h, &o, &prior, &r);
    }
    // By z = +-sqrt(2) e_i along F = [[1, 1], [1, -1]] / sqrt(2), x = +-(1, 1) and +-(1, -1): the cubature rule
    // sees x1 x2 = +-1 with variance 1. Along the Cholesky root, the identity, it sees x1 x2 = 0 everywhere.
    let half = 0.5f64.sqrt();
    let turned = Gaussian::from_root(dvector![0.0, 0.0], dmatrix![half, half; half, -half]).unwrap();
    let upright = Gaussian::new(dvector![0.0, 0.0], turned.covariance().clone()).unwrap();
    let product = Polynomial::new(2, vec![vec![(1.0, vec![1, 1])]]);
    let cubature = MethodSpec::parse("cubature-3").unwrap();
    let none = dmatrix![0.0];
    assert_close(moments(&cubature, &product, &turned, &none).covariance[(0, 0)], 1.0, 4e-15, 1.0, "turned");
    assert_close(moments(&cubature, &product, &upright, &none).covariance[(0, 0)], 0.0, 4e-15, 1.0, "upright");
}

#[derive(Debug)]
struct Sum;

impl Shape for Sum {
    fn evaluate<T: gaussworthy::sensor::Number>(x: &[T]) -> T {
        x.iter().fold(T::constant(0.0), |sum, &v| sum + v)
    }
}

#[test]
fn a_linear_angle_is_exact_in_its_chart() {
    // theta = x1 + x2, an angle that the sensor does not wrap, anywhere along five turns; no point comes
    // within pi of the far side of the chart (sd 0.1, points up to 2.9 sd away).
    let sensor = Shaped::<Sum>::new(2, Output::angle("theta"));
    let covariance = dmatrix![0.006, 0.001; 0.001, 0.002];
    let r = dmatrix![1e-4];
    for k in -50..=50 {
        let m = f64::from(k) * 0.314;
        let prior = Gaussian::new(dvector![m, 0.3], covariance.clone()).unwrap();
        for method in exact_methods(&sensor) {
            let got = moments(&method, &sensor, &prior, &r);
            let what = format!("{} at {m}", method.label());
            assert!(got.mean[0] > -std::f64::consts::PI && got.mean[0] <= std::f64::consts::PI, "{what}");
            let size = m.abs() + 0.3;
            assert_close(wrap(got.mean[0] - m - 0.3), 0.0, tolerance(&method), size, &what);
            // The values are up to 160 sd large: so many times the rounding.
            let spread = 160.0 * TIGHT;
            assert_close(got.covariance[(0, 0)], 0.0101, spread, 0.0101, &what);
            assert_close(got.cross_covariance[(0, 0)], 0.007, spread, 0.0078, &what);
            assert_close(got.cross_covariance[(1, 0)], 0.003, spread, 0.0045, &what);
        }
    }
}

#[test]
fn the_chart_is_centred_at_the_value_at_the_mean() {
    // An angle with sd 2: two points 2 rad to either side of h(m) are inside its chart, but more than pi from
    // each other, so a chart centred at a point would wrap one of them.
    let sensor = Shaped::<Sum>::new(1, Output::angle("theta"));
    let prior = Gaussian::new(dvector![3.0], dmatrix![4.0]).unwrap();
    for label in ["cubature-3", "gauss-hermite:order=2", "unscented:kappa=0"] {
        let got = moments(&MethodSpec::parse(label).unwrap(), &sensor, &prior, &dmatrix![0.0]);
        assert_close(got.mean[0], 3.0, TIGHT, 3.0, label);
        assert_close(got.covariance[(0, 0)], 4.0, TIGHT, 4.0, label);
    }
}

#[test]
fn a_large_mean_with_a_small_spread_keeps_its_digits() {
    // y = 1e6 + x with sd(x) = 1e-3: a value is rounded to 1e6 * 1.1e-16 = 1.2e-10, 1.2e-7 sd, and so is what
    // a rule makes of it; a plain sum of squares would have lost 1e12 * 1.1e-16 = 1.2e-4, 120 variances.
    let sensor = Linear::new(vec![vec![1.0, 1.0]], vec![1e6], 2).unwrap();
    let prior = Gaussian::new(dvector![0.0, 0.0], dmatrix![0.6e-6, 0.1e-6; 0.1e-6, 0.2e-6]).unwrap();
    for method in exact_methods(&sensor).filter(|m| !has_tiny_alpha(m)) {
        let got = moments(&method, &sensor, &prior, &dmatrix![0.0]);
        assert_close(got.mean[0], 1e6, 4e-16, 1e6, method.label());
        assert_close(got.covariance[(0, 0)], 1e-6, 5e-7, 1e-6, method.label());
    }
}
