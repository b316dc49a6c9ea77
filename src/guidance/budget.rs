use serde::Serialize;

use crate::method::{Evaluations, MethodSpec};
use crate::sensor::Arithmetic;

/// What an estimator can afford; what is not given does not bind.
#[derive(Debug, Clone, Copy, PartialEq, Default, Serialize)]
pub struct Budget {
    /// Most evaluations of the sensor in one transform, derivatives and exact moments counted as one each.
    pub evaluations: Option<u64>,
    /// Longest time of a transform, as a ratio to first-order Taylor.
    pub time: Option<f64>,
    /// No Jacobian, no Hessian.
    pub no_derivatives: bool,
    /// No weight below zero.
    pub no_negative_weights: bool,
    /// Single precision only.
    pub single_precision: bool,
}

impl Budget {
    /// What of a method is beyond the budget, on a sensor of `inputs` inputs; `None` if nothing is.
    pub fn objection(
        &self,
        method: &MethodSpec,
        evaluations: Evaluations,
        inputs: usize,
        time: Option<f64>,
    ) -> Option<String> {
        let Evaluations { values, jacobians, hessians, exact_moments } = evaluations;
        let all = values + jacobians + hessians + exact_moments;
        if let Some(most) = self.evaluations.filter(|most| all > *most) {
            return Some(format!("{all} evaluations, {most} are allowed"));
        }
        match (self.time, time) {
            (Some(most), Some(time)) if time > most => {
                return Some(format!("{time:.1} times the time of first-order Taylor, {most} are allowed"));
            }
            // What was not measured cannot be within a limit.
            (Some(_), None) => return Some("its time was not measured".into()),
            _ => {}
        }
        if self.no_derivatives && jacobians + hessians > 0 {
            return Some("needs derivatives".into());
        }
        if self.no_negative_weights && has_negative_weights(method, inputs) {
            return Some("has negative weights".into());
        }
        if self.single_precision && method.arithmetic() == Arithmetic::Double {
            return Some("runs in double precision".into());
        }
        None
    }
}

/// Whether a weight of its point set is below zero, if it has one.
fn has_negative_weights(method: &MethodSpec, inputs: usize) -> bool {
    let Ok(Some(set)) = method.method().point_set(inputs) else { return false };
    set.mean_weights().iter().chain(set.covariance_weights().iter()).any(|&weight| weight < 0.0)
}
