use std::fmt::Debug;

use nalgebra::DMatrix;

use crate::gaussian::{Gaussian, Moments};
use crate::sensor::{Arithmetic, Sensor};

use super::{Exactness, PointSet};

/// One transform to do: the sensor, the prior of the components that it reads, the noise covariance.
#[derive(Debug, Clone, Copy)]
pub struct Problem<'a> {
    /// h, on a inputs and p outputs.
    pub sensor: &'a dyn Sensor,
    /// Prior of the read components (a).
    pub prior: &'a Gaussian,
    /// R (p x p), zero where there is no noise.
    pub noise: &'a DMatrix<f64>,
}

impl Problem<'_> {
    /// Stops a caller whose parts do not fit together before a wrong number is written.
    #[track_caller]
    pub(super) fn assert_fits(&self, a: usize, p: usize, moments: &Moments) {
        assert_eq!(self.sensor.reads().len(), a, "the plan and the sensor differ in read components");
        assert_eq!(self.sensor.outputs().len(), p, "the plan and the sensor differ in outputs");
        assert_eq!(self.prior.dimension(), a, "the prior is that of the read components");
        assert_eq!(self.noise.shape(), (p, p), "the noise covariance is p x p");
        assert_eq!(moments.mean.len(), p, "the mean to write has p entries");
        assert_eq!(moments.covariance.shape(), (p, p), "the covariance to write is p x p");
        assert_eq!(moments.cross_covariance.shape(), (a, p), "the cross-covariance to write is a x p");
    }
}

/// A published approximation with its parameters fixed.
pub trait Method: Debug + Send + Sync {
    /// Lays out weights and workspace for `a` read components and `p` outputs; the transform does its sums, and asks the
    /// sensor, in this arithmetic.
    ///
    /// # Errors
    /// [`Refusal`] says why this method cannot serve these dimensions, or this arithmetic.
    fn plan(&self, a: usize, p: usize, arithmetic: Arithmetic) -> Result<Box<dyn Transform>, Refusal>;

    /// Whether it serves this sensor, whatever the dimensions: every sensor unless it says otherwise.
    ///
    /// # Errors
    /// [`Refusal`] says what the sensor lacks.
    fn serves(&self, _sensor: &dyn Sensor) -> Result<(), Refusal> {
        Ok(())
    }

    /// Up to which degree of a polynomial sensor its moments are exact, if it claims any.
    fn exactness(&self) -> Option<Exactness> {
        None
    }

    /// Its points and weights for `a` read components, if it is a weighted point set.
    ///
    /// # Errors
    /// As [`Method::plan`].
    fn point_set(&self, _a: usize) -> Result<Option<PointSet>, Refusal> {
        Ok(None)
    }
}

/// A method laid out for one pair of dimensions: what an estimator would run at every measurement.
pub trait Transform: Debug + Send {
    /// Writes the method's moments of the problem into `moments` (mean p, covariance p x p with noise,
    /// cross-covariance a x p). What stood there before does not matter.
    ///
    /// Angular outputs are worked in the chart centred at h(m) and the mean is wrapped back to (-pi, pi].
    /// An indefinite or non-finite result is written as it comes: the scores flag it.
    ///
    /// # Panics
    /// If the problem or `moments` has other dimensions than were planned.
    fn apply(&mut self, problem: Problem<'_>, moments: &mut Moments);
}

/// Why a method cannot serve a problem, for the person who asked for it.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[error("{0}")]
pub struct Refusal(pub String);

impl Refusal {
    /// Nothing can be transformed where nothing is read.
    pub(super) fn unless_something_is_read(a: usize) -> Result<(), Self> {
        if a == 0 {
            Err(Self("the sensor reads no state component; there is nothing to transform".into()))
        } else {
            Ok(())
        }
    }
}
