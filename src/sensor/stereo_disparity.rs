use serde::{Deserialize, Serialize};

use super::kinds::{Kind, built};
use super::parameter::{above_zero, checked_components, checked_row};
use super::position::first_three;
use super::{Formula, Number, Output, ParameterError};
use crate::gaussian::Gaussian;

pub(super) const KIND: Kind = Kind {
    name: "stereo-disparity",
    summary: "left image point and disparity of a position in the axes of a rectified pair of cameras",
    formula: "u = f x/z + cu, v = f y/z + cv, d = f b/z [pixel]",
    parameters: "focal_length f pixel; baseline b m; centre [cu, cv] pixel = 0; position [i, j, k] = [0, 1, 2]",
    quantities: &[("baseline", "m")],
    source: "Matthies, Shafer 1987",
    example: r#"{"case":"fender","sensor":{"kind":"stereo-disparity","focal_length":800,"baseline":0.6,"centre":[640,360]},"prior":{"mean":[1,0.5,15],"covariance":[[0.04,0,0],[0,0.04,0],[0,0,1]]},"noise":{"covariance":0.25}}"#,
    build: |map, n| built(map, n, StereoDisparity::from_parameters),
};

/// Left image point and disparity of a position in the axes of the left camera of a rectified pair: x to the right, y
/// down, z ahead \[m\].
///
/// u = f x/z + cu, v = f y/z + cv, d = f b/z \[pixel\], with the focal length f and the image centre (cu, cv) \[pixel\]
/// and the baseline b \[m\] between the cameras.
///
/// Undefined at z = 0; its moments exist only as those of [`Pinhole`](super::Pinhole) do.
///
/// Source: L. Matthies, S. Shafer, "Error modeling in stereo navigation", IEEE J. Robotics and Automation 3 (1987)
/// 239-248 (from memory).
#[derive(Debug, Clone, PartialEq)]
pub struct StereoDisparity {
    focal_length: f64,
    baseline: f64,
    centre: [f64; 2],
    position: [usize; 3],
    outputs: [Output; 3],
}

/// What a suite or a case record says of a [`StereoDisparity`].
#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Parameters {
    focal_length: f64,
    baseline: f64,
    #[serde(default)]
    centre: [f64; 2],
    #[serde(default = "first_three")]
    position: [usize; 3],
}

impl StereoDisparity {
    /// Two cameras of this focal length and image centre \[pixel\], `baseline` \[m\] apart, that see the position \[m\] at
    /// the components `position` of a state of `n`.
    ///
    /// # Errors
    /// [`ParameterError`] if focal length or baseline is not above 0, a number is not finite, or a component is
    /// outside the state or stands twice.
    pub fn new(
        focal_length: f64,
        baseline: f64,
        centre: [f64; 2],
        position: [usize; 3],
        n: usize,
    ) -> Result<Self, ParameterError> {
        above_zero("focal_length", focal_length)?;
        above_zero("baseline", baseline)?;
        checked_row("centre", &centre, 2)?;
        checked_components("position", &position, n)?;
        let outputs = ["u", "v", "disparity"].map(|name| Output::plain(name, "pixel"));
        Ok(Self { focal_length, baseline, centre, position, outputs })
    }

    pub(super) fn from_parameters(p: Parameters, n: usize) -> Result<Self, ParameterError> {
        Self::new(p.focal_length, p.baseline, p.centre, p.position, n)
    }
}

impl Formula for StereoDisparity {
    const INPUTS: &'static [usize] = &[3];

    fn reads(&self) -> &[usize] {
        &self.position
    }

    fn outputs(&self) -> &[Output] {
        &self.outputs
    }

    fn natural_spread(&self, prior: &Gaussian) -> Option<f64> {
        Some(prior.largest_sd(&[0, 1, 2])? / prior.mean()[2].abs())
    }

    #[inline(always)]
    fn evaluate<T: Number>(&self, x: &[T], y: &mut [T]) {
        // One reciprocal and products: dual numbers divide that way, and so their values are those of plain numbers.
        let scale = T::constant(1.0) / x[2] * T::constant(self.focal_length);
        for i in 0..2 {
            y[i] = scale * x[i] + T::constant(self.centre[i]);
        }
        y[2] = scale * T::constant(self.baseline);
    }
}
