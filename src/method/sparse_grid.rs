use std::collections::BTreeMap;

use nalgebra::{DMatrix, DVector};
use serde::{Deserialize, Serialize};

use super::gauss_hermite::normal_rule;
use super::kinds::{BuildError, Kind, built, given_whole};
use super::{PointRule, PointSet, Refusal};

pub(super) const KIND: Kind = Kind {
    id: "sparse-gauss-hermite",
    name: "sparse-grid Gauss-Hermite rule (Smolyak)",
    parameters: "level = 3 (2 to 4)",
    evaluations: "level 2: 2a + 1; level 3: 2a^2 + 4a + 1; level 4: 4a(a - 1)(a - 2)/3 + 10a^2 + 2a + 1; at a = 1: 2 level - 1",
    source: "Jia, Xin, Cheng 2012; Smolyak 1963",
    examples: &["sparse-gauss-hermite:level=2", "sparse-gauss-hermite:level=4"],
    build: |map| built(map, |p: Parameters| SparseGaussHermite::new(p.level.unwrap_or(3))),
};

const LEVELS: std::ops::RangeInclusive<usize> = 2..=4;
const MOST_NODES: usize = 100_000;

/// The sparse-grid Gauss-Hermite rule of level L: with U_i the Gauss-Hermite rule of 2i - 1 points on one axis,
///
/// ```text
/// sum over q from L - a to L - 1 of (-1)^(L-1-q) binomial(a - 1, L - 1 - q)
///     sum over i_1 + .. + i_a = a + q of the product rule U_(i_1) x .. x U_(i_a)
/// ```
///
/// Equal nodes are merged, their weights added. Exact for polynomials of total degree 2L - 1: in the mean up to 2L - 1, in the
/// cross-covariance up to 2L - 2, in the covariance up to L - 1, with a number of points that grows as a^(L-1) and not
/// exponentially. Some weights are negative, from a = 4 on at level 2 (which is the unscented transform with
/// kappa = 3 - a) and from a = 2 on above: the covariance can come out indefinite.
///
/// Sources: B. Jia, M. Xin, Y. Cheng, "Sparse-grid quadrature nonlinear filtering", Automatica 48 (2012) 327-341;
/// S. A. Smolyak, "Quadrature and interpolation formulas for tensor products of certain classes of functions", Dokl.
/// Akad. Nauk SSSR 148 (1963) 1042-1045.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct SparseGaussHermite {
    level: usize,
}

#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
struct Parameters {
    #[serde(default, deserialize_with = "given_whole", skip_serializing_if = "Option::is_none")]
    level: Option<usize>,
}

impl SparseGaussHermite {
    /// The rule of this level.
    ///
    /// # Errors
    /// [`BuildError`] if the level is not 2 to 4.
    pub fn new(level: usize) -> Result<Self, BuildError> {
        if !LEVELS.contains(&level) {
            return Err(BuildError::new("level", format!("is {level}; give 2, 3 or 4")));
        }
        Ok(Self { level })
    }
}

impl PointRule for SparseGaussHermite {
    fn lay_out(&self, a: usize) -> Result<PointSet, Refusal> {
        let rules: Vec<_> = (1..=self.level).map(|i| normal_rule(2 * i - 1)).collect();
        let mut nodes = BTreeMap::new();
        // How far the level of each axis is above 1, 0 on all axes that are not listed: at most L - 1 in sum.
        let mut raised = Vec::new();
        let mut far_too_many = false;
        each_choice(a, self.level - 1, &mut raised, &mut |raised| {
            let left = self.level - 1 - raised.iter().map(|&(_, by)| by).sum::<usize>();
            let sign = if left.is_multiple_of(2) { 1.0 } else { -1.0 };
            let factor = sign * binomial(a - 1, left);
            if factor != 0.0 && !far_too_many {
                add_product(&rules, raised, factor, &mut nodes);
                far_too_many = nodes.len() > MOST_NODES;
            }
        });
        if far_too_many {
            return Err(Refusal(format!(
                "level {} on {a} read components needs more than {MOST_NODES} nodes; take a lower level",
                self.level
            )));
        }
        let mut points = DMatrix::zeros(nodes.len(), a);
        let mut weights = DVector::zeros(nodes.len());
        for (k, (node, weight)) in nodes.iter().enumerate() {
            weights[k] = *weight;
            for &(axis, order, place) in node {
                points[(k, axis)] = rules[order][place].0;
            }
        }
        Ok(PointSet::new(points, weights.clone(), weights))
    }

    fn degree(&self) -> u32 {
        2 * self.level as u32 - 1
    }
}

/// A node by its coordinates that are not zero: axis, rule and place in the rule. The rules share no other node.
type Node = Vec<(usize, usize, usize)>;

/// Calls `act` with every choice of axes and of how far each is raised, in sum by `most` at the most.
fn each_choice(a: usize, most: usize, raised: &mut Vec<(usize, usize)>, act: &mut impl FnMut(&[(usize, usize)])) {
    act(raised);
    let first = raised.last().map_or(0, |&(axis, _)| axis + 1);
    for axis in first..a {
        for by in 1..=most {
            raised.push((axis, by));
            each_choice(a, most - by, raised, act);
            raised.pop();
        }
    }
}

/// Adds the nodes of a product rule, their weights times `factor`.
fn add_product(rules: &[Vec<(f64, f64)>], raised: &[(usize, usize)], factor: f64, nodes: &mut BTreeMap<Node, f64>) {
    let mut products: Vec<(Node, f64)> = vec![(Vec::new(), factor)];
    for &(axis, order) in raised {
        let mut longer = Vec::with_capacity(products.len() * rules[order].len());
        for (node, weight) in &products {
            for (place, &(z, w)) in rules[order].iter().enumerate() {
                let mut node = node.clone();
                if z != 0.0 {
                    node.push((axis, order, place));
                }
                longer.push((node, weight * w));
            }
        }
        products = longer;
    }
    for (node, weight) in products {
        *nodes.entry(node).or_insert(0.0) += weight;
    }
}

fn binomial(n: usize, k: usize) -> f64 {
    if k > n { 0.0 } else { (0..k).map(|i| (n - i) as f64 / (i + 1) as f64).product() }
}
