//! What the laws are tried on.

use gaussworthy::gaussian::{Gaussian, Moments};
use gaussworthy::method::{Method, MethodSpec, Problem, every_method};
use gaussworthy::sensor::{ExactMoments, Formula, KINDS, Number, Output, Sensor, SensorSpec};
use nalgebra::{DMatrix, DVector};
use rand::SeedableRng;
use rand_distr::{Distribution, StandardNormal};
use rand_pcg::Pcg64;
use serde_json::{Value, json};

/// Relative tolerance of an exact claim.
pub const TIGHT: f64 = 1e-12;

/// Relative tolerance of an exact claim on the mean, or on any moment of a curved output.
///
/// The scaled unscented transform at alpha = 1e-3 sums weights of total size 2 / alpha^2 = 2e6, each with a
/// value rounded to 1.1e-16 of its size on points rounded likewise: 2e6 * 2 * 1.1e-16 = 4e-10. (Of a linear
/// output the second moments lose only one power of alpha, 1e3 * 4 * 1.1e-16 = 4e-13, because the deviations
/// are of size alpha themselves: there it keeps [`TIGHT`].)
///
/// Bayesian quadrature solves with its kernel matrix. On three Gauss-Hermite nodes at the length scale 3 its condition is 76, on
/// the product in six components 76^6 = 2e11: at the worst 2e11 * 1.1e-16 = 2e-5 is lost, and a tenth of that is asked.
pub fn tolerance(method: &MethodSpec) -> f64 {
    match method.kind().unwrap().id {
        _ if has_tiny_alpha(method) => 4e-10,
        "bayesian-quadrature" => 2e-6,
        _ => TIGHT,
    }
}

/// Whether this is the scaled unscented transform with its default alpha of 1e-3.
pub fn has_tiny_alpha(method: &MethodSpec) -> bool {
    method.kind().unwrap().id == "unscented-scaled" && !method.label().contains("alpha")
}

/// Every kind of method with its defaults and its examples of other parameters.
pub fn methods() -> Vec<MethodSpec> {
    every_method()
}

/// Those that serve this sensor and its dimensions; the others say why not, which tests of their own hold.
pub fn methods_for(sensor: &dyn Sensor) -> Vec<MethodSpec> {
    let (a, p) = (sensor.reads().len(), sensor.outputs().len());
    let serves = |m: &MethodSpec| m.method().serves(sensor).is_ok() && m.plan(a, p).is_ok();
    methods().into_iter().filter(serves).collect()
}

/// Whether all three moments of a linear sensor are exact, as far as the method claims.
pub fn is_exact_on_linear(method: &MethodSpec) -> bool {
    let claim = method.method().exactness().unwrap();
    claim.mean.covers(1) && claim.cross_covariance.covers(1) && claim.covariance.covers(1)
}

/// Whether its points in `a` components map onto themselves, weights too, when any one component changes its sign, or it has no
/// point set: then it is blind to whatever is odd in a component.
pub fn is_mirrored(method: &dyn Method, a: usize) -> bool {
    let Some(set) = method.point_set(a).unwrap() else { return true };
    let (points, weights) = (set.points(), set.mean_weights());
    let is_mirror = |k: usize, l: usize, axis: usize| {
        let mirrored = |i: usize| if i == axis { -points[(k, i)] } else { points[(k, i)] };
        weights[k] == weights[l] && (0..a).all(|i| (points[(l, i)] - mirrored(i)).abs() < 1e-14)
    };
    let n = points.nrows();
    (0..n).all(|k| (0..a).all(|axis| (0..n).any(|l| is_mirror(k, l, axis))))
}

/// The moments by one method, planned for this once.
pub fn moments(method: &MethodSpec, sensor: &dyn Sensor, prior: &Gaussian, noise: &DMatrix<f64>) -> Moments {
    let (a, p) = (sensor.reads().len(), sensor.outputs().len());
    let mut moments = Moments::zeros(a, p);
    let mut transform = method.plan(a, p).unwrap();
    transform.apply(Problem { sensor, prior, noise }, &mut moments);
    moments
}

