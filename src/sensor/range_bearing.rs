use super::kinds::{Kind, built};
use super::lookout::{Coordinates, Lookout, Parameters, seen_from, with_position};
use super::{Formula, Number, Output, ParameterError};
use crate::gaussian::Gaussian;

pub(super) const KIND: Kind = Kind {
    name: "range-bearing",
    summary: "range and bearing of a planar position from one or several stations",
    formula: "r_j = hypot(x - sx_j, y - sy_j) [m], theta_j = atan2(y - sy_j, x - sx_j) [rad, angular]",
    parameters: "station [x, y] m or stations [[x, y], ...] m; position [i, j] = [0, 1]",
    quantities: &[("station", "m"), ("stations", "m")],
    source: "Bar-Shalom, Li, Kirubarajan 2001",
    example: r#"{"case":"ferry","sensor":{"kind":"range-bearing","station":[0,0]},"prior":{"mean":[3000,1000],"covariance":[[2500,0],[0,40000]]},"noise":{"covariance":[[100,0],[0,2.7e-5]]}}"#,
    build: |map, n| built(with_position(map), n, RangeBearing::from_parameters),
};

/// Range and bearing of a planar position from one or several stations.
///
/// r_j = sqrt((x - sx_j)^2 + (y - sy_j)^2) \[m\], theta_j = atan2(y - sy_j, x - sx_j) \[rad\],
/// counter-clockwise from the x axis, angular; range and bearing of the first station, then of the next.
/// Undefined derivatives at a station itself.
///
/// Source: Y. Bar-Shalom, X. R. Li, T. Kirubarajan, Estimation with Applications to Tracking and Navigation
/// (Wiley, 2001), sec. 10.4.3 (polar measurements of a Cartesian state; section number from memory).
#[derive(Debug, Clone, PartialEq)]
pub struct RangeBearing {
    lookout: Lookout,
    outputs: Vec<Output>,
}

impl RangeBearing {
    /// Stations \[m\] that read the position at the components `position` of a state of `n`.
    ///
    /// # Errors
    /// [`ParameterError`] if there is no station, a coordinate is not finite, or a component is outside the
    /// state or stands twice.
    pub fn new(stations: Vec<[f64; 2]>, position: [usize; 2], n: usize) -> Result<Self, ParameterError> {
        let stations = stations.into_iter().map(Vec::from).collect();
        Ok(Self::over(Lookout::new(stations, &position, Coordinates::Two, n)?))
    }

    fn over(lookout: Lookout) -> Self {
        let outputs =
            lookout.outputs(|called| vec![Output::plain(called("range"), "m"), Output::angle(called("bearing"))]);
        Self { lookout, outputs }
    }

    pub(super) fn from_parameters(p: Parameters, n: usize) -> Result<Self, ParameterError> {
        Ok(Self::over(p.lookout(Coordinates::Two, n)?))
    }
}

impl Formula for RangeBearing {
    const INPUTS: &'static [usize] = &[2];

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
        for (station, pair) in self.lookout.stations.iter().zip(y.chunks_exact_mut(2)) {
            let (east, north) = seen_from(x, station);
            pair[0] = east.hypot(north);
            pair[1] = north.atan2(east);
        }
    }
}
