use nalgebra::{Cholesky, DMatrix, Dyn, RealField};

/// An eigenvalue of the correlation matrix at or below this share of the largest counts as zero.
const RANK_SLACK: f64 = 1e-13;
/// A squared pivot at or below this share of its diagonal entry is rounding, not variance.
const PIVOT_SLACK: f64 = 1e-14;
/// The same in any arithmetic, in steps of the number's last place.
const PIVOT_STEPS: f64 = PIVOT_SLACK / f64::EPSILON;

/// A square root F of a covariance A, F F' = A, and how it was found.
#[derive(Debug, Clone, PartialEq)]
pub enum SquareRoot {
    /// Lower triangular, A positive definite.
    Cholesky(DMatrix<f64>),
    /// D V sqrt(Lambda), with D the standard deviations and V Lambda V' the correlation matrix: A is
    /// singular (a state known exactly, or one that is a combination of others).
    Eigen(DMatrix<f64>),
}

impl SquareRoot {
    /// A square root of the covariance `a` (n x n, symmetric positive semi-definite).
    ///
    /// Cholesky where it exists; else by the eigenvalues of the correlation matrix, those below zero by
    /// rounding taken as zero.
    pub fn of(a: &DMatrix<f64>) -> Self {
        match cholesky_in_place(a.clone()) {
            Some(lower) => Self::Cholesky(lower),
            None => Self::Eigen(eigen_root(a)),
        }
    }

    /// F (n x n).
    pub fn into_factor(self) -> DMatrix<f64> {
        match self {
            Self::Cholesky(f) | Self::Eigen(f) => f,
        }
    }
}

/// The Cholesky factor of `a` in `a`'s own storage, its upper triangle cleared; `None` when `a` is not positive
/// definite.
///
/// nalgebra's factorisation accepts a pivot of any positive size, so a matrix that is singular but for
/// rounding would pass with a worthless last column: a pivot under 1e-14 of its diagonal entry (5e-6 in single precision) is
/// refused.
pub(crate) fn cholesky_in_place<T: RealField + Copy>(a: DMatrix<T>) -> Option<DMatrix<T>> {
    let n = a.nrows();
    let slack = nalgebra::convert::<f64, T>(PIVOT_STEPS) * T::default_epsilon();
    let variances: smallvec::SmallVec<[T; 8]> = (0..n).map(|i| a[(i, i)]).collect();
    let lower = Cholesky::new(a)?.unpack();
    let sound = (0..n).all(|i| {
        let pivot = lower[(i, i)];
        pivot * pivot > slack * variances[i]
    });
    sound.then_some(lower)
}

/// The Cholesky factorisation of `a` if it is positive definite beyond rounding: with the same guard as
/// [`cholesky_in_place`], so that no divergence or gain is made of a pivot that is noise.
pub(super) fn definite(a: &DMatrix<f64>) -> Option<Cholesky<f64, Dyn>> {
    definite_beyond(a, |i| PIVOT_SLACK * a[(i, i)])
}

/// The Cholesky factorisation of the residual `omega` = `whole` - (what is explained) if it is positive
/// definite beyond the rounding of that difference, which is judged against `whole`: where nothing is left,
/// the difference is noise in the last digits of `whole`.
pub(super) fn definite_residual(omega: &DMatrix<f64>, whole: &DMatrix<f64>) -> Option<Cholesky<f64, Dyn>> {
    definite_beyond(omega, |i| RANK_SLACK * whole[(i, i)])
}

fn definite_beyond(a: &DMatrix<f64>, least: impl Fn(usize) -> f64) -> Option<Cholesky<f64, Dyn>> {
    let factor = Cholesky::new(a.clone())?;
    let pivot = |i| factor.l_dirty()[(i, i)];
    (0..a.nrows()).all(|i| pivot(i) * pivot(i) > least(i)).then_some(factor)
}

fn eigen_root(a: &DMatrix<f64>) -> DMatrix<f64> {
    let n = a.nrows();
    let support = Support::of(a);
    let mut root = DMatrix::zeros(n, n);
    root.columns_mut(0, support.rank()).copy_from(support.factor());
    root
}

