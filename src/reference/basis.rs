use smallvec::SmallVec;

use super::columns::{Column, Last, Run, add_runs};
use crate::lanes::Simd;

/// Hermite polynomials of z up to a total degree, the constant left out: their expectation under N(0, I) is zero,
/// so their sample means are known errors that can be taken out of other sample means.
///
/// One factor an axis: He_1 = z, He_2 = z^2 - 1, He_3 = z^3 - 3 z, He_4 = z^4 - 6 z^2 + 3.
///
/// Source: M. Abramowitz, I. A. Stegun, Handbook of Mathematical Functions (1964), 22.2.15, 22.5.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Basis {
    axes: usize,
    degree: usize,
    /// Each a product of factors (axis, degree), by rising total degree.
    terms: Vec<SmallVec<[(usize, usize); 4]>>,
    /// The same by number of factors, as runs of columns to be multiplied and summed.
    ones: Vec<Run<0>>,
    twos: Vec<Run<1>>,
    threes: Vec<Run<2>>,
    fours: Vec<Run<3>>,
}

impl Basis {
    /// Polynomials in `axes` variables up to `degree`, 0 to 4.
    pub fn new(axes: usize, degree: usize) -> Self {
        debug_assert!(degree <= 4, "products of at most four columns are summed");
        let mut terms = Vec::new();
        for total in 1..=degree {
            extend(&mut terms, axes, 0, total, SmallVec::new());
        }
        Self {
            ones: runs(&terms, degree),
            twos: runs(&terms, degree),
            threes: runs(&terms, degree),
            fours: runs(&terms, degree),
            axes,
            degree,
            terms,
        }
    }

    /// How many polynomials there are.
    pub fn len(&self) -> usize {
        self.terms.len()
    }

    /// How many there are of [`Basis::new`] in `axes` variables up to `degree`, without laying them out.
    pub fn count(axes: usize, degree: usize) -> usize {
        // C(axes + degree, degree) - 1.
        (1..=degree).fold(1, |product, d| product * (axes + d) / d) - 1
    }

    /// Columns of one-dimensional polynomials that [`Basis::add_block`] needs.
    pub fn columns(&self) -> usize {
        self.axes * self.degree
    }

    /// Writes the one-dimensional polynomials of a block, axis by axis.
    #[inline(always)]
    pub fn write_columns(&self, z: &[Column], columns: &mut [Column]) {
        if self.degree == 0 {
            return;
        }
        for (z, columns) in z.iter().zip(columns.chunks_exact_mut(self.degree)) {
            for (d, column) in columns.iter_mut().enumerate() {
                for (v, &z) in column.iter_mut().zip(z) {
                    let s = z * z;
                    *v = match d {
                        0 => z,
                        1 => s - 1.0,
                        2 => z * (s - 3.0),
                        _ => s * (s - 6.0) + 3.0,
                    };
                }
            }
        }
    }

    /// Adds the sums of a block to `sums`, one a polynomial.
    #[inline(always)]
    pub fn add_block<S: Simd>(&self, columns: &[Column], sums: &mut [f64]) {
        add_runs::<S, 0>(columns, &self.ones, sums);
        add_runs::<S, 1>(columns, &self.twos, sums);
        add_runs::<S, 2>(columns, &self.threes, sums);
        add_runs::<S, 3>(columns, &self.fours, sums);
    }

    /// Writes every polynomial of a block, one column each.
    pub fn write_products(&self, columns: &[Column], products: &mut [Column]) {
        for (term, product) in self.terms.iter().zip(products) {
            product.fill(1.0);
            for &(axis, degree) in term {
                for (p, c) in product.iter_mut().zip(&columns[axis * self.degree + degree - 1]) {
                    *p *= c;
                }
            }
        }
    }
}

/// The terms of K + 1 factors, those with the same first K together.
fn runs<const K: usize>(terms: &[SmallVec<[(usize, usize); 4]>], degree: usize) -> Vec<Run<K>> {
    let mut runs: Vec<Run<K>> = Vec::new();
    for (place, term) in terms.iter().enumerate() {
        let factors: SmallVec<[usize; 4]> = term.iter().map(|&(axis, d)| axis * degree + d - 1).collect();
        let Some((&column, shared)) = factors.split_last() else { continue };
        let Ok(shared) = <[usize; K]>::try_from(shared) else { continue };
        let last = Last { column, place };
        match runs.iter_mut().find(|run| run.shared == shared) {
            Some(run) => run.lasts.push(last),
            None => runs.push(Run { shared, lasts: vec![last] }),
        }
    }
    runs
}

