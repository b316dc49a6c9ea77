use serde::{Deserialize, Serialize};

use crate::gaussian::{Gaussian, Moments};

use super::exact::write_linear;
use super::kinds::{Kind, built};
use super::parameter::{checked_components, checked_row};
use super::position::first_two;
use super::{ExactMoments, Formula, Number, Output, ParameterError};

pub(super) const KIND: Kind = Kind {
    name: "line-offset",
    summary: "signed distance of a planar position from a fixed line, as of a leading line; linear",
    formula: "y = u'(q - q0) [m], u the unit normal to the left of the way from q0 to q1, the points of `through`",
    parameters: "through [q0, q1] = [[x0, y0], [x1, y1]] m; position [i, j] = [0, 1]",
    quantities: &[("through", "m")],
    source: "Hesse normal form",
    example: r#"{"case":"fairway","sensor":{"kind":"line-offset","through":[[0,0],[900,300]]},"prior":{"mean":[2500,800],"covariance":[[400,100],[100,900]]},"noise":{"covariance":9}}"#,
    build: |map, n| built(map, n, LineOffset::from_parameters),
};

/// Signed distance of a planar position from a fixed line through two points, as of a ship from a leading line.
///
/// y = u'(q - q0) \[m\] with u the unit normal to the left of the way from q0 to q1: positive on that side. Linear: every
/// method is exact on it.
///
/// Source: the Hesse normal form of a line.
#[derive(Debug, Clone, PartialEq)]
pub struct LineOffset {
    normal: [f64; 2],
    first: [f64; 2],
    position: [usize; 2],
    outputs: [Output; 1],
}

/// What a suite or a case record says of a [`LineOffset`].
#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Parameters {
    through: [[f64; 2]; 2],
    #[serde(default = "first_two")]
    position: [usize; 2],
}

impl LineOffset {
    /// The line `through` two points \[m\], and the position \[m\] at the components `position` of a state of `n`.
    ///
    /// # Errors
    /// [`ParameterError`] if a coordinate is not finite, the points are no way apart or so far that their distance
    /// overflows, or a component is outside the state or stands twice.
    pub fn new(through: [[f64; 2]; 2], position: [usize; 2], n: usize) -> Result<Self, ParameterError> {
        for (j, point) in through.iter().enumerate() {
            checked_row(&format!("through[{j}]"), point, 2)?;
        }
        checked_components("position", &position, n)?;
        let [first, second] = through;
        let (east, north) = (second[0] - first[0], second[1] - first[1]);
        let length = east.hypot(north);
        if !(length > 0.0 && length.is_finite()) {
            let message = format!("its two points are {length} m apart; give two different points of the line");
            return Err(ParameterError::new("through", message));
        }
        let normal = [-north / length, east / length];
        Ok(Self { normal, first, position, outputs: [Output::plain("offset", "m")] })
    }

    pub(super) fn from_parameters(p: Parameters, n: usize) -> Result<Self, ParameterError> {
        Self::new(p.through, p.position, n)
    }
}

impl Formula for LineOffset {
    const INPUTS: &'static [usize] = &[2];

    fn reads(&self) -> &[usize] {
        &self.position
    }

    fn outputs(&self) -> &[Output] {
        &self.outputs
    }

    fn exact_moments(&self) -> Option<&dyn ExactMoments> {
        Some(self)
    }

    #[inline(always)]
    fn evaluate<T: Number>(&self, x: &[T], y: &mut [T]) {
        let mut sum = T::constant(0.0);
        for ((&x, &normal), &first) in x.iter().zip(&self.normal).zip(&self.first) {
            sum = sum + T::constant(normal) * (x - T::constant(first));
        }
        y[0] = sum;
    }
}

impl ExactMoments for LineOffset {
    fn write_exact(&self, prior: &Gaussian, moments: &mut Moments) {
        self.evaluate(prior.mean().as_slice(), moments.mean.as_mut_slice());
        write_linear(prior, |_, k| self.normal[k], moments);
    }
}
