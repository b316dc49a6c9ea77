use super::kinds::{Kind, built};
use super::lookout::{Coordinates, Lookout, Parameters, squared_range, with_position};
use super::{Formula, Number, Output, ParameterError};
use crate::gaussian::Gaussian;

pub(super) const KIND: Kind = Kind {
    name: "range-only",
    summary: "ranges of a position in the plane or in space from one or several stations",
    formula: "r_j = |p - s_j| [m]",
    parameters: "station [x, y(, z)] m or stations [[x, y(, z)], ...] m; position [i, j(, k)] = [0, 1(, 2)]",
    quantities: &[("station", "m"), ("stations", "m")],
    source: "Bar-Shalom, Li, Kirubarajan 2001",
    example: r#"{"case":"mooring","sensor":{"kind":"range-only","stations":[[0,0,-12],[900,0,-15]]},"prior":{"mean":[400,600,-3],"covariance":[[2500,0,0],[0,2500,0],[0,0,4]]},"noise":{"covariance":1}}"#,
    build: |map, n| built(with_position(map), n, RangeOnly::from_parameters),
};

/// Ranges of a position from one or several stations, in the plane or in space.
///
/// r_j = |p - s_j| \[m\], p the position and s_j a station, both with two or three coordinates.
/// Undefined derivatives at a station itself.
///
/// Source: Y. Bar-Shalom, X. R. Li, T. Kirubarajan, Estimation with Applications to Tracking and Navigation
/// (Wiley, 2001), the range of its polar and spherical measurements (from memory).
#[derive(Debug, Clone, PartialEq)]
pub struct RangeOnly {
    lookout: Lookout,
    outputs: Vec<Output>,
}

impl RangeOnly {
    /// Stations \[m\] of two or three coordinates that read the position at the components `position`, as many, of a
    /// state of `n`.
    ///
    /// # Errors
    /// [`ParameterError`] if there is no station, a coordinate is not finite, lengths do not fit, or a component is
    /// outside the state or stands twice.
    pub fn new(stations: Vec<Vec<f64>>, position: &[usize], n: usize) -> Result<Self, ParameterError> {
        Ok(Self::over(Lookout::new(stations, position, Coordinates::TwoOrThree, n)?))
    }

    fn over(lookout: Lookout) -> Self {
        let outputs = lookout.outputs(|called| vec![Output::plain(called("range"), "m")]);
        Self { lookout, outputs }
    }

    pub(super) fn from_parameters(p: Parameters, n: usize) -> Result<Self, ParameterError> {
        Ok(Self::over(p.lookout(Coordinates::TwoOrThree, n)?))
    }
}

impl Formula for RangeOnly {
    const INPUTS: &'static [usize] = &[2, 3];

    fn reads(&self) -> &[usize] {
        &self.lookout.reads
    }

    fn outputs(&self) -> &[Output] {
        &self.outputs
    }

    fn natural_spread(&self, prior: &Gaussian) -> Option<f64> {
        self.lookout.spread(prior, self.lookout.reads.len())
    }

    #[inline(always)]
    fn evaluate<T: Number>(&self, x: &[T], y: &mut [T]) {
        for (station, range) in self.lookout.stations.iter().zip(y) {
            *range = squared_range(x, station).sqrt();
        }
    }
}
