use serde::{Deserialize, Serialize};

use super::kinds::{Kind, built};
use super::lookout::{Coordinates, Lookout, range_and_rate, with_motion};
use super::parameter::{given, positive};
use super::{Formula, Number, Output, ParameterError};
use crate::gaussian::Gaussian;

pub(super) const KIND: Kind = Kind {
    name: "frequency-difference",
    summary: "differences of the frequency heard of a moving emitter between a reference station and others",
    formula: "y_j = -(f0 / c) (rate_j - rate_0) [Hz], rate_j = (p - s_j)' v / |p - s_j|, j = 1, 2, ...",
    parameters: "stations [[x, y(, z)], ...] m, at least 2, the first is the reference; carrier f0 Hz; wave_speed c \
                 m/s; position [i, j(, k)] = [0, 1(, 2)]; velocity = the components after the position",
    quantities: &[("stations", "m"), ("carrier", "Hz"), ("wave_speed", "m/s")],
    source: "Ho, Xu 2004",
    example: r#"{"case":"drifter","sensor":{"kind":"frequency-difference","stations":[[0,0],[3000,0],[0,3000]],"carrier":1.6e8,"wave_speed":2.998e8},"prior":{"mean":[1500,2000,6,-4],"covariance":[[40000,0,0,0],[0,40000,0,0],[0,0,4,0],[0,0,0,4]]},"noise":{"covariance":[[0.02,0.01],[0.01,0.02]]}}"#,
    build: |map, n| built(with_motion(map), n, FrequencyDifference::from_parameters),
};

/// Differences of the Doppler-shifted frequency of a moving emitter at several stations at rest, in the plane or in
/// space.
///
/// y_j = -(f0 / c) (rate_j - rate_0) \[Hz\], rate_j = (p - s_j)' v / |p - s_j|, j = 1, 2, ..: the first station s_0 is
/// the reference of all others; f0 is the carrier \[Hz\], c the speed of the wave \[m/s\], large beside that of the
/// emitter. Undefined at a station itself.
///
/// Source: K. C. Ho, W. Xu, "An accurate algebraic solution for moving source location using TDOA and FDOA
/// measurements", IEEE Transactions on Signal Processing 52 (2004) 2453-2463 (from memory).
#[derive(Debug, Clone, PartialEq)]
pub struct FrequencyDifference {
    lookout: Lookout,
    /// f0 / c, cycles a metre.
    wave_number: f64,
    outputs: Vec<Output>,
}

/// What a suite or a case record says of a [`FrequencyDifference`].
#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Parameters {
    stations: Option<Vec<Vec<f64>>>,
    #[serde(default)]
    position: Vec<usize>,
    #[serde(default)]
    velocity: Vec<usize>,
    carrier: Option<f64>,
    wave_speed: Option<f64>,
}

/// What the wave of an emitter is like.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Wave {
    /// The frequency that it would have at rest \[Hz\].
    pub carrier: f64,
    /// How fast it travels \[m/s\].
    pub speed: f64,
}

impl FrequencyDifference {
    /// Stations \[m\] of two or three coordinates, the first being the reference, that hear the wave of an emitter
    /// with position and velocity at the components `position` and `velocity`, as many, of a state of `n`.
    ///
    /// # Errors
    /// [`ParameterError`] if there are fewer than two stations, one stands where the reference does, a coordinate is
    /// not finite, lengths do not fit, carrier or speed is not above zero, or a component is outside the state or
    /// stands twice.
    pub fn new(
        stations: Vec<Vec<f64>>,
        position: &[usize],
        velocity: &[usize],
        wave: Wave,
        n: usize,
    ) -> Result<Self, ParameterError> {
        let lookout = Lookout::new(stations, position, Coordinates::TwoOrThree, n)?.with_velocity(velocity, n)?;
        let outputs = lookout.differences("frequency difference", "Hz")?;
        let carrier = positive("carrier", wave.carrier, "the frequency of the emitter in Hz")?;
        let wave_number = carrier / positive("wave_speed", wave.speed, "the speed of the wave in m/s")?;
        Ok(Self { lookout, wave_number, outputs })
    }

    pub(super) fn from_parameters(p: Parameters, n: usize) -> Result<Self, ParameterError> {
        let stations = given("stations", p.stations, "two or more [[x, y(, z)], ...], the first is the reference")?;
        let carrier = given("carrier", p.carrier, "the frequency of the emitter in Hz")?;
        let speed = given("wave_speed", p.wave_speed, "the speed of the wave in m/s")?;
        let wave = Wave { carrier, speed };
        Self::new(stations, &p.position, &p.velocity, wave, n)
    }
}

impl Formula for FrequencyDifference {
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
        let stations = &self.lookout.stations;
        let (_, reference) = range_and_rate(x, &stations[0]);
        let wave_number = T::constant(self.wave_number);
        for (station, difference) in stations[1..].iter().zip(y) {
            let (_, rate) = range_and_rate(x, station);
            *difference = (reference - rate) * wave_number;
        }
    }
}
