//! Control variates: what the sums of Hermite polynomials tell of a replicate's error.

use nalgebra::{Cholesky, DMatrix};

use super::basis::Basis;
use super::block::Block;
use super::columns::{Column, add_dots};
use super::sums::Sums;
use crate::lanes::{Level, Simd, Task, dispatch};
use crate::net::BLOCK;

/// Regression of every integrand on the control variates.
///
/// Integrands are e_j, e_j e_k (k <= j) and z_i e_j, in the order of [`Sums`]. The coefficients come from a pilot
/// of its own points; given the pilot, each replicate's estimate mean(q) - c' mean(controls) is as unbiased as
/// mean(q), because the controls' expectation is zero.
///
/// Source: P. Glasserman, Monte Carlo Methods in Financial Engineering (Springer, 2003), sec. 4.1 (linear control
/// variates, coefficients from a pilot; section from memory).
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Controls {
    pub basis: Basis,
    /// One column an integrand, one row a polynomial (K x M).
    coefficients: DMatrix<f64>,
    /// About the integrands' expectations (M).
    intercepts: Vec<f64>,
}

impl Controls {
    /// No control variates.
    pub fn none(a: usize, p: usize) -> Self {
        Self {
            basis: Basis::new(a, 0),
            coefficients: DMatrix::zeros(0, integrands(a, p)),
            intercepts: vec![0.0; integrands(a, p)],
        }
    }

    /// Means of the integrands with the controls' error taken out: e (p), e e' (packed), z e' (p x a).
    pub fn means(&self, sums: &Sums) -> Means {
        let scale = 1.0 / sums.count;
        let errors: Vec<f64> = sums.basis.iter().take(self.basis.len()).map(|s| s * scale).collect();
        let mut place = 0;
        let mut adjusted = |raw: &[f64]| -> Vec<f64> {
            raw.iter()
                .map(|sum| {
                    let known: f64 = self.coefficients.column(place).iter().zip(&errors).map(|(c, e)| c * e).sum();
                    place += 1;
                    sum * scale - known
                })
                .collect()
        };
        Means { e: adjusted(&sums.e), ee: adjusted(&sums.ee), ze: adjusted(&sums.ze) }
    }

    /// Room to compute point by point what the controls leave of the integrands.
    pub fn residuals(&self) -> Residuals<'_> {
        let room = |n: usize| vec![[0.0; BLOCK]; n];
        let (columns, products) = (room(self.basis.columns()), room(self.basis.len()));
        Residuals { controls: self, columns, products, left: room(self.intercepts.len()) }
    }
}

/// What control variates leave of each integrand, in the order of [`Sums`].
#[derive(Debug)]
pub(super) struct Residuals<'a> {
    controls: &'a Controls,
    columns: Vec<Column>,
    products: Vec<Column>,
    left: Vec<Column>,
}

impl Residuals<'_> {
    /// Of the points of a block, one column an integrand.
    pub fn of(&mut self, block: &Block, level: Level) -> &[Column] {
        dispatch(level, TakeOut { block, residuals: self });
        &self.left
    }
}

struct TakeOut<'a, 'b> {
    block: &'a Block,
    residuals: &'a mut Residuals<'b>,
}

impl Task for TakeOut<'_, '_> {
    type Output = ();

    #[inline(always)]
    fn run<S: Simd>(self) {
        let Residuals { controls, columns, products, left } = self.residuals;
        controls.basis.write_columns(&self.block.z, columns);
        controls.basis.write_products(columns, products);
        write_integrands(&self.block.z, &self.block.e, left);
        let coefficients = controls.coefficients.column_iter().zip(&controls.intercepts);
        for (left, (coefficients, intercept)) in left.iter_mut().zip(coefficients) {
            left.iter_mut().for_each(|v| *v -= intercept);
            for (c, product) in coefficients.iter().zip(products.iter()) {
                left.iter_mut().zip(product).for_each(|(v, product)| *v -= c * product);
            }
        }
    }
}

