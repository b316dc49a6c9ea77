use serde::{Deserialize, Serialize};

use super::basis::Basis;
use super::columns::{Column, add_dots, add_totals};
use crate::lanes::Simd;
use crate::net::BLOCK;

/// Sums over the points of one replicate, on which every moment rests.
///
/// z (a) are the standard normals, e (p) the outputs' deviations from the pilot's linear fit: small beside the
/// outputs themselves, so plain sums keep their digits. Folded block by block in a fixed order and within a block
/// in eight fixed lanes: the same bits at every level of vector instructions.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Sums {
    pub count: f64,
    /// sum z_i (a).
    pub z: Vec<f64>,
    /// sum e_j (p).
    pub e: Vec<f64>,
    /// sum e_j e_k, k <= j, row by row.
    pub ee: Vec<f64>,
    /// sum z_i e_j, output by output (p x a).
    pub ze: Vec<f64>,
    /// Sums of the control variates.
    pub basis: Vec<f64>,
}

impl Sums {
    /// Nothing yet, of `a` inputs, `p` outputs and `controls` control variates.
    pub fn empty(a: usize, p: usize, controls: usize) -> Self {
        Self {
            count: 0.0,
            z: vec![0.0; a],
            e: vec![0.0; p],
            ee: vec![0.0; p * (p + 1) / 2],
            ze: vec![0.0; a * p],
            basis: vec![0.0; controls],
        }
    }

    /// Whether these are sums of `a` inputs, `p` outputs and `controls` control variates.
    pub fn fit(&self, a: usize, p: usize, controls: usize) -> bool {
        let shape = |s: &Self| [s.z.len(), s.e.len(), s.ee.len(), s.ze.len(), s.basis.len()];
        shape(self) == shape(&Self::empty(a, p, controls))
    }

    /// Whether every sum is a number.
    pub fn is_finite(&self) -> bool {
        let all = [&self.z, &self.e, &self.ee, &self.ze, &self.basis];
        self.count.is_finite() && all.into_iter().flatten().all(|v| v.is_finite())
    }

    /// Adds a block: z and e one array a coordinate.
    #[inline(always)]
    pub fn add_block<S: Simd>(&mut self, z: &[Column], e: &[Column], basis: &Basis, columns: &[Column]) {
        self.count += BLOCK as f64;
        add_totals::<S>(z, &mut self.z);
        add_totals::<S>(e, &mut self.e);
        for (j, left) in e.iter().enumerate() {
            let row = Self::pair(j, 0);
            add_dots::<S>(left, &e[..=j], &mut self.ee[row..=row + j]);
        }
        for (output, sums) in e.iter().zip(self.ze.chunks_exact_mut(z.len())) {
            add_dots::<S>(output, z, sums);
        }
        basis.add_block::<S>(columns, &mut self.basis);
    }

    /// Place of e_j e_k among the packed products.
    pub fn pair(j: usize, k: usize) -> usize {
        let (j, k) = if j >= k { (j, k) } else { (k, j) };
        j * (j + 1) / 2 + k
    }

    /// Moves the origin of output `j` by `step`: what a chart does when its centre moves.
    pub fn move_origin(&mut self, j: usize, step: f64) {
        let (a, p) = (self.z.len(), self.e.len());
        for k in 0..p {
            let change = if k == j { step * (self.count * step - 2.0 * self.e[j]) } else { -step * self.e[k] };
            self.ee[Self::pair(j, k)] += change;
        }
        for i in 0..a {
            self.ze[j * a + i] -= step * self.z[i];
        }
        self.e[j] -= self.count * step;
    }

    /// Moves one point that is already counted, at (z, e), by `step` in output `j`: what a branch cut that passes
    /// it does.
    pub fn move_point(&mut self, z: &[f64], e: &[f64], j: usize, step: f64) {
        let a = self.z.len();
        for (k, &ek) in e.iter().enumerate() {
            self.ee[Self::pair(j, k)] += if k == j { step * (2.0 * ek + step) } else { step * ek };
        }
        for (i, &zi) in z.iter().enumerate() {
            self.ze[j * a + i] += step * zi;
        }
        self.e[j] += step;
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::lanes::{Level, Task, dispatch};

    struct Add<'a> {
        z: &'a [Column],
        e: &'a [Column],
        sums: &'a mut Sums,
    }

    impl Task for Add<'_> {
        type Output = ();

        #[inline(always)]
        fn run<S: Simd>(self) {
            self.sums.add_block::<S>(self.z, self.e, &Basis::new(self.z.len(), 0), &[]);
        }
    }

    fn column(phase: f64) -> Column {
        std::array::from_fn(|k| (phase + 0.7 * k as f64).sin() + 0.1 * phase)
    }

    fn sums(z: &[Column], e: &[Column]) -> Sums {
        let mut sums = Sums::empty(z.len(), e.len(), 0);
        dispatch(Level::best(), Add { z, e, sums: &mut sums });
        sums
    }

    fn close(a: &Sums, b: &Sums) {
        let all = |s: &Sums| -> Vec<f64> { [&s.z, &s.e, &s.ee, &s.ze].into_iter().flatten().copied().collect() };
        for (x, y) in all(a).iter().zip(all(b)) {
            assert!((x - y).abs() < 1e-11 * BLOCK as f64, "{x} and {y}");
        }
    }

    #[test]
    fn a_moved_origin_gives_the_sums_of_the_moved_points() {
        let z = [column(0.0), column(1.0)];
        let mut e = [column(2.0), column(3.0)];
        let mut moved = sums(&z, &e);
        moved.move_origin(1, 0.375);
        e[1].iter_mut().for_each(|v| *v -= 0.375);
        close(&moved, &sums(&z, &e));
    }

    #[test]
    fn a_moved_point_gives_the_sums_of_the_moved_points() {
        let z = [column(0.0), column(1.0)];
        let mut e = [column(2.0), column(3.0)];
        let mut moved = sums(&z, &e);
        moved.move_point(&[z[0][17], z[1][17]], &[e[0][17], e[1][17]], 0, -6.25);
        e[0][17] -= 6.25;
        close(&moved, &sums(&z, &e));
    }
}
