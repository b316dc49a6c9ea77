use nalgebra::{DMatrix, DVector};
use serde::{Deserialize, Serialize};

use super::kinds::{BuildError, Kind, built, given_whole};
use super::{PointRule, PointSet, Refusal};

pub(super) const KIND: Kind = Kind {
    id: "gauss-hermite",
    name: "Gauss-Hermite product rule",
    parameters: "order = 3 (2 to 20), max_nodes = 100000",
    evaluations: "order^a, and 1 where an output is angular and the order even",
    source: "Ito, Xiong 2000; Golub, Welsch 1969",
    examples: &["gauss-hermite:order=2", "gauss-hermite:order=4", "gauss-hermite:order=5"],
    build: |map| built(map, GaussHermite::from_parameters),
};

const ORDERS: std::ops::RangeInclusive<usize> = 2..=20;
const DEFAULT_ORDER: usize = 3;
const DEFAULT_MAX_NODES: usize = 100_000;
/// Ten million nodes in six components with two outputs need about 1.3 GB of workspace.
const GREATEST_MAX_NODES: usize = 10_000_000;

/// The Gauss-Hermite product rule: the nodes of the m-point rule for N(0, 1) on every axis, m^a points whose
/// weights are the products of the axes' weights.
///
/// Exact for polynomials of degree 2m - 1 in each coordinate of z: with degree q in the state, the mean for
/// q <= 2m - 1, the cross-covariance for q <= 2m - 2, the covariance for q <= m - 1.
///
/// Sources: K. Ito, K. Xiong, "Gaussian filters for nonlinear filtering problems", IEEE Trans. Automatic
/// Control 45 (2000) 910-927; nodes and weights by G. H. Golub, J. H. Welsch, "Calculation of Gauss
/// quadrature rules", Math. Comp. 23 (1969) 221-230.
#[derive(Debug, Clone, PartialEq)]
pub struct GaussHermite {
    max_nodes: usize,
    rule: Vec<(f64, f64)>,
}

#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
struct Parameters {
    #[serde(default, deserialize_with = "given_whole", skip_serializing_if = "Option::is_none")]
    order: Option<usize>,
    #[serde(default, deserialize_with = "given_whole", skip_serializing_if = "Option::is_none")]
    max_nodes: Option<usize>,
}

impl GaussHermite {
    /// The rule of `order` points an axis, refused for a problem where it has more than `max_nodes` points.
    ///
    /// # Errors
    /// [`BuildError`] if the order is not 2 to 20, or `max_nodes` is below the order or above ten million.
    pub fn new(order: usize, max_nodes: usize) -> Result<Self, BuildError> {
        if !ORDERS.contains(&order) {
            let (least, greatest) = ORDERS.into_inner();
            return Err(BuildError::new("order", format!("is {order}; give {least} to {greatest} points an axis")));
        }
        if !(order..=GREATEST_MAX_NODES).contains(&max_nodes) {
            return Err(BuildError::new(
                "max_nodes",
                format!("is {max_nodes}; give a cap from {order} (one axis of this order) to {GREATEST_MAX_NODES}"),
            ));
        }
        Ok(Self { max_nodes, rule: normal_rule(order) })
    }

    fn from_parameters(p: Parameters) -> Result<Self, BuildError> {
        Self::new(p.order.unwrap_or(DEFAULT_ORDER), p.max_nodes.unwrap_or(DEFAULT_MAX_NODES))
    }

    /// Nodes and weights on one axis, for the weight function of N(0, 1): nodes rise, weights sum to one.
    pub fn rule(&self) -> &[(f64, f64)] {
        &self.rule
    }

    fn count(&self, a: usize) -> Result<usize, Refusal> {
        let order = self.rule.len();
        let count = u32::try_from(a).ok().and_then(|a| order.checked_pow(a));
        match count {
            Some(count) if count <= self.max_nodes => Ok(count),
            _ => {
                let count =
                    count.map_or_else(|| format!("about {:.1e}", (order as f64).powf(a as f64)), |c| c.to_string());
                Err(Refusal(format!(
                    "order {order} on {a} read components needs {order}^{a} = {count} nodes; the cap max_nodes is {}",
                    self.max_nodes
                )))
            }
        }
    }
}

impl PointRule for GaussHermite {
    fn lay_out(&self, a: usize) -> Result<PointSet, Refusal> {
        let (count, order) = (self.count(a)?, self.rule.len());
        let mut points = DMatrix::zeros(count, a);
        let mut weights = DVector::from_element(count, 1.0);
        for k in 0..count {
            // The digits of k in base `order` say which node stands on which axis.
            let mut digits = k;
            for i in 0..a {
                let (node, weight) = self.rule[digits % order];
                points[(k, i)] = node;
                weights[k] *= weight;
                digits /= order;
            }
        }
        Ok(PointSet::new(points, weights.clone(), weights))
    }

