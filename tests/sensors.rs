//! Every sensor: derivatives against finite differences, blocks against single points, closed forms.

mod common;

use std::collections::BTreeSet;
use std::f64::consts::PI;

use common::random;
use common::records::matrix;
use common::trials::{Trial, trials};
use gaussworthy::gaussian::wrap;
use gaussworthy::sensor::{Derivatives, KINDS, Sensor};
use gaussworthy::suite::Case;
use nalgebra::{DMatrix, dmatrix, dvector};

/// Random points for each trial.
const POINTS: u64 = 40;
/// How many units in the last place a value or a derivative may be off, in its own bound.
const ULPS: f64 = 8.0;

fn derivatives(sensor: &dyn Sensor, x: &[f64]) -> Derivatives {
    let mut at = Derivatives::zeros(sensor.reads().len(), sensor.outputs().len());
    sensor.hessians(x, &mut at);
    at
}

fn value(sensor: &dyn Sensor, x: &[f64]) -> Vec<f64> {
    let mut y = vec![0.0; sensor.outputs().len()];
    sensor.value(x, &mut y);
    y
}

fn jacobian(sensor: &dyn Sensor, x: &[f64]) -> DMatrix<f64> {
    let (a, p) = (sensor.reads().len(), sensor.outputs().len());
    let (mut y, mut j) = (vec![0.0; p], DMatrix::zeros(p, a));
    sensor.jacobian(x, &mut y, &mut j);
    assert_eq!(y, value(sensor, x), "the value beside a Jacobian is the value");
    j
}

/// The points around `x` along component `i`, and their distance.
fn around(x: &[f64], i: usize, step: f64) -> (Vec<f64>, Vec<f64>, f64) {
    let (mut below, mut above) = (x.to_vec(), x.to_vec());
    below[i] -= step;
    above[i] += step;
    let distance = above[i] - below[i];
    (below, above, distance)
}

#[test]
fn every_kind_of_sensor_is_tried() {
    let tried: BTreeSet<&str> = trials().iter().map(|t| t.spec.kind()).collect();
    let known: BTreeSet<&str> = KINDS.iter().map(|k| k.name).collect();
    assert_eq!(tried, known, "a sensor kind without a line in tests/common/trials.rs");
    assert_eq!(known.len(), KINDS.len(), "a name stands twice");
}

/// |central difference of h - J| <= s^2/6 |h'''| + rounding of h over s, with the bounds of `Trial::bend`.
fn jacobian_matches(trial: &Trial, x: &[f64]) {
    let sensor = trial.spec.sensor();
    let (exact, by_second_order) = (jacobian(sensor, x), derivatives(sensor, x).jacobian);
    for (j, output) in sensor.outputs().iter().enumerate() {
        let bend = trial.bend(x, j);
        let passes = (exact.row(j) - by_second_order.row(j)).amax();
        assert!(passes <= ULPS * f64::EPSILON * bend.slope, "{}: two passes, {passes:e} apart", trial.name);
        let tolerance = bend.step.powi(2) / 6.0 * bend.third + ULPS * f64::EPSILON * bend.value / bend.step;
        for i in 0..x.len() {
            let (below, above, distance) = around(x, i, bend.step);
            let rise = value(sensor, &above)[j] - value(sensor, &below)[j];
            let slope = if output.angular { wrap(rise) } else { rise } / distance;
            let difference = (slope - exact[(j, i)]).abs();
            assert!(
                difference <= tolerance,
                "{} at {x:?}: dy{j}/dx{i} is {}, differences give {slope}: off by {difference:.1e}, over {tolerance:.1e}",
                trial.name,
                exact[(j, i)]
            );
        }
    }
}

