//! Every operation of a number: derivatives by dual numbers against differences, lanes against plain numbers.

use gaussworthy::lanes::{Lanes, Level, Simd, Task, dispatch};
use gaussworthy::sensor::{Derivatives, Formula, Number, Output, Sensor};
use nalgebra::DMatrix;

/// One operation of a curved function of `inputs` numbers: 2 are differentiated whole, 7 in pairs.
#[derive(Debug)]
struct Operation<const WHICH: usize> {
    reads: Vec<usize>,
    outputs: [Output; 1],
}

impl<const WHICH: usize> Operation<WHICH> {
    fn new(inputs: usize) -> Self {
        Self { reads: (0..inputs).collect(), outputs: [Output::plain("value", "1")] }
    }
}

const OPERATIONS: usize = 14;

#[inline(always)]
fn operation<T: Number>(which: usize, u: T) -> T {
    let half = T::constant(0.5);
    match which {
        0 => u.sqrt(),
        1 => u.sin(),
        2 => u.cos(),
        3 => u.atan2(u * u - half),
        4 => u.hypot(u * u - half),
        5 => u.tan(),
        6 => u.exp(),
        7 => u.ln(),
        8 => u.tanh(),
        9 => (u - T::constant(2.0)).abs() * u,
        10 => (-u).powi(3),
        11 => (-u).powi(-2),
        12 => u.powf(2.7),
        _ => (-u).powf(4.0),
    }
}

impl<const WHICH: usize> Formula for Operation<WHICH> {
    fn reads(&self) -> &[usize] {
        &self.reads
    }

    fn outputs(&self) -> &[Output] {
        &self.outputs
    }

    #[inline(always)]
    fn evaluate<T: Number>(&self, x: &[T], y: &mut [T]) {
        let mut u = x[0] * x[1];
        for (i, &x) in x.iter().enumerate() {
            u = u + T::constant(0.1 * (i + 1) as f64) * x;
        }
        y[0] = operation(WHICH, u);
    }
}

/// Central differences with step 1e-4 err by some 1e-8 (third derivatives here are below 100), second differences by
/// as much and by rounding, 1e-16 / 1e-8.
const TOLERANCE: f64 = 1e-5;

fn check_derivatives<const WHICH: usize>() {
    for inputs in [2, 7] {
        let sensor = Operation::<WHICH>::new(inputs);
        let x: Vec<f64> = (0..inputs).map(|i| 0.9 - 0.07 * i as f64).collect();
        let value = |x: &[f64]| {
            let mut y = [0.0];
            sensor.value(x, &mut y);
            y[0]
        };
        let moved = |moves: &[(usize, f64)]| {
            let mut x = x.clone();
            for &(i, step) in moves {
                x[i] += step;
            }
            value(&x)
        };
        let mut y = [0.0];
        let mut jacobian = DMatrix::zeros(1, inputs);
        sensor.jacobian(&x, &mut y, &mut jacobian);
        let mut at = Derivatives::zeros(inputs, 1);
        sensor.hessians(&x, &mut at);
        assert!((y[0] - value(&x)).abs() < 1e-14 * value(&x).abs(), "value {WHICH}");
        assert!((at.value[0] - value(&x)).abs() < 1e-14 * value(&x).abs(), "value {WHICH}");
        let h = 1e-4;
        for i in 0..inputs {
            let slope = (moved(&[(i, h)]) - moved(&[(i, -h)])) / (2.0 * h);
            let scale = 1.0 + slope.abs();
            assert!((jacobian[(0, i)] - slope).abs() < TOLERANCE * scale, "operation {WHICH}, d/dx{i}");
            assert!((at.jacobian[(0, i)] - slope).abs() < TOLERANCE * scale, "operation {WHICH}, d/dx{i}");
            for k in 0..inputs {
                let bend = (moved(&[(i, h), (k, h)]) - moved(&[(i, h), (k, -h)]) - moved(&[(i, -h), (k, h)])
                    + moved(&[(i, -h), (k, -h)]))
                    / (4.0 * h * h);
                let off = (at.hessians[0][(i, k)] - bend).abs();
                assert!(off < TOLERANCE * (1.0 + bend.abs()), "operation {WHICH}, d2/dx{i}dx{k}: {off:e}");
            }
        }
    }
}

