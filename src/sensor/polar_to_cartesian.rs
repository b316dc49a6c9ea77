use serde::{Deserialize, Serialize};

use crate::gaussian::{Gaussian, Moments};

use super::exact::write_linear;
use super::kinds::{Kind, built};
use super::parameter::checked_component;
use super::{ExactMoments, Formula, Number, Output, ParameterError};

pub(super) const KIND: Kind = Kind {
    name: "polar-to-cartesian",
    summary: "planar position of a state that holds range and bearing",
    formula: "east = r cos(theta), north = r sin(theta) [m]",
    parameters: "range (component of r m) = 0; bearing (component of theta rad) = 1",
    quantities: &[],
    source: "Lerro, Bar-Shalom 1993",
    example: r#"{"case":"plot","sensor":{"kind":"polar-to-cartesian"},"prior":{"mean":[4000,0.8],"covariance":[[400,0],[0,0.01]]},"noise":{"covariance":100}}"#,
    build: |map, n| built(map, n, PolarToCartesian::from_parameters),
};

/// Planar position of a state that holds range and bearing: the plot of a radar contact.
///
/// east = r cos(theta), north = r sin(theta) \[m\], with the range r \[m\] and the bearing theta \[rad\] counter-clockwise
/// from the x axis, an ordinary number in the state.
///
/// Its moments are known exactly: with s = Cov(r, theta) and v = Var(theta), E\[east + i north\] =
/// (E\[r\] + i s) exp(i E\[theta\] - v/2).
///
/// Source: D. Lerro, Y. Bar-Shalom, "Tracking with debiased consistent converted measurements versus EKF", IEEE Trans.
/// Aerospace and Electronic Systems 29 (1993) 1015-1022 (from memory).
#[derive(Debug, Clone, PartialEq)]
pub struct PolarToCartesian {
    /// Range, bearing.
    reads: [usize; 2],
    outputs: [Output; 2],
}

/// What a suite or a case record says of a [`PolarToCartesian`].
#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Parameters {
    #[serde(default)]
    range: usize,
    #[serde(default = "default_bearing")]
    bearing: usize,
}

fn default_bearing() -> usize {
    1
}

impl PolarToCartesian {
    /// Which components of a state of `n` are range \[m\] and bearing \[rad\].
    ///
    /// # Errors
    /// [`ParameterError`] if a component is outside the state, or both are the same.
    pub fn new(range: usize, bearing: usize, n: usize) -> Result<Self, ParameterError> {
        checked_component("range", range, n)?;
        checked_component("bearing", bearing, n)?;
        if range == bearing {
            let message = format!("names component {bearing}, which is the range; give another");
            return Err(ParameterError::new("bearing", message));
        }
        Ok(Self { reads: [range, bearing], outputs: ["east", "north"].map(|name| Output::plain(name, "m")) })
    }

    pub(super) fn from_parameters(p: Parameters, n: usize) -> Result<Self, ParameterError> {
        Self::new(p.range, p.bearing, n)
    }
}

impl Formula for PolarToCartesian {
    const INPUTS: &'static [usize] = &[2];

    fn reads(&self) -> &[usize] {
        &self.reads
    }

    fn outputs(&self) -> &[Output] {
        &self.outputs
    }

    fn natural_spread(&self, prior: &Gaussian) -> Option<f64> {
        prior.largest_sd(&[1])
    }

    fn exact_moments(&self) -> Option<&dyn ExactMoments> {
        Some(self)
    }

    #[inline(always)]
    fn evaluate<T: Number>(&self, x: &[T], y: &mut [T]) {
        y[0] = x[0] * x[1].cos();
        y[1] = x[0] * x[1].sin();
    }
}

impl ExactMoments for PolarToCartesian {
    /// With r ~ N(m, V) and theta of mean t and variance v, s their covariance: E\[r e^(i k t)\] and E\[r^2 e^(i k t)\] from
    /// the characteristic function are (m + i k s) and ((m + i k s)^2 + V) times e^(i k t - k^2 v / 2); the cross-covariance is
    /// P E\[h'\] by Stein's identity. Second moments are differences of sums of the size m^2 + V, and lose the digits by which
    /// that is larger than the spread.
    fn write_exact(&self, prior: &Gaussian, moments: &mut Moments) {
        let p = prior.covariance();
        let (m, t) = (prior.mean()[0], prior.mean()[1]);
        let (range, both, angle) = (p[(0, 0)], p[(0, 1)], p[(1, 1)]);
        let damped = (-0.5 * angle).exp();
        let (cos, sin) = (damped * t.cos(), damped * t.sin());
        let (east, north) = (m * cos - both * sin, m * sin + both * cos);
        write_linear(prior, |j, k| [[cos, -north], [sin, east]][j][k], moments);
        moments.mean[0] = east;
        moments.mean[1] = north;
        let (real, imaginary) = (m * m - 4.0 * both * both + range, 4.0 * m * both);
        let twice = (-2.0 * angle).exp();
        let (cos, sin) = (twice * (2.0 * t).cos(), twice * (2.0 * t).sin());
        let (squares, difference) = (m * m + range, real * cos - imaginary * sin);
        let product = 0.5 * (real * sin + imaginary * cos) - east * north;
        moments.covariance[(0, 0)] = 0.5 * (squares + difference) - east * east;
        moments.covariance[(1, 1)] = 0.5 * (squares - difference) - north * north;
        moments.covariance[(0, 1)] = product;
        moments.covariance[(1, 0)] = product;
    }
}