/// The same one order higher: differences of the Jacobian against the Hessians.
fn hessians_match(trial: &Trial, x: &[f64]) {
    let sensor = trial.spec.sensor();
    let exact = derivatives(sensor, x).hessians;
    for (j, hessian) in exact.iter().enumerate() {
        assert_eq!(hessian, &hessian.transpose(), "{}: a Hessian is symmetric", trial.name);
        let bend = trial.bend(x, j);
        let tolerance = bend.step.powi(2) / 6.0 * bend.fourth + ULPS * f64::EPSILON * bend.slope / bend.step;
        for k in 0..x.len() {
            let (below, above, distance) = around(x, k, bend.step);
            let rise = jacobian(sensor, &above).row(j) - jacobian(sensor, &below).row(j);
            for i in 0..x.len() {
                let difference = (rise[i] / distance - hessian[(i, k)]).abs();
                assert!(
                    difference <= tolerance,
                    "{} at {x:?}: d2y{j}/dx{i}dx{k} is {}: off by {difference:.1e}, over {tolerance:.1e}",
                    trial.name,
                    hessian[(i, k)]
                );
            }
        }
    }
}

fn each_point(check: impl Fn(&Trial, &[f64])) {
    for (t, trial) in trials().iter().enumerate() {
        let mut rng = random::stream(t as u64);
        for _ in 0..POINTS {
            check(trial, &trial.point(&mut rng));
        }
    }
}

#[test]
fn jacobians_are_the_slopes() {
    each_point(jacobian_matches);
}

#[test]
fn hessians_are_the_slopes_of_the_jacobians() {
    each_point(hessians_match);
}

/// Single precision against double at the same point, in sizes of the output over all points: steps of 6e-8, and differences
/// inside a formula (two ranges, a field and its background) that lose four digits of them; each derivative may lose one more.
#[test]
fn single_precision_is_double_precision_rounded() {
    for (t, trial) in trials().iter().enumerate() {
        let sensor = trial.spec.sensor();
        let (a, p) = (sensor.reads().len(), sensor.outputs().len());
        let mut rng = random::stream(t as u64);
        let points: Vec<Vec<f32>> =
            (0..POINTS).map(|_| trial.point(&mut rng).iter().map(|&x| x as f32).collect()).collect();
        let doubles: Vec<Derivatives> = points
            .iter()
            .map(|x| derivatives(sensor, &x.iter().map(|&x| x.into()).collect::<Vec<f64>>()))
            .collect();
        let sizes = |j: usize| {
            let value = doubles.iter().map(|d| d.value[j].abs()).fold(0.0, f64::max);
            let slope = doubles.iter().map(|d| d.jacobian.row(j).amax()).fold(0.0, f64::max);
            (value, slope, doubles.iter().map(|d| d.hessians[j].amax()).fold(0.0, f64::max))
        };
        let mut differs = false;
        for (x, double) in points.iter().zip(&doubles) {
            let mut y = vec![0.0_f32; p];
            sensor.values_single(1, x, &mut y);
            let (mut beside, mut slopes) = (vec![0.0_f32; p], DMatrix::<f32>::zeros(p, a));
            sensor.jacobian_single(x, &mut beside, &mut slopes);
            let mut at = Derivatives::<f32>::zeros(a, p);
            sensor.hessians_single(x, &mut at);
            for j in 0..p {
                let (value, slope, bend) = sizes(j);
                let close = |found: f32, wanted: f64, allowed: f64, what: &str| {
                    let error = (f64::from(found) - wanted).abs();
                    assert!(error <= allowed, "{}: {what} {found} is not {wanted}", trial.name);
                };
                let near = |angle: f32| {
                    let wanted = double.value[j];
                    if sensor.outputs()[j].angular {
                        wrap(f64::from(angle) - wanted) + wanted
                    } else {
                        angle.into()
                    }
                };
                for found in [y[j], beside[j], at.value[j]] {
                    close(near(found) as f32, double.value[j], 1e-3 * value, "value");
                }
                differs |= f64::from(y[j]) != double.value[j];
                for i in 0..a {
                    close(slopes[(j, i)], double.jacobian[(j, i)], 1e-3 * slope, "slope");
                    close(at.jacobian[(j, i)], double.jacobian[(j, i)], 1e-3 * slope, "slope");
                    for k in 0..a {
                        close(at.hessians[j][(i, k)], double.hessians[j][(i, k)], 3e-2 * bend, "bend");
                    }
                }
            }
        }
        assert!(differs, "{}: nothing is rounded", trial.name);
    }
}

