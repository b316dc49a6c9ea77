//! Seeded random laws and matrices, the same on every run.

use gaussworthy::gaussian::Gaussian;
use nalgebra::{DMatrix, DVector};
use rand::{RngExt, SeedableRng};
use rand_distr::StandardNormal;
use rand_pcg::Pcg64;

/// A stream of its own for each seed.
pub fn stream(seed: u64) -> Pcg64 {
    Pcg64::seed_from_u64(seed)
}

/// Independent standard normal entries.
pub fn normal_matrix(rows: usize, columns: usize, rng: &mut Pcg64) -> DMatrix<f64> {
    DMatrix::from_fn(rows, columns, |_, _| rng.sample(StandardNormal))
}

/// Independent standard normal entries.
pub fn normal_vector(length: usize, rng: &mut Pcg64) -> DVector<f64> {
    DVector::from_fn(length, |_, _| rng.sample(StandardNormal))
}

/// A positive definite covariance G G' of `n` components, G with twice as many columns as rows (so that the
/// condition number stays in the hundreds), in units that lie up to 12 orders apart.
pub fn covariance(n: usize, rng: &mut Pcg64) -> DMatrix<f64> {
    let g = normal_matrix(n, 2 * n, rng);
    let units = DVector::from_fn(n, |_, _| 10f64.powf(rng.random_range(-6.0..6.0)));
    symmetric(DMatrix::from_diagonal(&units) * (&g * g.transpose()) * DMatrix::from_diagonal(&units))
}

/// A law with [`covariance`] and a mean of that size.
pub fn law(n: usize, rng: &mut Pcg64) -> Gaussian {
    let covariance = covariance(n, rng);
    let mean = normal_vector(n, rng).zip_map(&covariance.diagonal(), |z, v| z * v.sqrt());
    Gaussian::new(mean, covariance).expect("a random covariance is one")
}

/// The mean of a matrix and its transpose: exactly symmetric.
pub fn symmetric(a: DMatrix<f64>) -> DMatrix<f64> {
    0.5 * (&a + a.transpose())
}

/// Largest over smallest eigenvalue of the correlation matrix: how far rounding is amplified, units aside.
pub fn condition(covariance: &DMatrix<f64>) -> f64 {
    let n = covariance.nrows();
    let correlation =
        DMatrix::from_fn(n, n, |i, j| covariance[(i, j)] / (covariance[(i, i)].sqrt() * covariance[(j, j)].sqrt()));
    let eigenvalues = correlation.symmetric_eigenvalues();
    eigenvalues.max() / eigenvalues.min()
}