/// One sensor of every kind at least, each reading all components of its prior.
pub fn sensors() -> Vec<(SensorSpec, Gaussian)> {
    let planar = || law(&[30.0, 10.0], &[&[5.0, 1.0], &[-0.5, 2.0]]);
    let spatial = || law(&[30.0, 10.0, 20.0], &[&[4.0, 1.0, 0.0], &[-0.5, 2.0, 1.0], &[0.5, 0.0, 3.0]]);
    let moving = || {
        let root = [[5.0, 1.0, 0.0, 0.0], [-0.5, 2.0, 0.0, 0.0], [0.3, 0.0, 0.5, 0.1], [0.0, -0.2, 0.0, 0.4]];
        law(&[30.0, 10.0, -2.0, 3.0], &root.each_ref().map(|row| row.as_slice()))
    };
    let space = || law(&[3.0, -2.0, 40.0], &[&[1.0, 0.2, 0.0], &[0.3, 1.5, 0.0], &[-0.5, 0.4, 2.0]]);
    let small = || law(&[0.1, -0.2, 0.3], &[&[0.2, 0.0, 0.0], &[0.05, 0.1, 0.0], &[-0.1, 0.02, 0.3]]);
    let single = || law(&[1.5], &[&[0.7]]);
    let polar = || law(&[30.0, 0.5], &[&[2.0, 0.0], &[0.05, 0.2]]);
    let wall = || {
        law(
            &[30.0, 10.0, 25.0, 0.6],
            &[&[2.0, 0.0, 0.0, 0.0], &[0.5, 1.5, 0.0, 0.0], &[0.2, 0.1, 0.5, 0.0], &[0.01, -0.02, 0.0, 0.2]],
        )
    };
    let described = [
        (json!({"kind": "range-bearing", "station": [2.0, -1.0]}), planar()),
        (json!({"kind": "bearing-only", "station": [2.0, -1.0]}), planar()),
        (json!({"kind": "bearing-only", "stations": [[2.0, -1.0], [60.0, 3.0]]}), planar()),
        (
            json!({"kind": "quadratic", "A": [[[1, 2], [0, -1]], [[0, 0], [0, 1]]], "b": [[1, 0], [0, 3]], "c": [1, 2]}),
            planar(),
        ),
        (json!({"kind": "range-only", "stations": [[2.0, -1.0], [60.0, 3.0]]}), planar()),
        (json!({"kind": "range-only", "station": [2.0, -1.0, 4.0]}), spatial()),
        (json!({"kind": "range-doppler", "station": [2.0, -1.0]}), moving()),
        (json!({"kind": "bearing-rate", "station": [2.0, -1.0]}), moving()),
        (json!({"kind": "range-azimuth-elevation", "station": [2.0, -1.0, 4.0]}), spatial()),
        (json!({"kind": "azimuth-elevation", "stations": [[2.0, -1.0, 4.0], [60.0, 3.0, 5.0]]}), spatial()),
        (
            json!({"kind": "time-difference", "stations": [[2.0, -1.0], [60.0, 3.0]], "wave_speed": 1500.0}),
            planar(),
        ),
        (
            json!({"kind": "frequency-difference", "stations": [[2.0, -1.0], [60.0, 3.0], [1.0, 70.0]], "carrier": 9e3, "wave_speed": 1500.0}),
            moving(),
        ),
        (
            json!({"kind": "received-strength", "station": [2.0, -1.0], "strength": -40.0, "reference_distance": 1.0, "exponent": 2.4}),
            planar(),
        ),
        (json!({"kind": "linear", "H": [[1, 2], [3, -1], [0.5, 0]], "offset": [1, 2, 3]}), planar()),
        (
            json!({"kind": "formula", "state": ["x", "y"], "outputs": [
                {"name": "range", "formula": "hypot(x - 2, y + 1)"},
                {"name": "bearing", "formula": "atan2(y + 1, x - 2)", "angular": true}]}),
            planar(),
        ),
        (json!({"kind": "polar-to-cartesian"}), polar()),
        (json!({"kind": "line-offset", "through": [[0, 0], [900, 300]]}), planar()),
        (json!({"kind": "line-feature"}), wall()),
        (json!({"kind": "pinhole", "focal_length": 800, "centre": [640, 360]}), space()),
        (json!({"kind": "stereo-disparity", "focal_length": 800, "baseline": 0.6}), space()),
        (json!({"kind": "attitude-vector", "direction": [0.5, 0.2, 0.8]}), small()),
        (
            json!({"kind": "dipole-field", "moment": [2e4, 5e3, -4e4], "place": [0, 0, -8], "background": [18e3, 1e3, -45e3]}),
            space(),
        ),
        (json!({"kind": "exponential-decay", "amplitude": 900, "scale": 3.5}), single()),
        (json!({"kind": "saturating", "limit": 2}), single()),
        (json!({"kind": "phase-sine", "amplitude": 1.8, "frequency": 0.5, "offset": 3}), single()),
    ];
    for kind in KINDS {
        assert!(described.iter().any(|(d, _)| d["kind"] == kind.name), "no law is tried on sensor {}", kind.name);
    }
    described
        .into_iter()
        .map(|(described, prior)| {
            let Value::Object(map) = described else { unreachable!("every description is an object") };
            (SensorSpec::from_json(map, prior.dimension()).unwrap(), prior)
        })
        .collect()
}

