use std::sync::atomic::{AtomicU64, Ordering};

use nalgebra::DMatrix;

use crate::gaussian::Gaussian;
use crate::lanes::Level;
use crate::sensor::{Derivatives, Output, Sensor};

/// How often a sensor was asked, and for what.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct Evaluations {
    /// Plain values h(x); a block of `length` points counts `length`.
    pub values: u64,
    /// Jacobians; the value that comes with one is not counted beside it.
    pub jacobians: u64,
    /// Sets of all p Hessians; the value and the Jacobian that come with one are not counted beside it.
    pub hessians: u64,
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
}

impl<'a> Counted<'a> {
    /// `sensor`, asked nothing yet.
    pub fn new(sensor: &'a dyn Sensor) -> Self {
        Self { sensor, values: 0.into(), jacobians: 0.into(), hessians: 0.into() }
    }

    /// What was asked so far.
    pub fn evaluations(&self) -> Evaluations {
        Evaluations {
            values: self.values.load(Ordering::Relaxed),
            jacobians: self.jacobians.load(Ordering::Relaxed),
            hessians: self.hessians.load(Ordering::Relaxed),
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
