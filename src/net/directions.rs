use std::sync::LazyLock;

use super::joe_kuo::JOE_KUO;

/// Bits of a coordinate, and columns of a generator matrix.
pub(super) const BITS: usize = 64;

/// One dimension of a table of direction numbers, as it is published: a primitive polynomial over GF(2),
/// x^s + a_1 x^(s-1) + ... + a_(s-1) x + 1, and the initial numbers m_1..m_s.
#[derive(Debug, Clone, Copy)]
pub(super) struct Polynomial {
    /// s.
    pub degree: usize,
    /// The inner coefficients a_1..a_(s-1), a_1 in the highest bit.
    pub inner: u32,
    /// m_1..m_s: odd, m_i < 2^i.
    pub initial: &'static [u16],
}

impl Polynomial {
    /// The direction integers v_k = m_k 2^(64-k) by the recurrence
    /// m_k = 2 a_1 m_(k-1) + 4 a_2 m_(k-2) + ... + 2^(s-1) a_(s-1) m_(k-s+1) + 2^s m_(k-s) + m_(k-s), sums without
    /// carry. On the v it needs no powers: v_k = sum of the v_(k-i) with a_i = 1, plus v_(k-s), plus v_(k-s) / 2^s.
    ///
    /// Source: P. Bratley, B. L. Fox, "Algorithm 659: Implementing Sobol's quasirandom sequence generator", ACM
    /// Transactions on Mathematical Software 14 (1988) 88-100, sec. 2.
    fn columns(&self) -> [u64; BITS] {
        let s = self.degree;
        let mut v = [0; BITS];
        for (k, &m) in self.initial.iter().enumerate() {
            v[k] = u64::from(m) << (BITS - 1 - k);
        }
        for k in s..BITS {
            v[k] = v[k - s] ^ (v[k - s] >> s);
            for i in 1..s {
                if self.inner >> (s - 1 - i) & 1 == 1 {
                    v[k] ^= v[k - i];
                }
            }
        }
        v
    }
}

/// Generator matrices of a digital net in base 2, one a dimension, by columns: bit 63 of a column is the first
/// row. Point i has the coordinate XOR of the columns k where bit k of i is set, over 2^64.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Directions(Vec<[u64; BITS]>);

impl Directions {
    /// Sobol' sequence with the direction numbers of Joe and Kuo, criterion D(6), in
    /// [`MOST_DIMENSIONS`](super::MOST_DIMENSIONS) dimensions.
    ///
    /// Sources: I. M. Sobol', "The distribution of points in a cube and the accurate evaluation of integrals",
    /// Zh. Vychisl. Mat. i Mat. Phys. 7 (1967) 784-802; S. Joe, F. Y. Kuo, "Constructing Sobol sequences with better
    /// two-dimensional projections", SIAM Journal on Scientific Computing 30 (2008) 2635-2654,
    /// doi:10.1137/070709359, table "new-joe-kuo-6".
    pub fn joe_kuo() -> &'static Self {
        static COLUMNS: LazyLock<Directions> = LazyLock::new(|| {
            let van_der_corput = std::array::from_fn(|k| 1 << (BITS - 1 - k));
            Directions([van_der_corput].into_iter().chain(JOE_KUO.iter().map(Polynomial::columns)).collect())
        });
        &COLUMNS
    }

    /// Any matrices, as they are: nothing is checked. For nets of one's own, and to see what a wrong one does: the
    /// digital shift makes each single point uniform whatever the matrices, so that a wrong one costs precision, which
    /// the spread of the replicates shows, and brings no bias.
    pub fn from_columns(columns: Vec<[u64; BITS]>) -> Self {
        Self(columns)
    }

    /// The matrices, one a dimension.
    pub fn columns(&self) -> &[[u64; BITS]] {
        &self.0
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// An example of the recurrence: Bratley and Fox (1988), sec. 2, from memory, worked by hand:
    /// x^3 + x + 1 (a_1 = 0, a_2 = 1) and m = 1, 3, 7 give m_4 = 12 + 8 + 1 = 5 and m_5 = 28 + 24 + 3 = 7, without carry.
    #[test]
    fn recurrence_gives_the_published_example() {
        let v = Polynomial { degree: 3, inner: 0b01, initial: &[1, 3, 7] }.columns();
        let m: Vec<u64> = (0..5).map(|k| v[k] >> (BITS - 1 - k)).collect();
        assert_eq!(m, [1, 3, 7, 5, 7]);
    }

    #[test]
    fn table_is_well_formed() {
        for row in &JOE_KUO {
            assert_eq!(row.initial.len(), row.degree, "{row:?}");
            assert!(row.inner < 1 << (row.degree - 1), "{row:?}");
            for (i, m) in row.initial.iter().enumerate() {
                assert!(m % 2 == 1 && *m < 2 << i, "{row:?}");
            }
        }
    }
}
