use serde::{Deserialize, Serialize};

use super::kinds::{Kind, built};
use super::parameter::{above_zero, finite};
use super::single::Single;
use super::{Formula, Number, Output, ParameterError};
use crate::gaussian::Gaussian;

pub(super) const KIND: Kind = Kind {
    name: "saturating",
    summary: "reading of one component that saturates smoothly at its limits",
    formula: "y = limit tanh(gain (x_i - offset) / limit)",
    parameters: "limit; gain = 1; offset = 0; component i = 0; unit (of y) = \"\"",
    quantities: &[],
    source: "common practice",
    example: r#"{"case":"current","sensor":{"kind":"saturating","limit":2,"gain":1,"unit":"m/s"},"prior":{"mean":[1.5],"covariance":[[0.36]]},"noise":{"covariance":0.0025}}"#,
    build: |map, n| built(map, n, Saturating::from_parameters),
};

/// A reading of one component that saturates smoothly at its limits.
///
/// y = limit tanh(gain (x_i - offset) / limit): `gain` is the slope around `offset`, and y stays between -limit and limit.
/// Limit in the unit of y, offset in that of x_i, gain in the one over the other.
///
/// Source: common practice.
#[derive(Debug, Clone, PartialEq)]
pub struct Saturating {
    limit: f64,
    gain: f64,
    offset: f64,
    single: Single,
}

/// What a suite or a case record says of a [`Saturating`].
#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Parameters {
    limit: f64,
    #[serde(default = "default_gain")]
    gain: f64,
    #[serde(default)]
    offset: f64,
    #[serde(default)]
    component: usize,
    #[serde(default)]
    unit: String,
}

fn default_gain() -> f64 {
    1.0
}

impl Saturating {
    /// The limit in `unit`, the slope around `offset`, and the `component` of a state of `n` that is read.
    ///
    /// # Errors
    /// [`ParameterError`] if the limit is not above 0, a number is not finite, or the component is outside the
    /// state.
    pub fn new(
        limit: f64,
        gain: f64,
        offset: f64,
        component: usize,
        unit: String,
        n: usize,
    ) -> Result<Self, ParameterError> {
        above_zero("limit", limit)?;
        finite("gain", gain)?;
        finite("offset", offset)?;
        Ok(Self { limit, gain, offset, single: Single::new(component, unit, n)? })
    }

    pub(super) fn from_parameters(p: Parameters, n: usize) -> Result<Self, ParameterError> {
        Self::new(p.limit, p.gain, p.offset, p.component, p.unit, n)
    }
}

impl Formula for Saturating {
    const INPUTS: &'static [usize] = &[1];

    fn reads(&self) -> &[usize] {
        &self.single.reads
    }

    fn outputs(&self) -> &[Output] {
        &self.single.outputs
    }

    fn natural_spread(&self, prior: &Gaussian) -> Option<f64> {
        Some(prior.largest_sd(&[0])? * (self.gain / self.limit).abs())
    }

    #[inline(always)]
    fn evaluate<T: Number>(&self, x: &[T], y: &mut [T]) {
        let drive = T::constant(self.gain / self.limit) * (x[0] - T::constant(self.offset));
        y[0] = T::constant(self.limit) * drive.tanh();
    }
}
