use nalgebra::{DMatrix, DVector};

use super::{GaussianError, SquareRoot};

/// How far two mirrored entries may differ, in units of the two standard deviations.
const SYMMETRY_SLACK: f64 = 1e-9;
/// How far below zero an eigenvalue of the correlation matrix may come by rounding.
const EIGENVALUE_SLACK: f64 = 1e-12;

/// A Gaussian law N(mean, covariance) of n components; the covariance may be singular (a component known
/// exactly is legal).
#[derive(Debug, Clone, PartialEq)]
pub struct Gaussian {
    mean: DVector<f64>,
    covariance: DMatrix<f64>,
    given_root: Option<DMatrix<f64>>,
}

impl Gaussian {
    /// The law with this mean (n) and covariance (n x n).
    ///
    /// # Errors
    /// [`GaussianError`] by what is wrong, with the entry or the eigenvalue: empty, wrong shape, not finite,
    /// negative variance, not symmetric (mirrored entries further apart than 1e-9 of their standard
    /// deviations), indefinite.
    pub fn new(mean: DVector<f64>, covariance: DMatrix<f64>) -> Result<Self, GaussianError> {
        if mean.is_empty() {
            return Err(GaussianError::Empty);
        }
        if let Some((index, &value)) = mean.iter().enumerate().find(|(_, v)| !v.is_finite()) {
            return Err(GaussianError::MeanNotFinite { index, value });
        }
        let covariance = checked_covariance(covariance, mean.len())?;
        Ok(Self { mean, covariance, given_root: None })
    }

    /// A law whose parts are known to be sound (a block of a checked covariance).
    pub(super) fn from_checked(mean: DVector<f64>, covariance: DMatrix<f64>) -> Self {
        Self { mean, covariance, given_root: None }
    }

    /// The law with covariance F F' that keeps F as its square root, as a square-root filter does.
    ///
    /// Point sets are laid along the columns of the square root, so two roots of one covariance give two
    /// different point sets. Without a given root the Cholesky factor is used.
    ///
    /// # Errors
    /// As [`Gaussian::new`]; F must be square (n x n).
    pub fn from_root(mean: DVector<f64>, root: DMatrix<f64>) -> Result<Self, GaussianError> {
        let n = mean.len();
        if root.nrows() != n || root.ncols() != n {
            return Err(GaussianError::Shape { rows: root.nrows(), columns: root.ncols(), expected: n });
        }
        let law = Self::new(mean, &root * root.transpose())?;
        Ok(Self { given_root: Some(root), ..law })
    }

    /// Number of components n.
    pub fn dimension(&self) -> usize {
        self.mean.len()
    }

    /// Mean (n).
    pub fn mean(&self) -> &DVector<f64> {
        &self.mean
    }

    /// Covariance (n x n), exactly symmetric.
    pub fn covariance(&self) -> &DMatrix<f64> {
        &self.covariance
    }

    /// The largest standard deviation in any direction of the components `of`: the root of the largest eigenvalue of their block
    /// of the covariance. `None` of no component.
    ///
    /// # Panics
    /// If a component is outside the law.
    pub fn largest_sd(&self, of: &[usize]) -> Option<f64> {
        let block = DMatrix::from_fn(of.len(), of.len(), |i, j| self.covariance[(of[i], of[j])]);
        (!block.is_empty()).then(|| block.symmetric_eigenvalues().max().max(0.0).sqrt())
    }

    /// The square root that this law was made from, if it was.
    pub fn given_root(&self) -> Option<&DMatrix<f64>> {
        self.given_root.as_ref()
    }

    /// A square root F (n x n) with F F' = covariance: the given one, else Cholesky, else by eigenvalues.
    pub fn root(&self) -> DMatrix<f64> {
        match &self.given_root {
            Some(root) => root.clone(),
            None => SquareRoot::of(&self.covariance).into_factor(),
        }
    }
}

