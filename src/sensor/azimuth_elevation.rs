use super::kinds::{Kind, built};
use super::lookout::{Coordinates, Lookout, Parameters, azimuth_and_elevation, with_position};
use super::{Formula, Number, Output, ParameterError};
use crate::gaussian::Gaussian;

pub(super) const KIND: Kind = Kind {
    name: "azimuth-elevation",
    summary: "azimuth and elevation of a position in space from one or several stations",
    formula: "azimuth_j = atan2(y - sy_j, x - sx_j) [rad, angular], \
              elevation_j = atan2(z - sz_j, hypot(x - sx_j, y - sy_j)) [rad]",
    parameters: "station [x, y, z] m or stations [[x, y, z], ...] m; position [i, j, k] = [0, 1, 2]",
    quantities: &[("station", "m"), ("stations", "m")],
    source: "Blackman, Popoli 1999",
    example: r#"{"case":"cameras","sensor":{"kind":"azimuth-elevation","stations":[[0,0,25],[800,0,30]]},"prior":{"mean":[300,400,120],"covariance":[[900,0,0],[0,900,0],[0,0,225]]},"noise":{"covariance":1e-5}}"#,
    build: |map, n| built(with_position(map), n, AzimuthElevation::from_parameters),
};

/// Azimuth and elevation of a position in space from one or several stations, as cameras measure them.
///
/// azimuth_j = atan2(y - sy_j, x - sx_j) \[rad\], counter-clockwise from the x axis, angular, elevation_j =
/// atan2(z - sz_j, hypot(x - sx_j, y - sy_j)) \[rad\] in \[-pi/2, pi/2\], an ordinary number; both of the first station,
/// then of the next. Undefined derivatives straight above and below a station.
///
/// Source: S. Blackman, R. Popoli, Design and Analysis of Modern Tracking Systems (Artech House, 1999), angle-only
/// measurements (from memory).
#[derive(Debug, Clone, PartialEq)]
pub struct AzimuthElevation {
    lookout: Lookout,
    outputs: Vec<Output>,
}

impl AzimuthElevation {
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
        let outputs = lookout
            .outputs(|called| vec![Output::angle(called("azimuth")), Output::plain(called("elevation"), "rad")]);
        Self { lookout, outputs }
    }

    pub(super) fn from_parameters(p: Parameters, n: usize) -> Result<Self, ParameterError> {
        Ok(Self::over(p.lookout(Coordinates::Three, n)?))
    }
}

impl Formula for AzimuthElevation {
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
        for (station, pair) in self.lookout.stations.iter().zip(y.chunks_exact_mut(2)) {
            let (azimuth, elevation) = azimuth_and_elevation(x, station);
            pair[0] = azimuth;
            pair[1] = elevation;
        }
    }
}
