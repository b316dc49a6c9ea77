use nalgebra::{DMatrix, DVector};
use serde::{Deserialize, Serialize};

use super::kinds::{BuildError, Kind, built, finite, given, given_whole};
use super::spread::Spread;
use super::{Exactness, GaussHermite, Method, PointRule, Problem, Refusal, Transform, Unscented};
use crate::gaussian::{Moments, cholesky_in_place};
use crate::sensor::{Arithmetic, Real};

pub(super) const KIND: Kind = Kind {
    id: "bayesian-quadrature",
    name: "Bayesian quadrature (Gaussian process, squared exponential kernel)",
    parameters: "nodes = unscented (or gauss-hermite), order = 3 (of gauss-hermite), length_scale = 3, amplitude \
                 (of the outputs; estimated unless given)",
    evaluations: "2a + 1; gauss-hermite: order^a, and 1 where the order is even",
    source: "O'Hagan 1991; Prueher, Straka 2018",
    examples: &[
        "bayesian-quadrature:nodes=gauss-hermite",
        "bayesian-quadrature:nodes=gauss-hermite:order=4:length_scale=2",
        "bayesian-quadrature:length_scale=1.5:amplitude=0",
    ],
    build: |map| built(map, BayesianQuadrature::from_parameters),
};

/// Kernel matrices of this size are factored in about a second.
const MOST_NODES: usize = 1000;

/// Bayesian quadrature: the sensor in the coordinates z of x = m + L z is taken for a Gaussian process with the
/// squared-exponential kernel k(z, z') = s^2 exp(-|z - z'|^2 / (2 l^2)), conditioned on its values at nodes z_i, and the moments
/// are those of that process. With K_ij = k(z_i, z_j) / s^2, q_i = E\[k(z, z_i)\] / s^2, Q_ij = E\[k(z, z_i) k(z, z_j)\] / s^4,
/// R_i = E\[z k(z, z_i)\] / s^2 over z ~ N(0, I), all in closed form, and d_i = h(x_i) - h(m) (wrapped where angular):
///
/// ```text
/// e = d' K^-1 q,  mu = h(m) + e
/// S = d' K^-1 Q K^-1 d - e e' + diag(s_j^2 (1 - tr(Q K^-1))) + R
/// C = L R K^-1 d
/// ```
///
/// The diagonal term is the expected variance of the process: what the nodes leave unknown of h widens S. Its amplitude s_j is
/// given, in the unit of the outputs, or left out: then it is the one of greatest likelihood for the values at the nodes,
/// s_j^2 = d_j' K^-1 d_j / N with d_j of output j. Zero leaves the term away.
///
/// Two things are as the charts of angles and the units of outputs ask and not as published: the process has the mean h(m),
/// where the papers have zero, and the amplitude can be estimated. No polynomial but a constant has exact moments; the mean of
/// a linear sensor is exact by symmetry, but for the digits that the condition of K takes: the longer the length scale, and the
/// more nodes, the more (eight of 16 on 729 nodes at the default). The length scale 3 is common practice, no source.
///
/// Sources: A. O'Hagan, "Bayes-Hermite quadrature", J. Statistical Planning and Inference 29 (1991) 245-260; S. Sarkka,
/// J. Hartikainen, L. Svensson, F. Sandblom, "On the relation between Gaussian process quadratures and sigma-point
/// methods", J. Advances in Information Fusion 11 (2016) 31-46; J. Prueher, O. Straka, "Gaussian process quadrature moment
/// transform", IEEE Trans. Automatic Control 63 (2018) 2844-2854, with the expected variance; the amplitude of greatest
/// likelihood: C. E. Rasmussen, C. K. I. Williams, Gaussian Processes for Machine Learning (MIT Press, 2006), ch. 5 (all from
/// memory).
#[derive(Debug, Clone, PartialEq)]
pub struct BayesianQuadrature {
    rule: Rule,
    length_scale: f64,
    amplitude: Option<f64>,
}

/// Where the nodes of [`BayesianQuadrature`] are.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum Nodes {
    /// Those of the unscented transform with kappa = 3 - a.
    Unscented,
    /// Those of a Gauss-Hermite product rule.
    GaussHermite,
}

#[derive(Debug, Clone, PartialEq)]
enum Rule {
    Unscented(Unscented),
    GaussHermite(GaussHermite),
}

#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
struct Parameters {
    #[serde(default, skip_serializing_if = "Option::is_none")]
    nodes: Option<Nodes>,
    #[serde(default, deserialize_with = "given_whole", skip_serializing_if = "Option::is_none")]
    order: Option<usize>,
    #[serde(default, deserialize_with = "given", skip_serializing_if = "Option::is_none")]
    length_scale: Option<f64>,
    #[serde(default, deserialize_with = "given", skip_serializing_if = "Option::is_none")]
    amplitude: Option<f64>,
}

