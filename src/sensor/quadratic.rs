use nalgebra::{DMatrix, DVector};
use serde::{Deserialize, Serialize};

use crate::gaussian::{Gaussian, Moments};

use super::exact::write_linear;
use super::kinds::{Kind, built};
use super::parameter::{checked_row, read_components};
use super::{ExactMoments, Formula, Number, Output, ParameterError};

pub(super) const KIND: Kind = Kind {
    name: "quadratic",
    summary: "quadratic forms of the state",
    formula: "y_j = x' A_j x + b_j' x + c_j",
    parameters: "A: p matrices n x n; b: p x n = 0; c: p = 0",
    quantities: &[],
    source: "Mathai, Provost 1992",
    example: r#"{"case":"meter","sensor":{"kind":"quadratic","A":[[[1,0],[0,1]]]},"prior":{"mean":[1,0.5],"covariance":[[0.04,0],[0,0.09]]},"noise":{"covariance":0.01}}"#,
    build: |map, n| built(map, n, Quadratic::from_parameters),
};

/// Quadratic forms: y_j = x' A_j x + b_j' x + c_j.
///
/// Its moments are known exactly: E\[y_j\] = tr(A_j P) + m' A_j m + b_j' m + c_j, Cov(y_i, y_j) =
/// 2 tr(A_i P A_j P) + g_i' P g_j with g = 2 A m + b, Cov(x, y_j) = P g_j (A symmetric).
///
/// Source: A. M. Mathai, S. B. Provost, Quadratic Forms in Random Variables (Dekker, 1992), ch. 3 (chapter
/// from memory).
#[derive(Debug, Clone, PartialEq)]
pub struct Quadratic {
    reads: Vec<usize>,
    forms: Vec<Form>,
    outputs: Vec<Output>,
}

#[derive(Debug, Clone, PartialEq)]
struct Form {
    /// Rows of the upper triangle: entry (i, k), k >= i, holds a_ii or a_ik + a_ki.
    upper: Vec<Vec<f64>>,
    linear: Vec<f64>,
    constant: f64,
}

/// What a suite or a case record says of a [`Quadratic`].
#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Parameters {
    #[serde(rename = "A")]
    a: Vec<Vec<Vec<f64>>>,
    #[serde(default, skip_serializing_if = "Option::is_none")]
    b: Option<Vec<Vec<f64>>>,
    #[serde(default, skip_serializing_if = "Option::is_none")]
    c: Option<Vec<f64>>,
}

impl Quadratic {
    /// Forms `a` (p matrices n x n; only their symmetric parts count), linear parts `b` (p x n) and constants
    /// `c` (p) on a state of `n`. Components that no form touches are not read.
    ///
    /// # Errors
    /// [`ParameterError`] if there is no form, a shape does not fit, or a number is not finite.
    pub fn new(a: Vec<Vec<Vec<f64>>>, b: Vec<Vec<f64>>, c: Vec<f64>, n: usize) -> Result<Self, ParameterError> {
        let p = a.len();
        if p == 0 {
            return Err(ParameterError::new("A", "give at least one matrix"));
        }
        for (j, matrix) in a.iter().enumerate() {
            if matrix.len() != n {
                return Err(ParameterError::new(
                    format!("A[{j}]"),
                    format!("has {} rows; the state has {n} components", matrix.len()),
                ));
            }
            for (i, row) in matrix.iter().enumerate() {
                checked_row(&format!("A[{j}][{i}]"), row, n)?;
            }
        }
        if b.len() != p {
            return Err(ParameterError::new(
                "b",
                format!("has {} rows; {p} are needed, one a matrix in A", b.len()),
            ));
        }
        for (j, row) in b.iter().enumerate() {
            checked_row(&format!("b[{j}]"), row, n)?;
        }
        checked_row("c", &c, p)?;
        let reads = read_components(n, |i| {
            (0..p).any(|j| b[j][i] != 0.0 || (0..n).any(|k| a[j][i][k] != 0.0 || a[j][k][i] != 0.0))
        });
        let forms = (0..p).map(|j| Form::new(&a[j], &b[j], c[j], &reads)).collect();
        let outputs = (1..=p).map(|j| Output::plain(format!("y{j}"), "")).collect();
        Ok(Self { reads, forms, outputs })
    }

