use nalgebra::{DMatrix, DVector};

use super::Problem;
use super::placed::Placed;
use crate::sensor::Real;

/// A sensor around the mean: values at x_k = m + L z_k as deviations from h(m), wrapped where angular. For methods that
/// are no weighted sum over their points.
#[derive(Debug)]
pub(super) struct Spread<T: Real> {
    pub placed: Placed<T>,
    /// h(x_k) - h(m), N x p.
    pub deviations: DMatrix<T>,
    /// h(m) (p).
    pub at_mean: DVector<T>,
}

impl<T: Real> Spread<T> {
    /// Room for `points` (N x a, none of them zero) and `p` outputs.
    pub fn new(points: &DMatrix<f64>, p: usize) -> Self {
        Self {
            placed: Placed::new(points),
            deviations: DMatrix::zeros(points.nrows(), p),
            at_mean: DVector::zeros(p),
        }
    }

    /// Evaluates the sensor at the mean and at the points: N + 1 values.
    pub fn evaluate(&mut self, problem: Problem<'_>) {
        let placed = &mut self.placed;
        placed.around(problem.prior);
        T::values(problem.sensor, 1, placed.mean.as_slice(), self.at_mean.as_mut_slice());
        let inputs = placed.inputs.as_slice();
        T::values(problem.sensor, placed.inputs.nrows(), inputs, self.deviations.as_mut_slice());
        let columns = self.deviations.column_iter_mut().zip(problem.sensor.outputs());
        for ((mut column, output), &centre) in columns.zip(self.at_mean.iter()) {
            if output.angular {
                column.apply(|v| *v = (*v - centre).wrapped());
            } else {
                column.add_scalar_mut(-centre);
            }
        }
    }

    /// h_j(m) + `shift`, wrapped where `angular`.
    pub fn mean(&self, j: usize, shift: T, angular: bool) -> f64 {
        let mean = self.at_mean[j] + shift;
        if angular { mean.wrapped().widened() } else { mean.widened() }
    }
}
