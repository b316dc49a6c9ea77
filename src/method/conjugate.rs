use nalgebra::{DMatrix, DVector};
use serde::{Deserialize, Serialize};

use super::kinds::{BuildError, Kind, built, finite, given};
use super::{PointRule, PointSet, Refusal};

pub(super) const KIND: Kind = Kind {
    id: "conjugate-4",
    name: "conjugate unscented transform of fourth order",
    parameters: "w0 = 0 (weight of the centre, 0 to below 1)",
    evaluations: "2a + 2^a, and 1 where w0 is above 0 or an output is angular",
    source: "Adurthi, Singla, Singh 2012, 2018",
    examples: &["conjugate-4:w0=0.25"],
    build: |map| built(map, |p: Parameters| FourthOrderConjugate::new(p.w0.unwrap_or(0.0))),
};

/// 65,568 points.
const MOST_COMPONENTS: usize = 16;

/// The conjugate unscented transform that matches all moments up to order four, and those of order five by symmetry:
/// 2a + 2^a points
///
/// ```text
/// z = +-sqrt(s) e_i, weight 1 / s^2 each;  sqrt(t) (+-1, .., +-1), weight 1 / (2^a t^2) each
/// ```
///
/// with s = (a + 2) / 2 and t = (a + 2) / (a - 2), which is 4 / (a + 2)^2 and (a - 2)^2 / (2^a (a + 2)^2) in weights.
/// Exact for polynomials of degree 5 in the mean, 4 in the cross-covariance, 2 in the covariance; no weight is negative.
/// In one and two components there is no such s and t: refused.
///
/// A weight w0 of the centre above zero makes s the lesser root of w0 s^2 - 4 s + 2a + 4 = 0 and t = s / (s - 2), which
/// serves two components too (the moment equations are the published ones; that family is worked out here).
///
/// Sources: N. Adurthi, P. Singla, T. Singh, "The conjugate unscented transform: an approach to evaluate
/// multi-dimensional expectation integrals", Proc. American Control Conference (2012) 5556-5561; the same, "Conjugate
/// unscented transformation: applications to estimation and control", J. Dynamic Systems, Measurement, and Control 140
/// (2018) 030907 (from memory).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct FourthOrderConjugate {
    w0: f64,
}

#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
struct Parameters {
    #[serde(default, deserialize_with = "given", skip_serializing_if = "Option::is_none")]
    w0: Option<f64>,
}

impl FourthOrderConjugate {
    /// With the weight `w0` of the centre.
    ///
    /// # Errors
    /// [`BuildError`] if it is not in \[0, 1). Whether the moment equations have a solution is seen only when a is known.
    pub fn new(w0: f64) -> Result<Self, BuildError> {
        finite("w0", w0)?;
        if !(0.0..1.0).contains(&w0) {
            return Err(BuildError::new(
                "w0",
                format!("is {w0}; the weight of the centre is 0 or above and below 1"),
            ));
        }
        Ok(Self { w0 })
    }

    /// s: the squared distance of the points on the axes.
    fn squared_distance(&self, a: usize) -> Result<f64, Refusal> {
        let n = a as f64;
        // 4 times the discriminant of w0 s^2 - 4 s + 2a + 4; the root in the form that stays finite at w0 = 0.
        let square = 4.0 - self.w0 * (2.0 * n + 4.0);
        let s = (2.0 * n + 4.0) / (2.0 + square.max(0.0).sqrt());
        if square < 0.0 {
            let most = 2.0 / (n + 2.0);
            Err(Refusal(format!(
                "with w0 = {} the moments of {a} components have no real solution; give w0 up to {most:.4}",
                self.w0
            )))
        } else if s <= 2.0 {
            let mend = if a == 2 { "give w0 above 0 and up to 0.5" } else { "use gauss-hermite" };
            Err(Refusal(format!(
                "with w0 = {} the conjugate points of {a} read component{} would have to lie infinitely far away; {mend}",
                self.w0,
                if a == 1 { "" } else { "s" }
            )))
        } else {
            Ok(s)
        }
    }
}

impl PointRule for FourthOrderConjugate {
    fn lay_out(&self, a: usize) -> Result<PointSet, Refusal> {
        if a > MOST_COMPONENTS {
            return Err(Refusal(format!(
                "{a} read components need 2^{a} conjugate points; at most {MOST_COMPONENTS} components are served"
            )));
        }
        let s = self.squared_distance(a)?;
        let t = s / (s - 2.0);
        let (corners, first) = (1 << a, usize::from(self.w0 > 0.0));
        let count = first + 2 * a + corners;
        let mut points = DMatrix::zeros(count, a);
        let mut weights = DVector::from_element(count, 1.0 / (corners as f64 * t * t));
        weights.rows_mut(first, 2 * a).fill(1.0 / (s * s));
        if self.w0 > 0.0 {
            weights[0] = self.w0;
        }
        for i in 0..a {
            points[(first + i, i)] = s.sqrt();
            points[(first + a + i, i)] = -s.sqrt();
            for corner in 0..corners {
                // The bits of the corner's number are its signs.
                let sign = if corner >> i & 1 == 0 { 1.0 } else { -1.0 };
                points[(first + 2 * a + corner, i)] = sign * t.sqrt();
            }
        }
        Ok(PointSet::new(points, weights.clone(), weights))
    }

    fn degree(&self) -> u32 {
        5
    }
}