struct InLanes<'a, F>(&'a F, &'a [[f64; 8]; 2]);

impl<F: Formula> Task for InLanes<'_, F> {
    type Output = [f64; 8];

    #[inline(always)]
    fn run<S: Simd>(self) -> [f64; 8] {
        let x = [Lanes::<S>::from_array(&self.1[0]), Lanes::from_array(&self.1[1])];
        let mut y = [Lanes::splat(0.0)];
        self.0.evaluate(&x, &mut y);
        y[0].to_array()
    }
}

/// Both are within a few units in the last place, and a rounding of the argument counts no more than tenfold here.
fn check_lanes<const WHICH: usize>() {
    let sensor = Operation::<WHICH>::new(2);
    let x: [[f64; 8]; 2] =
        [std::array::from_fn(|i| 0.5 + 0.1 * i as f64), std::array::from_fn(|i| 0.9 - 0.05 * i as f64)];
    for level in Level::available() {
        let lanes = dispatch(level, InLanes(&sensor, &x));
        for (i, ours) in lanes.iter().enumerate() {
            let mut y = [0.0];
            sensor.value(&[x[0][i], x[1][i]], &mut y);
            assert!((ours - y[0]).abs() <= 1e-14 * y[0].abs(), "operation {WHICH}, {level}: {ours}, {}", y[0]);
        }
    }
}

macro_rules! every_operation {
    ($check:ident: $($which:literal)*) => {
        $( $check::<$which>(); )*
        assert_eq!([$($which),*].len(), OPERATIONS);
    };
}

#[test]
fn derivatives_agree_with_differences() {
    every_operation!(check_derivatives: 0 1 2 3 4 5 6 7 8 9 10 11 12 13);
}

#[test]
fn lanes_agree_with_plain_numbers() {
    every_operation!(check_lanes: 0 1 2 3 4 5 6 7 8 9 10 11 12 13);
}

/// Value, slope and second derivative of an operation of one number at `x`.
fn at(x: f64, operation: impl Fn(num_dual::Dual2SVec64<1>) -> num_dual::Dual2SVec64<1>) -> [f64; 3] {
    use nalgebra::{Const, U1};
    let y = operation(num_dual::Dual2SVec64::<1>::from_re(x).derivative(0));
    [y.re, y.v1.unwrap_generic(U1, Const::<1>)[0], y.v2.unwrap_generic(Const::<1>, Const::<1>)[0]]
}

#[test]
fn powers_and_sizes_at_zero_and_below_are_what_calculus_says() {
    assert_eq!(at(0.0, |x| Number::powi(x, 0)), [1.0, 0.0, 0.0]);
    assert_eq!(at(0.0, |x| Number::powi(x, 1)), [0.0, 1.0, 0.0]);
    assert_eq!(at(0.0, |x| Number::powi(x, 2)), [0.0, 0.0, 2.0]);
    assert_eq!(at(0.0, |x| Number::powf(x, 2.0)), [0.0, 0.0, 2.0]);
    assert_eq!(at(0.0, |x| Number::powf(x, 3.0)), [0.0, 0.0, 0.0]);
    assert_eq!(at(-2.0, |x| Number::powf(x, 3.0)), [-8.0, 12.0, -12.0]);
    assert_eq!(at(-2.0, |x| Number::powi(x, -1)), [-0.5, -0.25, -0.25]);
    assert!(at(-2.0, |x| Number::powf(x, 0.5)).iter().all(|v| v.is_nan()));
    assert_eq!(at(-3.0, Number::abs), [3.0, -1.0, 0.0]);
    let [value, slope, bend] = at(0.0, Number::abs);
    assert!(value == 0.0 && slope.is_nan() && bend.is_nan());
    // The square root's slope at zero is infinite; the value stays.
    assert_eq!(at(0.0, |x| Number::powf(x, 0.5))[0], 0.0);
    assert_eq!(at(800.0, Number::tanh), [1.0, 0.0, 0.0]);
}
