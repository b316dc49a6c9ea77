//! Lists and matrices of bare numbers.

use nalgebra::DMatrix;

use super::SuiteError;
use super::node::Node;
use crate::gaussian::GaussianError;

/// The matrix at a node: a list of rows of one length.
pub(super) fn matrix(node: &Node) -> Result<DMatrix<f64>, SuiteError> {
    let mut rows: Vec<Vec<f64>> = Vec::new();
    for row in node.list()? {
        let numbers = row.list()?.iter().map(Node::number).collect::<Result<Vec<_>, _>>()?;
        if let Some(first) = rows.first().filter(|first| first.len() != numbers.len()) {
            return Err(row.error(format!("has {} numbers, but the first row has {}", numbers.len(), first.len())));
        }
        rows.push(numbers);
    }
    let columns = rows.first().map_or(0, Vec::len);
    Ok(DMatrix::from_row_iterator(rows.len(), columns, rows.into_iter().flatten()))
}

/// What is wrong with a Gaussian, said at the entry of `covariance` that is at fault where there is one.
pub(super) fn covariance_error(covariance: &Node, e: &GaussianError) -> SuiteError {
    let path = match e {
        GaussianError::NotFinite { row, column, .. } | GaussianError::NotSymmetric { row, column, .. } => {
            format!("[{row}][{column}]")
        }
        GaussianError::NegativeVariance { index, .. } => format!("[{index}][{index}]"),
        _ => String::new(),
    };
    covariance.at(&path).error(e.to_string())
}
