use super::kinds::{Kind, built};
use super::lookout::{Coordinates, Lookout, MovingParameters, range_and_rate, with_motion};
use super::{Formula, Number, Output, ParameterError};
use crate::gaussian::Gaussian;

pub(super) const KIND: Kind = Kind {
    name: "range-doppler",
    summary: "range and range rate of a moving position in the plane or in space from one or several stations",
    formula: "r_j = |p - s_j| [m], rate_j = (p - s_j)' v / r_j [m/s]",
    parameters: "station [x, y(, z)] m or stations [[x, y(, z)], ...] m; position [i, j(, k)] = [0, 1(, 2)]; \
                 velocity = the components after the position",
    quantities: &[("station", "m"), ("stations", "m")],
    source: "Blackman, Popoli 1999",
    example: r#"{"case":"pilot","sensor":{"kind":"range-doppler","station":[0,0]},"prior":{"mean":[900,400,-6,2],"covariance":[[400,0,0,0],[0,400,0,0],[0,0,1,0],[0,0,0,1]]},"noise":{"covariance":[[25,0],[0,0.04]]}}"#,
    build: |map, n| built(with_motion(map), n, RangeDoppler::from_parameters),
};

/// Range and range rate of a moving position from one or several stations at rest, in the plane or in space.
///
/// r_j = |p - s_j| \[m\], rate_j = (p - s_j)' v / r_j \[m/s\], positive when receding; range and rate of the first
/// station, then of the next. The rate is what a Doppler shift measures. Undefined at a station itself.
///
/// Source: S. Blackman, R. Popoli, Design and Analysis of Modern Tracking Systems (Artech House, 1999), radar
/// measurements with range rate (from memory).
#[derive(Debug, Clone, PartialEq)]
pub struct RangeDoppler {
    lookout: Lookout,
    outputs: Vec<Output>,
}

impl RangeDoppler {
    /// Stations \[m\] of two or three coordinates that read position and velocity at the components `position` and
    /// `velocity`, as many, of a state of `n`.
    ///
    /// # Errors
    /// [`ParameterError`] if there is no station, a coordinate is not finite, lengths do not fit, or a component is
    /// outside the state or stands twice.
    pub fn new(
        stations: Vec<Vec<f64>>,
        position: &[usize],
        velocity: &[usize],
        n: usize,
    ) -> Result<Self, ParameterError> {
        let lookout = Lookout::new(stations, position, Coordinates::TwoOrThree, n)?;
        Ok(Self::over(lookout.with_velocity(velocity, n)?))
    }

    fn over(lookout: Lookout) -> Self {
        let outputs = lookout.outputs(|called| {
            vec![Output::plain(called("range"), "m"), Output::plain(called("range rate"), "m/s")]
        });
        Self { lookout, outputs }
    }

    pub(super) fn from_parameters(p: MovingParameters, n: usize) -> Result<Self, ParameterError> {
        Ok(Self::over(p.lookout(Coordinates::TwoOrThree, n)?))
    }
}

impl Formula for RangeDoppler {
    const INPUTS: &'static [usize] = &[4, 6];

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
            let (range, rate) = range_and_rate(x, station);
            pair[0] = range;
            pair[1] = rate;
        }
    }
}