/// Adds every term of total degree `left` in the axes from `axis` on, after the factors `chosen`.
fn extend(
    terms: &mut Vec<SmallVec<[(usize, usize); 4]>>,
    axes: usize,
    axis: usize,
    left: usize,
    chosen: SmallVec<[(usize, usize); 4]>,
) {
    if left == 0 {
        terms.push(chosen);
        return;
    }
    for next in axis..axes {
        for degree in (1..=left).rev() {
            let mut more = chosen.clone();
            more.push((next, degree));
            extend(terms, axes, next + 1, left - degree, more);
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::lanes::{Level, Task, dispatch};
    use crate::net::BLOCK;

    struct Add<'a>(&'a Basis, &'a [Column], &'a mut [f64]);

    impl Task for Add<'_> {
        type Output = ();

        #[inline(always)]
        fn run<S: Simd>(self) {
            self.0.add_block::<S>(self.1, self.2);
        }
    }

    #[test]
    fn there_are_as_many_terms_as_monomials() {
        for axes in 1..=6 {
            for degree in 0..=4 {
                let basis = Basis::new(axes, degree);
                assert_eq!(basis.len(), Basis::count(axes, degree), "{axes} axes, degree {degree}");
                let mut terms = basis.terms.clone();
                terms.sort();
                terms.dedup();
                assert_eq!(terms.len(), basis.len(), "a term stands twice");
            }
        }
        assert_eq!(Basis::count(2, 4), 14);
        assert_eq!(Basis::count(6, 4), 209);
    }

    /// A lower degree is the beginning of a higher one, so that one set of sums serves both.
    #[test]
    fn a_lower_degree_is_a_prefix() {
        let (low, high) = (Basis::new(3, 2), Basis::new(3, 4));
        assert_eq!(low.terms[..], high.terms[..low.len()]);
    }

    /// Under a product Gauss-Hermite rule of 5 nodes, exact to degree 9 an axis, each polynomial has mean 0 and
    /// the mean square of its factors' factorials (orthogonality: Abramowitz & Stegun 22.2.15).
    #[test]
    fn the_polynomials_are_orthogonal_under_the_normal_law() {
        let rule = crate::method::GaussHermite::new(5, 1000).unwrap().rule().to_vec();
        let basis = Basis::new(2, 4);
        let mut z = vec![[0.0; BLOCK]; 2];
        let mut weights = [0.0; BLOCK];
        for (i, (x, wx)) in rule.iter().enumerate() {
            for (j, (y, wy)) in rule.iter().enumerate() {
                (z[0][5 * i + j], z[1][5 * i + j], weights[5 * i + j]) = (*x, *y, wx * wy);
            }
        }
        let mut columns = vec![[0.0; BLOCK]; basis.columns()];
        let mut products = vec![[0.0; BLOCK]; basis.len()];
        basis.write_columns(&z, &mut columns);
        basis.write_products(&columns, &mut products);
        let dot = |x: &Column, y: &Column| x.iter().zip(y).map(|(x, y)| x * y).sum::<f64>();
        for (s, left) in products.iter().enumerate() {
            let weighted = std::array::from_fn(|k| left[k] * weights[k]);
            assert!(dot(left, &weights).abs() < 1e-13, "mean of term {s}");
            for (t, right) in products.iter().enumerate() {
                let expected: f64 = if s == t {
                    basis.terms[s].iter().map(|&(_, d)| (1..=d).map(|k| k as f64).product::<f64>()).product()
                } else {
                    0.0
                };
                assert!((dot(&weighted, right) - expected).abs() < 1e-11, "terms {s} and {t}");
            }
        }
        let mut sums = vec![0.0; basis.len()];
        dispatch(Level::best(), Add(&basis, &columns, &mut sums));
        let total = |x: &Column| x.iter().sum::<f64>();
        for (sum, product) in sums.iter().zip(&products) {
            assert!((sum - total(product)).abs() < 1e-9 * total(&product.map(f64::abs)));
        }
    }
}
