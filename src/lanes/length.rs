use super::{Lanes, Simd};

/// 2^510 and 2^-450: between them the square of the longer side neither overflows nor loses bits.
const LONG: f64 = f64::from_bits(0x5fd0_0000_0000_0000);
const SHORT: f64 = f64::from_bits(0x23d0_0000_0000_0000);

impl<S: Simd> Lanes<S> {
    /// sqrt(self^2 + other^2), within 2 ulp (1.2 seen), without overflow or underflow on the way.
    ///
    /// Infinite if either is infinite, even beside NaN.
    #[inline(always)]
    pub fn hypot(self, other: Self) -> Self {
        let (a, b) = (self.abs(), other.abs());
        let length = (a * a + b * b).sqrt();
        let longest = a.max(b);
        let safe = longest.at_least(Self::splat(SHORT)) & longest.at_most(Self::splat(LONG));
        if !safe.all() {
            let mut lengths = length.to_array();
            lengths_rare(&a.to_array(), &b.to_array(), &mut lengths);
            return Self::from_array(&lengths);
        }
        length
    }
}

#[cold]
#[inline(never)]
fn lengths_rare(a: &[f64; 8], b: &[f64; 8], lengths: &mut [f64; 8]) {
    for i in 0..8 {
        lengths[i] = length_rare(a[i], b[i], lengths[i]);
    }
}

fn length_rare(a: f64, b: f64, length: f64) -> f64 {
    if a.is_infinite() || b.is_infinite() {
        return f64::INFINITY;
    }
    // Powers of two, so that scaling is exact where it counts.
    let scaled = |up: f64, down: f64| ((a * up) * (a * up) + (b * up) * (b * up)).sqrt() * down;
    const UP: f64 = f64::from_bits(0x6570_0000_0000_0000); // 2^600
    const DOWN: f64 = f64::from_bits(0x1a70_0000_0000_0000); // 2^-600
    match a.max(b) {
        longest if longest > LONG => scaled(DOWN, UP),
        longest if longest < SHORT => scaled(UP, DOWN),
        _ => length,
    }
}
