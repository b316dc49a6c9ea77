use nalgebra::{Cholesky, DMatrix, Dyn};

use crate::sensor::Derivatives;

/// What an estimator can compute on board at every update, without sampling, to see whether it is still where a method was
/// found good: from h, its exact derivatives at the prior's mean, P and R alone.
///
/// With the Jacobian J (p x a), the Hessians H_i (a x a), S1 = J P J' + R and Q_ij = 1/2 tr(H_i P H_j P).
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord)]
#[non_exhaustive]
pub enum RegimeIndex {
    /// Second-order spread against first-order spread, see [`curvature`].
    Curvature,
    /// A second-order forecast of the floor, see [`bend_over_noise`].
    BendOverNoise,
    /// How much the measurement says, see [`information`].
    Information,
    /// The sensor's natural ratio, see [`Sensor::natural_spread`](crate::sensor::Sensor::natural_spread).
    Spread,
}

impl RegimeIndex {
    /// Every index.
    pub const ALL: [Self; 4] = [Self::Curvature, Self::BendOverNoise, Self::Information, Self::Spread];

    /// Its name in files and sentences.
    pub fn name(self) -> &'static str {
        match self {
            Self::Curvature => "curvature",
            Self::BendOverNoise => "bend over noise",
            Self::Information => "information",
            Self::Spread => "spread",
        }
    }

    /// Its formula.
    pub fn formula(self) -> &'static str {
        match self {
            Self::Curvature => "sqrt(tr(S1^-1 Q)), S1 = J P J' + R, Q_ij = 1/2 tr(H_i P H_j P)",
            Self::BendOverNoise => "1/2 ln det(I + R^-1 Q) [nats]",
            Self::Information => "1/2 (ln det S1 - ln det R) [nats]",
            Self::Spread => {
                "largest standard deviation over the sensor's own length, such as position sd over range"
            }
        }
    }

    /// Its value where it has one; `spread` is the sensor's own.
    pub fn of(
        self,
        at: &Derivatives,
        prior: &DMatrix<f64>,
        noise: &DMatrix<f64>,
        spread: Option<f64>,
    ) -> Option<f64> {
        match self {
            Self::Curvature => curvature(at, prior, noise),
            Self::BendOverNoise => bend_over_noise(at, prior, noise),
            Self::Information => information(at, prior, noise),
            Self::Spread => spread.filter(|s| s.is_finite()),
        }
    }
}

/// sqrt(tr(S1^-1 Q)) = sqrt(sum_ij \[S1^-1\]_ij 1/2 tr(H_i P H_j P)): the spread that the second order adds, in units of the
/// first. `prior` is P (a x a), `noise` R (p x p), `at` the derivatives at the prior's mean. `None` where S1 is singular or a
/// derivative is not finite.
///
/// Source: ours, of the relative-curvature kind; D. M. Bates, D. G. Watts, "Relative curvature measures of nonlinearity",
/// J. Royal Statistical Society B 42 (1980) 1-25, for the idea.
pub fn curvature(at: &Derivatives, prior: &DMatrix<f64>, noise: &DMatrix<f64>) -> Option<f64> {
    let trace = definite(first_order(at, prior, noise))?.solve(&bend(at, prior)).trace();
    finite(trace.max(0.0).sqrt())
}

/// 1/2 ln det(I + R^-1 Q) in nats: what a law that is bent to second order differs from any Gaussian, against the noise.
/// Arguments as for [`curvature`]. `None` where R is singular.
///
/// Source: ours; the floor of a Gaussian is 1/2 (ln det Omega - ln det R), and to second order Omega = R + Q.
pub fn bend_over_noise(at: &Derivatives, prior: &DMatrix<f64>, noise: &DMatrix<f64>) -> Option<f64> {
    let bent = definite(noise + bend(at, prior))?;
    finite(0.5 * (bent.ln_determinant() - definite(noise.clone())?.ln_determinant()))
}