/// The law of this mean and covariance F F', without F as a given root.
pub fn law(mean: &[f64], root: &[&[f64]]) -> Gaussian {
    let f = DMatrix::from_fn(mean.len(), root[0].len(), |i, j| root[i][j]);
    Gaussian::new(DVector::from_row_slice(mean), &f * f.transpose()).unwrap()
}

/// The standard normal law of `a` components.
pub fn standard(a: usize) -> Gaussian {
    Gaussian::new(DVector::zeros(a), DMatrix::identity(a, a)).unwrap()
}

/// A seeded stream of standard normal numbers.
#[derive(Debug)]
pub struct Dice(Pcg64);

impl Dice {
    pub fn new(seed: u64) -> Self {
        Self(Pcg64::seed_from_u64(seed))
    }

    pub fn normal(&mut self) -> f64 {
        StandardNormal.sample(&mut self.0)
    }

    /// A whole number below `end`.
    pub fn below(&mut self, end: usize) -> usize {
        (self.normal().abs() * 1e6) as usize % end
    }

    pub fn matrix(&mut self, rows: usize, columns: usize) -> DMatrix<f64> {
        DMatrix::from_fn(rows, columns, |_, _| self.normal())
    }

    /// A law of `n` components whose covariance has this rank.
    pub fn law(&mut self, n: usize, rank: usize) -> Gaussian {
        let root = self.matrix(n, rank);
        Gaussian::new(self.matrix(n, 1).column(0).into(), &root * root.transpose()).unwrap()
    }

    pub fn covariance(&mut self, n: usize) -> DMatrix<f64> {
        let root = self.matrix(n, n);
        &root * root.transpose()
    }
}

/// An output of a [`Polynomial`]: coefficients and the exponent of each component.
pub type Terms = Vec<(f64, Vec<u32>)>;

/// y_j = sum of coefficients times monomials.
#[derive(Debug)]
pub struct Polynomial {
    reads: Vec<usize>,
    outputs: Vec<Output>,
    pub terms: Vec<Terms>,
}

impl Polynomial {
    pub fn new(a: usize, terms: Vec<Terms>) -> Self {
        let outputs = (0..terms.len()).map(|j| Output::plain(format!("y{j}"), "")).collect();
        Self { reads: (0..a).collect(), outputs, terms }
    }
}

impl Formula for Polynomial {
    fn reads(&self) -> &[usize] {
        &self.reads
    }

    fn outputs(&self) -> &[Output] {
        &self.outputs
    }

    fn exact_moments(&self) -> Option<&dyn ExactMoments> {
        Some(self)
    }

    fn evaluate<T: Number>(&self, x: &[T], y: &mut [T]) {
        for (terms, output) in self.terms.iter().zip(y) {
            *output = T::constant(0.0);
            for (coefficient, exponents) in terms {
                let mut product = T::constant(*coefficient);
                for (&component, &exponent) in x.iter().zip(exponents) {
                    for _ in 0..exponent {
                        product = product * component;
                    }
                }
                *output = *output + product;
            }
        }
    }
}

/// A sensor that has whatever outputs and formula a test needs, on `a` components.
pub trait Shape: std::fmt::Debug + Send + Sync {
    fn evaluate<T: Number>(x: &[T]) -> T;
}

/// One output of a [`Shape`], angular or not.
#[derive(Debug)]
pub struct Shaped<S> {
    reads: Vec<usize>,
    outputs: [Output; 1],
    shape: std::marker::PhantomData<S>,
}

impl<S: Shape> Shaped<S> {
    pub fn new(a: usize, output: Output) -> Self {
        Self { reads: (0..a).collect(), outputs: [output], shape: std::marker::PhantomData }
    }
}

impl<S: Shape> Formula for Shaped<S> {
    fn reads(&self) -> &[usize] {
        &self.reads
    }

    fn outputs(&self) -> &[Output] {
        &self.outputs
    }

    fn evaluate<T: Number>(&self, x: &[T], y: &mut [T]) {
        y[0] = S::evaluate(x);
    }
}

/// Fails unless |got - wanted| <= tolerance * scale, with what was tried.
#[track_caller]
pub fn assert_close(got: f64, wanted: f64, tolerance: f64, scale: f64, what: &str) {
    let error = (got - wanted).abs() / scale;
    assert!(
        error <= tolerance,
        "{what}: {got} is not {wanted}: {error:.2e} of {scale:.3e}, {tolerance:.0e} allowed"
    );
}
