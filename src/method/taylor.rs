use nalgebra::{DMatrix, DVector};
use serde::{Deserialize, Serialize};

use super::{BuildError, Method, Problem, Refusal, Transform};
use crate::gaussian::{Moments, wrap};
use crate::sensor::{Derivatives, Output};

/// First-order Taylor expansion at the mean, as in the extended Kalman filter: with J = h'(m) (p x a),
///
/// ```text
/// mu = h(m),  S = J P J' + R,  C = P J'
/// ```
///
/// Mean and covariance are exact for polynomials of degree 1, the cross-covariance for degree 2: there
/// Cov(x, y) = P E\[h'\]' (Stein's identity), and a linear h' has its expectation at the mean. One Jacobian a
/// transform.
///
/// Source: A. H. Jazwinski, Stochastic Processes and Filtering Theory (Academic Press, 1970), ch. 8 (chapter
/// from memory).
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct FirstOrderTaylor;

/// Second-order Taylor expansion at the mean under a Gaussian prior: with the Hessians H_i (a x a) of the
/// outputs,
///
/// ```text
/// mu_i = h_i(m) + 1/2 tr(H_i P),  S_ij = (J P J')_ij + 1/2 tr(H_i P H_j P) + R_ij,  C = P J'
/// ```
///
/// All three are exact for polynomials of degree 2; the mean even for degree 3, whose third central moments
/// vanish. One set of Hessians a transform.
///
/// Source: M. Athans, R. P. Wishner, A. Bertolini, "Suboptimal state estimation for continuous-time nonlinear
/// systems from discrete noisy measurements", IEEE Trans. Automatic Control 13 (1968) 504-514.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct SecondOrderTaylor;

/// A Taylor expansion has no parameter.
#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Parameters {}

impl FirstOrderTaylor {
    pub(super) fn from_parameters(_: Parameters) -> Result<Self, BuildError> {
        Ok(Self)
    }
}

impl SecondOrderTaylor {
    pub(super) fn from_parameters(_: Parameters) -> Result<Self, BuildError> {
        Ok(Self)
    }
}

impl Method for FirstOrderTaylor {
    fn plan(&self, a: usize, p: usize) -> Result<Box<dyn Transform>, Refusal> {
        Refusal::unless_something_is_read(a)?;
        Ok(Box::new(FirstOrder { value: DVector::zeros(p), jacobian: DMatrix::zeros(p, a) }))
    }
}

impl Method for SecondOrderTaylor {
    fn plan(&self, a: usize, p: usize) -> Result<Box<dyn Transform>, Refusal> {
        Refusal::unless_something_is_read(a)?;
        Ok(Box::new(SecondOrder { at: Derivatives::zeros(a, p), bends: vec![DMatrix::zeros(a, a); p] }))
    }
}

#[derive(Debug)]
struct FirstOrder {
    value: DVector<f64>,
    jacobian: DMatrix<f64>,
}

impl Transform for FirstOrder {
    fn apply(&mut self, problem: Problem<'_>, moments: &mut Moments) {
        let (p, a) = self.jacobian.shape();
        problem.assert_fits(a, p, moments);
        let at = problem.prior.mean().as_slice();
        problem.sensor.jacobian(at, self.value.as_mut_slice(), &mut self.jacobian);
        for (j, output) in problem.sensor.outputs().iter().enumerate() {
            moments.mean[j] = landed(output, self.value[j]);
        }
        write_linear_part(problem, &self.jacobian, moments);
    }
}

#[derive(Debug)]
struct SecondOrder {
    at: Derivatives,
    /// H_i P.
    bends: Vec<DMatrix<f64>>,
}

impl Transform for SecondOrder {
    fn apply(&mut self, problem: Problem<'_>, moments: &mut Moments) {
        let (p, a) = self.at.jacobian.shape();
        problem.assert_fits(a, p, moments);
        problem.sensor.hessians(problem.prior.mean().as_slice(), &mut self.at);
        write_linear_part(problem, &self.at.jacobian, moments);
        for (bend, hessian) in self.bends.iter_mut().zip(&self.at.hessians) {
            write_product(hessian, problem.prior.covariance(), bend);
        }
        for (j, output) in problem.sensor.outputs().iter().enumerate() {
            moments.mean[j] = landed(output, self.at.value[j] + 0.5 * self.bends[j].trace());
            for i in 0..=j {
                let spread = 0.5 * trace_of_product(&self.bends[i], &self.bends[j]);
                moments.covariance[(i, j)] += spread;
                if i != j {
                    moments.covariance[(j, i)] += spread;
                }
            }
        }
    }
}

fn landed(output: &Output, value: f64) -> f64 {
    if output.angular { wrap(value) } else { value }
}

/// C = P J' and S = J C + R. Plain loops: the matrices are small, and the library's product allocates once
/// all dimensions are above five.
fn write_linear_part(problem: Problem<'_>, jacobian: &DMatrix<f64>, moments: &mut Moments) {
    let (p, a) = jacobian.shape();
    let covariance = problem.prior.covariance();
    for j in 0..p {
        for i in 0..a {
            moments.cross_covariance[(i, j)] = (0..a).map(|k| covariance[(i, k)] * jacobian[(j, k)]).sum();
        }
        for i in 0..=j {
            let s: f64 = (0..a).map(|k| jacobian[(i, k)] * moments.cross_covariance[(k, j)]).sum();
            moments.covariance[(i, j)] = s + problem.noise[(i, j)];
            moments.covariance[(j, i)] = s + problem.noise[(j, i)];
        }
    }
}

fn write_product(left: &DMatrix<f64>, right: &DMatrix<f64>, product: &mut DMatrix<f64>) {
    let n = left.nrows();
    for j in 0..n {
        for i in 0..n {
            product[(i, j)] = (0..n).map(|k| left[(i, k)] * right[(k, j)]).sum();
        }
    }
}

fn trace_of_product(left: &DMatrix<f64>, right: &DMatrix<f64>) -> f64 {
    let n = left.nrows();
    (0..n).map(|i| (0..n).map(|k| left[(i, k)] * right[(k, i)]).sum::<f64>()).sum()
}
