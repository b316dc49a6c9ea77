use nalgebra::{DMatrix, DVector};
use serde::{Deserialize, Serialize};

use super::draws::Seeded;
use super::kinds::{BuildError, Kind, built, given_whole};
use super::{PointRule, PointSet, Refusal};
use crate::net::{BLOCK, Net};

pub(super) const PLAIN: Kind = Kind {
    id: "monte-carlo",
    name: "Monte Carlo sampling",
    parameters: "points = 100, seed = 0",
    evaluations: "points, and 1 where an output is angular",
    source: "Metropolis, Ulam 1949",
    examples: &["monte-carlo:points=1000:seed=7"],
    build: |map| built(map, |p: Parameters| MonteCarlo::new(p.points.unwrap_or(100), p.seed.unwrap_or(0))),
};

pub(super) const QUASI: Kind = Kind {
    id: "quasi-monte-carlo",
    name: "quasi-Monte Carlo sampling (scrambled Sobol')",
    parameters: "points = 128 (a power of two), seed = 0",
    evaluations: "points, and 1 where an output is angular",
    source: "Joe, Kuo 2008; Matousek 1998; Owen 1995",
    examples: &["quasi-monte-carlo:points=1024:seed=7"],
    build: |map| built(map, |p: Parameters| QuasiMonteCarlo::new(p.points.unwrap_or(128), p.seed.unwrap_or(0))),
};

const MOST_POINTS: usize = 1_000_000;

/// Plain Monte Carlo: N independent points from N(0, I), the sample mean, and sample covariances with the divisor N - 1.
///
/// Mean, covariance and cross-covariance are unbiased over the seeds; of one seed they err by about 1/sqrt(N) of a
/// standard deviation or more, of a linear sensor too. The points are drawn once, when the transform is planned, and
/// depend on seed and a alone: one sample for every case of a survey.
///
/// Source: N. Metropolis, S. Ulam, "The Monte Carlo method", J. American Statistical Association 44 (1949) 335-341.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct MonteCarlo {
    points: usize,
    seed: usize,
}

/// Quasi-Monte Carlo: the first N = 2^m points of a Sobol' sequence with linear matrix scrambling and digital shift, taken
/// through the normal quantile, all with the weight 1/N.
///
/// The mean is unbiased over the seeds. No polynomial but a constant is exact, though the smooth ones of few components are far
/// better than by [`MonteCarlo`]. Drawn once, as there.
///
/// Sources: S. Joe, F. Y. Kuo, "Constructing Sobol sequences with better two-dimensional projections", SIAM J.
/// Scientific Computing 30 (2008) 2635-2654; J. Matousek, "On the L2-discrepancy for anchored boxes", J. Complexity 14
/// (1998) 527-556; A. B. Owen, "Randomly permuted (t, m, s)-nets and (t, s)-sequences", in Monte Carlo and Quasi-Monte
/// Carlo Methods in Scientific Computing (Springer, 1995) 299-317.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct QuasiMonteCarlo {
    points: usize,
    seed: usize,
}

#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
struct Parameters {
    #[serde(default, deserialize_with = "given_whole", skip_serializing_if = "Option::is_none")]
    points: Option<usize>,
    #[serde(default, deserialize_with = "given_whole", skip_serializing_if = "Option::is_none")]
    seed: Option<usize>,
}

impl MonteCarlo {
    /// `points` points under `seed`.
    ///
    /// # Errors
    /// [`BuildError`] if there are fewer than two points or more than a million.
    pub fn new(points: usize, seed: usize) -> Result<Self, BuildError> {
        if !(2..=MOST_POINTS).contains(&points) {
            return Err(BuildError::new("points", format!("is {points}; give 2 to {MOST_POINTS}")));
        }
        Ok(Self { points, seed })
    }
}

impl QuasiMonteCarlo {
    /// `points` points under `seed`.
    ///
    /// # Errors
    /// [`BuildError`] if the number of points is no power of two from 2 to 2^19.
    pub fn new(points: usize, seed: usize) -> Result<Self, BuildError> {
        if !(2..=MOST_POINTS).contains(&points) || !points.is_power_of_two() {
            return Err(BuildError::new("points", format!("is {points}; give a power of two from 2 to 524288")));
        }
        Ok(Self { points, seed })
    }
}

impl PointRule for MonteCarlo {
    fn lay_out(&self, a: usize) -> Result<PointSet, Refusal> {
        let mut draws = Seeded::new(PLAIN.id, self.seed, a).part(0);
        let mut points = DMatrix::zeros(self.points, a);
        // Point by point, so that more points begin with these.
        for k in 0..self.points {
            for i in 0..a {
                points[(k, i)] = draws.normal();
            }
        }
        let equal = |sum: usize| DVector::from_element(self.points, 1.0 / sum as f64);
        Ok(PointSet::new(points, equal(self.points), equal(self.points - 1)))
    }

    fn degree(&self) -> u32 {
        0
    }
}

impl PointRule for QuasiMonteCarlo {
    fn lay_out(&self, a: usize) -> Result<PointSet, Refusal> {
        let net = Net::new(&Seeded::new(QUASI.id, self.seed, a), 0, a, self.points.ilog2())
            .map_err(|e| Refusal(e.to_string()))?;
        let mut points = DMatrix::zeros(self.points, a);
        let mut block = vec![0.0; BLOCK * a];
        let taken = self.points.min(BLOCK);
        for index in 0..self.points / taken {
            net.normals(index as u64, &mut block);
            for (i, column) in block.chunks_exact(BLOCK).enumerate() {
                for (k, &z) in column[..taken].iter().enumerate() {
                    points[(index * taken + k, i)] = z;
                }
            }
        }
        let weights = DVector::from_element(self.points, 1.0 / self.points as f64);
        Ok(PointSet::new(points, weights.clone(), weights))
    }

    fn degree(&self) -> u32 {
        0
    }
}
