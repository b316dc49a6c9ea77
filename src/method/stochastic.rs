use nalgebra::{DMatrix, DVector};
use serde::{Deserialize, Serialize};

use super::draws::Seeded;
use super::kinds::{BuildError, Kind, built, given_whole};
use super::simplex::regular_simplex;
use super::{PointRule, PointSet, Refusal};

pub(super) const THIRD_DEGREE: Kind = Kind {
    id: "stochastic-3",
    name: "stochastic spherical-radial rule of degree 3",
    parameters: "iterations = 10, seed = 0",
    evaluations: "2a iterations + 1",
    source: "Genz, Monahan 1998; Dunik, Straka, Simandl 2013",
    examples: &["stochastic-3:iterations=1:seed=7"],
    build: |map| built(map, |p: Parameters| p.checked().map(ThirdDegreeStochastic)),
};

pub(super) const FIFTH_DEGREE: Kind = Kind {
    id: "stochastic-5",
    name: "stochastic spherical-radial rule of degree 5",
    parameters: "iterations = 10, seed = 0",
    evaluations: "2(a + 1)(a + 2) iterations + 1; at a = 1: 4 iterations + 1; at a = 2: 12 iterations + 1",
    source: "Genz, Monahan 1998; Dunik, Straka, Simandl 2013",
    examples: &["stochastic-5:iterations=1:seed=7"],
    build: |map| built(map, |p: Parameters| p.checked().map(FifthDegreeStochastic)),
};

const DEFAULT_ITERATIONS: usize = 10;
const MOST_POINTS: usize = 1_000_000;

/// The stochastic spherical-radial rule of degree 3: the average over `iterations` independent draws of
///
/// ```text
/// z = 0, weight 1 - a / r^2;  +-r Q e_i, weight 1 / (2 r^2) each
/// ```
///
/// with r^2 from a chi-squared law of a + 2 degrees of freedom and Q uniform on the orthogonal matrices. Every draw
/// is exact for polynomials of degree 3 in the mean, 2 in the cross-covariance, 1 in the covariance; over the draws the mean
/// and the cross-covariance of any sensor are unbiased. The weight of the centre is often negative, and the covariance can
/// come out indefinite.
///
/// The points are drawn once, when the transform is planned, and depend on seed and a alone: what a filter meets that keeps its
/// points. One that draws anew at every measurement is this method over many seeds.
///
/// Sources: A. Genz, J. Monahan, "Stochastic integration rules for infinite regions", SIAM J. Scientific Computing 19
/// (1998) 426-439; J. Dunik, O. Straka, M. Simandl, "Stochastic integration filter", IEEE Trans. Automatic Control 58
/// (2013) 1561-1566 (both from memory; that the law of r makes the rule unbiased is tested).
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct ThirdDegreeStochastic(Drawn);

/// The stochastic spherical-radial rule of degree 5: the average over `iterations` independent draws of
///
/// ```text
/// z = 0, weight 1 - a (r^2 + s^2 - a - 2) / (r^2 s^2);
/// +-r Q u_k, weight a (a + 2 - s^2) / (r^2 (r^2 - s^2)) w_k;  +-s Q u_k, weight a (a + 2 - r^2) / (s^2 (s^2 - r^2)) w_k
/// ```
///
/// Directions u_k: the a + 1 corners of a regular simplex, w_k = a (7 - a) / (2 (a + 1)^2 (a + 2)), and the directions
/// midway between two of them, w_k = 2 (a - 1)^2 / (a (a + 1)^2 (a + 2)); where they fall together (a = 1, 2) they are
/// taken once. Q is uniform on the orthogonal matrices; (r, s) has a density in proportion to
/// (r s)^(a+1) (r^2 - s^2)^2 exp(-(r^2 + s^2) / 2). That is t^2 (1 -+ c) / 2 for r^2 and s^2, with t^2 chi-squared of
/// 2a + 8 degrees of freedom, c^2 = Y / (X + Y), X and Y chi-squared of a + 2 and of 3 degrees.
///
/// Every draw is exact for polynomials of degree 5 in the mean, 4 in the cross-covariance, 2 in the covariance; over the
/// draws the mean and the cross-covariance of any sensor are unbiased. Some weights are negative, and the covariance can come
/// out indefinite. Drawn once, as [`ThirdDegreeStochastic`].
///
/// Sources: as [`ThirdDegreeStochastic`]; the directions are those of I. P. Mysovskikh, "The approximation of multiple
/// integrals by using interpolatory cubature formulae", in Quantitative Approximation (Academic Press, 1980) 217-243 (from
/// memory). The law of r and s is worked out here from their density.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct FifthDegreeStochastic(Drawn);

#[derive(Debug, Clone, Copy, PartialEq, Eq)]
struct Drawn {
    iterations: usize,
    seed: usize,
}

#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
struct Parameters {
    #[serde(default, deserialize_with = "given_whole", skip_serializing_if = "Option::is_none")]
    iterations: Option<usize>,
    #[serde(default, deserialize_with = "given_whole", skip_serializing_if = "Option::is_none")]
    seed: Option<usize>,
}

impl Parameters {
    fn checked(&self) -> Result<Drawn, BuildError> {
        Drawn::new(self.iterations.unwrap_or(DEFAULT_ITERATIONS), self.seed.unwrap_or(0))
    }
}

