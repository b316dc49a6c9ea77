use serde::{Deserialize, Serialize};

use super::kinds::{Kind, built, finite, given};
use super::{BuildError, PointRule, PointSet, Refusal};

pub(super) const PLAIN: Kind = Kind {
    id: "unscented",
    name: "unscented transform",
    parameters: "kappa = 3 - a",
    evaluations: "2a + 1",
    source: "Julier, Uhlmann, Durrant-Whyte 2000",
    examples: &["unscented:kappa=0", "unscented:kappa=1"],
    build: |map| built(map, |p: Parameters| Unscented::new(p.kappa)),
};

pub(super) const SCALED: Kind = Kind {
    id: "unscented-scaled",
    name: "scaled unscented transform",
    parameters: "alpha = 1e-3, beta = 2, kappa = 0",
    evaluations: "2a + 1",
    source: "Wan, van der Merwe 2000; Julier 2002",
    examples: &["unscented-scaled:alpha=1", "unscented-scaled:alpha=0.5:beta=0:kappa=1"],
    build: |map| built(map, ScaledUnscented::from_parameters),
};

/// The unscented transform: 2a + 1 points
///
/// ```text
/// z_0 = 0, weight kappa / (a + kappa);  z = +-sqrt(a + kappa) e_i, weight 1 / (2 (a + kappa)) each
/// ```
///
/// Exact for polynomials of degree 3 in the mean, 2 in the cross-covariance, 1 in the covariance. kappa =
/// 3 - a, the default, also matches E\[z_i^4\]; from a = 4 on it makes the centre weight negative, and the
/// covariance can come out indefinite. kappa = 0 is the third-degree cubature rule.
///
/// Sources: S. J. Julier, J. K. Uhlmann, H. F. Durrant-Whyte, "A new method for the nonlinear transformation
/// of means and covariances in filters and estimators", IEEE Trans. Automatic Control 45 (2000) 477-482;
/// S. J. Julier, J. K. Uhlmann, "Unscented filtering and nonlinear estimation", Proc. IEEE 92 (2004) 401-422.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Unscented {
    kappa: Option<f64>,
}

#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
struct Parameters {
    #[serde(default, deserialize_with = "given", skip_serializing_if = "Option::is_none")]
    kappa: Option<f64>,
}

impl Unscented {
    /// With this kappa, or 3 - a.
    ///
    /// # Errors
    /// [`BuildError`] if kappa is not finite. Whether a + kappa is positive is seen only when a is known, by
    /// [`Method::plan`](super::Method::plan).
    pub fn new(kappa: Option<f64>) -> Result<Self, BuildError> {
        kappa.map_or(Ok(()), |kappa| finite("kappa", kappa))?;
        Ok(Self { kappa })
    }
}

impl PointRule for Unscented {
    fn lay_out(&self, a: usize) -> Result<PointSet, Refusal> {
        let n = a as f64;
        let kappa = self.kappa.unwrap_or(3.0 - n);
        let scale = positive_scale(a, kappa, 1.0)?;
        let centre = kappa / scale;
        Ok(PointSet::on_axes(a, scale.sqrt(), 0.5 / scale, Some((centre, centre))))
    }

    fn degree(&self) -> u32 {
        3
    }
}

/// The scaled unscented transform: with s = alpha^2 (a + kappa) and lambda = s - a, 2a + 1 points
///
/// ```text
/// z_0 = 0, weights lambda / s (mean) and lambda / s + 1 - alpha^2 + beta (covariance);
/// z = +-sqrt(s) e_i, weight 1 / (2 s) each
/// ```
///
/// Three choices are usual: alpha = 1e-3, beta = 2, kappa = 0, the default (Wan & van der Merwe); alpha = 1 with beta = 0
/// and kappa = 3 - a, which is [`Unscented`] with its default; alpha = 1 with beta = 2 and kappa = 3 - a. kappa is a number
/// here, so 3 - a is written out for the a at hand. Exact for polynomials of degree 3 in the mean, 2 in the
/// cross-covariance, 1 in the covariance.
///
/// With a small alpha the weights are of size 1 / alpha^2 and the points alpha standard deviations apart, so
/// the method differentiates numerically: about 2 log10(1 / alpha) of the 16 digits are lost, six at the
/// default. That is the method as published, and it is evaluated as such.
///
/// Sources: E. A. Wan, R. van der Merwe, "The unscented Kalman filter for nonlinear estimation", Proc. IEEE
/// AS-SPCC (2000) 153-158; S. J. Julier, "The scaled unscented transformation", Proc. American Control
/// Conference (2002) 4555-4559.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ScaledUnscented {
    alpha: f64,
    beta: f64,
    kappa: f64,
}

#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
struct ScaledParameters {
    #[serde(default, deserialize_with = "given", skip_serializing_if = "Option::is_none")]
    alpha: Option<f64>,
    #[serde(default, deserialize_with = "given", skip_serializing_if = "Option::is_none")]
    beta: Option<f64>,
    #[serde(default, deserialize_with = "given", skip_serializing_if = "Option::is_none")]
    kappa: Option<f64>,
}

impl ScaledUnscented {
    /// With these parameters.
    ///
    /// # Errors
    /// [`BuildError`] if one is not finite or alpha is not positive. Whether a + kappa is positive is seen
    /// only when a is known, by [`Method::plan`](super::Method::plan).
    pub fn new(alpha: f64, beta: f64, kappa: f64) -> Result<Self, BuildError> {
        finite("alpha", alpha)?;
        finite("beta", beta)?;
        finite("kappa", kappa)?;
        if alpha <= 0.0 {
            return Err(BuildError::new(
                "alpha",
                format!("is {alpha}; the spread of the points is above zero, 1e-3 to 1"),
            ));
        }
        Ok(Self { alpha, beta, kappa })
    }

    fn from_parameters(p: ScaledParameters) -> Result<Self, BuildError> {
        Self::new(p.alpha.unwrap_or(1e-3), p.beta.unwrap_or(2.0), p.kappa.unwrap_or(0.0))
    }
}

impl PointRule for ScaledUnscented {
    fn lay_out(&self, a: usize) -> Result<PointSet, Refusal> {
        let squared = self.alpha * self.alpha;
        let scale = positive_scale(a, self.kappa, squared)?;
        let mean = (scale - a as f64) / scale;
        let covariance = mean + (1.0 - squared + self.beta);
        Ok(PointSet::on_axes(a, scale.sqrt(), 0.5 / scale, Some((mean, covariance))))
    }

    fn degree(&self) -> u32 {
        3
    }
}

/// `factor` (a + kappa): the square of the points' distance, which must be a positive number whose inverse is
/// a weight.
fn positive_scale(a: usize, kappa: f64, factor: f64) -> Result<f64, Refusal> {
    let sum = a as f64 + kappa;
    if sum <= 0.0 {
        return Err(Refusal(format!(
            "a + kappa is {a} + {kappa} = {sum}, which has no square root to place points at; kappa must be above -{a}"
        )));
    }
    let scale = factor * sum;
    if !scale.is_normal() || !(0.5 / scale).is_finite() {
        return Err(Refusal(format!(
            "the squared distance of the points, alpha^2 (a + kappa), is {scale}; weights of that size do not exist"
        )));
    }
    Ok(scale)
}
