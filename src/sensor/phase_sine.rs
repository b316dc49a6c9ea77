use serde::{Deserialize, Serialize};

use crate::gaussian::{Gaussian, Moments};

use super::kinds::{Kind, built};
use super::parameter::finite;
use super::single::Single;
use super::{ExactMoments, Formula, Number, Output, ParameterError};

pub(super) const KIND: Kind = Kind {
    name: "phase-sine",
    summary: "sine of one component, as of a time or a phase",
    formula: "y = amplitude sin(frequency x_i + phase) + offset",
    parameters: "amplitude; frequency rad per unit of x_i; phase rad = 0; offset = 0; component i = 0; \
                 unit (of y) = \"\"",
    quantities: &[("phase", "rad")],
    source: "Kay 1993",
    example: r#"{"case":"tide","sensor":{"kind":"phase-sine","amplitude":1.8,"frequency":0.506,"phase":0.4,"offset":3.1,"unit":"m"},"prior":{"mean":[2],"covariance":[[0.64]]},"noise":{"covariance":0.0025}}"#,
    build: |map, n| built(map, n, PhaseSine::from_parameters),
};

/// The sine of one component, as of a time or a phase: the level of a tide by the hour.
///
/// y = amplitude sin(frequency x_i + phase) + offset; frequency in rad per unit of x_i, phase \[rad\], amplitude and offset
/// in the unit of y.
///
/// Its moments are known exactly: with x_i ~ N(m, v), E\[y\] = amplitude exp(-frequency^2 v / 2) sin(frequency m + phase)
/// + offset.
///
/// Source: S. M. Kay, Fundamentals of Statistical Signal Processing: Estimation Theory (Prentice-Hall, 1993), ch. 3
/// (phase of a sinusoid; chapter from memory).
#[derive(Debug, Clone, PartialEq)]
pub struct PhaseSine {
    amplitude: f64,
    frequency: f64,
    phase: f64,
    offset: f64,
    single: Single,
}

/// What a suite or a case record says of a [`PhaseSine`].
#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Parameters {
    amplitude: f64,
    frequency: f64,
    #[serde(default)]
    phase: f64,
    #[serde(default)]
    offset: f64,
    #[serde(default)]
    component: usize,
    #[serde(default)]
    unit: String,
}

impl PhaseSine {
    /// Amplitude and offset in `unit`, frequency \[rad per unit of the component\], phase \[rad\], and the `component` of a
    /// state of `n` that is read.
    ///
    /// # Errors
    /// [`ParameterError`] if a number is not finite or the component is outside the state.
    pub fn new(
        amplitude: f64,
        frequency: f64,
        phase: f64,
        offset: f64,
        component: usize,
        unit: String,
        n: usize,
    ) -> Result<Self, ParameterError> {
        for (key, value) in
            [("amplitude", amplitude), ("frequency", frequency), ("phase", phase), ("offset", offset)]
        {
            finite(key, value)?;
        }
        Ok(Self { amplitude, frequency, phase, offset, single: Single::new(component, unit, n)? })
    }

    pub(super) fn from_parameters(p: Parameters, n: usize) -> Result<Self, ParameterError> {
        Self::new(p.amplitude, p.frequency, p.phase, p.offset, p.component, p.unit, n)
    }
}

impl Formula for PhaseSine {
    const INPUTS: &'static [usize] = &[1];

    fn reads(&self) -> &[usize] {
        &self.single.reads
    }

    fn outputs(&self) -> &[Output] {
        &self.single.outputs
    }

    fn natural_spread(&self, prior: &Gaussian) -> Option<f64> {
        Some(prior.largest_sd(&[0])? * self.frequency.abs())
    }

    fn exact_moments(&self) -> Option<&dyn ExactMoments> {
        Some(self)
    }

    #[inline(always)]
    fn evaluate<T: Number>(&self, x: &[T], y: &mut [T]) {
        let phase = T::constant(self.frequency) * x[0] + T::constant(self.phase);
        y[0] = T::constant(self.amplitude) * phase.sin() + T::constant(self.offset);
    }
}

impl ExactMoments for PhaseSine {
    fn write_exact(&self, prior: &Gaussian, moments: &mut Moments) {
        let variance = prior.covariance()[(0, 0)];
        let (phase, spread) = (self.frequency * prior.mean()[0] + self.phase, self.frequency.powi(2) * variance);
        let damped = self.amplitude * (-0.5 * spread).exp();
        moments.mean[0] = damped * phase.sin() + self.offset;
        moments.cross_covariance[(0, 0)] = damped * phase.cos() * self.frequency * variance;
        // E[sin^2] - E[sin]^2 with the common factor 1 - e^-w taken out, which is small where w is.
        let lost = -(-spread).exp_m1();
        let share = 0.5 * lost * (1.0 + (-spread).exp() * (2.0 * phase).cos());
        moments.covariance[(0, 0)] = self.amplitude.powi(2) * share;
    }
}
