use serde::{Deserialize, Serialize};

use super::kinds::{Kind, built};
use super::parameter::checked_component;
use super::{Formula, Number, Output, ParameterError};
use crate::gaussian::Gaussian;

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

    #[inline(always)]
    fn evaluate<T: Number>(&self, x: &[T], y: &mut [T]) {
        y[0] = x[0] * x[1].cos();
        y[1] = x[0] * x[1].sin();
    }
}
