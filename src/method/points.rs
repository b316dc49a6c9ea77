use nalgebra::{DMatrix, DVector};

use super::placed::Placed;
use super::{Problem, Refusal, Transform};
use crate::gaussian::Moments;
use crate::sensor::{Arithmetic, Output, Real};

/// A quadrature rule for N(0, I) in a components: unit points z_k, weights for the mean and weights for the
/// second moments. The two differ only in the scaled unscented transform.
#[derive(Debug, Clone, PartialEq)]
pub struct PointSet {
    /// N x a: one column a coordinate, as [`Sensor::values`](crate::sensor::Sensor::values) wants its points.
    points: DMatrix<f64>,
    mean_weights: DVector<f64>,
    covariance_weights: DVector<f64>,
    /// Which point is zero, if one is: its value is h(m).
    centre: Option<usize>,
}

impl PointSet {
    /// The rule with `points` (N x a, one row a point) and their weights (N each).
    ///
    /// # Panics
    /// If there is no point or the lengths differ.
    #[track_caller]
    pub fn new(points: DMatrix<f64>, mean_weights: DVector<f64>, covariance_weights: DVector<f64>) -> Self {
        let n = points.nrows();
        assert!(n > 0, "a rule has at least one point");
        assert_eq!(mean_weights.len(), n, "one mean weight a point");
        assert_eq!(covariance_weights.len(), n, "one covariance weight a point");
        let centre = (0..n).find(|&k| points.row(k).iter().all(|&z| z == 0.0));
        Self { points, mean_weights, covariance_weights, centre }
    }

    /// Two points +-`reach` e_i of weight `weight` on each of `a` axes, behind a centre point with its mean
    /// and covariance weights if there is one.
    pub(super) fn on_axes(a: usize, reach: f64, weight: f64, centre: Option<(f64, f64)>) -> Self {
        let first = usize::from(centre.is_some());
        let n = first + 2 * a;
        let mut points = DMatrix::zeros(n, a);
        for i in 0..a {
            points[(first + i, i)] = reach;
            points[(first + a + i, i)] = -reach;
        }
        let mut mean_weights = DVector::from_element(n, weight);
        let mut covariance_weights = mean_weights.clone();
        if let Some((mean, covariance)) = centre {
            mean_weights[0] = mean;
            covariance_weights[0] = covariance;
        }
        Self::new(points, mean_weights, covariance_weights)
    }

    /// Unit points, N x a, one row a point.
    pub fn points(&self) -> &DMatrix<f64> {
        &self.points
    }

    /// Weights of the mean (N).
    pub fn mean_weights(&self) -> &DVector<f64> {
        &self.mean_weights
    }

    /// Weights of covariance and cross-covariance (N).
    pub fn covariance_weights(&self) -> &DVector<f64> {
        &self.covariance_weights
    }
}

/// The transform that all weighted point sets share.
///
/// With P = L L', x_k = m + L z_k and a centre c:
///
/// ```text
/// d_k = h(x_k) - c (wrapped where angular),  e = sum_k wm_k d_k,  mu = c + e (wrapped where angular)
/// S = sum_k wc_k (d_k - e)(d_k - e)' + R,    C = L sum_k wc_k z_k (d_k - e)'
/// ```
///
/// Because the mean weights sum to one, this is the published sum wm_k h(x_k) with its deviations, for any c;
/// a c close to the values keeps the digits that a sum of large values loses (a mean of 1e6, a spread of
/// 1e-3). c is h(m). A rule without a centre point takes the value at its first point for plain outputs, and
/// one more evaluation, h(m), only where an output is angular: there c is the centre of the chart.
///
/// L is the prior's own root if it was given one, else the Cholesky factor, else (P singular) an eigen root.
/// The axes of a Cholesky factor follow the order of the state components, not the shape of P: a rotated
/// problem gets a point set that is not the rotated one, and the results of a rule that is not exact differ
/// a little. That belongs to the published methods. A square-root filter, which carries L through its
/// rotations, gives exactly rotated results.
///
/// In single precision all of this is done in it: mean and covariance of the prior, weights, points and noise are rounded first,
/// and the root is factored from the rounded covariance. Where rounding has left that indefinite the root is the rounded one
/// of the prior.
///
/// Everything is laid out beforehand: `apply` allocates nothing unless P is singular or the sensor has more
/// than eight inputs or outputs.
#[derive(Debug)]
pub struct PointTransform<T: Real = f64> {
    placed: Placed<T>,
    /// wm_k.
    mean_weights: DVector<T>,
    /// wc_k.
    covariance_weights: DVector<T>,
    centre: Option<usize>,
    /// h(m) for a rule that has no centre point.
    at_mean: DVector<T>,
    /// h(x_k), then d_k - e, N x p.
    deviations: DMatrix<T>,
    /// c, then mu.
    middle: DVector<T>,
    /// wc_k (d_k - e) of one output.
    weighted: DVector<T>,
    /// sum_k wc_k z_k (d_k - e) of one output.
    unit_cross: DVector<T>,
}

