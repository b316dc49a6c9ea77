use std::sync::atomic::{AtomicU64, Ordering};

use nalgebra::{DMatrix, DVector};

use super::{Method, Problem, Refusal};
use crate::gaussian::{Gaussian, Moments};
use crate::lanes::Level;
use crate::sensor::{Arithmetic, Derivatives, ExactMoments, Linear, Output, Sensor};

/// How often a sensor was asked, and for what.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct Evaluations {
    /// Plain values h(x); a block of `length` points counts `length`.
    pub values: u64,
    /// Jacobians; the value that comes with one is not counted beside it.
    pub jacobians: u64,
    /// Sets of all p Hessians; the value and the Jacobian that come with one are not counted beside it.
    pub hessians: u64,
    /// Sets of exact moments.
    pub exact_moments: u64,
}

impl Evaluations {
    /// What it takes in numbers that a sensor of `inputs` inputs would have to compute, without unit: 1 a value, 1 + a a Jacobian,
    /// 1 + a + a (a + 1) / 2 a set of Hessians or of exact moments.
    ///
    /// Common practice, no source: what differences would cost. Unlike a time it is the same on every machine.
    pub fn work(&self, inputs: usize) -> u64 {
        let a = inputs as u64;
        self.values + self.jacobians * (1 + a) + (self.hessians + self.exact_moments) * (1 + a + a * (a + 1) / 2)
    }

    /// What one transform of `method` asks of a sensor that reads `a` components and has no angular output, counted on one.
    ///
    /// # Errors
    /// [`Refusal`] if the method does not serve `a` components.
    pub fn of(method: &dyn Method, a: usize) -> Result<Self, Refusal> {
        let sensor = Linear::new(vec![vec![1.0; a]], vec![0.0], a).map_err(|e| Refusal(e.to_string()))?;
        let prior =
            Gaussian::new(DVector::zeros(a), DMatrix::identity(a, a)).map_err(|e| Refusal(e.to_string()))?;
        let counted = Counted::new(&sensor);
        let mut transform = method.plan(a, 1, Arithmetic::Double)?;
        let problem = Problem { sensor: &counted, prior: &prior, noise: &DMatrix::zeros(1, 1) };
        transform.apply(problem, &mut Moments::zeros(a, 1));
        Ok(counted.evaluations())
    }
}

/// A sensor that counts what is asked of it.
///
/// ```
/// use gaussworthy::method::Counted;
/// use gaussworthy::sensor::{RangeBearing, Sensor};
/// let radar = RangeBearing::new(vec![[0.0, 0.0]], [0, 1], 2).unwrap();
/// let counted = Counted::new(&radar);
/// counted.value(&[3.0, 4.0], &mut [0.0; 2]);
/// counted.values(2, &[3.0, 6.0, 4.0, 8.0], &mut [0.0; 4]);
/// assert_eq!(counted.evaluations().values, 3);
/// ```
#[derive(Debug)]
pub struct Counted<'a> {
    sensor: &'a dyn Sensor,
    values: AtomicU64,
    jacobians: AtomicU64,
    hessians: AtomicU64,
    exact_moments: AtomicU64,
}

impl<'a> Counted<'a> {
    /// `sensor`, asked nothing yet.
    pub fn new(sensor: &'a dyn Sensor) -> Self {
        Self { sensor, values: 0.into(), jacobians: 0.into(), hessians: 0.into(), exact_moments: 0.into() }
    }

    /// What was asked so far.
    pub fn evaluations(&self) -> Evaluations {
        Evaluations {
            values: self.values.load(Ordering::Relaxed),
            jacobians: self.jacobians.load(Ordering::Relaxed),
            hessians: self.hessians.load(Ordering::Relaxed),
            exact_moments: self.exact_moments.load(Ordering::Relaxed),
        }
    }
}

impl Sensor for Counted<'_> {
    fn reads(&self) -> &[usize] {
        self.sensor.reads()
    }

    fn noise(&self) -> &[String] {
        self.sensor.noise()
    }

    fn outputs(&self) -> &[Output] {
        self.sensor.outputs()
    }

    fn natural_spread(&self, prior: &Gaussian) -> Option<f64> {
        self.sensor.natural_spread(prior)
    }

    fn exact_moments(&self) -> Option<&dyn ExactMoments> {
        self.sensor.exact_moments().map(|_| self as &dyn ExactMoments)
    }

    fn value(&self, x: &[f64], y: &mut [f64]) {
        self.values.fetch_add(1, Ordering::Relaxed);
        self.sensor.value(x, y);
    }

    fn values(&self, length: usize, x: &[f64], y: &mut [f64]) {
        self.values.fetch_add(length as u64, Ordering::Relaxed);
        self.sensor.values(length, x, y);
    }

    fn sample(&self, level: Level, length: usize, x: &[f64], y: &mut [f64]) {
        self.values.fetch_add(length as u64, Ordering::Relaxed);
        self.sensor.sample(level, length, x, y);
    }

    fn jacobian(&self, x: &[f64], y: &mut [f64], jacobian: &mut DMatrix<f64>) {
        self.jacobians.fetch_add(1, Ordering::Relaxed);
        self.sensor.jacobian(x, y, jacobian);
    }

    fn hessians(&self, x: &[f64], at: &mut Derivatives) {
        self.hessians.fetch_add(1, Ordering::Relaxed);
        self.sensor.hessians(x, at);
    }
    fn values_single(&self, length: usize, x: &[f32], y: &mut [f32]) {
        self.values.fetch_add(length as u64, Ordering::Relaxed);
        self.sensor.values_single(length, x, y);
    }

    fn jacobian_single(&self, x: &[f32], y: &mut [f32], jacobian: &mut DMatrix<f32>) {
        self.jacobians.fetch_add(1, Ordering::Relaxed);
        self.sensor.jacobian_single(x, y, jacobian);
    }

    fn hessians_single(&self, x: &[f32], at: &mut Derivatives<f32>) {
        self.hessians.fetch_add(1, Ordering::Relaxed);
        self.sensor.hessians_single(x, at);
    }
}

impl ExactMoments for Counted<'_> {
    fn write_exact(&self, prior: &Gaussian, moments: &mut Moments) {
        if let Some(exact) = self.sensor.exact_moments() {
            self.exact_moments.fetch_add(1, Ordering::Relaxed);
            exact.write_exact(prior, moments);
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn work_counts_what_differences_would_cost() {
        let none = Evaluations::default();
        assert_eq!(Evaluations { values: 5, ..none }.work(2), 5);
        assert_eq!(Evaluations { jacobians: 1, ..none }.work(2), 3);
        assert_eq!(Evaluations { hessians: 1, ..none }.work(2), 6);
        assert_eq!(Evaluations { exact_moments: 1, ..none }.work(6), 28);
    }
}