    pub(super) fn from_parameters(p: Parameters, n: usize) -> Result<Self, ParameterError> {
        let outputs = p.a.len();
        let b = p.b.unwrap_or_else(|| vec![vec![0.0; n]; outputs]);
        let c = p.c.unwrap_or_else(|| vec![0.0; outputs]);
        Self::new(p.a, b, c, n)
    }
}

impl Form {
    fn new(a: &[Vec<f64>], b: &[f64], constant: f64, reads: &[usize]) -> Self {
        let upper = (0..reads.len())
            .map(|i| {
                (i..reads.len())
                    .map(|k| {
                        let (row, column) = (reads[i], reads[k]);
                        if i == k { a[row][row] } else { a[row][column] + a[column][row] }
                    })
                    .collect()
            })
            .collect();
        Self { upper, linear: reads.iter().map(|&i| b[i]).collect(), constant }
    }
}

impl Formula for Quadratic {
    fn reads(&self) -> &[usize] {
        &self.reads
    }

    fn outputs(&self) -> &[Output] {
        &self.outputs
    }

    fn exact_moments(&self) -> Option<&dyn ExactMoments> {
        Some(self)
    }

    #[inline(always)]
    fn evaluate<T: Number>(&self, x: &[T], y: &mut [T]) {
        for (form, output) in self.forms.iter().zip(y) {
            let mut sum = T::constant(form.constant);
            for (i, row) in form.upper.iter().enumerate() {
                let mut slope = T::constant(form.linear[i]);
                for (&weight, &component) in row.iter().zip(&x[i..]) {
                    slope = slope + T::constant(weight) * component;
                }
                sum = sum + slope * x[i];
            }
            *output = sum;
        }
    }
}

impl Form {
    /// A_ik of the symmetric A.
    fn entry(&self, i: usize, k: usize) -> f64 {
        if i == k { self.upper[i][0] } else { 0.5 * self.upper[i.min(k)][i.abs_diff(k)] }
    }

    /// (A P)_ik.
    fn bend(&self, covariance: &DMatrix<f64>, i: usize, k: usize) -> f64 {
        (0..self.upper.len()).map(|l| self.entry(i, l) * covariance[(l, k)]).sum()
    }

    /// g_k = (2 A m + b)_k.
    fn slope(&self, mean: &DVector<f64>, k: usize) -> f64 {
        self.linear[k] + 2.0 * (0..self.upper.len()).map(|l| self.entry(k, l) * mean[l]).sum::<f64>()
    }
}

impl ExactMoments for Quadratic {
    fn write_exact(&self, prior: &Gaussian, moments: &mut Moments) {
        let (a, covariance) = (prior.dimension(), prior.covariance());
        self.evaluate(prior.mean().as_slice(), moments.mean.as_mut_slice());
        write_linear(prior, |j, k| self.forms[j].slope(prior.mean(), k), moments);
        for (j, form) in self.forms.iter().enumerate() {
            moments.mean[j] += (0..a).map(|i| form.bend(covariance, i, i)).sum::<f64>();
            for (l, other) in self.forms[..=j].iter().enumerate() {
                let product = |i: usize, k: usize| form.bend(covariance, i, k) * other.bend(covariance, k, i);
                let bent = 2.0 * (0..a).map(|i| (0..a).map(|k| product(i, k)).sum::<f64>()).sum::<f64>();
                moments.covariance[(j, l)] += bent;
                if l != j {
                    moments.covariance[(l, j)] += bent;
                }
            }
        }
    }
}
