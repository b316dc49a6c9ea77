use nalgebra::{Const, DMatrix, DVector, U1};
use num_dual::{Dual2SVec64, DualSVec64, HyperDual64};
use smallvec::SmallVec;

use super::{Formula, Number};

/// Value, Jacobian and Hessians of a sensor at one point.
#[derive(Debug, Clone, PartialEq)]
pub struct Derivatives {
    /// h(x) (p).
    pub value: DVector<f64>,
    /// dh_j/dx_i (p x a).
    pub jacobian: DMatrix<f64>,
    /// One a x a matrix an output: d2h_j / dx_i dx_k.
    pub hessians: Vec<DMatrix<f64>>,
}

impl Derivatives {
    /// Room for a sensor that reads `a` components and has `p` outputs.
    pub fn zeros(a: usize, p: usize) -> Self {
        Self { value: DVector::zeros(p), jacobian: DMatrix::zeros(p, a), hessians: vec![DMatrix::zeros(a, a); p] }
    }
}

type Few<T> = SmallVec<[T; 8]>;

/// Exact Jacobian by forward mode, up to four directions a pass.
pub(super) fn jacobian<F: Formula + ?Sized>(f: &F, x: &[f64], y: &mut [f64], jacobian: &mut DMatrix<f64>) {
    let mut first = 0;
    while first < x.len() {
        first += match x.len() - first {
            1 => directions::<F, 1>(f, x, first, y, jacobian),
            2 => directions::<F, 2>(f, x, first, y, jacobian),
            3 => directions::<F, 3>(f, x, first, y, jacobian),
            _ => directions::<F, 4>(f, x, first, y, jacobian),
        };
    }
}

fn directions<F: Formula + ?Sized, const N: usize>(
    f: &F,
    x: &[f64],
    first: usize,
    y: &mut [f64],
    jacobian: &mut DMatrix<f64>,
) -> usize {
    let inputs: Few<DualSVec64<N>> = x
        .iter()
        .enumerate()
        .map(|(i, &v)| {
            let dual = DualSVec64::<N>::from_re(v);
            if (first..first + N).contains(&i) { dual.derivative(i - first) } else { dual }
        })
        .collect();
    let mut outputs: Few<DualSVec64<N>> = SmallVec::from_elem(Number::constant(0.0), y.len());
    f.evaluate(&inputs, &mut outputs);
    for (j, dual) in outputs.iter().enumerate() {
        y[j] = dual.re;
        let gradient = dual.eps.unwrap_generic(Const::<N>, U1);
        for i in 0..N {
            jacobian[(j, first + i)] = gradient[i];
        }
    }
    N
}

/// Exact Hessians: one pass of second-order duals up to six inputs, hyper-dual pairs beyond.
pub(super) fn hessians<F: Formula + ?Sized>(f: &F, x: &[f64], at: &mut Derivatives) {
    match x.len() {
        1 => whole::<F, 1>(f, x, at),
        2 => whole::<F, 2>(f, x, at),
        3 => whole::<F, 3>(f, x, at),
        4 => whole::<F, 4>(f, x, at),
        5 => whole::<F, 5>(f, x, at),
        6 => whole::<F, 6>(f, x, at),
        _ => pairs(f, x, at),
    }
}

fn whole<F: Formula + ?Sized, const N: usize>(f: &F, x: &[f64], at: &mut Derivatives) {
    let inputs: Few<Dual2SVec64<N>> =
        x.iter().enumerate().map(|(i, &v)| Dual2SVec64::<N>::from_re(v).derivative(i)).collect();
    let mut outputs: Few<Dual2SVec64<N>> = SmallVec::from_elem(Number::constant(0.0), at.value.len());
    f.evaluate(&inputs, &mut outputs);
    for (j, dual) in outputs.iter().enumerate() {
        at.value[j] = dual.re;
        at.jacobian.row_mut(j).copy_from(&dual.v1.unwrap_generic(U1, Const::<N>));
        at.hessians[j].copy_from(&dual.v2.unwrap_generic(Const::<N>, Const::<N>));
        // A product adds its terms in another order on either side of the diagonal and rounds them apart.
        at.hessians[j].fill_lower_triangle_with_upper_triangle();
    }
}

fn pairs<F: Formula + ?Sized>(f: &F, x: &[f64], at: &mut Derivatives) {
    let mut inputs: Few<HyperDual64> = x.iter().map(|&v| HyperDual64::from_re(v)).collect();
    let mut outputs: Few<HyperDual64> = SmallVec::from_elem(Number::constant(0.0), at.value.len());
    for i in 0..x.len() {
        for k in i..x.len() {
            inputs[i].eps1 = 1.0;
            inputs[k].eps2 = 1.0;
            f.evaluate(&inputs, &mut outputs);
            inputs[i].eps1 = 0.0;
            inputs[k].eps2 = 0.0;
            for (j, dual) in outputs.iter().enumerate() {
                at.value[j] = dual.re;
                at.jacobian[(j, i)] = dual.eps1;
                at.hessians[j][(i, k)] = dual.eps1eps2;
                at.hessians[j][(k, i)] = dual.eps1eps2;
            }
        }
    }
}
