//! Sums over the columns of a block, and over products of columns.
//!
//! Each sum runs in eight fixed lanes that are folded in a fixed order: the same bits at every level of vector
//! instructions. An addition waits for the one before it, so four sums run side by side. Written in lanes: left to
//! itself the compiler pairs the lanes as the fold does and shuffles every load, at twice to three times the time.

use super::net::BLOCK;
use crate::lanes::{Lanes, Level, Simd, Task, dispatch};

/// One array of a block.
pub(super) type Column = [f64; BLOCK];

/// Sums that run side by side. SSE2 has registers for one, and is no slower with four.
const ABREAST: usize = 4;

/// Adds the sum of each column to its entry of `sums`.
#[inline(always)]
pub(super) fn add_totals<S: Simd>(columns: &[Column], sums: &mut [f64]) {
    let (fours, rest) = columns.as_chunks::<ABREAST>();
    let (four_sums, rest_sums) = sums.as_chunks_mut::<ABREAST>();
    for (four, sums) in fours.iter().zip(four_sums) {
        add(sums, totals::<S, ABREAST, 1>(four.each_ref().map(|c| [c])));
    }
    for (column, sum) in rest.iter().zip(rest_sums) {
        *sum += totals::<S, 1, 1>([[column]])[0];
    }
}

/// Adds the sum of the products of `left` with each column of `right` to its entry of `sums`.
#[inline(always)]
pub(super) fn add_dots<S: Simd>(left: &Column, right: &[Column], sums: &mut [f64]) {
    let (fours, rest) = right.as_chunks::<ABREAST>();
    let (four_sums, rest_sums) = sums.as_chunks_mut::<ABREAST>();
    for (four, sums) in fours.iter().zip(four_sums) {
        add(sums, totals::<S, ABREAST, 2>(four.each_ref().map(|c| [left, c])));
    }
    for (column, sum) in rest.iter().zip(rest_sums) {
        *sum += totals::<S, 1, 2>([[left, column]])[0];
    }
}

/// A product of K columns, and the entry to which its sum is added.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Product<const K: usize> {
    pub factors: [usize; K],
    pub place: usize,
}

/// Adds the sum of each product to its entry of `sums`.
#[inline(always)]
pub(super) fn add_products<S: Simd, const K: usize>(columns: &[Column], products: &[Product<K>], sums: &mut [f64]) {
    let (fours, rest) = products.as_chunks::<ABREAST>();
    for four in fours {
        let totals = totals::<S, ABREAST, K>(four.map(|p| p.factors.map(|i| &columns[i])));
        for (product, total) in four.iter().zip(totals) {
            sums[product.place] += total;
        }
    }
    for product in rest {
        sums[product.place] += totals::<S, 1, K>([product.factors.map(|i| &columns[i])])[0];
    }
}

/// [`add_totals`] with the instructions of `level`.
pub(super) fn add_totals_at(level: Level, columns: &[Column], sums: &mut [f64]) {
    struct Totals<'a>(&'a [Column], &'a mut [f64]);
    impl Task for Totals<'_> {
        type Output = ();
        #[inline(always)]
        fn run<S: Simd>(self) {
            add_totals::<S>(self.0, self.1);
        }
    }
    dispatch(level, Totals(columns, sums));
}

/// [`add_dots`] with the instructions of `level`.
pub(super) fn add_dots_at(level: Level, left: &Column, right: &[Column], sums: &mut [f64]) {
    struct Dots<'a>(&'a Column, &'a [Column], &'a mut [f64]);
    impl Task for Dots<'_> {
        type Output = ();
        #[inline(always)]
        fn run<S: Simd>(self) {
            add_dots::<S>(self.0, self.1, self.2);
        }
    }
    dispatch(level, Dots(left, right, sums));
}

#[inline(always)]
fn add<const N: usize>(sums: &mut [f64; N], totals: [f64; N]) {
    for (sum, total) in sums.iter_mut().zip(totals) {
        *sum += total;
    }
}

/// Sums of N products of K columns each.
#[inline(always)]
fn totals<S: Simd, const N: usize, const K: usize>(products: [[&Column; K]; N]) -> [f64; N] {
    let mut sums = [Lanes::<S>::splat(0.0); N];
    for eight in 0..BLOCK / 8 {
        for n in 0..N {
            let at = |k: usize| &products[n][k].as_chunks::<8>().0[eight];
            let term = match K {
                1 => Lanes::<S>::from_array(at(0)),
                2 => Lanes::<S>::from_array(at(0)) * Lanes::from_array(at(1)),
                3 => Lanes::<S>::from_array(at(0)) * Lanes::from_array(at(1)) * Lanes::from_array(at(2)),
                _ => {
                    (Lanes::<S>::from_array(at(0)) * Lanes::from_array(at(1)))
                        * (Lanes::from_array(at(2)) * Lanes::from_array(at(3)))
                }
            };
            sums[n] = sums[n] + term;
        }
    }
    let mut folded = [0.0; N];
    for n in 0..N {
        let l = sums[n].to_array();
        folded[n] = ((l[0] + l[1]) + (l[2] + l[3])) + ((l[4] + l[5]) + (l[6] + l[7]));
    }
    folded
}

#[cfg(test)]
mod tests {
    use super::*;

    fn column(phase: f64) -> Column {
        std::array::from_fn(|k| (phase + 0.7 * k as f64).sin() + 0.1 * phase)
    }

    struct Products<'a, const K: usize>(&'a [Column], &'a [Product<K>], &'a mut [f64]);

    impl<const K: usize> Task for Products<'_, K> {
        type Output = ();
        #[inline(always)]
        fn run<S: Simd>(self) {
            add_products::<S, K>(self.0, self.1, self.2);
        }
    }

    /// Six columns, so that four go side by side and two alone; 256 terms up to 2 in size, rounded each, are within
    /// 256 x 256 x 2^-53 = 7e-12 of any other order.
    const TOLERANCE: f64 = 1e-11;

    fn check<const K: usize>(level: Level, columns: &[Column]) {
        let products: Vec<Product<K>> =
            (0..6).map(|n| Product { factors: std::array::from_fn(|k| (n + 2 * k) % 6), place: 5 - n }).collect();
        let mut sums = [1.0; 6];
        dispatch(level, Products(columns, &products, &mut sums));
        for product in &products {
            let term = |i: usize| product.factors.iter().map(|&f| columns[f][i]).product::<f64>();
            let expected = 1.0 + (0..BLOCK).map(term).sum::<f64>();
            assert!((sums[product.place] - expected).abs() < TOLERANCE, "{level}: {product:?}");
        }
    }

    #[test]
    fn products_of_columns_are_summed_at_every_level() {
        let columns: Vec<Column> = (0..6).map(|k| column(0.1 + f64::from(k))).collect();
        for level in Level::available() {
            check::<1>(level, &columns);
            check::<2>(level, &columns);
            check::<3>(level, &columns);
            check::<4>(level, &columns);
            let (mut totals, mut dots) = ([1.0; 6], [1.0; 6]);
            add_totals_at(level, &columns, &mut totals);
            add_dots_at(level, &columns[2], &columns, &mut dots);
            for (k, column) in columns.iter().enumerate() {
                let dot: f64 = column.iter().zip(&columns[2]).map(|(x, y)| x * y).sum();
                assert!((totals[k] - 1.0 - column.iter().sum::<f64>()).abs() < TOLERANCE, "{level}: {k}");
                assert!((dots[k] - 1.0 - dot).abs() < TOLERANCE, "{level}: {k}");
            }
        }
    }
}
