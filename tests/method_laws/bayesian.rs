//! Bayesian quadrature: exact where the sensor is what its process takes it for, and honest about what is left.

use gaussworthy::method::MethodSpec;
use gaussworthy::sensor::{Formula, Number, Output};
use nalgebra::DMatrix;

use crate::cases::{assert_close, moments, standard};

/// y_j = sum of c_jk exp(-|z - z_k|^2 / (2 l^2)): in the span of the kernels at the nodes, zero at the mean.
#[derive(Debug)]
struct Bumps {
    reads: Vec<usize>,
    outputs: Vec<Output>,
    nodes: DMatrix<f64>,
    length_scale: f64,
    coefficients: DMatrix<f64>,
}

impl Bumps {
    fn new(nodes: DMatrix<f64>, length_scale: f64) -> Self {
        let kernel = |k: usize| (-0.5 * nodes.row(k).norm_squared() / length_scale.powi(2)).exp();
        let mut coefficients = DMatrix::from_fn(2, nodes.nrows(), |j, k| ((3 * j + k * (j + 1)) as f64).sin());
        for j in 0..2 {
            let rest: f64 = (1..nodes.nrows()).map(|k| coefficients[(j, k)] * kernel(k)).sum();
            coefficients[(j, 0)] = -rest / kernel(0);
        }
        let outputs = ["u", "v"].map(|name| Output::plain(name, "")).to_vec();
        Self { reads: (0..nodes.ncols()).collect(), outputs, nodes, length_scale, coefficients }
    }
}

impl Formula for Bumps {
    fn reads(&self) -> &[usize] {
        &self.reads
    }

    fn outputs(&self) -> &[Output] {
        &self.outputs
    }

    fn evaluate<T: Number>(&self, x: &[T], y: &mut [T]) {
        for (j, output) in y.iter_mut().enumerate() {
            *output = T::constant(0.0);
            for k in 0..self.nodes.nrows() {
                let mut square = T::constant(0.0);
                for (i, &x) in x.iter().enumerate() {
                    let d = x - T::constant(self.nodes[(k, i)]);
                    square = square + d * d;
                }
                let bump = (square * T::constant(-0.5 / self.length_scale.powi(2))).exp();
                *output = *output + T::constant(self.coefficients[(j, k)]) * bump;
            }
        }
    }
}

#[test]
fn sums_of_its_kernels_have_exact_moments() {
    // Against the Gauss-Hermite product rule of order 20, which has converged far below the tolerance on bumps this wide; the
    // condition of the kernel matrices is below 1e7.
    for (label, nodes, length_scale, dimensions) in [
        ("bayesian-quadrature:amplitude=0", "unscented", 3.0, 1..=3),
        ("bayesian-quadrature:length_scale=2:amplitude=0", "unscented", 2.0, 1..=3),
        ("bayesian-quadrature:nodes=gauss-hermite:length_scale=2:amplitude=0", "gauss-hermite", 2.0, 1..=2),
    ] {
        for a in dimensions {
            let set = MethodSpec::parse(nodes).unwrap().method().point_set(a).unwrap().unwrap();
            let bumps = Bumps::new(set.points().clone(), length_scale);
            let none = DMatrix::zeros(2, 2);
            let fine = MethodSpec::parse("gauss-hermite:order=20").unwrap();
            let exact = moments(&fine, &bumps, &standard(a), &none);
            let got = moments(&MethodSpec::parse(label).unwrap(), &bumps, &standard(a), &none);
            let sd = |j: usize| exact.covariance[(j, j)].sqrt();
            for j in 0..2 {
                let what = format!("{label} in {a} components");
                assert_close(got.mean[j], exact.mean[j], 1e-8, sd(j), &what);
                for l in 0..2 {
                    assert_close(got.covariance[(j, l)], exact.covariance[(j, l)], 1e-8, sd(j) * sd(l), &what);
                }
                for i in 0..a {
                    assert_close(got.cross_covariance[(i, j)], exact.cross_covariance[(i, j)], 1e-8, sd(j), &what);
                }
            }
        }
    }
}

#[test]
fn what_the_nodes_leave_unknown_widens_the_variances() {
    let set = MethodSpec::parse("unscented").unwrap().method().point_set(2).unwrap().unwrap();
    let bumps = Bumps::new(set.points().clone(), 2.0);
    let at = |amplitude: &str| {
        let label = format!("bayesian-quadrature:length_scale=2{amplitude}");
        moments(&MethodSpec::parse(&label).unwrap(), &bumps, &standard(2), &DMatrix::zeros(2, 2))
    };
    let [none, one, two, fitted] = [":amplitude=0", ":amplitude=1", ":amplitude=2", ""].map(at);
    let unit = one.covariance[(0, 0)] - none.covariance[(0, 0)];
    assert!(unit > 1e-3 && unit < 1.0, "a share of the process's variance: {unit}");
    for j in 0..2 {
        // In proportion to the square of the amplitude, alike in all outputs.
        assert_close(two.covariance[(j, j)] - none.covariance[(j, j)], 4.0 * unit, 1e-12, unit, "amplitude 2");
        let fitted = (fitted.covariance[(j, j)] - none.covariance[(j, j)]) / unit;
        // The likeliest amplitude of y = sum c_k k(z, z_k) is sqrt(c'K c / N), with K c the values at the nodes.
        let mut likeliest = 0.0;
        for k in 0..5 {
            let point: Vec<f64> = set.points().row(k).iter().copied().collect();
            let mut y = [0.0; 2];
            bumps.evaluate(&point, &mut y);
            likeliest += bumps.coefficients[(j, k)] * y[j] / 5.0;
        }
        assert_close(fitted, likeliest, 1e-10, likeliest, "estimated amplitude");
    }
    assert_eq!(none.covariance[(0, 1)], one.covariance[(0, 1)]);
    assert_eq!((&none.mean, &none.cross_covariance), (&one.mean, &one.cross_covariance));
}

#[test]
fn the_amplitude_follows_the_unit_of_the_output() {
    let set = MethodSpec::parse("unscented").unwrap().method().point_set(2).unwrap().unwrap();
    let mut bumps = Bumps::new(set.points().clone(), 1.5);
    let method = MethodSpec::parse("bayesian-quadrature").unwrap();
    let metres = moments(&method, &bumps, &standard(2), &DMatrix::zeros(2, 2));
    bumps.coefficients *= 1000.0;
    let millimetres = moments(&method, &bumps, &standard(2), &DMatrix::zeros(2, 2));
    for j in 0..2 {
        let variance = metres.covariance[(j, j)];
        assert_close(millimetres.covariance[(j, j)], 1e6 * variance, 1e-12, 1e6 * variance, "variance");
    }
}

#[test]
fn a_kernel_too_wide_for_its_nodes_is_refused() {
    let refuse = |label: &str, a| MethodSpec::parse(label).unwrap().plan(a, 1).unwrap_err().0;
    assert_eq!(
        refuse("bayesian-quadrature:nodes=gauss-hermite:order=9:length_scale=50", 1),
        "the kernel matrix of 9 nodes is singular to rounding at the length scale 50; take a shorter one"
    );
    assert_eq!(
        refuse("bayesian-quadrature:nodes=gauss-hermite", 7),
        "7 read components have more than 1000 nodes; a Gaussian process on so many is not served"
    );
}
