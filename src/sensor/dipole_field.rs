use serde::{Deserialize, Serialize};

use super::kinds::{Kind, built};
use super::parameter::{checked_components, checked_row};
use super::position::first_three;
use super::{Formula, Number, Output, ParameterError};
use crate::gaussian::Gaussian;

pub(super) const KIND: Kind = Kind {
    name: "dipole-field",
    summary: "strength of a magnetic dipole's field at a moving magnetometer, over a constant background",
    formula: "|B| [nT], B = 1e9 mu0/(4 pi) (3 r (m'r) / |r|^5 - m / |r|^3) + background, r = position - place",
    parameters: "moment m [mx, my, mz] A m^2; place [x, y, z] m; background [bx, by, bz] nT = 0; \
                 position [i, j, k] = [0, 1, 2]",
    quantities: &[("place", "m")],
    source: "Jackson 1999",
    example: r#"{"case":"hull","sensor":{"kind":"dipole-field","moment":[20000,5000,-40000],"place":[0,0,-8],"background":[18000,1000,-45000]},"prior":{"mean":[25,10,2],"covariance":[[9,0,0],[0,4,0],[0,0,0.25]]},"noise":{"covariance":4}}"#,
    build: |map, n| built(map, n, DipoleField::from_parameters),
};

/// mu0 / (4 pi) in nT m / A: 1e-7 T m / A, which the SI of 2019 leaves true to 1e-9 of its size.
const FIELD_OF_MOMENT: f64 = 100.0;

/// Strength of a magnetic dipole's field at a moving magnetometer, over a constant background: a hull of steel in the
/// field of the earth.
///
/// |B| \[nT\] with B = mu0/(4 pi) (3 r (m'r) / |r|^5 - m / |r|^3) + B0, r the position of the magnetometer \[m\] seen
/// from the dipole, m its moment \[A m^2\], B0 the background \[nT\].
///
/// Undefined at the dipole itself, where the field grows as |r|^-3: a prior that reaches it has no mean. Undefined
/// derivatives where dipole and background cancel.
///
/// Source: J. D. Jackson, Classical Electrodynamics, 3rd ed. (Wiley, 1999), sec. 5.6 (field of a localised current
/// distribution; section from memory).
#[derive(Debug, Clone, PartialEq)]
pub struct DipoleField {
    moment: [f64; 3],
    place: [f64; 3],
    background: [f64; 3],
    position: [usize; 3],
    outputs: [Output; 1],
}

/// What a suite or a case record says of a [`DipoleField`].
#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Parameters {
    moment: [f64; 3],
    place: [f64; 3],
    #[serde(default)]
    background: [f64; 3],
    #[serde(default = "first_three")]
    position: [usize; 3],
}

impl DipoleField {
    /// A dipole of this `moment` \[A m^2\] at this `place` \[m\] over a `background` \[nT\], its field read at the position
    /// \[m\] that stands at the components `position` of a state of `n`.
    ///
    /// # Errors
    /// [`ParameterError`] if a number is not finite, or a component is outside the state or stands twice.
    pub fn new(
        moment: [f64; 3],
        place: [f64; 3],
        background: [f64; 3],
        position: [usize; 3],
        n: usize,
    ) -> Result<Self, ParameterError> {
        for (key, vector) in [("moment", &moment), ("place", &place), ("background", &background)] {
            checked_row(key, vector, 3)?;
        }
        checked_components("position", &position, n)?;
        Ok(Self { moment, place, background, position, outputs: [Output::plain("field strength", "nT")] })
    }

    pub(super) fn from_parameters(p: Parameters, n: usize) -> Result<Self, ParameterError> {
        Self::new(p.moment, p.place, p.background, p.position, n)
    }
}

impl Formula for DipoleField {
    const INPUTS: &'static [usize] = &[3];

    fn reads(&self) -> &[usize] {
        &self.position
    }

    fn outputs(&self) -> &[Output] {
        &self.outputs
    }

    fn natural_spread(&self, prior: &Gaussian) -> Option<f64> {
        let distance = (0..3).map(|i| (prior.mean()[i] - self.place[i]).powi(2)).sum::<f64>().sqrt();
        Some(prior.largest_sd(&[0, 1, 2])? / distance)
    }

    #[inline(always)]
    fn evaluate<T: Number>(&self, x: &[T], y: &mut [T]) {
        let [east, north, up] = self.place;
        let r = [x[0] - T::constant(east), x[1] - T::constant(north), x[2] - T::constant(up)];
        let (mut distance2, mut along) = (T::constant(0.0), T::constant(0.0));
        for (&r, &moment) in r.iter().zip(&self.moment) {
            distance2 = distance2 + r * r;
            along = along + T::constant(moment) * r;
        }
        // One reciprocal and products: dual numbers divide that way, and so their values are those of plain numbers.
        let inverse2 = T::constant(1.0) / distance2;
        let scale = T::constant(FIELD_OF_MOMENT) * inverse2 * inverse2.sqrt();
        let radial = T::constant(3.0) * along * inverse2;
        let mut square = T::constant(0.0);
        for ((&r, &moment), &background) in r.iter().zip(&self.moment).zip(&self.background) {
            let field = scale * (radial * r - T::constant(moment)) + T::constant(background);
            square = square + field * field;
        }
        y[0] = square.sqrt();
    }
}
