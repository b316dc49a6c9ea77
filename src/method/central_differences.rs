use nalgebra::{DMatrix, DVector};
use serde::{Deserialize, Serialize};

use super::kinds::{BuildError, Kind, built, finite, given};
use super::spread::Spread;
use super::{Exactness, Method, PointSet, Problem, Refusal, Transform};
use crate::gaussian::Moments;
use crate::sensor::{Arithmetic, Real};

pub(super) const FIRST: Kind = Kind {
    id: "central-difference-1",
    name: "divided differences of first order (Stirling)",
    parameters: "step = sqrt(3)",
    evaluations: "2a + 1",
    source: "Norgaard, Poulsen, Ravn 2000",
    examples: &["central-difference-1:step=1"],
    build: |map| built(map, |p: Parameters| FirstOrderDifferences::new(p.step())),
};

pub(super) const SECOND: Kind = Kind {
    id: "central-difference-2",
    name: "divided differences of second order (Stirling)",
    parameters: "step = sqrt(3) (1 or above)",
    evaluations: "2a + 1",
    source: "Norgaard, Poulsen, Ravn 2000",
    examples: &["central-difference-2:step=1.2"],
    build: |map| built(map, |p: Parameters| SecondOrderDifferences::new(p.step())),
};

/// First-order divided differences along the columns s_i of the square root of P, with the step h:
///
/// ```text
/// D_i = (h(m + h s_i) - h(m - h s_i)) / (2 h)
/// mu = h(m),  S = sum_i D_i D_i' + R,  C = sum_i s_i D_i'
/// ```
///
/// First-order Taylor with differences in place of the Jacobian; mean and covariance are exact for polynomials of
/// degree 1, the cross-covariance for degree 2. The step sqrt(3) is best for a Gaussian: its square is the kurtosis.
///
/// Source: M. Norgaard, N. K. Poulsen, O. Ravn, "New developments in state estimation for nonlinear systems",
/// Automatica 36 (2000) 1627-1638, filter DD1.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct FirstOrderDifferences {
    step: f64,
}

/// Second-order divided differences: with D_i as in [`FirstOrderDifferences`] and
/// E_i = h(m + h s_i) + h(m - h s_i) - 2 h(m),
///
/// ```text
/// mu = h(m) + sum_i E_i / (2 h^2)
/// S = sum_i D_i D_i' + (h^2 - 1) / (4 h^4) sum_i E_i E_i' + R,  C = sum_i s_i D_i'
/// ```
///
/// The mean is that of the unscented transform with a + kappa = h^2. The covariance is not: the cross terms of E are
/// left out, so that it is a sum of squares and never indefinite, and no weighted point set gives it. Exact for
/// polynomials of degree 3 in the mean, 2 in the cross-covariance, 1 in the covariance (with the step sqrt(3) also for
/// sums of polynomials of degree 2 in one component of z each).
///
/// Source: as [`FirstOrderDifferences`], filter DD2.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct SecondOrderDifferences {
    step: f64,
}

#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
struct Parameters {
    #[serde(default, deserialize_with = "given", skip_serializing_if = "Option::is_none")]
    step: Option<f64>,
}

impl Parameters {
    fn step(&self) -> f64 {
        self.step.unwrap_or(3f64.sqrt())
    }
}

impl FirstOrderDifferences {
    /// With this step, in standard deviations.
    ///
    /// # Errors
    /// [`BuildError`] if it is not finite and above zero.
    pub fn new(step: f64) -> Result<Self, BuildError> {
        finite("step", step)?;
        if step <= 0.0 {
            return Err(BuildError::new(
                "step",
                format!("is {step}; a step is above zero, sqrt(3) for a Gaussian"),
            ));
        }
        Ok(Self { step })
    }
}

impl SecondOrderDifferences {
    /// With this step, in standard deviations.
    ///
    /// # Errors
    /// [`BuildError`] if it is not finite and at least 1: below, the weight h^2 - 1 of the squares is negative.
    pub fn new(step: f64) -> Result<Self, BuildError> {
        finite("step", step)?;
        if step < 1.0 {
            let message = format!("is {step}; the second order needs a step of 1 or above, sqrt(3) for a Gaussian");
            return Err(BuildError::new("step", message));
        }
        Ok(Self { step })
    }
}

