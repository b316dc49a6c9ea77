use nalgebra::{DMatrix, DVector};

use super::root::definite;
use super::{Gaussian, Support};

/// The three moments that an approximation must get right: of y = h(x) + v with x ~ N(m, P).
#[derive(Debug, Clone, PartialEq)]
pub struct Moments {
    /// mu = E\[y\] (p). For an angular output: the mean in the chart at its circular mean direction, in (-pi, pi].
    pub mean: DVector<f64>,
    /// S = Cov(y) (p x p), noise included.
    pub covariance: DMatrix<f64>,
    /// C = Cov(x, y) (n x p).
    pub cross_covariance: DMatrix<f64>,
}

impl Moments {
    /// Zero moments of `n` state components and `p` outputs, to be written into.
    pub fn zeros(n: usize, p: usize) -> Self {
        Self { mean: DVector::zeros(p), covariance: DMatrix::zeros(p, p), cross_covariance: DMatrix::zeros(n, p) }
    }

    /// Whether every entry is a finite number.
    pub fn is_finite(&self) -> bool {
        self.mean.iter().chain(self.covariance.iter()).chain(self.cross_covariance.iter()).all(|v| v.is_finite())
    }

    /// The state given the innovation d = y - mu (p; wrapped by the caller where an output is angular), by
    /// the Schur complement of the joint \[\[P, C\], \[C', S\]\]: gain K = C S^-1, mean m + K d,
    /// covariance P - K S K'. By Cholesky solves; nothing is inverted.
    ///
    /// `None` when S is not positive definite beyond rounding.
    ///
    /// Source: R. E. Kalman, "A new approach to linear filtering and prediction problems", Trans. ASME J.
    /// Basic Eng. 82 (1960) 35-45, for the linear case; the Schur complement form is standard.
    ///
    /// ```
    /// use gaussworthy::gaussian::{Gaussian, Moments};
    /// use nalgebra::{dmatrix, dvector};
    /// // One state of variance 4, read directly with noise variance 1: the gain is 4/5.
    /// let prior = Gaussian::new(dvector![0.0], dmatrix![4.0]).unwrap();
    /// let read = Moments { mean: dvector![0.0], covariance: dmatrix![5.0], cross_covariance: dmatrix![4.0] };
    /// let after = read.conditional(&prior, &dvector![1.0]).unwrap();
    /// assert!((after.mean[0] - 0.8).abs() < 1e-15 && (after.covariance[(0, 0)] - 0.8).abs() < 1e-15);
    /// ```
    pub fn conditional(&self, prior: &Gaussian, innovation: &DVector<f64>) -> Option<Conditional> {
        let factor = definite(&self.covariance)?;
        let gain = factor.solve(&self.cross_covariance.transpose()).transpose();
        let mean = prior.mean() + &gain * innovation;
        // C L'^-1 first: the product with its own transpose is exactly symmetric.
        let mut half = self.cross_covariance.transpose();
        factor.l_dirty().solve_lower_triangular_mut(&mut half);
        let covariance = prior.covariance() - half.transpose() * half;
        Some(Conditional { gain, mean, covariance })
    }

    /// The same joint seen as a regression: y | x ~ N(mu + B (x - m), Omega), B = C' P^+,
    /// Omega = S - B P B'. On a singular P the support is used.
    pub fn regression(&self, prior: &Gaussian) -> Regression {
        let support = Support::of(prior.covariance());
        // Gamma = W C (r x p): C in units of the whitened state.
        let gamma = support.whitener() * &self.cross_covariance;
        let slope = gamma.transpose() * support.whitener();
        let residual = &self.covariance - gamma.transpose() * &gamma;
        Regression { slope, residual }
    }
}

/// The state after a measurement.
#[derive(Debug, Clone, PartialEq)]
pub struct Conditional {
    /// K (n x p).
    pub gain: DMatrix<f64>,
    /// m + K d (n).
    pub mean: DVector<f64>,
    /// P - K S K' (n x n).
    pub covariance: DMatrix<f64>,
}

/// The regression of measurement on state.
#[derive(Debug, Clone, PartialEq)]
pub struct Regression {
    /// B (p x n).
    pub slope: DMatrix<f64>,
    /// Omega (p x p): what of y the state does not explain linearly.
    pub residual: DMatrix<f64>,
}