    fn degree(&self) -> u32 {
        2 * self.rule.len() as u32 - 1
    }
}

/// Nodes and weights of the Gauss rule of `order` points for N(0, 1).
///
/// The nodes are the eigenvalues of the Jacobi matrix (zero diagonal, sqrt(k) beside it), polished by Newton
/// on the orthonormal Hermite polynomials; the weights are 1 / sum_k p_k(x)^2 over k < order, whose error is
/// only x times that of the node. The upper half is computed and mirrored, so the rule is symmetric to the last bit.
pub(super) fn normal_rule(order: usize) -> Vec<(f64, f64)> {
    let jacobi =
        DMatrix::from_fn(order, order, |i, j| if i.abs_diff(j) == 1 { (i.max(j) as f64).sqrt() } else { 0.0 });
    let mut nodes: Vec<f64> = jacobi.symmetric_eigenvalues().iter().copied().collect();
    nodes.sort_by(f64::total_cmp);
    let mut rule = vec![(0.0, 0.0); order];
    for k in order / 2..order {
        let mirror = order - 1 - k;
        let mut x = if k == mirror { 0.0 } else { nodes[k] };
        // Eigenvalues come to about 1e-15: one step polishes them, a second costs nothing.
        for _ in 0..2 {
            x -= Orthonormal::at(order, x).newton_step(order);
        }
        let weight = 1.0 / Orthonormal::at(order, x).squares;
        rule[k] = (x, weight);
        rule[mirror] = (-x, weight);
    }
    rule
}

/// Hermite polynomials orthonormal under N(0, 1), by sqrt(k + 1) p_{k+1} = x p_k - sqrt(k) p_{k-1}.
struct Orthonormal {
    /// p_order(x).
    last: f64,
    /// p_{order-1}(x).
    before: f64,
    /// sum_k p_k(x)^2 over k < order.
    squares: f64,
}

impl Orthonormal {
    fn at(order: usize, x: f64) -> Self {
        let (mut before, mut last, mut squares) = (0.0, 1.0, 0.0);
        for k in 0..order {
            squares += last * last;
            let next = (x * last - (k as f64).sqrt() * before) / ((k + 1) as f64).sqrt();
            (before, last) = (last, next);
        }
        Self { last, before, squares }
    }

    /// p / p', with p_n' = sqrt(n) p_{n-1}.
    fn newton_step(&self, order: usize) -> f64 {
        self.last / ((order as f64).sqrt() * self.before)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_plan_beyond_the_cap_says_how_many_nodes_it_would_need() {
        let rule = GaussHermite::new(5, 1000).unwrap();
        assert!(rule.lay_out(4).is_ok());
        assert_eq!(
            rule.lay_out(5).unwrap_err().0,
            "order 5 on 5 read components needs 5^5 = 3125 nodes; the cap max_nodes is 1000"
        );
        let refused = GaussHermite::new(20, DEFAULT_MAX_NODES).unwrap().lay_out(40).unwrap_err().0;
        assert!(refused.contains("20^40 = about 1.1e52 nodes"), "{refused}");
    }

    #[test]
    fn moments_of_every_order_come_out_as_they_must() {
        // E[z^2k] = (2k - 1)!! for 2k <= 2m - 1, and the defect at degree 2m is m!: Abramowitz & Stegun 25.4.46.
        for order in ORDERS {
            let rule = normal_rule(order);
            let moment = |degree: i32| rule.iter().map(|&(x, w)| w * x.powi(degree)).sum::<f64>();
            let mut double_factorial = 1.0;
            for k in 0..order {
                let degree = 2 * k as i32;
                let error = moment(degree) / double_factorial - 1.0;
                // The largest nodes carry the highest moments, each with degree times the node's rounding.
                assert!(
                    error.abs() < 2e-14 * (1.0 + f64::from(degree)),
                    "order {order}, degree {degree}: {error:.1e}"
                );
                double_factorial *= f64::from(degree + 1);
            }
            let factorial: f64 = (1..=order).map(|k| k as f64).product();
            let defect = double_factorial - moment(2 * order as i32);
            assert!(
                (defect / factorial - 1.0).abs() < 1e-12 * double_factorial / factorial,
                "order {order}: {defect}"
            );
        }
    }
}
