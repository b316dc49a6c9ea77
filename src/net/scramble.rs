use rand::Rng;

use super::directions::BITS;

/// A random linear scrambling of one coordinate: x -> L x + shift over GF(2), L lower triangular with a unit
/// diagonal, so that a digit depends on itself and on the digits before it.
///
/// It maps every elementary interval onto one of the same size, so that the net keeps its quality, and the shift
/// makes each single point uniform.
///
/// Source: J. Matousek, "On the L2-discrepancy for anchored boxes", Journal of Complexity 14 (1998) 527-556,
/// doi:10.1006/jcom.1998.0489, sec. 2 (section from memory).
#[derive(Debug, Clone)]
pub(super) struct Scramble {
    pub shift: u64,
    /// L by columns; bit 63 is the first row.
    columns: [u64; BITS],
}

impl Scramble {
    /// The shift first, then L whole, whatever the size of the net: a larger net starts with the smaller one's
    /// points.
    pub fn draw(rng: &mut impl Rng) -> Self {
        let shift = rng.next_u64();
        let columns = std::array::from_fn(|l| {
            let diagonal = 1 << (BITS - 1 - l);
            diagonal | (rng.next_u64() & (diagonal - 1))
        });
        Self { shift, columns }
    }

    /// Leaves every point where it is.
    pub fn none() -> Self {
        Self { shift: 0, columns: std::array::from_fn(|l| 1 << (BITS - 1 - l)) }
    }

    /// L v.
    pub fn apply(&self, mut v: u64) -> u64 {
        let mut scrambled = 0;
        while v != 0 {
            let row = v.leading_zeros();
            scrambled ^= self.columns[row as usize];
            v &= !(1 << (BITS as u32 - 1 - row));
        }
        scrambled
    }
}
