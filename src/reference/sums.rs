use serde::{Deserialize, Serialize};

use super::basis::Basis;
use super::net::BLOCK;

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
    pub fn add_block(&mut self, z: &[[f64; BLOCK]], e: &[[f64; BLOCK]], basis: &Basis, columns: &[[f64; BLOCK]]) {
        self.count += BLOCK as f64;
        for (sum, column) in self.z.iter_mut().zip(z) {
            *sum += total(column);
        }
        for (sum, column) in self.e.iter_mut().zip(e) {
            *sum += total(column);
        }
        let mut ee = self.ee.iter_mut();
        for (j, left) in e.iter().enumerate() {
            for (right, sum) in e[..=j].iter().zip(&mut ee) {
                *sum += dot(left, right);
            }
        }
        let a = z.len();
        for (j, output) in e.iter().enumerate() {
            for (input, sum) in z.iter().zip(&mut self.ze[j * a..(j + 1) * a]) {
                *sum += dot(input, output);
            }
        }
        basis.add_block(columns, &mut self.basis);
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

const LANES: usize = 8;

/// Sum of a column in eight fixed lanes.
#[inline(always)]
pub(super) fn total(column: &[f64; BLOCK]) -> f64 {
    let mut lanes = [0.0; LANES];
    for chunk in column.as_chunks::<LANES>().0 {
        for i in 0..LANES {
            lanes[i] += chunk[i];
        }
    }
    fold(lanes)
}

/// Sum of products of two columns in eight fixed lanes.
#[inline(always)]
pub(super) fn dot(x: &[f64; BLOCK], y: &[f64; BLOCK]) -> f64 {
    let mut lanes = [0.0; LANES];
    for (x, y) in x.as_chunks::<LANES>().0.iter().zip(y.as_chunks::<LANES>().0) {
        for i in 0..LANES {
            lanes[i] += x[i] * y[i];
        }
    }
    fold(lanes)
}

/// Sum of products of three columns in eight fixed lanes.
#[inline(always)]
pub(super) fn dot3(x: &[f64; BLOCK], y: &[f64; BLOCK], w: &[f64; BLOCK]) -> f64 {
    let mut lanes = [0.0; LANES];
    let (x, y, w) = (x.as_chunks::<LANES>().0, y.as_chunks::<LANES>().0, w.as_chunks::<LANES>().0);
    for ((x, y), w) in x.iter().zip(y).zip(w) {
        for i in 0..LANES {
            lanes[i] += x[i] * y[i] * w[i];
        }
    }
    fold(lanes)
}

/// Sum of products of four columns in eight fixed lanes.
#[inline(always)]
pub(super) fn dot4(x: &[f64; BLOCK], y: &[f64; BLOCK], w: &[f64; BLOCK], v: &[f64; BLOCK]) -> f64 {
    let mut lanes = [0.0; LANES];
    let (x, y) = (x.as_chunks::<LANES>().0, y.as_chunks::<LANES>().0);
    let (w, v) = (w.as_chunks::<LANES>().0, v.as_chunks::<LANES>().0);
    for (((x, y), w), v) in x.iter().zip(y).zip(w).zip(v) {
        for i in 0..LANES {
            lanes[i] += (x[i] * y[i]) * (w[i] * v[i]);
        }
    }
    fold(lanes)
}

#[inline(always)]
fn fold(lanes: [f64; LANES]) -> f64 {
    ((lanes[0] + lanes[1]) + (lanes[2] + lanes[3])) + ((lanes[4] + lanes[5]) + (lanes[6] + lanes[7]))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn column(phase: f64) -> [f64; BLOCK] {
        std::array::from_fn(|k| (phase + 0.7 * k as f64).sin() + 0.1 * phase)
    }

    fn sums(z: &[[f64; BLOCK]], e: &[[f64; BLOCK]]) -> Sums {
        let basis = Basis::new(z.len(), 0);
        let mut sums = Sums::empty(z.len(), e.len(), 0);
        sums.add_block(z, e, &basis, &[]);
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

    #[test]
    fn products_of_columns_are_summed() {
        let (x, y, w, v) = (column(0.1), column(0.2), column(0.3), column(0.4));
        let plain = |f: &dyn Fn(usize) -> f64| (0..BLOCK).map(f).sum::<f64>();
        assert!((total(&x) - plain(&|k| x[k])).abs() < 1e-12);
        assert!((dot(&x, &y) - plain(&|k| x[k] * y[k])).abs() < 1e-12);
        assert!((dot3(&x, &y, &w) - plain(&|k| x[k] * y[k] * w[k])).abs() < 1e-12);
        assert!((dot4(&x, &y, &w, &v) - plain(&|k| x[k] * y[k] * w[k] * v[k])).abs() < 1e-12);
    }
}
