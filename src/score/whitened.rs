use nalgebra::{Cholesky, DMatrix, DVector, Dyn};

use crate::gaussian::{Moments, Support};

/// The reference in its own units: output whitened by S, state by P on its support.
///
/// There S becomes I and P becomes I; what is left is G = W C L'^-1 (r x p), the canonical coupling, with W
/// the whitener of P and S = L L'.
#[derive(Debug, Clone)]
pub(super) struct Whitened {
    factor: Cholesky<f64, Dyn>,
    /// G (r x p).
    pub coupling: DMatrix<f64>,
    /// I - G'G (p x p): what of y the state does not explain linearly.
    pub residual: DMatrix<f64>,
}

/// A method's moments in the reference's units.
#[derive(Debug, Clone)]
pub(super) struct WhitenedMethod {
    /// L^-1 (mu - mu^) (p).
    pub shift: DVector<f64>,
    /// L^-1 S^ L'^-1 (p x p).
    pub covariance: DMatrix<f64>,
    /// W C^ L'^-1 (r x p).
    pub coupling: DMatrix<f64>,
}

impl Whitened {
    /// `None` when the reference covariance is not positive definite beyond rounding.
    pub fn new(reference: &Moments, support: &Support) -> Option<Self> {
        let factor = definite_within_scale(&reference.covariance)?;
        let coupling = whiten_right(&factor, support.whitener() * &reference.cross_covariance);
        let p = reference.mean.len();
        let residual = DMatrix::identity(p, p) - coupling.transpose() * &coupling;
        Some(Self { factor, coupling, residual })
    }

    /// The method's moments in these units; `shift` is mu - mu^ (p), wrapped.
    pub fn method(&self, method: &Moments, shift: &DVector<f64>, support: &Support) -> WhitenedMethod {
        let mut whitened_shift = shift.clone();
        self.factor.l_dirty().solve_lower_triangular_mut(&mut whitened_shift);
        WhitenedMethod {
            shift: whitened_shift,
            covariance: self.both_sides(&method.covariance),
            coupling: whiten_right(&self.factor, support.whitener() * &method.cross_covariance),
        }
    }

    /// L^-1 A L'^-1 of a symmetric A (p x p), made exactly symmetric.
    pub fn both_sides(&self, a: &DMatrix<f64>) -> DMatrix<f64> {
        let once = whiten_right(&self.factor, a.clone());
        let twice = whiten_right(&self.factor, once.transpose());
        (&twice + twice.transpose()) * 0.5
    }
}

/// A squared pivot at or below this share of its scale is not resolved: it is a difference of numbers of that
/// scale, each with some 1e-16 of rounding, and scores made of it would be off by more than a part in a thousand.
const RESOLVED: f64 = 1e-12;

/// The Cholesky factor of a matrix in whitened units, where entries are of order one; `None` if it is singular
/// or not resolved.
pub(super) fn definite(a: &DMatrix<f64>) -> Option<Cholesky<f64, Dyn>> {
    definite_beyond(a, |_| RESOLVED)
}

/// The Cholesky factor of a covariance in its own units; `None` if it is singular or a pivot is not resolved
/// beside its diagonal entry. Two outputs that repeat each other without noise leave a pivot of 1e-16 of either
/// sign, which must not pass for variance.
pub(super) fn definite_within_scale(a: &DMatrix<f64>) -> Option<Cholesky<f64, Dyn>> {
    definite_beyond(a, |i| RESOLVED * a[(i, i)])
}

fn definite_beyond(a: &DMatrix<f64>, least: impl Fn(usize) -> f64) -> Option<Cholesky<f64, Dyn>> {
    let factor = Cholesky::new(a.clone())?;
    let pivots = factor.l_dirty().diagonal();
    pivots.iter().enumerate().all(|(i, d)| d * d > least(i)).then_some(factor)
}

/// A L'^-1.
fn whiten_right(factor: &Cholesky<f64, Dyn>, a: DMatrix<f64>) -> DMatrix<f64> {
    let mut transposed = a.transpose();
    factor.l_dirty().solve_lower_triangular_mut(&mut transposed);
    transposed.transpose()
}
