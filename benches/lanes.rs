//! Time of each elementary function in lanes, by level, beside the standard library's: throughput counts elements.

use std::hint::black_box;
use std::time::Duration;

use criterion::{Criterion, Throughput, criterion_group, criterion_main};
use gaussworthy::lanes::{Lanes, Level, Simd, Task, dispatch};

/// As many elements as a block of points has; everything stays in the first cache.
const BLOCKS: usize = 32;

/// Two columns in, one out.
struct Columns {
    x: [[f64; 8]; BLOCKS],
    y: [[f64; 8]; BLOCKS],
    out: [[f64; 8]; BLOCKS],
}

impl Columns {
    /// Arguments spread over an interval each, in no order.
    fn new([low, high]: [f64; 2], [y_low, y_high]: [f64; 2]) -> Self {
        let at = |i: usize, k: usize, step: f64| ((8 * i + k) as f64 * step).fract();
        Self {
            x: std::array::from_fn(|i| std::array::from_fn(|k| low + (high - low) * at(i, k, 0.618_034))),
            y: std::array::from_fn(|i| std::array::from_fn(|k| y_low + (y_high - y_low) * at(i, k, 0.754_878))),
            out: [[0.0; 8]; BLOCKS],
        }
    }
}

macro_rules! functions {
    ($($name:literal $x:expr, $y:expr, |$a:ident, $b:ident| $lanes:expr, $standard:expr;)*) => {
        fn functions(c: &mut Criterion) {
            $({
                struct Work<'a>(&'a mut Columns);
                impl Task for Work<'_> {
                    type Output = ();
                    #[inline(always)]
                    fn run<S: Simd>(self) {
                        let columns = self.0;
                        for i in 0..BLOCKS {
                            let $a = Lanes::<S>::from_array(&columns.x[i]);
                            let $b = Lanes::<S>::from_array(&columns.y[i]);
                            let _ = $b;
                            columns.out[i] = Lanes::to_array($lanes);
                        }
                    }
                }

                let mut group = c.benchmark_group($name);
                group.throughput(Throughput::Elements(8 * BLOCKS as u64));
                group.warm_up_time(Duration::from_millis(100)).measurement_time(Duration::from_millis(400));
                let mut columns = Columns::new($x, $y);
                for level in Level::available() {
                    group.bench_function(level.to_string(), |b| {
                        b.iter(|| {
                            dispatch(level, Work(&mut columns));
                            black_box(&mut columns);
                        });
                    });
                }
                group.bench_function("standard", |b| {
                    b.iter(|| {
                        for i in 0..BLOCKS {
                            for k in 0..8 {
                                let ($a, $b) = (columns.x[i][k], columns.y[i][k]);
                                let _ = $b;
                                columns.out[i][k] = $standard;
                            }
                        }
                        black_box(&mut columns);
                    });
                });
                group.finish();
            })*
        }
    };
}

functions! {
    "sqrt" [0.0, 9.0], [0.0, 1.0], |x, y| x.sqrt(), x.sqrt();
    "sin" [-4.0, 4.0], [0.0, 1.0], |x, y| x.sin(), x.sin();
    "cos" [-4.0, 4.0], [0.0, 1.0], |x, y| x.cos(), x.cos();
    "sin and cos, summed" [-4.0, 4.0], [0.0, 1.0], |x, y| { let (s, c) = x.sin_cos(); s + c }, x.sin() + x.cos();
    "tan" [-4.0, 4.0], [0.0, 1.0], |x, y| x.tan(), x.tan();
    "atan" [-4.0, 4.0], [0.0, 1.0], |x, y| x.atan(), x.atan();
    "asin" [-1.0, 1.0], [0.0, 1.0], |x, y| x.asin(), x.asin();
    "acos" [-1.0, 1.0], [0.0, 1.0], |x, y| x.acos(), x.acos();
    "atan2" [-4.0, 4.0], [-4.0, 4.0], |x, y| y.atan2(x), y.atan2(x);
    "hypot" [-4.0, 4.0], [-4.0, 4.0], |x, y| x.hypot(y), x.hypot(y);
    "range and bearing, summed" [-4.0, 4.0], [-4.0, 4.0], |x, y| (x * x + y * y).sqrt() + y.atan2(x),
        (x * x + y * y).sqrt() + y.atan2(x);
    "exp" [-20.0, 20.0], [0.0, 1.0], |x, y| x.exp(), x.exp();
    "ln" [0.1, 20.0], [0.0, 1.0], |x, y| x.ln(), x.ln();
    "log10" [0.1, 20.0], [0.0, 1.0], |x, y| x.log10(), x.log10();
    "tanh" [-3.0, 3.0], [0.0, 1.0], |x, y| x.tanh(), x.tanh();
    "powf" [0.1, 20.0], [-3.0, 3.0], |x, y| x.powf(y), x.powf(y);
    "powi 3" [-4.0, 4.0], [0.0, 1.0], |x, y| x.powi(3), x.powi(3);
    "powi -7" [-4.0, 4.0], [0.0, 1.0], |x, y| x.powi(-7), x.powi(-7);
}

criterion_group!(benches, functions);
criterion_main!(benches);