impl Drawn {
    fn new(iterations: usize, seed: usize) -> Result<Self, BuildError> {
        if iterations == 0 {
            return Err(BuildError::new("iterations", "is 0; give 1 or more draws to average over"));
        }
        Ok(Self { iterations, seed })
    }

    /// The points of all draws, each `per_draw` of which `draw` gives as rows with their weights, behind the centre that
    /// has what is left of the weight.
    fn lay_out(
        self,
        id: &str,
        a: usize,
        per_draw: usize,
        draw: impl Fn(&mut super::draws::Draws) -> Vec<(DVector<f64>, f64)>,
    ) -> Result<PointSet, Refusal> {
        let count = self.iterations.checked_mul(per_draw).filter(|&count| count <= MOST_POINTS);
        let Some(count) = count else {
            return Err(Refusal(format!(
                "{} iterations of {per_draw} points on {a} read components are more than {MOST_POINTS} points; take fewer",
                self.iterations
            )));
        };
        let mut points = DMatrix::zeros(count + 1, a);
        let mut weights = DVector::zeros(count + 1);
        let seeded = Seeded::new(id, self.seed, a);
        let mut k = 1;
        for iteration in 0..self.iterations {
            for (point, weight) in draw(&mut seeded.part(iteration as u64)) {
                points.row_mut(k).tr_copy_from(&point);
                weights[k] = weight / self.iterations as f64;
                k += 1;
            }
        }
        weights[0] = 1.0 - weights.sum();
        Ok(PointSet::new(points, weights.clone(), weights))
    }
}

impl ThirdDegreeStochastic {
    /// The average over `iterations` draws under `seed`.
    ///
    /// # Errors
    /// [`BuildError`] if there is no iteration.
    pub fn new(iterations: usize, seed: usize) -> Result<Self, BuildError> {
        Drawn::new(iterations, seed).map(Self)
    }
}

impl FifthDegreeStochastic {
    /// The average over `iterations` draws under `seed`.
    ///
    /// # Errors
    /// [`BuildError`] if there is no iteration.
    pub fn new(iterations: usize, seed: usize) -> Result<Self, BuildError> {
        Drawn::new(iterations, seed).map(Self)
    }
}

impl PointRule for ThirdDegreeStochastic {
    fn lay_out(&self, a: usize) -> Result<PointSet, Refusal> {
        self.0.lay_out(THIRD_DEGREE.id, a, 2 * a, |draws| {
            let square = draws.chi_squared(a + 2);
            let q = draws.orthogonal(a);
            let directions = q.column_iter().map(|u| (u.into_owned(), 1.0));
            both_ways(directions, square.sqrt(), 0.5 / square).collect()
        })
    }

    fn degree(&self) -> u32 {
        3
    }
}

impl PointRule for FifthDegreeStochastic {
    fn lay_out(&self, a: usize) -> Result<PointSet, Refusal> {
        let directions = directions(a);
        let n = a as f64;
        self.0.lay_out(FIFTH_DEGREE.id, a, 4 * directions.len(), |draws| {
            let (square, x, y) = (draws.chi_squared(2 * a + 8), draws.chi_squared(a + 2), draws.chi_squared(3));
            let cosine = (y / (x + y)).sqrt();
            let (r, s) = (0.5 * square * (1.0 - cosine), 0.5 * square * (1.0 + cosine));
            let q = draws.orthogonal(a);
            let turned: Vec<_> = directions.iter().map(|(u, w)| (&q * u, *w)).collect();
            let near = both_ways(turned.iter().cloned(), r.sqrt(), n * (n + 2.0 - s) / (r * (r - s)));
            let far = both_ways(turned.iter().cloned(), s.sqrt(), n * (n + 2.0 - r) / (s * (s - r)));
            near.chain(far).collect()
        })
    }

    fn degree(&self) -> u32 {
        5
    }
}

/// +-`reach` u with `weight` w each.
fn both_ways(
    directions: impl Iterator<Item = (DVector<f64>, f64)>,
    reach: f64,
    weight: f64,
) -> impl Iterator<Item = (DVector<f64>, f64)> {
    directions.flat_map(move |(u, w)| [(&u * reach, weight * w), (&u * -reach, weight * w)])
}

/// Directions and weights of the rule of degree 5 on the unit sphere, of each pair +-u one; over both the weights sum to one.
fn directions(a: usize) -> Vec<(DVector<f64>, f64)> {
    let n = a as f64;
    let corners = regular_simplex(a) / n.sqrt();
    let corner = |k: usize| corners.row(k).transpose();
    match a {
        1 => vec![(corner(1), 0.5)],
        // Midway between two corners is opposite the third.
        2 => (0..3).map(|k| (corner(k), 1.0 / 6.0)).collect(),
        _ => {
            let common = (n + 1.0).powi(2) * (n + 2.0);
            let at_corner = n * (7.0 - n) / (2.0 * common);
            let midway = 2.0 * (n - 1.0).powi(2) / (n * common);
            let corners = (0..=a).map(|k| (corner(k), at_corner));
            let pairs = (0..=a).flat_map(|j| (0..j).map(move |i| (i, j)));
            corners.chain(pairs.map(|(i, j)| ((corner(i) + corner(j)).normalize(), midway))).collect()
        }
    }
}
