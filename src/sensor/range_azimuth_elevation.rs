use super::kinds::{Kind, built};
use super::lookout::{Coordinates, Lookout, Parameters, azimuth_and_elevation, squared_range, with_position};
use super::{Formula, Number, Output, ParameterError};
use crate::gaussian::Gaussian;

pub(super) const KIND: Kind = Kind {
    name: "range-azimuth-elevation",
    summary: "range, azimuth and elevation of a position in space from one or several stations",
    formula: "r_j = |p - s_j| [m], azimuth_j = atan2(y - sy_j, x - sx_j) [rad, angular], \
              elevation_j = atan2(z - sz_j, hypot(x - sx_j, y - sy_j)) [rad]",
    parameters: "station [x, y, z] m or stations [[x, y, z], ...] m; position [i, j, k] = [0, 1, 2]",
    quantities: &[("station", "m"), ("stations", "m")],
    source: "Lerro, Bar-Shalom 1993",
    example: r#"{"case":"drone","sensor":{"kind":"range-azimuth-elevation","station":[0,0,25]},"prior":{"mean":[300,400,120],"covariance":[[400,0,0],[0,400,0],[0,0,100]]},"noise":{"covariance":[[4,0,0],[0,3e-4,0],[0,0,3e-4]]}}"#,
    build: |map, n| built(with_position(map), n, RangeAzimuthElevation::from_parameters),
};

/// Range, azimuth and elevation of a position in space from one or several stations.
///
/// r_j = |p - s_j| \[m\], azimuth_j = atan2(y - sy_j, x - sx_j) \[rad\], counter-clockwise from the x axis, angular,
/// elevation_j = atan2(z - sz_j, hypot(x - sx_j, y - sy_j)) \[rad\] in \[-pi/2, pi/2\], an ordinary number; three of
/// the first station, then of the next. Undefined derivatives of both angles straight above and below a station.
///
/// Source: D. Lerro, Y. Bar-Shalom, "Tracking with debiased consistent converted measurements versus EKF", IEEE
/// Transactions on Aerospace and Electronic Systems 29 (1993) 1015-1022 (in the plane, its measurements in space are
/// the same with elevation; from memory).
#[derive(Debug, Clone, PartialEq)]
pub struct RangeAzimuthElevation {
    lookout: Lookout,
    outputs: Vec<Output>,
}

impl RangeAzimuthElevation {
    /// Stations \[m\] that read the position at the components `position` of a state of `n`.
    ///
    /// # Errors
    /// [`ParameterError`] if there is no station, a coordinate is not finite, or a component is outside the
    /// state or stands twice.
    pub fn new(stations: Vec<[f64; 3]>, position: [usize; 3], n: usize) -> Result<Self, ParameterError> {
        let stations = stations.into_iter().map(Vec::from).collect();
        Ok(Self::over(Lookout::new(stations, &position, Coordinates::Three, n)?))
    }

    fn over(lookout: Lookout) -> Self {
        let outputs = lookout.outputs(|called| {
            vec![
                Output::plain(called("range"), "m"),
                Output::angle(called("azimuth")),
                Output::plain(called("elevation"), "rad"),
            ]
        });
        Self { lookout, outputs }
    }

    pub(super) fn from_parameters(p: Parameters, n: usize) -> Result<Self, ParameterError> {
        Ok(Self::over(p.lookout(Coordinates::Three, n)?))
    }
}

impl Formula for RangeAzimuthElevation {
    const INPUTS: &'static [usize] = &[3];

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
        for (station, triple) in self.lookout.stations.iter().zip(y.chunks_exact_mut(3)) {
            let (azimuth, elevation) = azimuth_and_elevation(x, station);
            triple[0] = squared_range(x, station).sqrt();
            triple[1] = azimuth;
            triple[2] = elevation;
        }
    }
}
