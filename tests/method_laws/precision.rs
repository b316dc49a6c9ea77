//! Every method in single precision: the same method but for its rounding, at the same evaluations, without an allocation.

use gaussworthy::gaussian::Moments;
use gaussworthy::method::{Counted, MethodSpec, Problem};
use gaussworthy::sensor::{Arithmetic, Linear, Sensor};
use nalgebra::{DMatrix, dmatrix};

use crate::cases::{has_tiny_alpha, law, methods, methods_for, moments, sensors};

/// What rounding may do to a moment, in standard deviations: single precision has steps of 6e-8, coordinates stand within
/// some ten sd of the stations, and a field stands a thousand sd high on its background.
const ROUNDING: f64 = 1e-3;

fn single(method: &MethodSpec) -> MethodSpec {
    MethodSpec::parse(&format!("{}:arithmetic=f32", method.label())).unwrap()
}

/// Those that serve this sensor in single precision: not the one that needs exact moments.
fn singles(sensor: &dyn Sensor) -> Vec<MethodSpec> {
    let (a, p) = (sensor.reads().len(), sensor.outputs().len());
    methods_for(sensor).into_iter().filter(|m| single(m).plan(a, p).is_ok()).collect()
}

#[test]
fn what_knows_no_single_precision_says_so() {
    let refused: Vec<_> = methods().into_iter().filter(|m| single(m).plan(3, 1).is_err()).collect();
    assert_eq!(refused.iter().map(MethodSpec::label).collect::<Vec<_>>(), ["statistical-linearisation"]);
    let reason = single(&refused[0]).plan(3, 1).unwrap_err().0;
    assert_eq!(reason, "the exact moments of sensors are known in double precision only");
}

/// The largest difference of two results in standard deviations of the first.
fn difference(one: &Moments, other: &Moments, prior: &DMatrix<f64>) -> f64 {
    let (n, p) = one.cross_covariance.shape();
    let sd = |j: usize| one.covariance[(j, j)].sqrt();
    let mut worst: f64 = 0.0;
    for j in 0..p {
        worst = worst.max((one.mean[j] - other.mean[j]).abs() / sd(j));
        for l in 0..p {
            worst = worst.max((one.covariance[(j, l)] - other.covariance[(j, l)]).abs() / (sd(j) * sd(l)));
        }
        for i in 0..n {
            let cross = (one.cross_covariance[(i, j)] - other.cross_covariance[(i, j)]).abs();
            worst = worst.max(cross / (prior[(i, i)].sqrt() * sd(j)));
        }
    }
    worst
}

#[test]
fn single_precision_costs_digits_and_nothing_else() {
    for method in methods() {
        let rounded = single(&method);
        assert_eq!((method.arithmetic(), rounded.arithmetic()), (Arithmetic::Double, Arithmetic::Single));
        let mut worst: f64 = 0.0;
        let mut tried = 0;
        for (spec, prior) in sensors() {
            let sensor = spec.sensor();
            let p = sensor.outputs().len();
            let noise = DMatrix::zeros(p, p);
            if !singles(sensor).iter().any(|m| m.label() == method.label()) {
                continue;
            }
            tried += 1;
            let exact = moments(&method, sensor, &prior, &noise);
            let found = moments(&rounded, sensor, &prior, &noise);
            let error = difference(&exact, &found, prior.covariance());
            assert_eq!(found.covariance, found.covariance.transpose(), "{} on {}", rounded.label(), spec.kind());
            let allowed = if has_tiny_alpha(&method) { f64::INFINITY } else { ROUNDING };
            assert!(error <= allowed, "{} on {}: {error:.1e} sd", rounded.label(), spec.kind());
            worst = worst.max(error);
        }
        if tried == 0 {
            assert_eq!(method.label(), "statistical-linearisation");
            continue;
        }
        // An arithmetic that rounds nothing would not be single precision.
        assert!(worst > 1e-8, "{}: {worst:.1e}", rounded.label());
        // Points a thousandth of an sd apart and weights of a million: what the published warning is about.
        assert!(!has_tiny_alpha(&method) || worst > 1e-2, "{}: {worst:.1e}", rounded.label());
    }
}

/// y = x of x ~ N(16777217, 9): the mean is the first whole number that single precision cannot hold, and with it the points.
#[test]
fn mean_and_points_are_rounded_before_the_sensor_sees_them() {
    let sensor = Linear::new(vec![vec![1.0]], vec![0.0], 1).unwrap();
    let prior = law(&[16_777_217.0], &[&[3.0]]);
    for method in singles(&sensor).iter().filter(|m| !has_tiny_alpha(m)) {
        let found = moments(&single(method), &sensor, &prior, &dmatrix![0.0]);
        assert_eq!(found.mean[0].fract(), 0.0, "{}", method.label());
        assert_ne!(found.mean[0], 16_777_217.0, "{}", method.label());
    }
}

#[test]
fn it_costs_the_same_evaluations_and_no_allocation() {
    for (spec, prior) in sensors() {
        let sensor = spec.sensor();
        let (a, p) = (sensor.reads().len(), sensor.outputs().len());
        let noise = DMatrix::identity(p, p);
        for method in singles(sensor) {
            let evaluations = |method: &MethodSpec| {
                let counted = Counted::new(sensor);
                moments(method, &counted, &prior, &noise);
                counted.evaluations()
            };
            assert_eq!(evaluations(&single(&method)), evaluations(&method), "{}", method.label());
            let mut transform = single(&method).plan(a, p).unwrap();
            let mut found = Moments::zeros(a, p);
            let problem = Problem { sensor, prior: &prior, noise: &noise };
            let allocated = allocation_counter::measure(|| transform.apply(problem, &mut found)).count_total;
            assert_eq!(allocated, 0, "{} on {}", method.label(), spec.kind());
        }
    }
}