/// The matrix if it is a covariance of `dimension` components, made exactly symmetric.
///
/// # Errors
/// As [`Gaussian::new`].
pub fn checked_covariance(mut covariance: DMatrix<f64>, dimension: usize) -> Result<DMatrix<f64>, GaussianError> {
    let (rows, columns) = covariance.shape();
    if rows != dimension || columns != dimension {
        return Err(GaussianError::Shape { rows, columns, expected: dimension });
    }
    for row in 0..dimension {
        for column in 0..dimension {
            let value = covariance[(row, column)];
            if !value.is_finite() {
                return Err(GaussianError::NotFinite { row, column, value });
            }
        }
    }
    if let Some(index) = (0..dimension).find(|&i| covariance[(i, i)] < 0.0) {
        return Err(GaussianError::NegativeVariance { index, value: covariance[(index, index)] });
    }
    for row in 0..dimension {
        for column in row + 1..dimension {
            let (upper, lower) = (covariance[(row, column)], covariance[(column, row)]);
            let scale = covariance[(row, row)].sqrt() * covariance[(column, column)].sqrt();
            // A covariance with a component known exactly has scale 0: then only equality will do.
            if (upper - lower).abs() > SYMMETRY_SLACK * scale {
                return Err(GaussianError::NotSymmetric { row, column, upper, lower });
            }
            let middle = 0.5 * (upper + lower);
            covariance[(row, column)] = middle;
            covariance[(column, row)] = middle;
        }
    }
    let eigenvalue = least_correlation_eigenvalue(&covariance);
    if !(eigenvalue >= -EIGENVALUE_SLACK * dimension as f64) {
        return Err(GaussianError::Indefinite { eigenvalue });
    }
    Ok(covariance)
}

/// Least eigenvalue of D^-1 A D^-1 with D the square roots of A's diagonal: free of units, so a state with
/// kilometres beside microradians is judged fairly. A zero variance with a covariance beside it counts as
/// indefinite.
fn least_correlation_eigenvalue(covariance: &DMatrix<f64>) -> f64 {
    // A correlation far beyond one is as impossible as one just beyond; the bound keeps it from overflowing.
    const BOUND: f64 = 1e6;
    let n = covariance.nrows();
    let scaled = DMatrix::from_fn(n, n, |i, j| {
        let scale = covariance[(i, i)].sqrt() * covariance[(j, j)].sqrt();
        let entry = covariance[(i, j)];
        if scale > 0.0 {
            (entry / scale).clamp(-BOUND, BOUND)
        } else if i == j {
            1.0
        } else if entry == 0.0 {
            0.0
        } else {
            // Correlated with a constant: impossible, and the 2 x 2 minor has determinant below zero.
            2.0
        }
    });
    scaled.symmetric_eigenvalues().min()
}

#[cfg(test)]
mod tests {
    use super::*;
    use nalgebra::{dmatrix, dvector};

    #[test]
    fn what_is_wrong_is_named() {
        let two = dvector![0.0, 0.0];
        let refuse = |p: DMatrix<f64>| Gaussian::new(two.clone(), p).unwrap_err();
        assert_eq!(Gaussian::new(dvector![], DMatrix::zeros(0, 0)), Err(GaussianError::Empty));
        assert_eq!(
            refuse(dmatrix![1.0, 0.0, 0.0; 0.0, 1.0, 0.0]),
            GaussianError::Shape { rows: 2, columns: 3, expected: 2 }
        );
        assert_eq!(
            refuse(dmatrix![1.0, 0.2; 0.1, 1.0]),
            GaussianError::NotSymmetric { row: 0, column: 1, upper: 0.2, lower: 0.1 }
        );
        assert_eq!(
            refuse(dmatrix![1.0, 0.0; 0.0, -4.0]),
            GaussianError::NegativeVariance { index: 1, value: -4.0 }
        );
        assert!(matches!(
            refuse(dmatrix![1.0, f64::NAN; 0.0, 1.0]),
            GaussianError::NotFinite { row: 0, column: 1, .. }
        ));
        let GaussianError::Indefinite { eigenvalue } = refuse(dmatrix![1.0, 3.0; 3.0, 4.0]) else {
            panic!("a correlation of 1.5 was let through")
        };
        assert!((eigenvalue + 0.5).abs() < 1e-12, "1 - 1.5 = -0.5, not {eigenvalue}");
        for impossible in [dmatrix![0.0, 0.1; 0.1, 4.0], dmatrix![1e-300, 1e300; 1e300, 1e-300]] {
            assert!(matches!(refuse(impossible), GaussianError::Indefinite { .. }));
        }
        assert!(matches!(
            Gaussian::new(dvector![0.0, f64::INFINITY], DMatrix::identity(2, 2)),
            Err(GaussianError::MeanNotFinite { index: 1, .. })
        ));
    }

    #[test]
    fn singular_and_badly_scaled_laws_are_legal() {
        for p in [dmatrix![0.0, 0.0; 0.0, 1.0], dmatrix![1.0, 1.0; 1.0, 1.0], dmatrix![1e12, 0.5; 0.5, 1e-12]] {
            let law = Gaussian::new(dvector![1.0, 2.0], p.clone()).unwrap();
            let f = law.root();
            let back = &f * f.transpose();
            for (a, b) in back.iter().zip(p.iter()) {
                assert!((a - b).abs() <= 1e-12 * b.abs().max(1e-300), "{back} is not {p}");
            }
        }
    }
}