/// 1/2 (ln det S1 - ln det R) in nats: the mutual information of state and measurement to first order. Arguments as for
/// [`curvature`]. `None` where R is singular.
///
/// Source: T. M. Cover, J. A. Thomas, Elements of Information Theory, 2nd ed. (2006), thm. 8.4.1 (entropy of a Gaussian;
/// number from memory).
pub fn information(at: &Derivatives, prior: &DMatrix<f64>, noise: &DMatrix<f64>) -> Option<f64> {
    let first = definite(first_order(at, prior, noise))?;
    finite(0.5 * (first.ln_determinant() - definite(noise.clone())?.ln_determinant()))
}

/// S1 = J P J' + R.
fn first_order(at: &Derivatives, prior: &DMatrix<f64>, noise: &DMatrix<f64>) -> DMatrix<f64> {
    &at.jacobian * prior * at.jacobian.transpose() + noise
}

/// Q_ij = 1/2 tr(H_i P H_j P).
fn bend(at: &Derivatives, prior: &DMatrix<f64>) -> DMatrix<f64> {
    let bends: Vec<DMatrix<f64>> = at.hessians.iter().map(|h| h * prior).collect();
    let p = bends.len();
    DMatrix::from_fn(p, p, |i, j| 0.5 * bends[i].dot(&bends[j].transpose()))
}

fn definite(a: DMatrix<f64>) -> Option<Cholesky<f64, Dyn>> {
    // A factorisation of what is not finite need not end.
    if a.iter().all(|v| v.is_finite()) { Cholesky::new(a) } else { None }
}

fn finite(value: f64) -> Option<f64> {
    value.is_finite().then_some(value)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::sensor::{Quadratic, Sensor};
    use nalgebra::dmatrix;

    fn derivatives(sensor: &dyn Sensor, x: &[f64]) -> Derivatives {
        let mut at = Derivatives::zeros(x.len(), sensor.outputs().len());
        sensor.hessians(x, &mut at);
        at
    }

    /// y = x^2 + x around m with variance P and noise R: J = 2m + 1, H = 2, Q = 2 P^2, worked by hand.
    #[test]
    fn the_indices_of_a_square_are_those_worked_by_hand() {
        let (m, p, r) = (0.7, 0.3, 0.05);
        let square = Quadratic::new(vec![vec![vec![1.0]]], vec![vec![1.0]], vec![0.0], 1).unwrap();
        let at = derivatives(&square, &[m]);
        let (q, s1) = (2.0 * p * p, (2.0 * m + 1.0) * (2.0 * m + 1.0) * p + r);
        let (p, r) = (dmatrix![p], dmatrix![r]);
        let near = |found: Option<f64>, wanted: f64| assert!((found.unwrap() - wanted).abs() < 1e-14, "{found:?}");
        near(curvature(&at, &p, &r), (q / s1).sqrt());
        near(bend_over_noise(&at, &p, &r), 0.5 * (1.0 + q / r[0]).ln());
        near(information(&at, &p, &r), 0.5 * (s1 / r[0]).ln());
    }

    /// Bend over noise is exact where a law is bent to second order and its mean stands at the bottom: the floor of y = x^2 at
    /// m = 0 is 1/2 ln((2 P^2 + R) / R).
    #[test]
    fn without_noise_only_curvature_is_left() {
        let square = Quadratic::new(vec![vec![vec![1.0]]], vec![vec![0.0]], vec![0.0], 1).unwrap();
        let at = derivatives(&square, &[1.0]);
        let (p, r) = (dmatrix![0.5], dmatrix![0.0]);
        assert!(curvature(&at, &p, &r).is_some());
        assert_eq!((bend_over_noise(&at, &p, &r), information(&at, &p, &r)), (None, None));
        // At the bottom and without noise nothing of first order is left.
        let at = derivatives(&square, &[0.0]);
        assert_eq!(curvature(&at, &p, &r), None);
    }
}