#[test]
fn blocks_are_single_points_to_the_bit() {
    for (t, trial) in trials().iter().enumerate() {
        let sensor = trial.spec.sensor();
        let (a, p) = (sensor.reads().len(), sensor.outputs().len());
        for length in [1, 2, 7, 64, 129] {
            let mut rng = random::stream(t as u64);
            let points: Vec<Vec<f64>> = (0..length).map(|_| trial.point(&mut rng)).collect();
            let x: Vec<f64> = (0..a).flat_map(|i| points.iter().map(move |point| point[i])).collect();
            let mut y = vec![f64::NAN; p * length];
            sensor.values(length, &x, &mut y);
            for (k, point) in points.iter().enumerate() {
                for (j, single) in value(sensor, point).into_iter().enumerate() {
                    let block = y[j * length + k];
                    assert_eq!(block.to_bits(), single.to_bits(), "{}: {block} and {single}", trial.name);
                }
            }
        }
    }
}

#[test]
fn a_sensor_reads_its_components_in_its_order() {
    for trial in trials() {
        let (reads, noise) = (trial.spec.sensor().reads(), trial.spec.sensor().noise());
        let all = trial.n + noise.len();
        assert!(!reads.is_empty() && reads.iter().all(|&i| i < all), "{}: reads {reads:?}", trial.name);
        // Formulas read what they need, in the order of the state.
        if trial.spec.kind() == "formula" {
            assert!(reads.is_sorted(), "{}: reads {reads:?}", trial.name);
            continue;
        }
        // The parameters that name components, in the order in which they are read.
        let named: Vec<u64> = ["position", "velocity", "line", "attitude", "range", "bearing", "component"]
            .iter()
            .filter_map(|key| trial.spec.parameters().get(*key))
            .flat_map(|named| named.as_array().cloned().unwrap_or_else(|| vec![named.clone()]))
            .map(|component| component.as_u64().unwrap())
            .collect();
        let named = if named.is_empty() { (0..trial.n as u64).collect() } else { named };
        assert_eq!(reads.iter().map(|&i| i as u64).collect::<Vec<_>>(), named, "{}", trial.name);
    }
}

/// Range and bearing in closed form, seen from the origin of (x, y):
/// r: gradient u = (x, y)/r, Hessian (I - u u')/r; theta: gradient (-y, x)/r^2,
/// Hessian \[\[2xy, y^2 - x^2\], \[y^2 - x^2, -2xy\]\]/r^4.
fn closed_form(x: f64, y: f64) -> Derivatives {
    let r = x.hypot(y);
    let (c, s) = (x / r, y / r);
    let cross = (s * s - c * c) / (r * r);
    Derivatives {
        value: dvector![r, y.atan2(x)],
        jacobian: dmatrix![c, s; -s / r, c / r],
        hessians: vec![
            dmatrix![s * s, -c * s; -c * s, c * c] / r,
            dmatrix![2.0 * c * s / (r * r), cross; cross, -2.0 * c * s / (r * r)],
        ],
    }
}

/// All around the station, the four axes to the bit included, near and far.
#[test]
fn range_and_bearing_have_their_closed_form_derivatives() {
    let axes = [(1.0, 0.0), (0.0, 1.0), (-1.0, 0.0), (0.0, -1.0), (-1.0, -0.0), (1e-300, 1.0), (3.0, 4.0)];
    let around = (0..360).map(|k| {
        let a = f64::from(k) * PI / 180.0;
        (a.cos(), a.sin())
    });
    let trial = trials().into_iter().find(|t| t.spec.kind() == "range-bearing").unwrap();
    for (c, s) in axes.into_iter().chain(around) {
        for scale in [1e-3, 1.0, 1e7] {
            let (x, y) = (scale * c, scale * s);
            let (got, want) = (derivatives(trial.spec.sensor(), &[x, y]), closed_form(x, y));
            let r = want.value[0];
            let at = format!("at ({x}, {y}): {got:?}");
            let tolerance = ULPS * f64::EPSILON;
            assert!((got.value[0] - r).abs() <= tolerance * r, "range {at}");
            assert!((got.value[1] - want.value[1]).abs() <= tolerance * PI, "bearing {at}");
            for (j, natural) in [(0, 1.0), (1, 1.0 / r)] {
                let slopes = (got.jacobian.row(j) - want.jacobian.row(j)).map(f64::abs);
                let bends = (&got.hessians[j] - &want.hessians[j]).map(f64::abs);
                assert!(slopes.iter().all(|d| *d <= tolerance * natural), "gradient {j} {at}");
                assert!(bends.iter().all(|d| *d <= tolerance * natural / r), "Hessian {j} {at}");
            }
        }
    }
}

