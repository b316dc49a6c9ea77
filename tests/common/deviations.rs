//! How far a reference lies from outside values, in its own standard errors.

use gaussworthy::gaussian::{Moments, wrap};
use gaussworthy::reference::Reference;
use gaussworthy::suite::Case;

/// An entry that sampling knows exactly, but for rounding, is held to this share of its natural scale.
const ROUNDING: f64 = 1e-12;

/// Deviations of every entry from the exact moments in standard errors, with what to call each. `outputs` are those of
/// the case that `exact` speaks of.
pub fn deviations(
    id: &str,
    exact: &Moments,
    outputs: &[usize],
    case: &Case,
    reference: &Reference,
) -> Vec<(String, f64)> {
    let (found, error) = (&reference.moments, &reference.standard_error);
    let sd: Vec<f64> = exact.covariance.diagonal().iter().map(|v| v.sqrt()).collect();
    let mut all = Vec::new();
    let mut push = |entry: String, difference: f64, error: f64, scale: f64| {
        // Where nothing is left to chance the standard error is rounding too, and says nothing.
        let deviation =
            if difference.abs() <= ROUNDING * scale { 0.0 } else { difference / error.max(ROUNDING * scale) };
        all.push((format!("{id} {entry}"), deviation));
    };
    for (j, &out) in outputs.iter().enumerate() {
        let angular = case.sensor().outputs()[out].angular;
        let shift = found.mean[out] - exact.mean[j];
        push(format!("mean[{j}]"), if angular { wrap(shift) } else { shift }, error.mean[out], sd[j]);
        for (k, &other) in outputs.iter().enumerate().take(j + 1) {
            let difference = found.covariance[(out, other)] - exact.covariance[(j, k)];
            push(format!("covariance[{j}][{k}]"), difference, error.covariance[(out, other)], sd[j] * sd[k]);
        }
        for i in 0..case.prior().dimension() {
            let difference = found.cross_covariance[(i, out)] - exact.cross_covariance[(i, j)];
            let scale = case.prior().covariance()[(i, i)].sqrt() * sd[j];
            push(format!("cross_covariance[{i}][{j}]"), difference, error.cross_covariance[(i, out)], scale);
        }
    }
    all
}
