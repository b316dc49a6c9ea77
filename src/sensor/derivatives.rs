use nalgebra::{Const, DMatrix, DVector, U1};
use num_dual::{Dual2SVec, DualSVec, HyperDual};
use smallvec::SmallVec;

use super::{Formula, Number, Real};

/// Value, Jacobian and Hessians of a sensor at one point.
#[derive(Debug, Clone, PartialEq)]
pub struct Derivatives<T: Real = f64> {
    /// h(x) (p).
    pub value: DVector<T>,
    /// dh_j/dx_i (p x a).
    pub jacobian: DMatrix<T>,
    /// One a x a matrix an output: d2h_j / dx_i dx_k.
    pub hessians: Vec<DMatrix<T>>,
}

impl<T: Real> Derivatives<T> {
    /// Room for a sensor that reads `a` components and has `p` outputs.
    pub fn zeros(a: usize, p: usize) -> Self {
        Self { value: DVector::zeros(p), jacobian: DMatrix::zeros(p, a), hessians: vec![DMatrix::zeros(a, a); p] }
    }
}

type Few<T> = SmallVec<[T; 8]>;

/// Whether code is compiled for `n` inputs of formula `F`. Both arms of a condition on a constant would cost a minute of
/// compilation over all sensors; the arm that cannot be is not even looked at.
const fn compiled<F: Formula>(n: usize) -> bool {
    let mut k = 0;
    while k < F::INPUTS.len() {
        if F::INPUTS[k] == n {
            return true;
        }
        k += 1;
    }
    F::INPUTS.is_empty()
}

/// Exact Jacobian by forward mode, up to four directions a pass.
pub(super) fn jacobian<F: Formula, T: Real>(f: &F, x: &[T], y: &mut [T], jacobian: &mut DMatrix<T>) {
    let mut first = 0;
    while first < x.len() {
        first += match x.len() - first {
            2 if const { compiled::<F>(2) || compiled::<F>(6) } => directions::<F, T, 2>(f, x, first, y, jacobian),
            3 if const { compiled::<F>(3) } => directions::<F, T, 3>(f, x, first, y, jacobian),
            4.. if const { compiled::<F>(4) || compiled::<F>(6) } => {
                directions::<F, T, 4>(f, x, first, y, jacobian)
            }
            _ => directions::<F, T, 1>(f, x, first, y, jacobian),
        };
    }
}

fn directions<F: Formula, T: Real, const N: usize>(
    f: &F,
    x: &[T],
    first: usize,
    y: &mut [T],
    jacobian: &mut DMatrix<T>,
) -> usize {
    let inputs: Few<DualSVec<T, N>> = x
        .iter()
        .enumerate()
        .map(|(i, &v)| {
            let dual = DualSVec::<T, N>::from_re(v);
            if (first..first + N).contains(&i) { dual.derivative(i - first) } else { dual }
        })
        .collect();
    let mut outputs: Few<DualSVec<T, N>> = SmallVec::from_elem(Number::constant(0.0), y.len());
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
pub(super) fn hessians<F: Formula, T: Real>(f: &F, x: &[T], at: &mut Derivatives<T>) {
    match x.len() {
        1 if const { compiled::<F>(1) } => whole::<F, T, 1>(f, x, at),
        2 if const { compiled::<F>(2) } => whole::<F, T, 2>(f, x, at),
        3 if const { compiled::<F>(3) } => whole::<F, T, 3>(f, x, at),
        4 if const { compiled::<F>(4) } => whole::<F, T, 4>(f, x, at),
        5 if const { compiled::<F>(5) } => whole::<F, T, 5>(f, x, at),
        6 if const { compiled::<F>(6) } => whole::<F, T, 6>(f, x, at),
        _ => pairs(f, x, at),
    }
}

fn whole<F: Formula, T: Real, const N: usize>(f: &F, x: &[T], at: &mut Derivatives<T>) {
    let inputs: Few<Dual2SVec<T, N>> =
        x.iter().enumerate().map(|(i, &v)| Dual2SVec::<T, N>::from_re(v).derivative(i)).collect();
    let mut outputs: Few<Dual2SVec<T, N>> = SmallVec::from_elem(Number::constant(0.0), at.value.len());
    f.evaluate(&inputs, &mut outputs);
    for (j, dual) in outputs.iter().enumerate() {
        at.value[j] = dual.re;
        at.jacobian.row_mut(j).copy_from(&dual.v1.unwrap_generic(U1, Const::<N>));
        at.hessians[j].copy_from(&dual.v2.unwrap_generic(Const::<N>, Const::<N>));
        // A product of duals rounds its two mixed terms in different orders: the last bit may differ across the diagonal.
        at.hessians[j].fill_lower_triangle_with_upper_triangle();
    }
}

fn pairs<F: Formula, T: Real>(f: &F, x: &[T], at: &mut Derivatives<T>) {
    let (zero, one) = (T::constant(0.0), T::constant(1.0));
    let mut inputs: Few<HyperDual<T>> = x.iter().map(|&v| HyperDual::from_re(v)).collect();
    let mut outputs: Few<HyperDual<T>> = SmallVec::from_elem(Number::constant(0.0), at.value.len());
    for i in 0..x.len() {
        for k in i..x.len() {
            inputs[i].eps1 = one;
            inputs[k].eps2 = one;
            f.evaluate(&inputs, &mut outputs);
            inputs[i].eps1 = zero;
            inputs[k].eps2 = zero;
            for (j, dual) in outputs.iter().enumerate() {
                at.value[j] = dual.re;
                at.jacobian[(j, i)] = dual.eps1;
                at.hessians[j][(i, k)] = dual.eps1eps2;
                at.hessians[j][(k, i)] = dual.eps1eps2;
            }
        }
    }
}