impl Method for FirstOrderDifferences {
    fn plan(&self, a: usize, p: usize, arithmetic: Arithmetic) -> Result<Box<dyn Transform>, Refusal> {
        plan(a, p, arithmetic, self.step, None)
    }

    fn exactness(&self) -> Option<Exactness> {
        Some(Exactness::up_to(1, 2, 1))
    }
}

impl Method for SecondOrderDifferences {
    fn plan(&self, a: usize, p: usize, arithmetic: Arithmetic) -> Result<Box<dyn Transform>, Refusal> {
        let squared = self.step * self.step;
        let factors = [0.5 / squared, (squared - 1.0) / (4.0 * squared * squared)];
        plan(a, p, arithmetic, self.step, Some(factors))
    }

    fn exactness(&self) -> Option<Exactness> {
        Some(Exactness::up_to(3, 2, 1))
    }
}

fn plan(
    a: usize,
    p: usize,
    arithmetic: Arithmetic,
    step: f64,
    second: Option<[f64; 2]>,
) -> Result<Box<dyn Transform>, Refusal> {
    Refusal::unless_something_is_read(a)?;
    Ok(match arithmetic {
        Arithmetic::Double => Box::new(Differences::<f64>::new(a, p, step, second)),
        Arithmetic::Single => Box::new(Differences::<f32>::new(a, p, step, second)),
    })
}

#[derive(Debug)]
struct Differences<T: Real> {
    spread: Spread<T>,
    /// 1 / (2 h).
    slope_scale: T,
    /// Factors of the sums of E_i and of E_i E_i'; none at first order.
    second: Option<[T; 2]>,
    /// D_i, a x p.
    slopes: DMatrix<T>,
    /// E_i, a x p.
    bends: DMatrix<T>,
    unit_cross: DVector<T>,
}

impl<T: Real> Differences<T> {
    fn new(a: usize, p: usize, step: f64, second: Option<[f64; 2]>) -> Self {
        let set = PointSet::on_axes(a, step, 1.0, None);
        Self {
            spread: Spread::new(set.points(), p),
            slope_scale: T::rounded(0.5 / step),
            second: second.map(|factors| factors.map(T::rounded)),
            slopes: DMatrix::zeros(a, p),
            bends: DMatrix::zeros(a, p),
            unit_cross: DVector::zeros(a),
        }
    }
}

impl<T: Real> Transform for Differences<T> {
    fn apply(&mut self, problem: Problem<'_>, moments: &mut Moments) {
        let (a, p) = self.slopes.shape();
        problem.assert_fits(a, p, moments);
        self.spread.evaluate(problem);
        for j in 0..p {
            for i in 0..a {
                let (above, below) = (self.spread.deviations[(i, j)], self.spread.deviations[(a + i, j)]);
                self.slopes[(i, j)] = (above - below) * self.slope_scale;
                self.bends[(i, j)] = above + below;
            }
        }
        let zero = T::rounded(0.0);
        for (j, output) in problem.sensor.outputs().iter().enumerate() {
            let (slope, bend) = (self.slopes.column(j), self.bends.column(j));
            let shift = self.second.map_or(zero, |[mean, _]| mean * bend.sum());
            moments.mean[j] = self.spread.mean(j, shift, output.angular);
            for l in 0..=j {
                let bent = self.second.map_or(zero, |[_, squares]| squares * bend.dot(&self.bends.column(l)));
                let s = slope.dot(&self.slopes.column(l)) + bent;
                moments.covariance[(j, l)] = (s + T::rounded(problem.noise[(j, l)])).widened();
                moments.covariance[(l, j)] = (s + T::rounded(problem.noise[(l, j)])).widened();
            }
            self.unit_cross.copy_from(&slope);
            self.spread.placed.write_cross(&self.unit_cross, j, &mut moments.cross_covariance);
        }
    }
}
