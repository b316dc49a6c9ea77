use serde::{Deserialize, Serialize};

use super::kinds::{Kind, built};
use super::parameter::checked_components;
use super::position::first_two;
use super::{Formula, Number, Output, ParameterError};
use crate::gaussian::Gaussian;

pub(super) const KIND: Kind = Kind {
    name: "line-feature",
    summary: "signed distance of a planar position from a line that is part of the state",
    formula: "y = x cos(alpha) + y sin(alpha) - d [m]",
    parameters: "position [i, j] = [0, 1]; line [distance d m, angle alpha rad] = [2, 3]",
    quantities: &[],
    source: "Duda, Hart 1972",
    example: r#"{"case":"quay wall","sensor":{"kind":"line-feature"},"prior":{"mean":[30,10,25,0.6],"covariance":[[4,0,0,0],[0,4,0,0],[0,0,0.25,0],[0,0,0,0.01]]},"noise":{"covariance":0.01}}"#,
    build: |map, n| built(map, n, LineFeature::from_parameters),
};

/// Signed distance of a planar position from a line that is part of the state: a quay wall that is mapped while one
/// sails along it.
///
/// y = x cos(alpha) + y sin(alpha) - d \[m\]; alpha \[rad\] is the direction of the line's normal, counter-clockwise from
/// the x axis, and d \[m\] the line's distance from the origin along it. Both are state components beside the position.
///
/// Source: the normal parametrisation of R. O. Duda, P. E. Hart, "Use of the Hough transformation to detect lines and
/// curves in pictures", Commun. ACM 15 (1972) 11-15.
#[derive(Debug, Clone, PartialEq)]
pub struct LineFeature {
    /// x, y, distance, angle.
    reads: [usize; 4],
    outputs: [Output; 1],
}

/// What a suite or a case record says of a [`LineFeature`].
#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Parameters {
    #[serde(default = "first_two")]
    position: [usize; 2],
    #[serde(default = "default_line")]
    line: [usize; 2],
}

/// Where the line stands in a state when nothing is said: behind the position.
fn default_line() -> [usize; 2] {
    [2, 3]
}

impl LineFeature {
    /// The position \[m\] at the components `position` of a state of `n`, the line's distance \[m\] and angle \[rad\] at
    /// the components `line`.
    ///
    /// # Errors
    /// [`ParameterError`] if a component is outside the state or stands twice.
    pub fn new(position: [usize; 2], line: [usize; 2], n: usize) -> Result<Self, ParameterError> {
        checked_components("position", &position, n)?;
        checked_components("line", &line, n)?;
        if let Some(k) = (0..2).find(|&k| position.contains(&line[k])) {
            let message = format!("names component {}, which is part of the position; give another", line[k]);
            return Err(ParameterError::new(format!("line[{k}]"), message));
        }
        let reads = [position[0], position[1], line[0], line[1]];
        Ok(Self { reads, outputs: [Output::plain("offset", "m")] })
    }

    pub(super) fn from_parameters(p: Parameters, n: usize) -> Result<Self, ParameterError> {
        Self::new(p.position, p.line, n)
    }
}

impl Formula for LineFeature {
    const INPUTS: &'static [usize] = &[4];

    fn reads(&self) -> &[usize] {
        &self.reads
    }

    fn outputs(&self) -> &[Output] {
        &self.outputs
    }

    fn natural_spread(&self, prior: &Gaussian) -> Option<f64> {
        prior.largest_sd(&[3])
    }

    #[inline(always)]
    fn evaluate<T: Number>(&self, x: &[T], y: &mut [T]) {
        let (east, north, distance, angle) = (x[0], x[1], x[2], x[3]);
        y[0] = east * angle.cos() + north * angle.sin() - distance;
    }
}
