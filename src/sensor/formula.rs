use std::fmt::Debug;

use nalgebra::DMatrix;
use smallvec::SmallVec;

use super::{Derivatives, ExactMoments, Number, Output, Real, derivatives};
use crate::gaussian::Gaussian;
use crate::lanes::{Lanes, Level, Simd, Task, dispatch};

/// A measurement function as its author writes it: once, generic over the number.
///
/// The formula sees only the state components that it reads, in the order of [`Formula::reads`], so the same
/// code serves a position anywhere in a state of any size.
pub trait Formula: Debug + Send + Sync {
    /// How many inputs the sensor can have, if not any number: derivatives are compiled for these alone, so that many sensors
    /// compile quickly. With another number derivatives are as exact, but slower.
    const INPUTS: &'static [usize] = &[];

    /// Which components of state and noise inside are read (indices from 0, each once): the inputs of
    /// [`Formula::evaluate`].
    fn reads(&self) -> &[usize];

    /// Names of the noise variables v inside y = h(x, v), none unless told. Variable k is component n + k of
    /// [`Formula::reads`], after the n of the state.
    fn noise(&self) -> &[String] {
        &[]
    }

    /// The p outputs, in order.
    fn outputs(&self) -> &[Output];

    /// The prior's spread against the sensor's own length, without unit: such as the largest standard deviation of a position
    /// over its range. It sees a singularity of h that lies a few standard deviations away and that no derivative at the mean
    /// can see. `prior` is that of the read components; `None`, unless told, where the sensor has no such length.
    fn natural_spread(&self, prior: &Gaussian) -> Option<f64> {
        let _ = prior;
        None
    }

    /// Writes h at the read components `x` into `y` (p).
    ///
    /// Mark it `#[inline(always)]`: only what is inlined into the sampling loop is compiled for the vector
    /// instructions of a [`Level`]; left apart, a sample of a three-dimensional sensor took thirteen times as long
    /// with AVX2.
    ///
    /// # Panics
    /// May panic if `x` or `y` is shorter than [`Formula::reads`] or [`Formula::outputs`].
    fn evaluate<T: Number>(&self, x: &[T], y: &mut [T]);

    /// Its moments in closed form, if it has them.
    fn exact_moments(&self) -> Option<&dyn ExactMoments> {
        None
    }

    /// [`Formula::evaluate`] at `length` points, a multiple of eight, eight at a time; laid out as in [`Sensor::values`].
    /// A formula that is not compiled may know a faster order of work.
    #[inline(always)]
    fn evaluate_block<S: Simd>(&self, length: usize, x: &[f64], y: &mut [f64]) {
        let mut point: SmallVec<[Lanes<S>; 8]> = SmallVec::from_elem(Lanes::splat(0.0), self.reads().len());
        let mut output: SmallVec<[Lanes<S>; 8]> = SmallVec::from_elem(Lanes::splat(0.0), self.outputs().len());
        let (point, output) = (point.as_mut_slice(), output.as_mut_slice());
        for k in (0..length).step_by(8) {
            for (coordinate, column) in point.iter_mut().zip(x.chunks_exact(length)) {
                if let Some(eight) = column[k..].first_chunk() {
                    *coordinate = Lanes::from_array(eight);
                }
            }
            self.evaluate(point, output);
            for (value, column) in output.iter().zip(y.chunks_exact_mut(length)) {
                column[k..k + 8].copy_from_slice(&value.to_array());
            }
        }
    }
}

/// A measurement function as the rest of the program uses it. Every [`Formula`] is one.
///
/// `x` always holds the read components only (a of them), `y` the p outputs.
pub trait Sensor: Debug + Send + Sync {
    /// Which state components are read: indices from 0, each once.
    fn reads(&self) -> &[usize];

    /// Names of the noise variables inside, as [`Formula::noise`].
    fn noise(&self) -> &[String];

    /// The p outputs, in order.
    fn outputs(&self) -> &[Output];

    /// The prior's spread against the sensor's own length, as [`Formula::natural_spread`].
    fn natural_spread(&self, prior: &Gaussian) -> Option<f64>;

    /// Its moments in closed form, if it has them.
    fn exact_moments(&self) -> Option<&dyn ExactMoments>;

    /// Writes h(x) into `y` (p).
    fn value(&self, x: &[f64], y: &mut [f64]);

    /// Writes h of `length` points into `y`: both lie one array a coordinate, coordinate i of point k at
    /// `i * length + k`.
    fn values(&self, length: usize, x: &[f64], y: &mut [f64]);

