//! The normal quantile by rational approximation, in pieces without a branch that serve blocks of values too.
//!
//! Everything here is additions, multiplications, divisions and square roots in a fixed order, which IEEE 754
//! rounds alike on every machine, and no fused multiply-add.

// Coefficients stand as they are published, to be compared digit by digit.
#![allow(clippy::excessive_precision, clippy::inconsistent_digit_grouping)]

use std::f64::consts::LN_2;

/// Below this upper-tail probability (5/64) the tail's formula holds. The published algorithm changes over at 0.075;
/// its tail formula is exact to 4e-17 up to here, and a dyadic seam makes the share of tails in a net exact.
pub(super) const TAIL: f64 = 0.078125;
/// Below this upper-tail probability, e^-25 but for rounding, the far tail's formula holds.
pub(super) const FAR_TAIL: f64 = 1.388794386496402e-11;

/// The standard normal quantile: z with P(Z < z) = p, for p in \[0, 1\]; NaN outside.
///
/// Odd to the bit where p and 1 - p are both exact, 0 at 1/2, infinite at 0 and 1. The relative error measured against
/// 40-digit values is under 1e-15 for p from 1e-300 to 1/2. Above 1/2 that is so for the double p as it stands, though 1 - p
/// may be known to few digits.
///
/// Source: M. J. Wichura, "Algorithm AS 241: The percentage points of the normal distribution", Applied Statistics
/// 37 (1988) 477-484, doi:10.2307/2347330, routine PPND16, with the change-over at 5/64 in place of 0.075.
///
/// ```
/// use gaussworthy::net::normal_quantile;
/// assert!((normal_quantile(0.975) - 1.959963984540054).abs() < 1e-15);
/// ```
pub fn normal_quantile(p: f64) -> f64 {
    if !(0.0..=1.0).contains(&p) {
        return f64::NAN;
    }
    if p < 0.5 { -upper_quantile(p) } else { upper_quantile(1.0 - p) }
}

/// z >= 0 with P(Z > z) = q, for q in \[0, 1/2\].
fn upper_quantile(q: f64) -> f64 {
    if q >= TAIL {
        central(q)
    } else if q >= FAR_TAIL {
        tail(q)
    } else if q > 0.0 {
        far_tail(q)
    } else {
        f64::INFINITY
    }
}

/// Upper quantile for q in \[5/64, 1/2\].
#[inline(always)]
pub(super) fn central(q: f64) -> f64 {
    // Exact for q >= 1/4, and for every q that a net gives.
    let x = 0.5 - q;
    let r = 0.180625 - x * x;
    x * polynomial(&CENTRAL.0, r) / polynomial(&CENTRAL.1, r)
}

/// Upper quantile for q in \[e^-25, 5/64\].
#[inline(always)]
pub(super) fn tail(q: f64) -> f64 {
    let r = (-ln(q)).sqrt() - 1.6;
    polynomial(&NEAR.0, r) / polynomial(&NEAR.1, r)
}

/// Upper quantile for q in (0, e^-25\].
#[cold]
#[inline(never)]
pub(super) fn far_tail(q: f64) -> f64 {
    // The logarithm knows no subnormal numbers: lift them by 2^54.
    let ln = if q < f64::MIN_POSITIVE { ln(q * 18_014_398_509_481_984.0) - 54.0 * LN_2 } else { ln(q) };
    let r = (-ln).sqrt() - 5.0;
    polynomial(&FAR.0, r) / polynomial(&FAR.1, r)
}

/// Natural logarithm of a normal q in (0, 5/64\], to 1 ulp.
///
/// q = 2^e m with m in \[sqrt(1/2), sqrt(2)): ln q = e ln 2 + 2 artanh(s), s = (m - 1) / (m + 1), by the Taylor series.
/// |s| < 0.1716, so that the terms left out are below 2e-18; and the sum is at least 2.5 in size, so that nothing cancels.
#[inline(always)]
fn ln(q: f64) -> f64 {
    /// 2^52: an integer below it, put in the mantissa, is that many above it.
    const SHIFTER: u64 = 0x4330_0000_0000_0000;
    const ONE: u64 = 0x3ff0_0000_0000_0000;
    const HALF_ROOT: u64 = 0x3fe6_a09e_667f_3bcd;
    const MANTISSA: u64 = (1 << 52) - 1;
    /// The leading 32 bits of ln 2, so that e times it is exact.
    const LN_2_HIGH: f64 = 0.693_147_180_369_123_816_490;
    const LN_2_LOW: f64 = 1.908_214_929_270_587_700_02e-10;

    let lifted = q.to_bits() + (ONE - HALF_ROOT);
    let e = f64::from_bits(lifted >> 52 | SHIFTER) - (4_503_599_627_370_496.0 + 1023.0);
    let m = f64::from_bits((lifted & MANTISSA) + HALF_ROOT);
    let s = (m - 1.0) / (m + 1.0);
    let w = s * s;
    let (w2, w4) = (w * w, (w * w) * (w * w));
    let c = &ARTANH;
    let high = (c[0] * w + c[1]) * w + c[2];
    let middle = (c[3] * w + c[4]) * w2 + (c[5] * w + c[6]);
    let low = (c[7] * w + c[8]) * w2 + (c[9] * w + c[10]);
    let series = w * ((high * w4 + middle) * w4 + low);
    e * LN_2_HIGH + (e * LN_2_LOW + 2.0 * (s + s * series))
}