/// Sample means of the integrands.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Means {
    pub e: Vec<f64>,
    pub ee: Vec<f64>,
    pub ze: Vec<f64>,
}

/// How many integrands there are.
fn integrands(a: usize, p: usize) -> usize {
    p + p * (p + 1) / 2 + a * p
}

/// Least squares of the integrands on the polynomials, gathered block by block.
#[derive(Debug)]
pub(super) struct Regression {
    basis: Basis,
    /// Means over the pilot of products of controls (K + 1 with the constant first).
    gram: DMatrix<f64>,
    /// Products of controls with integrands (K + 1 x M).
    cross: DMatrix<f64>,
    columns: Vec<Column>,
    products: Vec<Column>,
    integrands: Vec<Column>,
}

impl Regression {
    pub fn new(a: usize, p: usize, degree: usize) -> Self {
        let basis = Basis::new(a, degree);
        let (k, m) = (basis.len() + 1, integrands(a, p));
        let room = |n: usize| vec![[0.0; BLOCK]; n];
        Self {
            gram: DMatrix::zeros(k, k),
            cross: DMatrix::zeros(k, m),
            columns: room(basis.columns()),
            products: room(k),
            integrands: room(m),
            basis,
        }
    }

    /// Adds a block of the pilot.
    pub fn add(&mut self, block: &Block, level: Level) {
        dispatch(level, AddPilot { block, regression: self });
    }

    /// The coefficients on the polynomials up to `degree`, at most that of the regression; no controls where the
    /// least squares cannot be solved or a sample was not finite.
    pub fn solve(&self, degree: usize, a: usize, p: usize) -> Controls {
        let basis = Basis::new(a, degree);
        let k = basis.len() + 1;
        // Only the lower triangle was filled, which is all that the factorisation reads.
        let gram = self.gram.view((0, 0), (k, k)).into_owned();
        let cross = self.cross.view((0, 0), (k, self.cross.ncols())).into_owned();
        let solved = Cholesky::new(gram).map(|g| g.solve(&cross));
        match solved.filter(|c| c.iter().all(|v| v.is_finite())) {
            Some(coefficients) => {
                let intercepts = coefficients.row(0).iter().copied().collect();
                Controls { basis, coefficients: coefficients.remove_row(0), intercepts }
            }
            None => Controls::none(a, p),
        }
    }
}

struct AddPilot<'a> {
    block: &'a Block,
    regression: &'a mut Regression,
}

impl Task for AddPilot<'_> {
    type Output = ();

    #[inline(always)]
    fn run<S: Simd>(self) {
        let Regression { basis, gram, cross, columns, products, integrands } = self.regression;
        basis.write_columns(&self.block.z, columns);
        products[0].fill(1.0);
        basis.write_products(columns, &mut products[1..]);
        write_integrands(&self.block.z, &self.block.e, integrands);
        // Column by column, of the Gram matrix what stands on and below the diagonal.
        let k = products.len();
        for (t, (left, column)) in products.iter().zip(gram.as_mut_slice().chunks_exact_mut(k)).enumerate() {
            add_dots::<S>(left, &products[t..], &mut column[t..]);
        }
        for (integrand, column) in integrands.iter().zip(cross.as_mut_slice().chunks_exact_mut(k)) {
            add_dots::<S>(integrand, products, column);
        }
    }
}

fn write_integrands(z: &[Column], e: &[Column], out: &mut [Column]) {
    let mut out = out.iter_mut();
    let mut put = |left: &Column, right: Option<&Column>| {
        if let Some(column) = out.next() {
            *column = *left;
            if let Some(right) = right {
                column.iter_mut().zip(right).for_each(|(c, r)| *c *= r);
            }
        }
    };
    for output in e {
        put(output, None);
    }
    for (j, left) in e.iter().enumerate() {
        for right in &e[..=j] {
            put(left, Some(right));
        }
    }
    for output in e {
        for input in z {
            put(output, Some(input));
        }
    }
}
