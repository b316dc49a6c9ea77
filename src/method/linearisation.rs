use nalgebra::{DMatrix, DVector};

use super::kinds::{Kind, NoParameters, built};
use super::{Degree, Exactness, Method, Problem, Refusal, Transform};
use crate::gaussian::{Gaussian, Moments, Support, cholesky_in_place, wrap};
use crate::sensor::{Arithmetic, Sensor};

pub(super) const KIND: Kind = Kind {
    id: "statistical-linearisation",
    name: "statistical linearisation by exact moments",
    parameters: "none",
    evaluations: "1 set of exact moments",
    source: "Gelb 1974; Roberts, Spanos 1990",
    examples: &[],
    build: |map| built(map, |_: NoParameters| Ok(StatisticalLinearisation)),
};

/// Statistical linearisation: h is replaced by the linear function b + N (x - m) that is nearest to it in mean square under
/// the prior, by the exact moments of the sensor:
///
/// ```text
/// b = E[h(x)],  N = Cov(h(x), x) P^-1
/// mu = b,  S = N P N' + R,  C = P N' = Cov(x, h(x))
/// ```
///
/// Mean and cross-covariance are exact. The covariance is not: what h bends away from the line is left out, so that S
/// is never above the true one, and exact for polynomials of degree 1 alone. On a singular P the inverse is that on its
/// support.
///
/// It serves sensors that know their moments ([`Sensor::exact_moments`]), in double precision.
///
/// Sources: A. Gelb (ed.), Applied Optimal Estimation (MIT Press, 1974), sec. 6.2; J. B. Roberts, P. D. Spanos, Random
/// Vibration and Statistical Linearization (Wiley, 1990) (both from memory).
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct StatisticalLinearisation;

impl Method for StatisticalLinearisation {
    fn plan(&self, a: usize, p: usize, arithmetic: Arithmetic) -> Result<Box<dyn Transform>, Refusal> {
        Refusal::unless_something_is_read(a)?;
        match arithmetic {
            Arithmetic::Double => Ok(Box::new(Linearised {
                root: DMatrix::zeros(a, a),
                column: DVector::zeros(a),
                white: DMatrix::zeros(a, p),
            })),
            Arithmetic::Single => {
                Err(Refusal("the exact moments of sensors are known in double precision only".into()))
            }
        }
    }

    fn serves(&self, sensor: &dyn Sensor) -> Result<(), Refusal> {
        match sensor.exact_moments() {
            Some(_) => Ok(()),
            None => Err(Refusal(
                "this sensor's moments have no closed form here; statistical linearisation needs one".into(),
            )),
        }
    }

    fn exactness(&self) -> Option<Exactness> {
        Some(Exactness { mean: Degree::Every, cross_covariance: Degree::Every, covariance: Degree::UpTo(1) })
    }
}

#[derive(Debug)]
struct Linearised {
    root: DMatrix<f64>,
    column: DVector<f64>,
    /// L^-1 C, a x p.
    white: DMatrix<f64>,
}

impl Linearised {
    /// L^-1 C with P = L L': N P N' = C' P^-1 C is its product with itself.
    fn whiten(&mut self, prior: &Gaussian, cross_covariance: &DMatrix<f64>) {
        let (a, p) = self.white.shape();
        let mut storage = std::mem::replace(&mut self.root, DMatrix::zeros(0, 0));
        storage.copy_from(prior.covariance());
        match cholesky_in_place(storage) {
            Some(lower) => {
                for j in 0..p {
                    self.column.copy_from(&cross_covariance.column(j));
                    lower.solve_lower_triangular_mut(&mut self.column);
                    self.white.set_column(j, &self.column);
                }
                self.root = lower;
            }
            None => {
                let support = Support::of(prior.covariance());
                self.white.fill(0.0);
                self.white.rows_mut(0, support.rank()).copy_from(&(support.whitener() * cross_covariance));
                self.root = DMatrix::zeros(a, a);
            }
        }
    }
}

impl Transform for Linearised {
    /// A sensor that has no closed form gets moments that are no numbers: [`Method::serves`] says so beforehand.
    fn apply(&mut self, problem: Problem<'_>, moments: &mut Moments) {
        let (a, p) = self.white.shape();
        problem.assert_fits(a, p, moments);
        match problem.sensor.exact_moments() {
            Some(exact) => exact.write_exact(problem.prior, moments),
            None => {
                moments.mean.fill(f64::NAN);
                moments.covariance.fill(f64::NAN);
                moments.cross_covariance.fill(f64::NAN);
                return;
            }
        }
        self.whiten(problem.prior, &moments.cross_covariance);
        for (j, output) in problem.sensor.outputs().iter().enumerate() {
            if output.angular {
                moments.mean[j] = wrap(moments.mean[j]);
            }
            for l in 0..=j {
                let s = self.white.column(j).dot(&self.white.column(l));
                moments.covariance[(j, l)] = s + problem.noise[(j, l)];
                moments.covariance[(l, j)] = s + problem.noise[(l, j)];
            }
        }
    }
}
