use nalgebra::{DMatrix, DVector};

/// Sums of one block or one replicate, centred, so that a mean of 1e6 with a spread of 1e-3 keeps its digits.
///
/// Holds the count, the means of z (a) and e (p), and the centred sums of products of e with e and z with e.
/// Tallies of disjoint points merge to the tally of all of them.
///
/// Source: T. F. Chan, G. H. Golub, R. J. LeVeque, "Algorithms for computing the sample variance: analysis and
/// recommendations", The American Statistician 37 (1983) 242-247, eq. (2.1) (number from memory).
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Tally {
    pub count: f64,
    pub mean_z: DVector<f64>,
    pub mean_e: DVector<f64>,
    /// sum (e - mean)(e - mean)' (p x p).
    pub ee: DMatrix<f64>,
    /// sum (z - mean)(e - mean)' (a x p).
    pub ze: DMatrix<f64>,
}

impl Tally {
    pub fn empty(a: usize, p: usize) -> Self {
        Self {
            count: 0.0,
            mean_z: DVector::zeros(a),
            mean_e: DVector::zeros(p),
            ee: DMatrix::zeros(p, p),
            ze: DMatrix::zeros(a, p),
        }
    }

    /// Overwrites this tally with that of `length` points, one array a coordinate; `z` and `e` are left
    /// centred.
    pub fn of_block(&mut self, length: usize, z: &mut [f64], e: &mut [f64]) {
        self.count = length as f64;
        for (mean, column) in self.mean_z.iter_mut().zip(z.chunks_exact_mut(length)) {
            *mean = centre(column);
        }
        for (mean, column) in self.mean_e.iter_mut().zip(e.chunks_exact_mut(length)) {
            *mean = centre(column);
        }
        for (j, ej) in e.chunks_exact(length).enumerate() {
            for (k, ek) in e.chunks_exact(length).enumerate().take(j + 1) {
                let sum = dot(ej, ek);
                self.ee[(j, k)] = sum;
                self.ee[(k, j)] = sum;
            }
            for (i, zi) in z.chunks_exact(length).enumerate() {
                self.ze[(i, j)] = dot(zi, ej);
            }
        }
    }

    /// Adds the points of `other`.
    pub fn merge(&mut self, other: &Self) {
        if other.count == 0.0 {
            return;
        }
        let total = self.count + other.count;
        let share = other.count / total;
        let weight = self.count * share;
        let shift_z = &other.mean_z - &self.mean_z;
        let shift_e = &other.mean_e - &self.mean_e;
        self.ee += &other.ee;
        self.ee.ger(weight, &shift_e, &shift_e, 1.0);
        self.ze += &other.ze;
        self.ze.ger(weight, &shift_z, &shift_e, 1.0);
        self.mean_z.axpy(share, &shift_z, 1.0);
        self.mean_e.axpy(share, &shift_e, 1.0);
        self.count = total;
    }

    /// Moves one point that is already counted, at (z, e), by `step` in e: what a branch cut that moves past
    /// it does.
    pub fn move_point(&mut self, z: &DVector<f64>, e: &DVector<f64>, step: &DVector<f64>) {
        let off_e = e - &self.mean_e;
        let off_z = z - &self.mean_z;
        self.ee.ger(1.0, &off_e, step, 1.0);
        self.ee.ger(1.0, step, &off_e, 1.0);
        self.ee.ger(1.0 - 1.0 / self.count, step, step, 1.0);
        self.ze.ger(1.0, &off_z, step, 1.0);
        self.mean_e.axpy(1.0 / self.count, step, 1.0);
    }
}

const LANES: usize = 8;

/// Sum in eight fixed lanes: the compiler vectorises it, and the order of additions, hence every bit, is the
/// same on every machine.
pub(super) fn sum(values: &[f64]) -> f64 {
    let mut lanes = [0.0; LANES];
    let chunks = values.chunks_exact(LANES);
    let rest: f64 = chunks.remainder().iter().sum();
    for chunk in chunks {
        for (lane, v) in lanes.iter_mut().zip(chunk) {
            *lane += v;
        }
    }
    lanes.iter().sum::<f64>() + rest
}

fn dot(a: &[f64], b: &[f64]) -> f64 {
    let mut lanes = [0.0; LANES];
    let (ca, cb) = (a.chunks_exact(LANES), b.chunks_exact(LANES));
    let rest: f64 = ca.remainder().iter().zip(cb.remainder()).map(|(x, y)| x * y).sum();
    for (x, y) in ca.zip(cb) {
        for i in 0..LANES {
            lanes[i] += x[i] * y[i];
        }
    }
    lanes.iter().sum::<f64>() + rest
}

fn centre(column: &mut [f64]) -> f64 {
    let mean = sum(column) / column.len() as f64;
    for v in column {
        *v -= mean;
    }
    mean
}

#[cfg(test)]
mod tests {
    use super::*;
    use nalgebra::dvector;

    fn tally_of(points: &[(f64, f64)]) -> Tally {
        let mut z: Vec<f64> = points.iter().map(|p| p.0).collect();
        let mut e: Vec<f64> = points.iter().map(|p| p.1).collect();
        let mut tally = Tally::empty(1, 1);
        tally.of_block(points.len(), &mut z, &mut e);
        tally
    }

    fn wavy(k: usize) -> (f64, f64) {
        let t = k as f64;
        ((t * 0.7).sin(), (t * 1.3).cos() + 0.1 * t)
    }

    #[test]
    fn parts_merge_to_the_whole() {
        let points: Vec<_> = (0..103).map(wavy).collect();
        let whole = tally_of(&points);
        let mut merged = Tally::empty(1, 1);
        for part in points.chunks(17) {
            merged.merge(&tally_of(part));
        }
        assert_eq!(merged.count, 103.0);
        assert!((merged.mean_e[0] - whole.mean_e[0]).abs() < 1e-14);
        assert!((merged.ee[0] / whole.ee[0] - 1.0).abs() < 1e-14);
        assert!((merged.ze[0] - whole.ze[0]).abs() < 1e-13);
    }

    #[test]
    fn a_moved_point_gives_the_tally_of_the_moved_points() {
        let mut points: Vec<_> = (0..40).map(wavy).collect();
        let mut moved = tally_of(&points);
        let (z, e) = points[11];
        moved.move_point(&dvector![z], &dvector![e], &dvector![-6.25]);
        points[11].1 -= 6.25;
        let expected = tally_of(&points);
        assert!((moved.mean_e[0] - expected.mean_e[0]).abs() < 1e-14);
        assert!((moved.ee[0] / expected.ee[0] - 1.0).abs() < 1e-13);
        assert!((moved.ze[0] - expected.ze[0]).abs() < 1e-12);
    }

    #[test]
    fn a_far_mean_keeps_the_digits_of_a_small_spread() {
        // 1e6 + 1e-3 k on k = -500..500, merged in blocks: the variance of an even grid is known exactly,
        // h^2 (N^2 - 1) / 12.
        let n = 1001;
        let mut merged = Tally::empty(1, 1);
        let points: Vec<_> = (0..n).map(|k| (0.0, 1e6 + 1e-3 * (k as f64 - 500.0))).collect();
        for part in points.chunks(64) {
            merged.merge(&tally_of(part));
        }
        let variance = merged.ee[0] / n as f64;
        let exact = 1e-6 * ((n * n - 1) as f64) / 12.0;
        // Each point was rounded to 1.2e-10, a 4e-10 share of the spread 0.29.
        assert!((variance / exact - 1.0).abs() < 1e-9, "{variance} against {exact}");
    }
}
