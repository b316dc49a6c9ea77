use super::kinds::{Kind, built};
use super::lookout::{Coordinates, Lookout, Parameters, seen_from, with_position};
use super::{Formula, Number, Output, ParameterError};
use crate::gaussian::Gaussian;

pub(super) const KIND: Kind = Kind {
    name: "bearing-only",
    summary: "bearings of a planar position from one or several stations",
    formula: "theta_j = atan2(y - sy_j, x - sx_j) [rad, angular]",
    parameters: "station [x, y] m or stations [[x, y], ...] m; position [i, j] = [0, 1]",
    quantities: &[("station", "m"), ("stations", "m")],
    source: "Bar-Shalom, Li, Kirubarajan 2001",
    example: r#"{"case":"trawler","sensor":{"kind":"bearing-only","stations":[[0,0],[1200,0]]},"prior":{"mean":[800,1500],"covariance":[[40000,0],[0,40000]]},"noise":{"covariance":3e-4}}"#,
    build: |map, n| built(with_position(map), n, BearingOnly::from_parameters),
};

/// Bearings of a planar position from one or several stations.
///
/// theta_j = atan2(y - sy_j, x - sx_j) \[rad\], counter-clockwise from the x axis, each angular.
///
/// Source: Y. Bar-Shalom, X. R. Li, T. Kirubarajan, Estimation with Applications to Tracking and Navigation
/// (Wiley, 2001), sec. 3.7 (bearings-only measurements; section number from memory).
#[derive(Debug, Clone, PartialEq)]
pub struct BearingOnly {
    lookout: Lookout,
    outputs: Vec<Output>,
}

impl BearingOnly {
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
        let outputs = lookout.outputs(|called| vec![Output::angle(called("bearing"))]);
        Self { lookout, outputs }
    }

    pub(super) fn from_parameters(p: Parameters, n: usize) -> Result<Self, ParameterError> {
        Ok(Self::over(p.lookout(Coordinates::Two, n)?))
    }
}

impl Formula for BearingOnly {
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
        for (station, angle) in self.lookout.stations.iter().zip(y) {
            let (east, north) = seen_from(x, station);
            *angle = north.atan2(east);
        }
    }
}
