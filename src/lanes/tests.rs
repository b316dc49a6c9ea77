//! Plain arrays, which elsewhere are the baseline, against the baseline of this machine.

use super::backend::Plain;
use super::{Lanes, Level, Simd, Task, Words, dispatch};

/// Everything there is, of two blocks.
struct Everything([f64; 8], [f64; 8]);

impl Task for Everything {
    type Output = Vec<u64>;

    #[inline(always)]
    fn run<S: Simd>(self) -> Vec<u64> {
        let (x, y) = (Lanes::<S>::from_array(&self.0), Lanes::from_array(&self.1));
        let (a, b) = (x.to_bits(), y.to_bits());
        let reals = [
            [x + y, x - y, x * y, x / y, -x, x.sqrt(), x.abs(), x.copysign(y), x.min(y), x.max(y)],
            [x.sin(), x.cos(), x.tan(), x.atan(), x.asin(), x.acos(), x.atan2(y), x.hypot(y), x.tanh(), x.exp()],
            [
                x.ln(),
                x.log10(),
                x.powf(y),
                x.powi(5),
                x.powi(-2),
                x.sin_cos().0,
                x.sin_cos().1,
                x + 1.0,
                2.0 - x,
                0.5 * x,
            ],
        ];
        let words =
            [a & b, a | b, a ^ b, !a, a + b, a - b, a.and_not(b), a.shift_left::<7>(), a.shift_right::<13>()];
        let small = a.shift_right::<12>().to_lanes();
        let choices =
            [x.less(y), x.at_most(y), x.greater(y), x.at_least(y), x.equal(y), x.is_nan(), a.highest_bit()];
        let mut all: Vec<u64> = Vec::new();
        for value in reals.into_iter().flatten().chain([small]) {
            all.extend(value.to_array().map(|v| if v.is_nan() { f64::NAN } else { v }.to_bits()));
        }
        for value in words {
            all.extend(value.to_array());
        }
        for choice in choices {
            let combined = [choice, !choice, choice & choices[0], choice | choices[6]];
            all.extend(combined.map(|c| u64::from(c.bits())));
            all.extend(combined.map(|c| u64::from(c.any()) + 2 * u64::from(c.all())));
            let one = Words::<S>::splat(1.0_f64.to_bits());
            all.extend(choice.select(Lanes::from_bits(one), Lanes::splat(0.0)).to_array().map(f64::to_bits));
        }
        all
    }
}

#[test]
fn plain_arrays_and_every_level_give_the_same_bits() {
    let values = [
        [0.0, -0.0, 1.0, -1.0, 0.3, -7.5, 1e300, -1e-300],
        [f64::INFINITY, f64::NEG_INFINITY, f64::NAN, 5e-324, -1e-310, 2.0, 1e6, 1e22],
        [0.5, 0.49, 0.7, 3.25, -709.0, 12.5, -0.99, 1e-9],
    ];
    for x in values {
        for y in values {
            for turned in 0..8 {
                let mut y = y;
                y.rotate_left(turned);
                let plain = Everything(x, y).run::<Plain>();
                for level in Level::available() {
                    assert_eq!(dispatch(level, Everything(x, y)), plain, "{level}, {x:?}, {y:?}");
                }
            }
        }
    }
}
