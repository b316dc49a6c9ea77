//! Every function of lanes beside the standard library's.

use gaussworthy::lanes::{Lanes, Level, Simd, Task, dispatch};

/// A function of one or two numbers (of one: the second is ignored).
pub trait Function {
    const NAME: &'static str;
    /// Greatest error in units in the last place of the true value: what the function's documentation says.
    const ULPS: f64;
    /// Greatest distance from the standard library's value, in representable numbers: the last unit and what the
    /// library adds (glibc here: under 1 unit, 2 for tan, log10 and tanh).
    const LIMIT: u64;
    fn lanes<S: Simd>(x: Lanes<S>, y: Lanes<S>) -> Lanes<S>;
    fn standard(x: f64, y: f64) -> f64;
    /// The arguments where it does something: the interval of the grid.
    const GRID: (f64, f64);
    const TWO: bool = false;
}

macro_rules! functions {
    ($($name:ident $ulps:literal $limit:literal [$low:expr, $high:expr] $two:literal |$x:ident, $y:ident| $lanes:expr, $standard:expr;)*) => {
        $(
            pub struct $name;

            impl Function for $name {
                const NAME: &'static str = stringify!($name);
                const ULPS: f64 = $ulps;
                const LIMIT: u64 = $limit;
                const GRID: (f64, f64) = ($low, $high);
                const TWO: bool = $two;
                #[inline(always)]
                fn lanes<S: Simd>($x: Lanes<S>, $y: Lanes<S>) -> Lanes<S> {
                    let _ = $y;
                    $lanes
                }
                fn standard($x: f64, $y: f64) -> f64 {
                    let _ = $y;
                    $standard
                }
            }
        )*

        /// Calls `$what::<F>()` for every function F.
        #[macro_export]
        macro_rules! for_every_function {
            ($what:ident) => { $( $what::<$crate::functions::$name>(); )* };
        }
    };
}

functions! {
    Sqrt 0.5 0 [0.0, 100.0] false |x, y| x.sqrt(), x.sqrt();
    Sin 1.0 1 [-20.0, 20.0] false |x, y| x.sin(), x.sin();
    Cos 1.0 1 [-20.0, 20.0] false |x, y| x.cos(), x.cos();
    SinOfPair 1.0 1 [-20.0, 20.0] false |x, y| x.sin_cos().0, x.sin();
    CosOfPair 1.0 1 [-20.0, 20.0] false |x, y| x.sin_cos().1, x.cos();
    Tan 3.0 2 [-20.0, 20.0] false |x, y| x.tan(), x.tan();
    Atan 2.0 2 [-10.0, 10.0] false |x, y| x.atan(), x.atan();
    Asin 3.0 3 [-1.0, 1.0] false |x, y| x.asin(), x.asin();
    Acos 3.0 3 [-1.0, 1.0] false |x, y| x.acos(), x.acos();
    Atan2 2.0 2 [-10.0, 10.0] true |x, y| x.atan2(y), x.atan2(y);
    Hypot 2.0 1 [-10.0, 10.0] true |x, y| x.hypot(y), x.hypot(y);
    Exp 1.0 1 [-750.0, 720.0] false |x, y| x.exp(), x.exp();
    Ln 1.0 1 [0.0, 10.0] false |x, y| x.ln(), x.ln();
    Log10 1.0 2 [0.0, 10.0] false |x, y| x.log10(), x.log10();
    Tanh 3.0 4 [-25.0, 25.0] false |x, y| x.tanh(), x.tanh();
    Powf 1.0 1 [-20.0, 20.0] true |x, y| x.powf(y), x.powf(y);
    PowiM7 1.0 1 [-10.0, 10.0] false |x, y| x.powi(-7), x.powf(-7.0);
    PowiM2 3.0 2 [-10.0, 10.0] false |x, y| x.powi(-2), x.powf(-2.0);
    PowiM1 0.5 1 [-10.0, 10.0] false |x, y| x.powi(-1), x.powf(-1.0);
    Powi0 0.5 0 [-10.0, 10.0] false |x, y| x.powi(0), x.powf(0.0);
    Powi2 0.5 1 [-10.0, 10.0] false |x, y| x.powi(2), x.powf(2.0);
    Powi3 2.0 2 [-10.0, 10.0] false |x, y| x.powi(3), x.powf(3.0);
    Powi4 3.0 3 [-10.0, 10.0] false |x, y| x.powi(4), x.powf(4.0);
    Powi100 1.0 1 [-10.0, 10.0] false |x, y| x.powi(100), x.powf(100.0);
    PowiLeast 1.0 1 [-10.0, 10.0] false |x, y| x.powi(i32::MIN), x.powf(f64::from(i32::MIN));
}

struct Map<'a, F> {
    x: &'a [[f64; 8]],
    y: &'a [[f64; 8]],
    out: &'a mut [[f64; 8]],
    function: std::marker::PhantomData<F>,
}

impl<F: Function> Task for Map<'_, F> {
    type Output = ();

    #[inline(always)]
    fn run<S: Simd>(self) {
        for ((x, y), out) in self.x.iter().zip(self.y).zip(self.out) {
            *out = F::lanes::<S>(Lanes::from_array(x), Lanes::from_array(y)).to_array();
        }
    }
}

/// F of every pair, by `level`.
pub fn map<F: Function>(level: Level, x: &[[f64; 8]], y: &[[f64; 8]]) -> Vec<[f64; 8]> {
    let mut out = vec![[0.0; 8]; x.len()];
    dispatch(level, Map::<F> { x, y, out: &mut out, function: std::marker::PhantomData });
    out
}
