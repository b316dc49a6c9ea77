use std::f64::consts::LN_2;

use super::exponential::bend;
use super::{LEAST_NORMAL, Lanes, Simd, Words};

/// ln 2 in two parts, the first of 26 bits.
const LN_2_PARTS: [f64; 2] = [0.693_147_167_563_438_4, 1.299_650_689_388_988_9e-8];

impl<S: Simd> Lanes<S> {
    /// self^exponent, within 1 ulp (0.92 seen).
    ///
    /// Negative numbers have powers with whole exponents only (NaN otherwise); 1 for exponent 0 and for self 1,
    /// whatever the other; all as [`f64::powf`].
    #[inline(always)]
    pub fn powf(self, exponent: Self) -> Self {
        // 2^(y log2 x) with the logarithm in two parts. A larger y gives zero, one or infinity all the same.
        const ENORMOUS: f64 = 1e20;
        let y = Self::splat(-ENORMOUS).max(Self::splat(ENORMOUS).min(exponent));
        let (log_high, log_low) = self.abs().log2_in_two();
        let y_high = y.leading();
        let high = y_high * log_high;
        let low = (y - y_high) * log_high + y * log_low;
        // Beyond these the result is infinite or zero; what was cut off is in high, so low must go too.
        let near = high.abs().less(Self::splat(1100.0));
        let high = Self::splat(-1100.0).max(Self::splat(1100.0).min(high));
        let low = near.select(low, Self::splat(0.0));
        let (n, _) = (high + low).nearest();
        // The rest times ln 2 = r + w.
        let rest = high - n;
        let part = (rest + low).leading();
        let u = part * LN_2_PARTS[0];
        let v = (low - (part - rest)) * LN_2 + part * LN_2_PARTS[1];
        let r = u + v;
        let size = (1.0 + (r + bend(r, v - (r - u)))).scaled(n);

        let ordinary = self.at_least(Self::splat(LEAST_NORMAL))
            & self.at_most(Self::splat(f64::MAX))
            & exponent.abs().at_most(Self::splat(f64::MAX));
        if !ordinary.all() {
            let mut powers = size.to_array();
            powers_rare(&self.to_array(), &exponent.to_array(), &mut powers);
            return Self::from_array(&powers);
        }
        size
    }

    /// self^exponent with the same whole exponent in all lanes, within 3 ulp (1.9 seen); within 1 where
    /// |exponent| is above 4 or -3, -4.
    #[inline(always)]
    pub fn powi(self, exponent: i32) -> Self {
        match exponent {
            0 => Self::splat(1.0),
            1 => self,
            2 => self * self,
            3 => self * self * self,
            4 => (self * self) * (self * self),
            -1 => 1.0 / self,
            // The inverse first: its square neither overflows nor becomes subnormal before the result does.
            -2 => (1.0 / self) * (1.0 / self),
            _ => {
                let odd = Words::splat((exponent as u64 & 1) << 63);
                self.abs().powf(Self::splat(f64::from(exponent))).flip(self.to_bits() & odd)
            }
        }
    }
}

/// Puts in the special values of ISO C 2018, F.10.4.4, and the sign of powers of negative numbers; `powers` holds
/// the power of the size wherever number and exponent are finite and the number is not zero.
#[cold]
#[inline(never)]
fn powers_rare(x: &[f64; 8], y: &[f64; 8], powers: &mut [f64; 8]) {
    for i in 0..8 {
        powers[i] = power_rare(x[i], y[i], powers[i]);
    }
}

fn power_rare(x: f64, y: f64, size: f64) -> f64 {
    if y == 0.0 || x == 1.0 {
        return 1.0;
    }
    if x.is_nan() || y.is_nan() {
        return f64::NAN;
    }
    let vast = |is_vast| if is_vast { f64::INFINITY } else { 0.0 };
    if y.is_infinite() {
        return if x.abs() == 1.0 { 1.0 } else { vast((x.abs() > 1.0) == (y > 0.0)) };
    }
    let size = match x.abs() {
        0.0 => vast(y < 0.0),
        f64::INFINITY => vast(y > 0.0),
        _ => size,
    };
    // From 2^53 on every double is even.
    let whole = y.trunc() == y;
    let odd = whole && y.abs() < 9_007_199_254_740_992.0 && (y as i64) & 1 == 1;
    match x.is_sign_negative() {
        true if odd => -size,
        true if !whole && x != 0.0 && x.is_finite() => f64::NAN,
        _ => size,
    }
}
