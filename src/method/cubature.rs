use serde::{Deserialize, Serialize};

use super::{BuildError, Method, PointSet, PointTransform, Refusal, Transform};
use crate::sensor::Arithmetic;

/// The third-degree spherical-radial cubature rule: 2a points
///
/// ```text
/// z = +-sqrt(a) e_i, weight 1 / (2 a) each
/// ```
///
/// Exact for polynomials of degree 3 in the mean, 2 in the cross-covariance, 1 in the covariance. No weight
/// is negative, so the covariance never comes out indefinite but for rounding.
///
/// Source: I. Arasaratnam, S. Haykin, "Cubature Kalman filters", IEEE Trans. Automatic Control 54 (2009)
/// 1254-1269.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct ThirdDegreeCubature;

/// The rule has no parameter.
#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Parameters {}

impl ThirdDegreeCubature {
    pub(super) fn from_parameters(_: Parameters) -> Result<Self, BuildError> {
        Ok(Self)
    }
}

impl Method for ThirdDegreeCubature {
    fn plan(&self, a: usize, p: usize, arithmetic: Arithmetic) -> Result<Box<dyn Transform>, Refusal> {
        Refusal::unless_something_is_read(a)?;
        let n = a as f64;
        PointTransform::plan(PointSet::on_axes(a, n.sqrt(), 0.5 / n, None), p, arithmetic)
    }
}
