use nalgebra::{DMatrix, DVector};

use super::kinds::{Kind, NoParameters, built};
use super::{Exactness, Method, Problem, Refusal, Transform};
use crate::gaussian::{Gaussian, Moments};
use crate::sensor::{Arithmetic, Derivatives, Output, Real};

pub(super) const FIRST: Kind = Kind {
    id: "taylor-1",
    name: "first-order Taylor (extended Kalman filter)",
    parameters: "none",
    evaluations: "1 Jacobian",
    source: "Jazwinski 1970",
    examples: &[],
    build: |map| built(map, |_: NoParameters| Ok(FirstOrderTaylor)),
};

pub(super) const SECOND: Kind = Kind {
    id: "taylor-2",
    name: "second-order Taylor",
    parameters: "none",
    evaluations: "1 Hessian set",
    source: "Athans, Wishner, Bertolini 1968",
    examples: &[],
    build: |map| built(map, |_: NoParameters| Ok(SecondOrderTaylor)),
};

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

impl Method for FirstOrderTaylor {
    fn plan(&self, a: usize, p: usize, arithmetic: Arithmetic) -> Result<Box<dyn Transform>, Refusal> {
        Refusal::unless_something_is_read(a)?;
        Ok(match arithmetic {
            Arithmetic::Double => Box::new(FirstOrder::<f64>::new(a, p)),
            Arithmetic::Single => Box::new(FirstOrder::<f32>::new(a, p)),
        })
    }

    fn exactness(&self) -> Option<Exactness> {
        Some(Exactness::up_to(1, 2, 1))
    }
}

impl Method for SecondOrderTaylor {
    fn plan(&self, a: usize, p: usize, arithmetic: Arithmetic) -> Result<Box<dyn Transform>, Refusal> {
        Refusal::unless_something_is_read(a)?;
        Ok(match arithmetic {
            Arithmetic::Double => Box::new(SecondOrder::<f64>::new(a, p)),
            Arithmetic::Single => Box::new(SecondOrder::<f32>::new(a, p)),
        })
    }

    fn exactness(&self) -> Option<Exactness> {
        Some(Exactness::up_to(3, 2, 2))
    }
}

#[derive(Debug)]
struct FirstOrder<T: Real> {
    linear: Linear<T>,
    value: DVector<T>,
    jacobian: DMatrix<T>,
}

impl<T: Real> FirstOrder<T> {
    fn new(a: usize, p: usize) -> Self {
        Self { linear: Linear::new(a, p), value: DVector::zeros(p), jacobian: DMatrix::zeros(p, a) }
    }
}

impl<T: Real> Transform for FirstOrder<T> {
    fn apply(&mut self, problem: Problem<'_>, moments: &mut Moments) {
        let (p, a) = self.jacobian.shape();
        problem.assert_fits(a, p, moments);
        self.linear.take_prior(problem.prior);
        T::jacobian(problem.sensor, self.linear.mean.as_slice(), self.value.as_mut_slice(), &mut self.jacobian);
        for (j, output) in problem.sensor.outputs().iter().enumerate() {
            moments.mean[j] = landed(output, self.value[j]);
        }
        self.linear.propagate(problem.noise, &self.jacobian);
        self.linear.write(moments);
    }
}

#[derive(Debug)]
struct SecondOrder<T: Real> {
    linear: Linear<T>,
    at: Derivatives<T>,
    /// H_i P.
    bends: Vec<DMatrix<T>>,
}

impl<T: Real> SecondOrder<T> {
    fn new(a: usize, p: usize) -> Self {
        Self { linear: Linear::new(a, p), at: Derivatives::zeros(a, p), bends: vec![DMatrix::zeros(a, a); p] }
    }
}

impl<T: Real> Transform for SecondOrder<T> {
    fn apply(&mut self, problem: Problem<'_>, moments: &mut Moments) {
        let (p, a) = self.at.jacobian.shape();
        problem.assert_fits(a, p, moments);
        self.linear.take_prior(problem.prior);
        T::hessians(problem.sensor, self.linear.mean.as_slice(), &mut self.at);
        self.linear.propagate(problem.noise, &self.at.jacobian);
        for (bend, hessian) in self.bends.iter_mut().zip(&self.at.hessians) {
            write_product(hessian, &self.linear.prior, bend);
        }
        let half = T::rounded(0.5);
        for (j, output) in problem.sensor.outputs().iter().enumerate() {
            moments.mean[j] = landed(output, self.at.value[j] + half * self.bends[j].trace());
            for i in 0..=j {
                let spread = half * trace_of_product(&self.bends[i], &self.bends[j]);
                self.linear.covariance[(i, j)] += spread;
                if i != j {
                    self.linear.covariance[(j, i)] += spread;
                }
            }
        }
        self.linear.write(moments);
    }
}

fn landed<T: Real>(output: &Output, value: T) -> f64 {
    if output.angular { value.wrapped().widened() } else { value.widened() }
}

/// The linear part of an expansion, and the prior that it starts from, in the arithmetic of the method.
#[derive(Debug)]
struct Linear<T: Real> {
    /// m and P.
    mean: DVector<T>,
    prior: DMatrix<T>,
    /// S and C.
    covariance: DMatrix<T>,
    cross_covariance: DMatrix<T>,
}

impl<T: Real> Linear<T> {
    fn new(a: usize, p: usize) -> Self {
        Self {
            mean: DVector::zeros(a),
            prior: DMatrix::zeros(a, a),
            covariance: DMatrix::zeros(p, p),
            cross_covariance: DMatrix::zeros(a, p),
        }
    }

    fn take_prior(&mut self, prior: &Gaussian) {
        self.mean.zip_apply(prior.mean(), |to, from| *to = T::rounded(from));
        self.prior.zip_apply(prior.covariance(), |to, from| *to = T::rounded(from));
    }

    /// C = P J' and S = J C + R. Plain loops: the matrices are small, and the library's product allocates once
    /// all dimensions are above five.
    fn propagate(&mut self, noise: &DMatrix<f64>, jacobian: &DMatrix<T>) {
        let (p, a) = jacobian.shape();
        for j in 0..p {
            for i in 0..a {
                self.cross_covariance[(i, j)] = sum((0..a).map(|k| self.prior[(i, k)] * jacobian[(j, k)]));
            }
            for i in 0..=j {
                let s = sum((0..a).map(|k| jacobian[(i, k)] * self.cross_covariance[(k, j)]));
                self.covariance[(i, j)] = s + T::rounded(noise[(i, j)]);
                self.covariance[(j, i)] = s + T::rounded(noise[(j, i)]);
            }
        }
    }

    fn write(&self, moments: &mut Moments) {
        moments.covariance.zip_apply(&self.covariance, |to, from| *to = from.widened());
        moments.cross_covariance.zip_apply(&self.cross_covariance, |to, from| *to = from.widened());
    }
}

fn write_product<T: Real>(left: &DMatrix<T>, right: &DMatrix<T>, product: &mut DMatrix<T>) {
    let n = left.nrows();
    for j in 0..n {
        for i in 0..n {
            product[(i, j)] = sum((0..n).map(|k| left[(i, k)] * right[(k, j)]));
        }
    }
}

fn trace_of_product<T: Real>(left: &DMatrix<T>, right: &DMatrix<T>) -> T {
    let n = left.nrows();
    sum((0..n).map(|i| sum((0..n).map(|k| left[(i, k)] * right[(k, i)]))))
}

fn sum<T: Real>(terms: impl Iterator<Item = T>) -> T {
    terms.fold(T::rounded(0.0), |sum, term| sum + term)
}