    /// As [`Sensor::values`], eight points at a time with the instructions of `level` and our own elementary
    /// functions: the same bits at every level, though not always those of [`Sensor::values`], which asks the
    /// machine's mathematical library. `length` is a multiple of eight.
    ///
    /// # Panics
    /// If `length` is no multiple of eight, or this machine does not have `level`.
    fn sample(&self, level: Level, length: usize, x: &[f64], y: &mut [f64]);

    /// Writes h(x) into `y` and the exact Jacobian dh_j/dx_i into `jacobian` (p x a).
    fn jacobian(&self, x: &[f64], y: &mut [f64], jacobian: &mut DMatrix<f64>);

    /// Writes value, exact Jacobian and exact Hessians at x.
    fn hessians(&self, x: &[f64], at: &mut Derivatives);

    /// [`Sensor::values`] in single precision, the sensor's parameters rounded too.
    fn values_single(&self, length: usize, x: &[f32], y: &mut [f32]);

    /// [`Sensor::jacobian`] in single precision: exact but for its rounding.
    fn jacobian_single(&self, x: &[f32], y: &mut [f32], jacobian: &mut DMatrix<f32>);

    /// [`Sensor::hessians`] in single precision: exact but for its rounding.
    fn hessians_single(&self, x: &[f32], at: &mut Derivatives<f32>);
}

impl<F: Formula> Sensor for F {
    fn reads(&self) -> &[usize] {
        Formula::reads(self)
    }

    fn noise(&self) -> &[String] {
        Formula::noise(self)
    }

    fn outputs(&self) -> &[Output] {
        Formula::outputs(self)
    }

    fn natural_spread(&self, prior: &Gaussian) -> Option<f64> {
        Formula::natural_spread(self, prior)
    }

    fn exact_moments(&self) -> Option<&dyn ExactMoments> {
        Formula::exact_moments(self)
    }

    fn value(&self, x: &[f64], y: &mut [f64]) {
        self.evaluate(x, y);
    }

    fn values(&self, length: usize, x: &[f64], y: &mut [f64]) {
        one_by_one(self, length, x, y);
    }

    fn sample(&self, level: Level, length: usize, x: &[f64], y: &mut [f64]) {
        assert_eq!(length % 8, 0, "points are sampled eight at a time");
        dispatch(level, Evaluate { formula: self, length, x, y });
    }

    fn jacobian(&self, x: &[f64], y: &mut [f64], jacobian: &mut DMatrix<f64>) {
        derivatives::jacobian(self, x, y, jacobian);
    }

    fn hessians(&self, x: &[f64], at: &mut Derivatives) {
        derivatives::hessians(self, x, at);
    }

    fn values_single(&self, length: usize, x: &[f32], y: &mut [f32]) {
        one_by_one(self, length, x, y);
    }

    fn jacobian_single(&self, x: &[f32], y: &mut [f32], jacobian: &mut DMatrix<f32>) {
        derivatives::jacobian(self, x, y, jacobian);
    }

    fn hessians_single(&self, x: &[f32], at: &mut Derivatives<f32>) {
        derivatives::hessians(self, x, at);
    }
}

/// h of `length` points, laid out as in [`Sensor::values`].
fn one_by_one<F: Formula, T: Real>(formula: &F, length: usize, x: &[T], y: &mut [T]) {
    let mut point: SmallVec<[T; 8]> = SmallVec::from_elem(T::constant(0.0), formula.reads().len());
    let mut output: SmallVec<[T; 8]> = SmallVec::from_elem(T::constant(0.0), formula.outputs().len());
    // Plain slices: through the small vectors each access would ask again where the numbers are kept.
    let (point, output) = (point.as_mut_slice(), output.as_mut_slice());
    for k in 0..length {
        for (coordinate, column) in point.iter_mut().zip(x.chunks_exact(length)) {
            *coordinate = column[k];
        }
        formula.evaluate(point, output);
        for (value, column) in output.iter().zip(y.chunks_exact_mut(length)) {
            column[k] = *value;
        }
    }
}

/// A block of points through a formula.
struct Evaluate<'a, F> {
    formula: &'a F,
    length: usize,
    x: &'a [f64],
    y: &'a mut [f64],
}

impl<F: Formula> Task for Evaluate<'_, F> {
    type Output = ();

    #[inline(always)]
    fn run<S: Simd>(self) {
        self.formula.evaluate_block::<S>(self.length, self.x, self.y);
    }
}
