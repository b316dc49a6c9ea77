//! What an answer must be to be scored: the right shapes, finite, a symmetric covariance.

use nalgebra::{DMatrix, DVector};
use serde_json::{Map, Value};

use crate::gaussian::{Moments, wrap};
use crate::sensor::Output;
use crate::suite::Case;
use crate::wording::nearest;

/// How far two mirrored entries of a covariance may differ, in units of the two standard deviations: some units in the
/// last place of single precision, which embedded implementations compute in. Common practice, no source.
const SYMMETRY_SLACK: f64 = 1e-6;

/// The moments that a record gives of a case, or what is wrong with it and what would be right.
pub(super) fn moments(case: &Case, record: &Map<String, Value>) -> Result<Moments, String> {
    let outputs = case.sensor().outputs();
    let (n, p) = (case.prior().dimension(), outputs.len());
    let names = || outputs.iter().map(|o| o.name.as_str()).collect::<Vec<_>>().join(", ");
    let mean = row(need(record, "mean")?, "mean", p, || format!("one an output ({})", names()))?;
    let covariance = matrix(need(record, "covariance")?, "covariance", (p, p), || {
        format!("a row and a column an output ({})", names())
    })?;
    let cross_covariance = matrix(need(record, "cross_covariance")?, "cross_covariance", (n, p), || {
        format!("a row a state component, a column an output ({})", names())
    })?;
    let mean = DVector::from_fn(p, |j, _| landed(&outputs[j], mean[j]));
    Ok(Moments { mean, covariance: symmetric(covariance)?, cross_covariance })
}

fn landed(output: &Output, value: f64) -> f64 {
    if output.angular { wrap(value) } else { value }
}

fn need<'a>(record: &'a Map<String, Value>, key: &str) -> Result<&'a Value, String> {
    record.get(key).ok_or_else(|| {
        let others = record.keys().map(String::as_str).filter(|k| !["case", "mean", "covariance"].contains(k));
        nearest(key, others).map_or_else(
            || format!("`{key}` is missing"),
            |near| format!("`{key}` is missing; `{near}` stands there, is it meant?"),
        )
    })
}

fn number(value: &Value, key: impl Fn() -> String) -> Result<f64, String> {
    match value.as_f64().filter(|v| v.is_finite()) {
        Some(number) => Ok(number),
        None => {
            // Whatever stands there may be long.
            let found: String = value.to_string().chars().take(40).collect();
            Err(format!("{} is {found}; give a finite number", key()))
        }
    }
}

fn row(value: &Value, key: &str, length: usize, meaning: impl Fn() -> String) -> Result<Vec<f64>, String> {
    let Some(entries) = value.as_array() else {
        return Err(format!("{key} is no list; give {length} numbers, {}", meaning()));
    };
    if entries.len() != length {
        return Err(format!("{key} has {} numbers; give {length}, {}", entries.len(), meaning()));
    }
    entries.iter().enumerate().map(|(j, entry)| number(entry, || format!("{key}[{j}]"))).collect()
}

fn matrix(
    value: &Value,
    key: &str,
    (rows, columns): (usize, usize),
    meaning: impl Fn() -> String,
) -> Result<DMatrix<f64>, String> {
    let wanted = || format!("give {rows} x {columns}, {}", meaning());
    let lists = value.as_array().and_then(|list| list.iter().map(Value::as_array).collect::<Option<Vec<_>>>());
    let Some(lists) = lists else { return Err(format!("{key} is no list of rows; {}", wanted())) };
    let width = lists.first().map_or(0, |first| first.len());
    if let Some(i) = lists.iter().position(|list| list.len() != width) {
        return Err(format!("{key} has rows of {width} and of {} numbers; {}", lists[i].len(), wanted()));
    }
    if (lists.len(), width) != (rows, columns) {
        let transposed = (width, lists.len()) == (rows, columns);
        let hint = if transposed { " (is it transposed?)" } else { "" };
        return Err(format!("{key} is {} x {width}; {}{hint}", lists.len(), wanted()));
    }
    let mut matrix = DMatrix::zeros(rows, columns);
    for (i, list) in lists.iter().enumerate() {
        for (j, entry) in list.iter().enumerate() {
            matrix[(i, j)] = number(entry, || format!("{key}[{i}][{j}]"))?;
        }
    }
    Ok(matrix)
}

/// The covariance with the mean of every two mirrored entries in both places.
fn symmetric(mut covariance: DMatrix<f64>) -> Result<DMatrix<f64>, String> {
    for i in 0..covariance.nrows() {
        for j in 0..i {
            let (lower, upper) = (covariance[(i, j)], covariance[(j, i)]);
            let scale = covariance[(i, i)].abs().sqrt() * covariance[(j, j)].abs().sqrt();
            if !((upper - lower).abs() <= SYMMETRY_SLACK * scale) {
                return Err(format!(
                    "covariance[{j}][{i}] is {upper}, but covariance[{i}][{j}] is {lower}; a covariance is symmetric"
                ));
            }
            let middle = 0.5 * lower + 0.5 * upper;
            covariance[(i, j)] = middle;
            covariance[(j, i)] = middle;
        }
    }
    Ok(covariance)
}
