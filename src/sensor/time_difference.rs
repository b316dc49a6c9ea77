use serde::{Deserialize, Serialize};

use super::kinds::{Kind, built};
use super::lookout::{Coordinates, Lookout, squared_range, with_position};
use super::parameter::{given, positive};
use super::{Formula, Number, Output, ParameterError};
use crate::gaussian::Gaussian;

pub(super) const KIND: Kind = Kind {
    name: "time-difference",
    summary: "differences of a wave's arrival times between a reference station and others, in the plane or in space",
    formula: "y_j = (|p - s_j| - |p - s_0|) / c [s], j = 1, 2, ...",
    parameters: "stations [[x, y(, z)], ...] m, at least 2, the first is the reference; wave_speed c m/s; \
                 position [i, j(, k)] = [0, 1(, 2)]",
    quantities: &[("stations", "m"), ("wave_speed", "m/s")],
    source: "Chan, Ho 1994",
    example: r#"{"case":"horn","sensor":{"kind":"time-difference","stations":[[0,0],[1200,0],[300,900]],"wave_speed":1490},"prior":{"mean":[500,700],"covariance":[[10000,0],[0,10000]]},"noise":{"covariance":[[1e-6,5e-7],[5e-7,1e-6]]}}"#,
    build: |map, n| built(with_position(map), n, TimeDifference::from_parameters),
};

/// Differences of the arrival times of one wave at several stations, in the plane or in space.
///
/// y_j = (|p - s_j| - |p - s_0|) / c \[s\], j = 1, 2, ..: the first station s_0 is the reference of all others; c is
/// the speed of the wave \[m/s\]. A constant difference is a branch of a hyperbola with the two stations as foci.
/// Undefined derivatives at a station itself. Independent errors of the arrivals make correlated ones of the differences,
/// for they share the reference.
///
/// Source: Y. T. Chan, K. C. Ho, "A simple and efficient estimator for hyperbolic location", IEEE Transactions on
/// Signal Processing 42 (1994) 1905-1915 (from memory).
#[derive(Debug, Clone, PartialEq)]
pub struct TimeDifference {
    lookout: Lookout,
    slowness: f64,
    outputs: Vec<Output>,
}

/// What a suite or a case record says of a [`TimeDifference`].
#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Parameters {
    stations: Option<Vec<Vec<f64>>>,
    #[serde(default)]
    position: Vec<usize>,
    wave_speed: Option<f64>,
}

impl TimeDifference {
    /// Stations \[m\] of two or three coordinates, the first being the reference, that hear a wave of `wave_speed`
    /// \[m/s\] from the position at the components `position`, as many, of a state of `n`.
    ///
    /// # Errors
    /// [`ParameterError`] if there are fewer than two stations, one stands where the reference does, a coordinate is
    /// not finite, lengths do not fit, the speed is not above zero, or a component is outside the state or stands twice.
    pub fn new(
        stations: Vec<Vec<f64>>,
        position: &[usize],
        wave_speed: f64,
        n: usize,
    ) -> Result<Self, ParameterError> {
        let lookout = Lookout::new(stations, position, Coordinates::TwoOrThree, n)?;
        let outputs = lookout.differences("time difference", "s")?;
        let slowness = 1.0 / positive("wave_speed", wave_speed, "the speed of the wave in m/s")?;
        Ok(Self { lookout, slowness, outputs })
    }

    pub(super) fn from_parameters(p: Parameters, n: usize) -> Result<Self, ParameterError> {
        let stations = given("stations", p.stations, "two or more [[x, y(, z)], ...], the first is the reference")?;
        let wave_speed = given("wave_speed", p.wave_speed, "the speed of the wave in m/s")?;
        Self::new(stations, &p.position, wave_speed, n)
    }
}

impl Formula for TimeDifference {
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
        let stations = &self.lookout.stations;
        let reference = squared_range(x, &stations[0]).sqrt();
        let slowness = T::constant(self.slowness);
        for (station, difference) in stations[1..].iter().zip(y) {
            *difference = (squared_range(x, station).sqrt() - reference) * slowness;
        }
    }
}