impl PointTransform {
    /// Workspace for `set` and `p` outputs.
    ///
    /// # Errors
    /// [`Refusal`] if the set has no coordinate.
    pub fn plan(set: PointSet, p: usize, arithmetic: Arithmetic) -> Result<Box<dyn Transform>, Refusal> {
        Refusal::unless_something_is_read(set.points.ncols())?;
        Ok(match arithmetic {
            Arithmetic::Double => Box::new(PointTransform::<f64>::new(&set, p)),
            Arithmetic::Single => Box::new(PointTransform::<f32>::new(&set, p)),
        })
    }
}

impl<T: Real> PointTransform<T> {
    fn new(set: &PointSet, p: usize) -> Self {
        let (n, a) = set.points.shape();
        Self {
            placed: Placed::new(&set.points),
            mean_weights: set.mean_weights.map(T::rounded),
            covariance_weights: set.covariance_weights.map(T::rounded),
            centre: set.centre,
            at_mean: DVector::zeros(p),
            deviations: DMatrix::zeros(n, p),
            middle: DVector::zeros(p),
            weighted: DVector::zeros(n),
            unit_cross: DVector::zeros(a),
        }
    }

    /// Writes c into the middle, which is completed by [`Self::centre_deviations`].
    fn write_centre(&mut self, problem: Problem<'_>) {
        let outputs = problem.sensor.outputs();
        for j in 0..outputs.len() {
            self.middle[j] = self.deviations[(self.centre.unwrap_or(0), j)];
        }
        if self.centre.is_none() && outputs.iter().any(|o| o.angular) {
            T::values(problem.sensor, 1, self.placed.mean.as_slice(), self.at_mean.as_mut_slice());
            for (j, _) in outputs.iter().enumerate().filter(|(_, o)| o.angular) {
                self.middle[j] = self.at_mean[j];
            }
        }
    }

    /// Turns values into d_k - e and the centre into the mean.
    fn centre_deviations(&mut self, outputs: &[Output]) {
        for (j, (mut d, output)) in self.deviations.column_iter_mut().zip(outputs).enumerate() {
            let centre = self.middle[j];
            if output.angular {
                d.apply(|v| *v = (*v - centre).wrapped());
            } else {
                d.add_scalar_mut(-centre);
            }
            let shift = d.dot(&self.mean_weights);
            d.add_scalar_mut(-shift);
            self.middle[j] = if output.angular { (centre + shift).wrapped() } else { centre + shift };
        }
    }
}

impl<T: Real> Transform for PointTransform<T> {
    fn apply(&mut self, problem: Problem<'_>, moments: &mut Moments) {
        let (n, a) = self.placed.points.shape();
        let p = self.deviations.ncols();
        problem.assert_fits(a, p, moments);
        self.placed.around(problem.prior);
        T::values(problem.sensor, n, self.placed.inputs.as_slice(), self.deviations.as_mut_slice());
        self.write_centre(problem);
        self.centre_deviations(problem.sensor.outputs());
        for l in 0..p {
            moments.mean[l] = self.middle[l].widened();
            let d = self.deviations.column(l);
            self.weighted.cmpy(T::rounded(1.0), &self.covariance_weights, &d, T::rounded(0.0));
            for j in 0..=l {
                let s = self.deviations.column(j).dot(&self.weighted);
                moments.covariance[(j, l)] = (s + T::rounded(problem.noise[(j, l)])).widened();
                moments.covariance[(l, j)] = (s + T::rounded(problem.noise[(l, j)])).widened();
            }
            for (k, z) in self.placed.points.column_iter().enumerate() {
                self.unit_cross[k] = z.dot(&self.weighted);
            }
            self.placed.write_cross(&self.unit_cross, l, &mut moments.cross_covariance);
        }
    }
}