impl BayesianQuadrature {
    /// With these nodes, of `order` points an axis if they are Gauss-Hermite's, this length scale in standard deviations, and
    /// the amplitude in the unit of the outputs, or estimated.
    ///
    /// # Errors
    /// [`BuildError`] if a number is not finite, the length scale not above zero, the amplitude below it, or an order is given for
    /// other nodes than Gauss-Hermite's or is not one of its.
    pub fn new(
        nodes: Nodes,
        order: Option<usize>,
        length_scale: f64,
        amplitude: Option<f64>,
    ) -> Result<Self, BuildError> {
        finite("length_scale", length_scale)?;
        if length_scale <= 0.0 {
            return Err(BuildError::new(
                "length_scale",
                format!("is {length_scale}; a length scale is above zero"),
            ));
        }
        if let Some(amplitude) = amplitude {
            finite("amplitude", amplitude)?;
            if amplitude < 0.0 {
                return Err(BuildError::new("amplitude", format!("is {amplitude}; an amplitude is zero or above")));
            }
        }
        let rule = match (nodes, order) {
            (Nodes::Unscented, None) => Rule::Unscented(Unscented::new(None)?),
            (Nodes::Unscented, Some(_)) => {
                return Err(BuildError::new("order", "has no meaning for unscented nodes; leave it out"));
            }
            (Nodes::GaussHermite, order) => Rule::GaussHermite(GaussHermite::new(order.unwrap_or(3), MOST_NODES)?),
        };
        Ok(Self { rule, length_scale, amplitude })
    }

    fn from_parameters(p: Parameters) -> Result<Self, BuildError> {
        Self::new(p.nodes.unwrap_or(Nodes::Unscented), p.order, p.length_scale.unwrap_or(3.0), p.amplitude)
    }

    /// The nodes but for the centre, where every deviation is zero.
    fn nodes(&self, a: usize) -> Result<DMatrix<f64>, Refusal> {
        let count = match &self.rule {
            Rule::Unscented(_) => Some(2 * a + 1),
            Rule::GaussHermite(rule) => u32::try_from(a).ok().and_then(|a| rule.rule().len().checked_pow(a)),
        };
        if count.is_none_or(|count| count > MOST_NODES) {
            return Err(Refusal(format!(
                "{a} read components have more than {MOST_NODES} nodes; a Gaussian process on so many is not served"
            )));
        }
        let set = match &self.rule {
            Rule::Unscented(rule) => rule.lay_out(a)?,
            Rule::GaussHermite(rule) => rule.lay_out(a)?,
        };
        let points = set.points();
        let off_centre: Vec<usize> =
            (0..points.nrows()).filter(|&k| points.row(k).iter().any(|&z| z != 0.0)).collect();
        Ok(points.select_rows(&off_centre))
    }
}

impl Method for BayesianQuadrature {
    fn plan(&self, a: usize, p: usize, arithmetic: Arithmetic) -> Result<Box<dyn Transform>, Refusal> {
        Refusal::unless_something_is_read(a)?;
        let nodes = self.nodes(a)?;
        let weights = Weights::new(&nodes, self.length_scale)?;
        Ok(match arithmetic {
            Arithmetic::Double => Box::new(Process::<f64>::new(&nodes, &weights, self.amplitude, p)),
            Arithmetic::Single => Box::new(Process::<f32>::new(&nodes, &weights, self.amplitude, p)),
        })
    }

    fn exactness(&self) -> Option<Exactness> {
        Some(Exactness::up_to(1, 0, 0))
    }
}

/// What the deviations at the nodes are multiplied with. The centre is a node too, but its deviation is zero: its row and
/// column are gone once K is inverted.
#[derive(Debug)]
struct Weights {
    /// K^-1 q.
    mean: DVector<f64>,
    /// K^-1 Q K^-1.
    second: DMatrix<f64>,
    /// R K^-1, a x N.
    cross: DMatrix<f64>,
    /// K^-1.
    inverse: DMatrix<f64>,
    /// 1 - tr(Q K^-1): the share of the process's variance that is left.
    left: f64,
    /// N with the centre.
    count: f64,
}

