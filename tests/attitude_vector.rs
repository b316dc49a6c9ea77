//! A direction seen through an attitude error, against rotations by another library's quaternions and against closed
//! forms at no rotation at all.

mod common;

use common::random;
use gaussworthy::sensor::{AttitudeVector, Derivatives, Sensor};
use nalgebra::{DMatrix, UnitQuaternion, Vector3};
use rand::RngExt;

const DIRECTION: [f64; 3] = [0.5, 0.2, 0.8];

fn seen(phi: Vector3<f64>) -> Derivatives {
    let sensor = AttitudeVector::new(DIRECTION, [0, 1, 2], 3).unwrap();
    let mut at = Derivatives::zeros(3, 3);
    sensor.hessians(phi.as_slice(), &mut at);
    at
}

/// A rotation by t that is right to rounding is right to t 2^-52; some fifty operations beside.
fn tolerance(t: f64) -> f64 {
    (50.0 + 4.0 * t) * f64::EPSILON
}

#[test]
fn it_is_the_rotation_from_nothing_to_a_million_radians() {
    let d = Vector3::from(DIRECTION).normalize();
    let mut rng = random::stream(3);
    for _ in 0..20_000 {
        let t = 10f64.powf(rng.random_range(-12.0..6.0));
        let phi = Vector3::from_iterator(random::normal_vector(3, &mut rng).iter().copied()).normalize() * t;
        let rotated = UnitQuaternion::from_scaled_axis(phi) * d;
        let y = seen(phi).value;
        for i in 0..3 {
            let off = (y[i] - rotated[i]).abs();
            assert!(off <= tolerance(t), "{phi:?}: component {i} is {}, not {}: {off:.1e}", y[i], rotated[i]);
        }
    }
}

/// y = d + phi x d + phi x (phi x d) / 2 to second order: dy_i/dphi_k = -\[d x\]_ik, and with a x (b x c) = b (a.c) -
/// c (a.b) the Hessian of y_i is 1/2 (delta_ik d_l + delta_il d_k) - d_i delta_kl.
#[test]
fn derivatives_at_no_rotation_are_those_of_the_closed_form() {
    let d = Vector3::from(DIRECTION).normalize();
    let at = seen(Vector3::zeros());
    let delta = |i: usize, k: usize| f64::from(u8::from(i == k));
    // The direction itself is rounded when it is brought to unit length.
    let rounding = 4.0 * f64::EPSILON;
    assert!((&at.value - d).amax() <= rounding, "{}", at.value);
    let slope = DMatrix::from_fn(3, 3, |i, k| -d.cross_matrix()[(i, k)]);
    assert!((&at.jacobian - slope).amax() <= rounding, "{}", at.jacobian);
    for i in 0..3 {
        let bend =
            DMatrix::from_fn(3, 3, |k, l| 0.5 * (delta(i, k) * d[l] + delta(i, l) * d[k]) - d[i] * delta(k, l));
        let off = (&at.hessians[i] - bend).amax();
        assert!(off <= rounding, "component {i}: {} is off by {off:.1e}", at.hessians[i]);
    }
}

/// The direction is one: its length does not matter, however large or small.
#[test]
fn a_direction_has_no_length() {
    let y = |scale: f64| {
        let sensor = AttitudeVector::new(DIRECTION.map(|v| v * scale), [0, 1, 2], 3).unwrap();
        let mut y = [0.0; 3];
        sensor.value(&[0.3, -0.2, 0.1], &mut y);
        y
    };
    // Powers of two, so that scaling rounds nothing.
    for exponent in [-1000, -40, 3, 1000] {
        assert_eq!(y(2f64.powi(exponent)), y(1.0));
    }
}
