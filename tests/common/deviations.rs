//! How far a reference lies from outside values, in its own standard errors.

use gaussworthy::gaussian::{Moments, wrap};
use gaussworthy::reference::Reference;
use gaussworthy::suite::Case;

/// An entry that sampling knows exactly, but for rounding, is held to this share of its natural scale.
const ROUNDING: f64 = 1e-12;

/// One entry of the moments.
#[derive(Debug)]
pub struct Deviation {
    /// Case and entry.
    pub entry: String,
    /// Found less exact, in standard errors; zero where nothing is left to chance and all agrees.
    pub z: f64,
    /// The standard error in the entry's natural scale: sd_j, sd_i sd_j, or sd(x_i) sd_j.
    pub share: f64,
}

/// Deviations of every entry from the outside values `exact`, which speak of these outputs of the case's sensor.
pub fn deviations(case: &Case, reference: &Reference, exact: &Moments, outputs: &[usize]) -> Vec<Deviation> {
    let (found, error) = (&reference.moments, &reference.standard_error);
    let sd: Vec<f64> = exact.covariance.diagonal().iter().map(|v| v.sqrt()).collect();
    let mut all = Vec::new();
    let mut push = |entry: String, difference: f64, error: f64, scale: f64| {
        // Where nothing is left to chance the standard error is rounding too, and says nothing.
        let z = if difference.abs() <= ROUNDING * scale { 0.0 } else { difference / error.max(ROUNDING * scale) };
        all.push(Deviation { entry: format!("{} {entry}", case.id()), z, share: error / scale });
    };
    for (j, &out) in outputs.iter().enumerate() {
        let angular = case.sensor().outputs()[out].angular;
        let shift = found.mean[out] - exact.mean[j];
        push(format!("mean[{j}]"), if angular { wrap(shift) } else { shift }, error.mean[out], sd[j]);
        for (k, &other) in outputs.iter().enumerate().take(j + 1) {
            let difference = found.covariance[(out, other)] - exact.covariance[(j, k)];
            push(format!("covariance[{j}][{k}]"), difference, error.covariance[(out, other)], sd[j] * sd[k]);
        }
        for i in 0..exact.cross_covariance.nrows() {
            let difference = found.cross_covariance[(i, out)] - exact.cross_covariance[(i, j)];
            let scale = case.prior().covariance()[(i, i)].sqrt() * sd[j];
            push(format!("cross_covariance[{i}][{j}]"), difference, error.cross_covariance[(i, out)], scale);
        }
    }
    all
}