/// At the station itself the bearing has no derivative and the range a kink: not finite, no panic. Rates, 0 / 0, have
/// no value either, and a received strength is infinite.
#[test]
fn at_the_station_there_is_no_derivative() {
    for trial in trials() {
        let parameters = trial.spec.parameters();
        let station = parameters.get("station").or_else(|| parameters.get("stations")?.get(0));
        let Some(station) = station else { continue };
        let mut x: Vec<f64> = serde_json::from_value(station.clone()).unwrap();
        // Any velocity.
        x.resize(trial.spec.sensor().reads().len(), 1.5);
        let at = derivatives(trial.spec.sensor(), &x);
        for (value, output) in at.value.iter().zip(trial.spec.sensor().outputs()) {
            // Stations are numbered from 1 where there are several, differences from that of the second.
            let first = !output.name.ends_with(['2', '3']) || trial.spec.kind() == "frequency-difference";
            let exists = !(first && ["m/s", "rad/s", "Hz", "dB"].contains(&output.unit.as_ref()));
            assert_eq!(value.is_finite(), exists, "{}: {} is {value}", trial.name, output.name);
        }
        assert!(at.jacobian.row(0).iter().all(|v| !v.is_finite()), "{}: {}", trial.name, at.jacobian);
        assert!(at.hessians[0].iter().all(|v| !v.is_finite()), "{}: {}", trial.name, at.hessians[0]);
    }
}

/// y = x'A x + b'x + c has the gradient (A + A')x + b and the Hessian A + A'; y = H x + offset has H and 0.
#[test]
fn polynomials_have_their_closed_form_derivatives() {
    each_point(|trial, x| {
        let parameters = trial.spec.parameters();
        let rows = |v: &serde_json::Value| matrix(&serde_json::from_value::<Vec<Vec<f64>>>(v.clone()).unwrap());
        let at = derivatives(trial.spec.sensor(), x);
        let point = nalgebra::DVector::from_column_slice(x);
        match trial.spec.kind() {
            "quadratic" => {
                let b = rows(&parameters["b"]);
                for (j, a) in parameters["A"].as_array().unwrap().iter().map(rows).enumerate() {
                    let twice = &a + a.transpose();
                    let gradient = &twice * &point + b.row(j).transpose();
                    let bend = trial.bend(x, j);
                    let value = point.dot(&(&a * &point)) + b.row(j).transpose().dot(&point);
                    let value = value + parameters["c"][j].as_f64().unwrap();
                    assert!((at.value[j] - value).abs() <= f64::EPSILON * bend.value, "{}", trial.name);
                    let slopes = (at.jacobian.row(j).transpose() - gradient).amax();
                    assert!(slopes <= f64::EPSILON * bend.slope, "{}: {slopes:e}", trial.name);
                    assert_eq!(at.hessians[j], twice, "{}", trial.name);
                }
            }
            "linear" => {
                assert_eq!(at.jacobian, rows(&parameters["H"]), "{}", trial.name);
                assert!(at.hessians.iter().all(|h| h.amax() == 0.0), "{}", trial.name);
            }
            _ => {}
        }
    });
}

/// What the catalogue offers to start from is a case of its kind.
#[test]
fn every_example_is_a_case() {
    for kind in KINDS {
        let record = serde_json::from_str(kind.example).unwrap_or_else(|e| panic!("{}: {e}", kind.name));
        let case = Case::from_json(record).unwrap_or_else(|e| panic!("{}: {e}", kind.name));
        assert_eq!(case.spec().kind(), kind.name);
    }
}
