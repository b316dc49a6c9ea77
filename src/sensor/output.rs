use std::borrow::Cow;

use nalgebra::DVector;

use crate::gaussian::wrap;

/// One component of a measurement.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Output {
    /// What it is called in tables and messages.
    pub name: String,
    /// Its unit, `rad` for every angle.
    pub unit: Cow<'static, str>,
    /// Whether it lives on the circle: deviations are wrapped to (-pi, pi].
    pub angular: bool,
}

impl Output {
    /// An ordinary number.
    pub fn plain(name: impl Into<String>, unit: impl Into<Cow<'static, str>>) -> Self {
        Self { name: name.into(), unit: unit.into(), angular: false }
    }

    /// An angle on the circle, in radians.
    pub fn angle(name: impl Into<String>) -> Self {
        Self { name: name.into(), unit: "rad".into(), angular: true }
    }
}

/// The deviation y - centre (p), wrapped to (-pi, pi] where an output is angular.
pub fn chart_deviation(outputs: &[Output], y: &DVector<f64>, centre: &DVector<f64>) -> DVector<f64> {
    DVector::from_fn(outputs.len(), |j, _| {
        let d = y[j] - centre[j];
        if outputs[j].angular { wrap(d) } else { d }
    })
}
