use nalgebra::{DMatrix, DVector};

use super::ScoreKind;
use super::whitened::{Whitened, WhitenedMethod, definite};

/// An eigenvalue below this share of the largest, on the wrong side of zero, is rounding and not indefinite.
const ROUNDING: f64 = 1e-9;

/// Why a method's answer is no Gaussian.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum Invalid {
    /// There is no answer that could be scored; it is said why.
    #[error("{0}")]
    NoAnswer(String),
    /// A value is NaN or infinite.
    #[error("a value is not finite")]
    NotFinite,
    /// The covariance of the measurement has a negative eigenvalue.
    #[error("its covariance has the eigenvalue {0:.3e} in reference units: not positive definite")]
    Covariance(f64),
    /// The joint covariance of state and measurement has a negative eigenvalue.
    #[error("its joint covariance is indefinite: the conditional covariance has the eigenvalue {0:.3e}")]
    Joint(f64),
}

/// Whether the method's answer is a Gaussian at all, judged in the reference's units.
pub(super) fn validity(method: &WhitenedMethod) -> Result<(), Invalid> {
    if !(finite(&method.covariance) && finite(&method.coupling) && method.shift.iter().all(|v| v.is_finite())) {
        return Err(Invalid::NotFinite);
    }
    let covariance = eigenvalues(&method.covariance).ok_or(Invalid::NotFinite)?;
    let (least, greatest) = (covariance.min(), covariance.max());
    if least <= 0.0 {
        return Err(Invalid::Covariance(least));
    }
    let least = eigenvalues(&residual(method)).ok_or(Invalid::NotFinite)?.min();
    if least < -ROUNDING * greatest {
        return Err(Invalid::Joint(least));
    }
    Ok(())
}

/// Every score in the order of [`ScoreKind::ALL`]; NaN where one is undefined (a joint that is singular).
pub(super) fn evaluate(reference: &Whitened, method: &WhitenedMethod) -> [f64; ScoreKind::COUNT] {
    let p = method.shift.len();
    let identity = DMatrix::identity(p, p);
    let (low, high) = eigenvalues(&method.covariance).map_or((f64::NAN, f64::NAN), |e| (e.min(), e.max()));
    let (nees, worst, lost) = update_scores(reference, method).unwrap_or((f64::NAN, f64::NAN, f64::NAN));
    [
        method.shift.norm(),
        (&method.covariance - identity).norm(),
        low,
        high,
        (&method.coupling - &reference.coupling).norm(),
        excess(reference, method).unwrap_or(f64::NAN),
        nees,
        worst,
        lost,
    ]
}

fn finite(a: &DMatrix<f64>) -> bool {
    a.iter().all(|v| v.is_finite())
}

/// The eigenvalues of a symmetric matrix. `None` where it has none: nalgebra panics on an empty matrix (a state
/// known exactly leaves nothing to whiten) and need not end on one that is not finite (squares of numbers
/// beyond 1e154 overflow).
fn eigenvalues(a: &DMatrix<f64>) -> Option<DVector<f64>> {
    (!a.is_empty() && finite(a)).then(|| a.symmetric_eigenvalues())
}

/// O^ = S^ - G^' G^ (p x p).
fn residual(method: &WhitenedMethod) -> DMatrix<f64> {
    &method.covariance - method.coupling.transpose() * &method.coupling
}

fn excess(reference: &Whitened, method: &WhitenedMethod) -> Option<f64> {
    let of = definite(&reference.residual)?;
    let from = definite(&residual(method))?;
    let slope = (&reference.coupling - &method.coupling).transpose();
    let spread = &reference.residual + &slope * slope.transpose();
    let trace = from.solve(&spread).trace();
    let quadratic = method.shift.dot(&from.solve(&method.shift));
    let p = method.shift.len() as f64;
    Some(0.5 * (trace - p + from.ln_determinant() - of.ln_determinant() + quadratic))
}

/// Expected NEES ratio, worst NEES direction and information lost; `None` where one is undefined, as all are for
/// a state known exactly, which no measurement updates.
fn update_scores(reference: &Whitened, method: &WhitenedMethod) -> Option<(f64, f64, f64)> {
    let (r, p) = method.coupling.shape();
    let identity = DMatrix::<f64>::identity(r, r);
    let gain = definite(&method.covariance)?.solve(&method.coupling.transpose()).transpose();
    let claimed = &identity - &gain * method.coupling.transpose();
    let cross = &gain * reference.coupling.transpose();
    let second = DMatrix::identity(p, p) + &method.shift * method.shift.transpose();
    let actual = &identity - &cross - cross.transpose() + &gain * second * gain.transpose();
    let claimed = definite(&((&claimed + claimed.transpose()) * 0.5))?;
    // L^-1 M L'^-1 shares its eigenvalues with P+^-1/2 M P+^-1/2.
    let mut half = actual.clone();
    claimed.l_dirty().solve_lower_triangular_mut(&mut half);
    let mut ratio = half.transpose();
    claimed.l_dirty().solve_lower_triangular_mut(&mut ratio);
    let ratio = (&ratio + ratio.transpose()) * 0.5;
    let ratio = eigenvalues(&ratio)?;
    let best = definite(&(&identity - &reference.coupling * reference.coupling.transpose()))?;
    let actual = definite(&actual)?;
    let lost = 0.5 * (actual.ln_determinant() - best.ln_determinant());
    Some((ratio.sum() / r as f64, ratio.max(), lost))
}