/// 1 / (2 k + 1) for k = 11 down to 1.
const ARTANH: [f64; 11] = [
    1.0 / 23.0,
    1.0 / 21.0,
    1.0 / 19.0,
    1.0 / 17.0,
    1.0 / 15.0,
    1.0 / 13.0,
    1.0 / 11.0,
    1.0 / 9.0,
    1.0 / 7.0,
    1.0 / 5.0,
    1.0 / 3.0,
];

/// A polynomial of degree seven by Estrin's scheme: its longest chain has three products where Horner's rule has seven.
/// Vector units wait for chains: with Horner's rule a block took a fifth longer with SSE2 and AVX2.
#[inline(always)]
fn polynomial(c: &[f64; 8], x: f64) -> f64 {
    let x2 = x * x;
    let high = (c[0] * x + c[1]) * x2 + (c[2] * x + c[3]);
    let low = (c[4] * x + c[5]) * x2 + (c[6] * x + c[7]);
    high * (x2 * x2) + low
}

// Wichura (1988), PPND16: numerator and denominator, highest degree first; the mantissas of each pair add up to its
// published check sum (55.88319 28806 14901 4439, 49.33206 50330 16102 89036, 47.52583 31754 92896 71629).

const CENTRAL: ([f64; 8], [f64; 8]) = (
    [
        2.50908_09287_30122_6727e3,
        3.34305_75583_58812_8105e4,
        6.72657_70927_00870_0853e4,
        4.59219_53931_54987_1457e4,
        1.37316_93765_50946_1125e4,
        1.97159_09503_06551_4427e3,
        1.33141_66789_17843_7745e2,
        3.38713_28727_96366_6080,
    ],
    [
        5.22649_52788_52854_5610e3,
        2.87290_85735_72194_2674e4,
        3.93078_95800_09271_0610e4,
        2.12137_94301_58659_5867e4,
        5.39419_60214_24751_1077e3,
        6.87187_00749_20579_0830e2,
        4.23133_30701_60091_1252e1,
        1.0,
    ],
);
const NEAR: ([f64; 8], [f64; 8]) = (
    [
        7.74545_01427_83414_07640e-4,
        2.27238_44989_26918_45833e-2,
        2.41780_72517_74506_11770e-1,
        1.27045_82524_52368_38258,
        3.64784_83247_63204_60504,
        5.76949_72214_60691_40550,
        4.63033_78461_56545_29590,
        1.42343_71107_49683_57734,
    ],
    [
        1.05075_00716_44416_84324e-9,
        5.47593_80849_95344_94600e-4,
        1.51986_66563_61645_71966e-2,
        1.48103_97642_74800_74590e-1,
        6.89767_33498_51000_04550e-1,
        1.67638_48301_83803_84940,
        2.05319_16266_37758_82187,
        1.0,
    ],
);
const FAR: ([f64; 8], [f64; 8]) = (
    [
        2.01033_43992_92288_13265e-7,
        2.71155_55687_43487_57815e-5,
        1.24266_09473_88078_43860e-3,
        2.65321_89526_57612_30930e-2,
        2.96560_57182_85048_91230e-1,
        1.78482_65399_17291_33580,
        5.46378_49111_64114_36990,
        6.65790_46435_01103_77720,
    ],
    [
        2.04426_31033_89939_78564e-15,
        1.42151_17583_16445_88870e-7,
        1.84631_83175_10054_68180e-5,
        7.86869_13114_56132_59100e-4,
        1.48753_61290_85061_48525e-2,
        1.36929_88092_27358_05310e-1,
        5.99832_20655_58879_37690e-1,
        1.0,
    ],
);
