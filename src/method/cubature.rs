use super::kinds::{Kind, NoParameters, built};
use super::{PointRule, PointSet, Refusal};

pub(super) const KIND: Kind = Kind {
    id: "cubature-3",
    name: "third-degree spherical-radial cubature",
    parameters: "none",
    evaluations: "2a, and 1 where an output is angular",
    source: "Arasaratnam, Haykin 2009",
    examples: &[],
    build: |map| built(map, |_: NoParameters| Ok(ThirdDegreeCubature)),
};

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

impl PointRule for ThirdDegreeCubature {
    fn lay_out(&self, a: usize) -> Result<PointSet, Refusal> {
        let n = a as f64;
        Ok(PointSet::on_axes(a, n.sqrt(), 0.5 / n, None))
    }

    fn degree(&self) -> u32 {
        3
    }
}
