use nalgebra::{DMatrix, DVector};

use crate::gaussian::{Gaussian, cholesky_in_place};
use crate::sensor::Real;

/// Points around the mean of a prior: x_k = m + L z_k.
///
/// L is the prior's own root if it was given one, else the Cholesky factor, else (P singular) an eigen root.
#[derive(Debug)]
pub(super) struct Placed<T: Real> {
    /// z_k, N x a.
    pub points: DMatrix<T>,
    root: DMatrix<T>,
    /// m.
    pub mean: DVector<T>,
    /// x_k, N x a.
    pub inputs: DMatrix<T>,
    /// L times a vector.
    lifted: DVector<T>,
}

impl<T: Real> Placed<T> {
    /// Room for `points` (N x a).
    pub fn new(points: &DMatrix<f64>) -> Self {
        let (n, a) = points.shape();
        Self {
            points: points.map(T::rounded),
            root: DMatrix::zeros(a, a),
            mean: DVector::zeros(a),
            inputs: DMatrix::zeros(n, a),
            lifted: DVector::zeros(a),
        }
    }

    /// Lays the points around `prior`.
    pub fn around(&mut self, prior: &Gaussian) {
        self.take(prior);
        // The mean is added last, so that it rounds once.
        for (i, mut x) in self.inputs.column_iter_mut().enumerate() {
            x.fill(T::rounded(0.0));
            for (k, z) in self.points.column_iter().enumerate() {
                let scale = self.root[(i, k)];
                if scale != T::rounded(0.0) {
                    x.axpy(scale, &z, T::rounded(1.0));
                }
            }
            x.add_scalar_mut(self.mean[i]);
        }
    }

    fn take(&mut self, prior: &Gaussian) {
        self.mean.zip_apply(prior.mean(), |to, from| *to = T::rounded(from));
        if let Some(root) = prior.given_root() {
            self.root.zip_apply(root, |to, from| *to = T::rounded(from));
            return;
        }
        // The factorisation works in the storage it is given: lend it ours. An empty matrix costs nothing.
        let mut storage = std::mem::replace(&mut self.root, DMatrix::zeros(0, 0));
        storage.zip_apply(prior.covariance(), |to, from| *to = T::rounded(from));
        self.root = cholesky_in_place(storage).unwrap_or_else(|| prior.root().map(T::rounded));
    }

    /// Writes L `unit` into column `j` of `cross_covariance`: Cov(x, y_j), given that of z.
    pub fn write_cross(&mut self, unit: &DVector<T>, j: usize, cross_covariance: &mut DMatrix<f64>) {
        self.lifted.gemv(T::rounded(1.0), &self.root, unit, T::rounded(0.0));
        for (k, cross) in self.lifted.iter().enumerate() {
            cross_covariance[(k, j)] = cross.widened();
        }
    }
}