impl Weights {
    fn new(off_centre: &DMatrix<f64>, length_scale: f64) -> Result<Self, Refusal> {
        let nodes = off_centre.clone().insert_row(0, 0.0);
        let (n, a) = nodes.shape();
        let square = length_scale * length_scale;
        let dot = |i: usize, j: usize| nodes.row(i).dot(&nodes.row(j));
        let kernel = DMatrix::from_fn(n, n, |i, j| {
            (-0.5 * (dot(i, i) - 2.0 * dot(i, j) + dot(j, j)).max(0.0) / square).exp()
        });
        let first = DVector::from_fn(n, |i, _| {
            (1.0 + 1.0 / square).powf(-0.5 * a as f64) * (-0.5 * dot(i, i) / (1.0 + square)).exp()
        });
        let scale = 1.0 + 2.0 / square;
        let second = DMatrix::from_fn(n, n, |i, j| {
            let (ends, middle) = (dot(i, i) + dot(j, j), dot(i, i) + 2.0 * dot(i, j) + dot(j, j));
            scale.powf(-0.5 * a as f64) * (-0.5 / square * (ends - middle / (square * scale))).exp()
        });
        let cross = DMatrix::from_fn(a, n, |k, i| first[i] * nodes[(i, k)] / (1.0 + square));
        let Some(lower) = cholesky_in_place(kernel) else {
            return Err(Refusal(format!(
                "the kernel matrix of {n} nodes is singular to rounding at the length scale {length_scale}; take a shorter one"
            )));
        };
        let half = lower.clone().solve_lower_triangular(&DMatrix::identity(n, n)).expect("no pivot is zero");
        let inverse = half.transpose() * half;
        let second_inverse = &second * &inverse;
        let left = (1.0 - second_inverse.trace()).max(0.0);
        // Symmetric but for rounding, which would make a covariance that is not.
        let product = &inverse * second_inverse;
        let product = 0.5 * (&product + product.transpose());
        let kept = |m: &DMatrix<f64>| m.clone().remove_row(0).remove_column(0);
        Ok(Self {
            mean: (&inverse * first).remove_row(0),
            second: kept(&product),
            cross: (cross * &inverse).remove_column(0),
            inverse: kept(&inverse),
            left,
            count: n as f64,
        })
    }
}

#[derive(Debug)]
struct Process<T: Real> {
    spread: Spread<T>,
    mean: DVector<T>,
    second: DMatrix<T>,
    cross: DMatrix<T>,
    /// K^-1 over N, where the amplitude is to be estimated.
    likelihood: Option<DMatrix<T>>,
    /// s^2 where it is given.
    amplitude: T,
    left: T,
    /// A matrix times d_j.
    weighted: DVector<T>,
    unit_cross: DVector<T>,
}

impl<T: Real> Process<T> {
    fn new(nodes: &DMatrix<f64>, weights: &Weights, amplitude: Option<f64>, p: usize) -> Self {
        let (n, a) = nodes.shape();
        Self {
            spread: Spread::new(nodes, p),
            mean: weights.mean.map(T::rounded),
            second: weights.second.map(T::rounded),
            cross: weights.cross.map(T::rounded),
            likelihood: amplitude.is_none().then(|| weights.inverse.map(|v| T::rounded(v / weights.count))),
            amplitude: T::rounded(amplitude.unwrap_or(0.0).powi(2)),
            left: T::rounded(weights.left),
            weighted: DVector::zeros(n),
            unit_cross: DVector::zeros(a),
        }
    }
}

impl<T: Real> Transform for Process<T> {
    fn apply(&mut self, problem: Problem<'_>, moments: &mut Moments) {
        let (a, p) = (self.cross.nrows(), self.spread.deviations.ncols());
        problem.assert_fits(a, p, moments);
        self.spread.evaluate(problem);
        let (zero, one) = (T::rounded(0.0), T::rounded(1.0));
        for (j, output) in problem.sensor.outputs().iter().enumerate() {
            let d = self.spread.deviations.column(j);
            let shift = d.dot(&self.mean);
            moments.mean[j] = self.spread.mean(j, shift, output.angular);
            let square = match &self.likelihood {
                Some(likelihood) => {
                    self.weighted.gemv(one, likelihood, &d, zero);
                    d.dot(&self.weighted)
                }
                None => self.amplitude,
            };
            self.weighted.gemv(one, &self.second, &d, zero);
            for l in 0..=j {
                let other = self.spread.deviations.column(l);
                let s = other.dot(&self.weighted) - shift * other.dot(&self.mean);
                let s = if l == j { s + square * self.left } else { s };
                moments.covariance[(j, l)] = (s + T::rounded(problem.noise[(j, l)])).widened();
                moments.covariance[(l, j)] = (s + T::rounded(problem.noise[(l, j)])).widened();
            }
            self.unit_cross.gemv(one, &self.cross, &d, zero);
            self.spread.placed.write_cross(&self.unit_cross, j, &mut moments.cross_covariance);
        }
    }
}
