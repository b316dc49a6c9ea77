use serde::{Deserialize, Serialize};

use crate::gaussian::{Gaussian, Moments};

use super::kinds::{Kind, built};
use super::parameter::{above_zero, finite};
use super::single::Single;
use super::{ExactMoments, Formula, Number, Output, ParameterError};

pub(super) const KIND: Kind = Kind {
    name: "exponential-decay",
    summary: "reading that decays with one component, as density with height or light with depth",
    formula: "y = amplitude exp(-x_i / scale) + offset",
    parameters: "amplitude; scale m; offset = 0; component i = 0; unit (of y) = \"\"",
    quantities: &[("scale", "m")],
    source: "Wallace, Hobbs 2006",
    example: r#"{"case":"light","sensor":{"kind":"exponential-decay","amplitude":900,"scale":3.5,"unit":"lux"},"prior":{"mean":[5],"covariance":[[1.44]]},"noise":{"covariance":400}}"#,
    build: |map, n| built(map, n, ExponentialDecay::from_parameters),
};

/// A reading that decays with one component: density with height, light with depth.
///
/// y = amplitude exp(-x_i / scale) + offset, x_i and scale \[m\] (or any one unit in both), the others in the unit of y.
///
/// Its moments are known exactly: with x_i ~ N(m, v) the decaying part is log-normal, E\[y\] = amplitude
/// exp(-m/scale + v / (2 scale^2)) + offset.
///
/// Source: the scale height of an isothermal atmosphere, J. M. Wallace, P. V. Hobbs, Atmospheric Science, 2nd ed.
/// (Academic Press, 2006), ch. 3 (chapter from memory).
#[derive(Debug, Clone, PartialEq)]
pub struct ExponentialDecay {
    amplitude: f64,
    scale: f64,
    offset: f64,
    single: Single,
}

/// What a suite or a case record says of an [`ExponentialDecay`].
#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Parameters {
    amplitude: f64,
    scale: f64,
    #[serde(default)]
    offset: f64,
    #[serde(default)]
    component: usize,
    #[serde(default)]
    unit: String,
}

impl ExponentialDecay {
    /// Amplitude and offset in `unit`, the scale over which the reading falls to 1/e, and the `component` of a state of
    /// `n` that it decays with.
    ///
    /// # Errors
    /// [`ParameterError`] if the scale is not above 0, a number is not finite, or the component is outside the state.
    pub fn new(
        amplitude: f64,
        scale: f64,
        offset: f64,
        component: usize,
        unit: String,
        n: usize,
    ) -> Result<Self, ParameterError> {
        finite("amplitude", amplitude)?;
        above_zero("scale", scale)?;
        finite("offset", offset)?;
        Ok(Self { amplitude, scale, offset, single: Single::new(component, unit, n)? })
    }

    pub(super) fn from_parameters(p: Parameters, n: usize) -> Result<Self, ParameterError> {
        Self::new(p.amplitude, p.scale, p.offset, p.component, p.unit, n)
    }
}

impl Formula for ExponentialDecay {
    const INPUTS: &'static [usize] = &[1];

    fn reads(&self) -> &[usize] {
        &self.single.reads
    }

    fn outputs(&self) -> &[Output] {
        &self.single.outputs
    }

    fn natural_spread(&self, prior: &Gaussian) -> Option<f64> {
        Some(prior.largest_sd(&[0])? / self.scale.abs())
    }

    fn exact_moments(&self) -> Option<&dyn ExactMoments> {
        Some(self)
    }

    #[inline(always)]
    fn evaluate<T: Number>(&self, x: &[T], y: &mut [T]) {
        let decay = (x[0] * T::constant(-1.0 / self.scale)).exp();
        y[0] = T::constant(self.amplitude) * decay + T::constant(self.offset);
    }
}

impl ExactMoments for ExponentialDecay {
    fn write_exact(&self, prior: &Gaussian, moments: &mut Moments) {
        let (mean, variance) = (prior.mean()[0] / self.scale, prior.covariance()[(0, 0)] / self.scale.powi(2));
        let decaying = self.amplitude * (0.5 * variance - mean).exp();
        moments.mean[0] = decaying + self.offset;
        moments.covariance[(0, 0)] = decaying * decaying * variance.exp_m1();
        moments.cross_covariance[(0, 0)] = -decaying * variance * self.scale;
    }
}
