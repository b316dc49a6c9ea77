use serde::{Deserialize, Serialize};

use super::kinds::{Kind, built};
use super::parameter::{above_zero, checked_components, checked_row};
use super::position::first_three;
use super::{Formula, Number, Output, ParameterError};
use crate::gaussian::Gaussian;

pub(super) const KIND: Kind = Kind {
    name: "pinhole",
    summary: "image point of a position in the axes of a pinhole camera",
    formula: "u = f x/z + cu, v = f y/z + cv [pixel]",
    parameters: "focal_length f pixel; centre [cu, cv] pixel = 0; position [i, j, k] = [0, 1, 2]",
    quantities: &[],
    source: "Hartley, Zisserman 2004",
    example: r#"{"case":"bollard","sensor":{"kind":"pinhole","focal_length":800,"centre":[640,360]},"prior":{"mean":[1.5,-0.5,12],"covariance":[[0.04,0,0],[0,0.04,0],[0,0,0.64]]},"noise":{"covariance":1}}"#,
    build: |map, n| built(map, n, Pinhole::from_parameters),
};

/// Image point of a position in the axes of a pinhole camera: x to the right, y down, z ahead \[m\].
///
/// u = f x/z + cu, v = f y/z + cv \[pixel\], with the focal length f and the image centre (cu, cv) \[pixel\].
///
/// Undefined at z = 0. Since 1/z has no mean under any Gaussian of z, no moment exists in the strict sense; what is
/// estimated is the law on the side of the camera where the mean lies, which means something when z = 0 is many
/// standard deviations away. Where samples come near it, the reference is refused or heavy-tailed.
///
/// Source: R. Hartley, A. Zisserman, Multiple View Geometry in Computer Vision, 2nd ed. (Cambridge University Press,
/// 2004), sec. 6.1 (section from memory).
#[derive(Debug, Clone, PartialEq)]
pub struct Pinhole {
    focal_length: f64,
    centre: [f64; 2],
    position: [usize; 3],
    outputs: [Output; 2],
}

/// What a suite or a case record says of a [`Pinhole`].
#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Parameters {
    focal_length: f64,
    #[serde(default)]
    centre: [f64; 2],
    #[serde(default = "first_three")]
    position: [usize; 3],
}

impl Pinhole {
    /// A camera of this focal length and image centre \[pixel\] that sees the position \[m\] at the components `position`
    /// of a state of `n`.
    ///
    /// # Errors
    /// [`ParameterError`] if the focal length is not above 0, a number is not finite, or a component is outside the
    /// state or stands twice.
    pub fn new(
        focal_length: f64,
        centre: [f64; 2],
        position: [usize; 3],
        n: usize,
    ) -> Result<Self, ParameterError> {
        above_zero("focal_length", focal_length)?;
        checked_row("centre", &centre, 2)?;
        checked_components("position", &position, n)?;
        Ok(Self { focal_length, centre, position, outputs: ["u", "v"].map(|name| Output::plain(name, "pixel")) })
    }

    pub(super) fn from_parameters(p: Parameters, n: usize) -> Result<Self, ParameterError> {
        Self::new(p.focal_length, p.centre, p.position, n)
    }
}

impl Formula for Pinhole {
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
    }
}
