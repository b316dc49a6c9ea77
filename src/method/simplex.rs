use nalgebra::{DMatrix, DVector};
use serde::{Deserialize, Serialize};

use super::kinds::{BuildError, Kind, built, finite, given};
use super::{PointRule, PointSet, Refusal};

pub(super) const SPHERICAL: Kind = Kind {
    id: "simplex",
    name: "spherical simplex unscented transform",
    parameters: "w0 = 0 (weight of the centre, 0 to below 1)",
    evaluations: "a + 1, and 1 where w0 is above 0 or an output is angular",
    source: "Julier 2003",
    examples: &["simplex:w0=0.25"],
    build: |map| built(map, |p: Parameters| SphericalSimplex::new(p.w0.unwrap_or(0.0))),
};

pub(super) const MINIMAL_SKEW: Kind = Kind {
    id: "minimal-skew-simplex",
    name: "minimal-skew simplex unscented transform",
    parameters: "w0 = 0 (weight of the centre, 0 to below 1)",
    evaluations: "a + 1, and 1 where w0 is above 0 or an output is angular",
    source: "Julier, Uhlmann 2002",
    examples: &["minimal-skew-simplex:w0=0.25"],
    build: |map| built(map, |p: Parameters| MinimalSkewSimplex::new(p.w0.unwrap_or(0.0))),
};

/// The spherical simplex set: a regular simplex of a + 1 points around the mean, each of weight w = (1 - w0) / (a + 1)
/// at the distance sqrt(a / (1 - w0)), and the mean itself with the weight w0. Coordinate j (from 1) of
///
/// ```text
/// point 0 (the mean): 0;  points 1 to j: -1 / sqrt(j (j + 1) w);  point j + 1: j / sqrt(j (j + 1) w);  all others: 0
/// ```
///
/// With w0 = 0, the default, the mean is left out. Exact for polynomials of degree 2 in the mean, 1 in
/// cross-covariance and covariance, with half the points of a symmetric set; no weight is negative. Points and third
/// moments depend on the order of the components.
///
/// Source: S. J. Julier, "The spherical simplex unscented transformation", Proc. American Control Conference (2003)
/// 2430-2434.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct SphericalSimplex {
    w0: f64,
}

/// The minimal-skew simplex set: a + 1 points beside the mean of weight w0, with w_1 = (1 - w0) / 2^a, w_2 = w_1 and
/// each further weight twice the one before. Coordinate j (from 1) of
///
/// ```text
/// point 0 (the mean): 0;  points 1 to j: -1 / sqrt(2 w_(j+1));  point j + 1: 1 / sqrt(2 w_(j+1));  all others: 0
/// ```
///
/// The third moment of every single coordinate is zero; mixed ones are not. The furthest points lie
/// 2^(a/2) / sqrt(2) standard deviations away. With w0 = 0, the default, the mean is left out. Exact for polynomials of
/// degree 2 in the mean, 1 in cross-covariance and covariance; no weight is negative.
///
/// Source: S. J. Julier, J. K. Uhlmann, "Reduced sigma point filters for the propagation of means and covariances
/// through nonlinear transformations", Proc. American Control Conference (2002) 887-892.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct MinimalSkewSimplex {
    w0: f64,
}

#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
struct Parameters {
    #[serde(default, deserialize_with = "given", skip_serializing_if = "Option::is_none")]
    w0: Option<f64>,
}

fn checked_centre(w0: f64) -> Result<f64, BuildError> {
    finite("w0", w0)?;
    if (0.0..1.0).contains(&w0) {
        Ok(w0)
    } else {
        Err(BuildError::new("w0", format!("is {w0}; the weight of the centre is 0 or above and below 1")))
    }
}

impl SphericalSimplex {
    /// With the weight `w0` of the centre.
    ///
    /// # Errors
    /// [`BuildError`] if it is not in \[0, 1).
    pub fn new(w0: f64) -> Result<Self, BuildError> {
        Ok(Self { w0: checked_centre(w0)? })
    }
}

impl MinimalSkewSimplex {
    /// With the weight `w0` of the centre.
    ///
    /// # Errors
    /// [`BuildError`] if it is not in \[0, 1).
    pub fn new(w0: f64) -> Result<Self, BuildError> {
        Ok(Self { w0: checked_centre(w0)? })
    }
}

impl PointRule for SphericalSimplex {
    fn lay_out(&self, a: usize) -> Result<PointSet, Refusal> {
        let weight = (1.0 - self.w0) / (a + 1) as f64;
        let points = regular_simplex(a) / (1.0 - self.w0).sqrt();
        Ok(around_centre(points, DVector::from_element(a + 1, weight), self.w0))
    }

    fn degree(&self) -> u32 {
        2
    }
}

impl PointRule for MinimalSkewSimplex {
    fn lay_out(&self, a: usize) -> Result<PointSet, Refusal> {
        let first = (1.0 - self.w0) * 0.5f64.powf(a as f64);
        if !first.is_normal() {
            return Err(Refusal(format!(
                "the least weight, (1 - w0) / 2^{a}, vanishes; this set serves fewer than 1000 components"
            )));
        }
        let weights = DVector::from_fn(a + 1, |k, _| first * 2f64.powf(k.saturating_sub(1) as f64));
        let mut points = DMatrix::zeros(a + 1, a);
        for j in 0..a {
            let reach = 1.0 / (2.0 * weights[j + 1]).sqrt();
            points.view_mut((0, j), (j + 1, 1)).fill(-reach);
            points[(j + 1, j)] = reach;
        }
        Ok(around_centre(points, weights, self.w0))
    }

    fn degree(&self) -> u32 {
        2
    }
}

/// The a + 1 corners of a regular simplex in `a` components around zero, sqrt(a) away from it; one row a corner.
pub(super) fn regular_simplex(a: usize) -> DMatrix<f64> {
    let mut corners = DMatrix::zeros(a + 1, a);
    for j in 0..a {
        let order = (j + 1) as f64;
        let reach = ((a + 1) as f64 / (order * (order + 1.0))).sqrt();
        corners.view_mut((0, j), (j + 1, 1)).fill(-reach);
        corners[(j + 1, j)] = order * reach;
    }
    corners
}

/// The points, behind the centre where that has a weight.
fn around_centre(points: DMatrix<f64>, weights: DVector<f64>, w0: f64) -> PointSet {
    if w0 == 0.0 {
        return PointSet::new(points, weights.clone(), weights);
    }
    let weights = weights.insert_row(0, w0);
    PointSet::new(points.insert_row(0, 0.0), weights.clone(), weights)
}
