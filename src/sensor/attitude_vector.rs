use serde::{Deserialize, Serialize};

use super::kinds::{Kind, built};
use super::parameter::{checked_components, checked_row};
use super::{Formula, Number, Output, ParameterError};
use crate::gaussian::Gaussian;

pub(super) const KIND: Kind = Kind {
    name: "attitude-vector",
    summary: "known direction, of the sun or of a beacon, seen through an attitude error",
    formula: "y = d + sin(t)/t phi x d + (1 - cos(t))/t^2 phi x (phi x d), t = |phi| [rad], d of unit length",
    parameters: "direction d [x, y, z], of any length; attitude [i, j, k] (phi) = [0, 1, 2]",
    quantities: &[],
    source: "Shuster 1993",
    example: r#"{"case":"sun","sensor":{"kind":"attitude-vector","direction":[0.5,0.2,0.8]},"prior":{"mean":[0,0,0],"covariance":[[0.01,0,0],[0,0.01,0],[0,0,0.04]]},"noise":{"covariance":1e-4}}"#,
    build: |map, n| built(map, n, AttitudeVector::from_parameters),
};

/// Up to here the series holds \[rad\].
const REACH: f64 = 60.0;
/// Halvings of the half angle before its series is summed.
const HALVINGS: usize = 6;
/// (-1)^k / (2k + 2)!: (1 - cos h) / h^2 in powers of h^2.
const VERSINE: [f64; 8] = [
    0.5,
    -1.0 / 24.0,
    1.0 / 720.0,
    -1.0 / 40_320.0,
    1.0 / 3_628_800.0,
    -1.0 / 479_001_600.0,
    1.0 / 87_178_291_200.0,
    -1.0 / 20_922_789_888_000.0,
];
/// (-1)^k / (2k + 1)!: sin(h) / h in powers of h^2.
const SINC: [f64; 8] = [
    1.0,
    -1.0 / 6.0,
    1.0 / 120.0,
    -1.0 / 5_040.0,
    1.0 / 362_880.0,
    -1.0 / 39_916_800.0,
    1.0 / 6_227_020_800.0,
    -1.0 / 1_307_674_368_000.0,
];

/// A known direction, of the sun or of a beacon, seen in the axes of a body through an attitude error.
///
/// y = R(phi) d, three components without unit, with Rodrigues' formula for the rotation by the vector phi \[rad\]:
/// y = d + sin(t)/t phi x d + (1 - cos(t))/t^2 phi x (phi x d), t = |phi|. The direction d is brought to unit length.
///
/// Both factors are smooth in t^2, but written in t they have no derivative at phi = 0. So they are worked from
/// t^2 / 4^7 by their power series and brought back by doubling the angle: 1 - cos 2h = 2 (1 - cos h)(2 - (1 - cos h)),
/// sin(2h) / (2h) = sin(h)/h cos h. That is exact to rounding up to 60 rad, derivatives at zero included; beyond, the two
/// factors are worked as they are written.
///
/// Source: M. D. Shuster, "A survey of attitude representations", J. Astronautical Sciences 41 (1993) 439-517 (from
/// memory); series and doubling as in scaling and squaring, C. Moler, C. Van Loan, "Nineteen dubious ways to compute
/// the exponential of a matrix, twenty-five years later", SIAM Review 45 (2003) 3-49, method 3 (from memory).
#[derive(Debug, Clone, PartialEq)]
pub struct AttitudeVector {
    direction: [f64; 3],
    attitude: [usize; 3],
    outputs: [Output; 3],
}

/// What a suite or a case record says of an [`AttitudeVector`].
#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Parameters {
    direction: [f64; 3],
    #[serde(default = "default_attitude")]
    attitude: [usize; 3],
}

/// Where the rotation vector stands in a state when nothing is said: its first three components.
fn default_attitude() -> [usize; 3] {
    [0, 1, 2]
}

impl AttitudeVector {
    /// A direction, of any length, and the rotation vector \[rad\] at the components `attitude` of a state of `n`.
    ///
    /// # Errors
    /// [`ParameterError`] if the direction is zero or not finite, or a component is outside the state or stands twice.
    pub fn new(direction: [f64; 3], attitude: [usize; 3], n: usize) -> Result<Self, ParameterError> {
        checked_row("direction", &direction, 3)?;
        checked_components("attitude", &attitude, n)?;
        // Over the largest component first, so that no square overflows.
        let largest = direction.iter().fold(0.0, |m: f64, v| m.max(v.abs()));
        if largest == 0.0 {
            return Err(ParameterError::new("direction", "is zero, which points nowhere; give a vector"));
        }
        let scaled = direction.map(|v| v / largest);
        let length = scaled.iter().map(|v| v * v).sum::<f64>().sqrt();
        let outputs = ["x", "y", "z"].map(|name| Output::plain(format!("direction {name}"), ""));
        Ok(Self { direction: scaled.map(|v| v / length), attitude, outputs })
    }

    pub(super) fn from_parameters(p: Parameters, n: usize) -> Result<Self, ParameterError> {
        Self::new(p.direction, p.attitude, n)
    }
}

/// sin(t)/t and (1 - cos t)/t^2 from t^2.
#[inline(always)]
fn rodrigues<T: Number>(square: T) -> (T, T) {
    // 4^-7: the half angle, halved again and again.
    let mut h2 = square * T::constant(0.25);
    for _ in 0..HALVINGS {
        h2 = h2 * T::constant(0.25);
    }
    let (mut versine, mut sinc) = (T::constant(0.0), T::constant(0.0));
    for k in (0..VERSINE.len()).rev() {
        versine = versine * h2 + T::constant(VERSINE[k]);
        sinc = sinc * h2 + T::constant(SINC[k]);
    }
    versine = versine * h2;
    let (one, two) = (T::constant(1.0), T::constant(2.0));
    for _ in 0..HALVINGS {
        sinc = sinc * (one - versine);
        versine = two * versine * (two - versine);
    }
    // Now of the half angle: sin t = 2 sin(t/2) cos(t/2) and 1 - cos t = 2 sin^2(t/2).
    let near = (sinc * (one - versine), T::constant(0.5) * sinc * sinc);
    let t = square.sqrt();
    let half = (T::constant(0.5) * t).sin();
    let far = (t.sin() / t, two * half * half / square);
    let reach = T::constant(REACH * REACH);
    (square.if_at_most(reach, near.0, far.0), square.if_at_most(reach, near.1, far.1))
}

#[inline(always)]
fn cross<T: Number>(a: &[T], b: &[T; 3]) -> [T; 3] {
    [a[1] * b[2] - a[2] * b[1], a[2] * b[0] - a[0] * b[2], a[0] * b[1] - a[1] * b[0]]
}

impl Formula for AttitudeVector {
    const INPUTS: &'static [usize] = &[3];

    fn reads(&self) -> &[usize] {
        &self.attitude
    }

    fn outputs(&self) -> &[Output] {
        &self.outputs
    }

    fn natural_spread(&self, prior: &Gaussian) -> Option<f64> {
        prior.largest_sd(&[0, 1, 2])
    }

    #[inline(always)]
    fn evaluate<T: Number>(&self, x: &[T], y: &mut [T]) {
        let mut direction = [T::constant(0.0); 3];
        let mut square = T::constant(0.0);
        for i in 0..3 {
            direction[i] = T::constant(self.direction[i]);
            square = square + x[i] * x[i];
        }
        let (first, second) = rodrigues(square);
        let once = cross(x, &direction);
        let twice = cross(x, &once);
        for i in 0..3 {
            y[i] = direction[i] + first * once[i] + second * twice[i];
        }
    }
}
