use std::fmt::Debug;

use nalgebra::{DMatrix, RealField};
use num_dual::{DualNum, DualNumFloat};

use super::{Derivatives, Number, Sensor};
use crate::gaussian::wrap;

/// The arithmetic that a method runs in.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Arithmetic {
    /// IEEE 754 binary64: 53 bits, steps of 1.1e-16.
    #[default]
    Double,
    /// IEEE 754 binary32: 24 bits, steps of 6.0e-8, as on a controller without a unit for doubles.
    Single,
}

/// A plain number of one [`Arithmetic`], `f64` or `f32`: what a transform is written over.
pub trait Real: Number + DualNumFloat + DualNum<Primitive = Self> + RealField {
    /// `value`, rounded to the nearest.
    fn rounded(value: f64) -> Self {
        Self::constant(value)
    }

    /// The same number in double precision.
    fn widened(self) -> f64;

    /// The angle wrapped to (-pi, pi], as [`wrap`].
    fn wrapped(self) -> Self {
        Self::rounded(wrap(self.widened()))
    }

    /// [`Sensor::values`] in this arithmetic.
    fn values(sensor: &dyn Sensor, length: usize, x: &[Self], y: &mut [Self]);

    /// [`Sensor::jacobian`] in this arithmetic.
    fn jacobian(sensor: &dyn Sensor, x: &[Self], y: &mut [Self], jacobian: &mut DMatrix<Self>);

    /// [`Sensor::hessians`] in this arithmetic.
    fn hessians(sensor: &dyn Sensor, x: &[Self], at: &mut Derivatives<Self>);
}

impl Real for f64 {
    fn widened(self) -> f64 {
        self
    }

    fn values(sensor: &dyn Sensor, length: usize, x: &[f64], y: &mut [f64]) {
        sensor.values(length, x, y);
    }

    fn jacobian(sensor: &dyn Sensor, x: &[f64], y: &mut [f64], jacobian: &mut DMatrix<f64>) {
        sensor.jacobian(x, y, jacobian);
    }

    fn hessians(sensor: &dyn Sensor, x: &[f64], at: &mut Derivatives) {
        sensor.hessians(x, at);
    }
}

impl Real for f32 {
    fn widened(self) -> f64 {
        self.into()
    }

    fn values(sensor: &dyn Sensor, length: usize, x: &[f32], y: &mut [f32]) {
        sensor.values_single(length, x, y);
    }

    fn jacobian(sensor: &dyn Sensor, x: &[f32], y: &mut [f32], jacobian: &mut DMatrix<f32>) {
        sensor.jacobian_single(x, y, jacobian);
    }

    fn hessians(sensor: &dyn Sensor, x: &[f32], at: &mut Derivatives<f32>) {
        sensor.hessians_single(x, at);
    }
}
