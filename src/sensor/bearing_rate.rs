use super::kinds::{Kind, built};
use super::lookout::{Coordinates, Lookout, MovingParameters, seen_from, with_motion};
use super::{Formula, Number, Output, ParameterError};
use crate::gaussian::Gaussian;

pub(super) const KIND: Kind = Kind {
    name: "bearing-rate",
    summary: "bearing and bearing rate of a moving planar position from one or several stations",
    formula: "theta_j = atan2(y - sy_j, x - sx_j) [rad, angular], \
              rate_j = ((x - sx_j) vy - (y - sy_j) vx) / |p - s_j|^2 [rad/s]",
    parameters: "station [x, y] m or stations [[x, y], ...] m; position [i, j] = [0, 1]; \
                 velocity = the components after the position",
    quantities: &[("station", "m"), ("stations", "m")],
    source: "Aidala, Hammel 1983",
    example: r#"{"case":"passing","sensor":{"kind":"bearing-rate","station":[0,0]},"prior":{"mean":[200,700,7,0],"covariance":[[900,0,0,0],[0,3600,0,0],[0,0,1,0],[0,0,0,1]]},"noise":{"covariance":[[1e-4,0],[0,1e-6]]}}"#,
    build: |map, n| built(with_motion(map), n, BearingRate::from_parameters),
};

/// Bearing and bearing rate of a moving planar position from one or several stations at rest.
///
/// theta_j = atan2(y - sy_j, x - sx_j) \[rad\], counter-clockwise from the x axis, angular, and its rate
/// ((x - sx_j) vy - (y - sy_j) vx) / r_j^2 \[rad/s\], an ordinary number; both of the first station, then of the next.
/// Undefined at a station itself; the rate grows like 1 / r beside it, so that its variance does not exist where
/// the position's law has a density there.
///
/// Source: V. J. Aidala, S. E. Hammel, "Utilization of modified polar coordinates for bearings-only tracking", IEEE
/// Transactions on Automatic Control 28 (1983) 283-294 (from memory).
#[derive(Debug, Clone, PartialEq)]
pub struct BearingRate {
    lookout: Lookout,
    outputs: Vec<Output>,
}

impl BearingRate {
    /// Stations \[m\] that read position and velocity at the components `position` and `velocity` of a state of `n`.
    ///
    /// # Errors
    /// [`ParameterError`] if there is no station, a coordinate is not finite, or a component is outside the
    /// state or stands twice.
    pub fn new(
        stations: Vec<[f64; 2]>,
        position: [usize; 2],
        velocity: [usize; 2],
        n: usize,
    ) -> Result<Self, ParameterError> {
        let stations = stations.into_iter().map(Vec::from).collect();
        let lookout = Lookout::new(stations, &position, Coordinates::Two, n)?;
        Ok(Self::over(lookout.with_velocity(&velocity, n)?))
    }

    fn over(lookout: Lookout) -> Self {
        let outputs = lookout.outputs(|called| {
            vec![Output::angle(called("bearing")), Output::plain(called("bearing rate"), "rad/s")]
        });
        Self { lookout, outputs }
    }

    pub(super) fn from_parameters(p: MovingParameters, n: usize) -> Result<Self, ParameterError> {
        Ok(Self::over(p.lookout(Coordinates::Two, n)?))
    }
}

impl Formula for BearingRate {
    const INPUTS: &'static [usize] = &[4];

    fn reads(&self) -> &[usize] {
        &self.lookout.reads
    }

    fn outputs(&self) -> &[Output] {
        &self.outputs
    }

    fn natural_spread(&self, prior: &Gaussian) -> Option<f64> {
        self.lookout.spread(prior, self.lookout.reads.len() / 2)
    }

    #[inline(always)]
    fn evaluate<T: Number>(&self, x: &[T], y: &mut [T]) {
        for (station, pair) in self.lookout.stations.iter().zip(y.chunks_exact_mut(2)) {
            let (east, north) = seen_from(x, station);
            pair[0] = north.atan2(east);
            // By the reciprocal, as dual numbers divide: the value beside a Jacobian is then the value to the bit.
            pair[1] = (east * x[3] - north * x[2]) * (T::constant(1.0) / (east * east + north * north));
        }
    }
}
