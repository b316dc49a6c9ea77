use nalgebra::{DMatrix, DVector};

use super::kinds::{Kind, NoParameters, built};
use super::{PointRule, PointSet, Refusal};

pub(super) const CUBATURE: Kind = Kind {
    id: "cubature-5",
    name: "fifth-degree spherical-radial cubature",
    parameters: "none",
    evaluations: "2a^2 + 1",
    source: "Jia, Xin, Cheng 2013",
    examples: &[],
    build: |map| built(map, |_: NoParameters| Ok(FifthDegreeCubature)),
};

pub(super) const FULLY_SYMMETRIC: Kind = Kind {
    id: "fully-symmetric-5",
    name: "fully symmetric rule of degree 5",
    parameters: "none",
    evaluations: "2a^2 + 1",
    source: "McNamee, Stenger 1967; Lerner 2002",
    examples: &[],
    build: |map| built(map, |_: NoParameters| Ok(FullySymmetricFifthDegree)),
};

/// The fifth-degree spherical-radial cubature rule: 2a^2 + 1 points
///
/// ```text
/// z = 0, weight 2 / (a + 2);  +-sqrt(a + 2) e_i, weight (4 - a) / (2 (a + 2)^2) each;
/// sqrt((a + 2) / 2) (+-e_i +- e_j) for i < j, weight 1 / (a + 2)^2 each
/// ```
///
/// Exact for polynomials of degree 5 in the mean, 4 in the cross-covariance, 2 in the covariance. The weights on the
/// axes are zero at a = 4 and negative from a = 5 on: the covariance can then come out indefinite.
///
/// Source: B. Jia, M. Xin, Y. Cheng, "High-degree cubature Kalman filter", Automatica 49 (2013) 510-518; the rule is
/// that of A. H. Stroud, Approximate Calculation of Multiple Integrals (Prentice-Hall, 1971) (from memory).
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct FifthDegreeCubature;

/// The fully symmetric rule of degree 5: 2a^2 + 1 points
///
/// ```text
/// z = 0, weight (a^2 - 7a + 18) / 18;  +-sqrt(3) e_i, weight (4 - a) / 18 each;
/// sqrt(3) (+-e_i +- e_j) for i < j, weight 1 / 36 each
/// ```
///
/// In two components it is the Gauss-Hermite product rule of order 3. Exact for polynomials of degree 5 in the mean, 4
/// in the cross-covariance, 2 in the covariance. The weights on the axes are zero at a = 4 and negative from a = 5 on:
/// the covariance can then come out indefinite.
///
/// Sources: J. McNamee, F. Stenger, "Construction of fully symmetric numerical integration formulas", Numerische
/// Mathematik 10 (1967) 327-344; in filters: U. Lerner, Hybrid Bayesian Networks for Reasoning about Complex Systems,
/// PhD thesis (Stanford, 2002) (from memory).
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct FullySymmetricFifthDegree;

impl PointRule for FifthDegreeCubature {
    fn lay_out(&self, a: usize) -> Result<PointSet, Refusal> {
        let n = a as f64;
        let (reach, square) = ((n + 2.0).sqrt(), (n + 2.0).powi(2));
        let weights = [2.0 / (n + 2.0), (4.0 - n) / (2.0 * square), 1.0 / square];
        Ok(axes_and_pairs(a, reach, (0.5 * (n + 2.0)).sqrt(), weights))
    }

    fn degree(&self) -> u32 {
        5
    }
}

impl PointRule for FullySymmetricFifthDegree {
    fn lay_out(&self, a: usize) -> Result<PointSet, Refusal> {
        let (n, reach) = (a as f64, 3f64.sqrt());
        let weights = [(n * n - 7.0 * n + 18.0) / 18.0, (4.0 - n) / 18.0, 1.0 / 36.0];
        Ok(axes_and_pairs(a, reach, reach, weights))
    }

    fn degree(&self) -> u32 {
        5
    }
}

/// The centre, +-`axis` e_i and `pair` (+-e_i +- e_j) for i < j, with their weights.
fn axes_and_pairs(a: usize, axis: f64, pair: f64, [centre, on_axis, on_pair]: [f64; 3]) -> PointSet {
    let count = 2 * a * a + 1;
    let mut points = DMatrix::zeros(count, a);
    let mut weights = DVector::from_element(count, on_pair);
    weights[0] = centre;
    weights.rows_mut(1, 2 * a).fill(on_axis);
    for i in 0..a {
        points[(1 + 2 * i, i)] = axis;
        points[(2 + 2 * i, i)] = -axis;
    }
    let mut k = 1 + 2 * a;
    for j in 0..a {
        for i in 0..j {
            for (left, right) in [(pair, pair), (pair, -pair), (-pair, pair), (-pair, -pair)] {
                points[(k, i)] = left;
                points[(k, j)] = right;
                k += 1;
            }
        }
    }
    PointSet::new(points, weights.clone(), weights)
}
