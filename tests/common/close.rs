//! Comparisons. Each takes one tolerance, in units that the caller names, and has no hidden floor.

use nalgebra::{DMatrix, DVector};

/// Largest |a_ij - b_ij| / (row_i column_j): the difference in the natural scale of each entry. An entry whose
/// scale is zero must agree exactly (the result is infinite otherwise).
#[track_caller]
pub fn scaled_difference(a: &DMatrix<f64>, b: &DMatrix<f64>, rows: &[f64], columns: &[f64]) -> f64 {
    assert_eq!(a.shape(), b.shape(), "matrices of different shape");
    assert_eq!(a.shape(), (rows.len(), columns.len()), "scales do not fit the matrix");
    let mut largest = 0.0;
    for i in 0..a.nrows() {
        for j in 0..a.ncols() {
            let difference = (a[(i, j)] - b[(i, j)]).abs();
            let scaled = if difference == 0.0 { 0.0 } else { difference / (rows[i] * columns[j]) };
            // `max` would drop a NaN: what cannot be compared does not agree.
            largest = if scaled.is_nan() { f64::INFINITY } else { scaled.max(largest) };
        }
    }
    largest
}

/// The same for vectors.
#[track_caller]
pub fn scaled_vector_difference(a: &DVector<f64>, b: &DVector<f64>, scales: &[f64]) -> f64 {
    let (a, b) = (
        DMatrix::from_column_slice(a.len(), 1, a.as_slice()),
        DMatrix::from_column_slice(b.len(), 1, b.as_slice()),
    );
    scaled_difference(&a, &b, scales, &[1.0])
}

/// Standard deviations of a covariance.
pub fn standard_deviations(covariance: &DMatrix<f64>) -> Vec<f64> {
    covariance.diagonal().iter().map(|v| v.sqrt()).collect()
}

/// Asserts `difference <= tolerance`, saying what was compared.
#[track_caller]
pub fn assert_within(difference: f64, tolerance: f64, what: impl std::fmt::Display) {
    assert!(difference <= tolerance, "{what}: {difference:.3e} is more than {tolerance:.3e}");
}