/// The subspace on which a covariance A has variance: A = F F' with F (n x r) of full column rank r, and
/// W = F^+ (r x n) that whitens on it, W A W' = I.
#[derive(Debug, Clone, PartialEq)]
pub struct Support {
    factor: DMatrix<f64>,
    whitener: DMatrix<f64>,
}

impl Support {
    /// The support of the covariance `a` (n x n, symmetric positive semi-definite); scaled to unit variances
    /// first, so that units far apart do not hide a direction.
    pub fn of(a: &DMatrix<f64>) -> Self {
        let n = a.nrows();
        let sd: Vec<f64> = (0..n).map(|i| a[(i, i)].max(0.0).sqrt()).collect();
        let correlation = DMatrix::from_fn(n, n, |i, j| {
            let scale = sd[i] * sd[j];
            if scale > 0.0 { a[(i, j)] / scale } else { 0.0 }
        });
        let eigen = correlation.symmetric_eigen();
        let largest = eigen.eigenvalues.max();
        let mut kept: Vec<usize> =
            (0..n).filter(|&k| eigen.eigenvalues[k] > RANK_SLACK * n as f64 * largest).collect();
        kept.sort_by(|&a, &b| eigen.eigenvalues[b].total_cmp(&eigen.eigenvalues[a]));
        let factor = DMatrix::from_fn(n, kept.len(), |i, c| {
            sd[i] * eigen.eigenvectors[(i, kept[c])] * eigen.eigenvalues[kept[c]].sqrt()
        });
        let whitener = DMatrix::from_fn(kept.len(), n, |c, i| {
            if sd[i] > 0.0 {
                eigen.eigenvectors[(i, kept[c])] / (eigen.eigenvalues[kept[c]].sqrt() * sd[i])
            } else {
                0.0
            }
        });
        Self { factor, whitener }
    }

    /// Rank r of the covariance.
    pub fn rank(&self) -> usize {
        self.factor.ncols()
    }

    /// F (n x r), F F' = A.
    pub fn factor(&self) -> &DMatrix<f64> {
        &self.factor
    }

    /// W (r x n), W A W' = I and W F = I.
    pub fn whitener(&self) -> &DMatrix<f64> {
        &self.whitener
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use nalgebra::dmatrix;

    #[test]
    fn a_definite_matrix_has_a_triangular_root() {
        let a = dmatrix![4.0, 2.0; 2.0, 3.0];
        let SquareRoot::Cholesky(l) = SquareRoot::of(&a) else { panic!("it is definite") };
        assert_eq!(l, dmatrix![2.0, 0.0; 1.0, 2f64.sqrt()]);
    }

    #[test]
    fn a_support_whitens_whatever_the_rank_and_the_units() {
        for a in [
            dmatrix![4.0, 2.0; 2.0, 3.0],
            dmatrix![1e12, 2e6, 0.0; 2e6, 4.0, 0.0; 0.0, 0.0, 0.0],
            dmatrix![1e12, 0.3; 0.3, 1e-12],
        ] {
            let s = Support::of(&a);
            let white = s.whitener() * &a * s.whitener().transpose();
            let one = DMatrix::<f64>::identity(s.rank(), s.rank());
            assert!((white - &one).amax() < 1e-10, "{a}");
            assert!((s.whitener() * s.factor() - one).amax() < 1e-12);
            let back = s.factor() * s.factor().transpose();
            for (x, y) in back.iter().zip(a.iter()) {
                assert!((x - y).abs() <= 1e-11 * y.abs() + 1e-300, "{back}");
            }
        }
        assert_eq!(Support::of(&dmatrix![1.0, 1.0; 1.0, 1.0]).rank(), 1);
        assert_eq!(Support::of(&DMatrix::zeros(2, 2)).rank(), 0);
    }

    #[test]
    fn rounding_does_not_pass_for_definite() {
        // 0.1 + 0.2 and its like leave a pivot of 1e-17 that is noise, not variance.
        let v = dmatrix![0.1, 0.3; 0.2, 0.7; 0.3, 1.0];
        let a = &v * v.transpose();
        assert!(matches!(SquareRoot::of(&a), SquareRoot::Eigen(_)));
    }
}
