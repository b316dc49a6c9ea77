//! Sums over the columns of a block, and over products of columns.
//!
//! Each sum runs in eight fixed lanes that are folded in a fixed order: the same bits at every level of vector
//! instructions. An addition waits for the one before it, and a load costs as much as a product, so four sums run side
//! by side and share the factors that they have in common. Written in lanes: left to itself the compiler pairs the
//! lanes as the fold does and shuffles every load, at twice to three times the time.

use crate::lanes::{Lanes, Level, Simd, Task, dispatch};
use crate::net::BLOCK;

/// One array of a block.
pub(super) type Column = [f64; BLOCK];

/// Sums that run side by side. SSE2 has registers for one, and is no slower with four.
const ABREAST: usize = 4;

/// Adds the sum of each column to its entry of `sums`.
#[inline(always)]
pub(super) fn add_totals<S: Simd>(columns: &[Column], sums: &mut [f64]) {
    add_each::<S, 0>([], columns, sums);
}

/// Adds the sum of the products of `left` with each column of `right` to its entry of `sums`.
#[inline(always)]
pub(super) fn add_dots<S: Simd>(left: &Column, right: &[Column], sums: &mut [f64]) {
    add_each::<S, 1>([left], right, sums);
}

#[inline(always)]
fn add_each<S: Simd, const K: usize>(shared: [&Column; K], columns: &[Column], sums: &mut [f64]) {
    let (fours, rest) = columns.as_chunks::<ABREAST>();
    let (four_sums, rest_sums) = sums.as_chunks_mut::<ABREAST>();
    for (four, sums) in fours.iter().zip(four_sums) {
        add(sums, totals::<S, K, ABREAST>(shared, four.each_ref()));
    }
    match rest {
        [a, b, c] => add(rest_sums, totals::<S, K, 3>(shared, [a, b, c])),
        [a, b] => add(rest_sums, totals::<S, K, 2>(shared, [a, b])),
        [a] => add(rest_sums, totals::<S, K, 1>(shared, [a])),
        _ => {}
    }
}

/// Products of columns that have all factors but the last in common.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) struct Run<const K: usize> {
    pub shared: [usize; K],
    pub lasts: Vec<Last>,
}

/// The last factor of a product, and the entry to which the product's sum is added.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Last {
    pub column: usize,
    pub place: usize,
}

/// Adds the sum of each product to its entry of `sums`.
#[inline(always)]
pub(super) fn add_runs<S: Simd, const K: usize>(columns: &[Column], runs: &[Run<K>], sums: &mut [f64]) {
    for run in runs {
        let shared = run.shared.map(|i| &columns[i]);
        let (fours, rest) = run.lasts.as_chunks::<ABREAST>();
        for four in fours {
            add_lasts::<S, K, ABREAST>(shared, *four, columns, sums);
        }
        match *rest {
            [a, b, c] => add_lasts::<S, K, 3>(shared, [a, b, c], columns, sums),
            [a, b] => add_lasts::<S, K, 2>(shared, [a, b], columns, sums),
            [a] => add_lasts::<S, K, 1>(shared, [a], columns, sums),
            _ => {}
        }
    }
}

#[inline(always)]
fn add_lasts<S: Simd, const K: usize, const N: usize>(
    shared: [&Column; K],
    lasts: [Last; N],
    columns: &[Column],
    sums: &mut [f64],
) {
    let totals = totals::<S, K, N>(shared, lasts.map(|last| &columns[last.column]));
    for (last, total) in lasts.iter().zip(totals) {
        sums[last.place] += total;
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
fn add<const N: usize>(sums: &mut [f64], totals: [f64; N]) {
    for (sum, total) in sums.iter_mut().zip(totals) {
        *sum += total;
    }
}

/// Sums of N products, each of the K shared columns and one of its own.
#[inline(always)]
#[allow(clippy::needless_range_loop, reason = "plain loops are sure to be inlined")]
fn totals<S: Simd, const K: usize, const N: usize>(shared: [&Column; K], own: [&Column; N]) -> [f64; N] {
    let mut sums = [Lanes::<S>::splat(0.0); N];
    for eight in 0..BLOCK / 8 {
        let mut common = Lanes::<S>::splat(1.0);
        for (k, column) in shared.iter().enumerate() {
            let factor = Lanes::from_array(&column.as_chunks().0[eight]);
            common = if k == 0 { factor } else { common * factor };
        }
        for n in 0..N {
            let factor = Lanes::from_array(&own[n].as_chunks().0[eight]);
            sums[n] = sums[n] + if K == 0 { factor } else { common * factor };
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

    struct Runs<'a, const K: usize>(&'a [Column], &'a [Run<K>], &'a mut [f64]);

    impl<const K: usize> Task for Runs<'_, K> {
        type Output = ();
        #[inline(always)]
        fn run<S: Simd>(self) {
            add_runs::<S, K>(self.0, self.1, self.2);
        }
    }

    /// 256 terms up to 2.6 in size, rounded each, are within 256 x 600 x 2^-53 = 2e-11 of any other order.
    const TOLERANCE: f64 = 2e-11;

    /// Runs of 1 to 7 products: fours, and every number that is left over.
    fn check<const K: usize>(level: Level, columns: &[Column]) {
        for length in 1..=7 {
            let lasts = (0..length).map(|n| Last { column: (n + 3) % 7, place: length - 1 - n }).collect();
            let run: Run<K> = Run { shared: std::array::from_fn(|k| 2 * k), lasts };
            let mut sums = vec![1.0; length];
            dispatch(level, Runs(columns, std::slice::from_ref(&run), &mut sums));
            for last in &run.lasts {
                let common = |i: usize| run.shared.iter().map(|&f| columns[f][i]).product::<f64>();
                let expected = 1.0 + (0..BLOCK).map(|i| common(i) * columns[last.column][i]).sum::<f64>();
                assert!((sums[last.place] - expected).abs() < TOLERANCE, "{level}: {last:?} of {length}");
            }
        }
    }

    #[test]
    fn products_of_columns_are_summed_at_every_level() {
        let columns: Vec<Column> = (0..7).map(|k| column(0.1 + 0.3 * f64::from(k))).collect();
        for level in Level::available() {
            check::<0>(level, &columns);
            check::<1>(level, &columns);
            check::<2>(level, &columns);
            check::<3>(level, &columns);
            let (mut totals, mut dots) = ([1.0; 7], [1.0; 7]);
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
