use serde::{Deserialize, Serialize};

use crate::gaussian::{Gaussian, Moments};

use super::exact::write_linear;
use super::kinds::{Kind, built};
use super::parameter::{checked_row, read_components};
use super::{ExactMoments, Formula, Number, Output, ParameterError};

pub(super) const KIND: Kind = Kind {
    name: "linear",
    summary: "linear reading, the sanity sensor: every method is exact on it",
    formula: "y = H x + offset",
    parameters: "H: p x n; offset: p = 0",
    quantities: &[],
    source: "Kalman 1960",
    example: r#"{"case":"gauge","sensor":{"kind":"linear","H":[[1,-1]]},"prior":{"mean":[2,3],"covariance":[[1,0.2],[0.2,1]]},"noise":{"covariance":0.1}}"#,
    build: |map, n| built(map, n, Linear::from_parameters),
};

/// The sanity sensor: y = H x + offset. Every method must be exact on it.
///
/// Source: R. E. Kalman, "A new approach to linear filtering and prediction problems", Trans. ASME J. Basic
/// Eng. 82 (1960) 35-45.
#[derive(Debug, Clone, PartialEq)]
pub struct Linear {
    reads: Vec<usize>,
    /// p rows over the read components.
    rows: Vec<Vec<f64>>,
    offset: Vec<f64>,
    outputs: Vec<Output>,
}

/// What a suite or a case record says of a [`Linear`].
#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Parameters {
    #[serde(rename = "H")]
    h: Vec<Vec<f64>>,
    #[serde(default, skip_serializing_if = "Option::is_none")]
    offset: Option<Vec<f64>>,
}

impl Linear {
    /// Rows `h` (p x n) and offsets (p) on a state of `n`. Components whose column is zero are not read.
    ///
    /// # Errors
    /// [`ParameterError`] if there is no row, a row has another length than `n`, `offset` another than p, or
    /// a number is not finite.
    pub fn new(h: Vec<Vec<f64>>, offset: Vec<f64>, n: usize) -> Result<Self, ParameterError> {
        if h.is_empty() {
            return Err(ParameterError::new("H", "give at least one row"));
        }
        for (j, row) in h.iter().enumerate() {
            checked_row(&format!("H[{j}]"), row, n)?;
        }
        checked_row("offset", &offset, h.len())?;
        let reads = read_components(n, |i| h.iter().any(|row| row[i] != 0.0));
        let rows = h.iter().map(|row| reads.iter().map(|&i| row[i]).collect()).collect();
        let outputs = (1..=h.len()).map(|j| Output::plain(format!("y{j}"), "")).collect();
        Ok(Self { reads, rows, offset, outputs })
    }

    pub(super) fn from_parameters(p: Parameters, n: usize) -> Result<Self, ParameterError> {
        let offset = p.offset.unwrap_or_else(|| vec![0.0; p.h.len()]);
        Self::new(p.h, offset, n)
    }
}

impl Formula for Linear {
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
        for (j, row) in self.rows.iter().enumerate() {
            let mut sum = T::constant(self.offset[j]);
            for (&weight, &component) in row.iter().zip(x) {
                sum = sum + T::constant(weight) * component;
            }
            y[j] = sum;
        }
    }
}

impl ExactMoments for Linear {
    fn write_exact(&self, prior: &Gaussian, moments: &mut Moments) {
        self.evaluate(prior.mean().as_slice(), moments.mean.as_mut_slice());
        write_linear(prior, |j, k| self.rows[j][k], moments);
    }
}
