//! The models that the benches share, read from the records that the peers' scripts read too. All numbers are invented.

// Every bench compiles this module whole and uses a part of it.
#![allow(dead_code)]

use gaussworthy::gaussian::{Gaussian, Marginal};
use gaussworthy::reference::{Key, Sampler, SamplerSettings};
use gaussworthy::sensor::{Formula, Number, Output};
use gaussworthy::suite::Case;
use nalgebra::DMatrix;
use serde::Deserialize;
use serde_json::Value;

/// A ship 3 km off the harbour radar, its bearing known to a few degrees: no sample comes near the cut.
pub fn range_bearing() -> Case {
    case("A")
}

/// Two listening buoys and a ship with position and velocity, state [x, y, vx, vy].
pub fn two_bearings() -> Case {
    case("B")
}

/// A power meter on three phases, state [v1, v2, v3, i1, i2, i3]: total power beside the current's sum of squares.
pub fn quadratic() -> Case {
    case("C")
}

fn case(name: &str) -> Case {
    Case::from_json(record(name)).expect("a case of ours is a case")
}

fn record(name: &str) -> Value {
    let mut records: Value = serde_json::from_str(include_str!("../peers/models.json")).expect("JSON");
    records[name].take()
}

/// One of the four models.
pub enum Model {
    /// A: range and bearing. B: two bearings. C: two quadratic forms.
    BuiltIn(Case),
    /// D: range, azimuth and elevation of a helicopter, state [x, y, z, vx, vy, vz].
    Own { sensor: RangeAzimuthElevation, prior: Gaussian, marginal: Marginal, noise: DMatrix<f64> },
}

impl Model {
    /// The names of the models.
    pub const NAMES: [&str; 4] = ["A", "B", "C", "D"];

    /// The model of that name.
    pub fn new(name: &str) -> Self {
        if name != "D" {
            return Self::BuiltIn(case(name));
        }
        let record: Record = serde_json::from_value(record(name)).expect("a record of ours is one");
        let prior = Gaussian::new(record.prior.mean.into(), matrix(&record.prior.covariance)).expect("a Gaussian");
        let sensor = RangeAzimuthElevation::new(record.sensor.station);
        let marginal = Marginal::new(&prior, Formula::reads(&sensor));
        Self::Own { sensor, prior, marginal, noise: matrix(&record.noise.covariance) }
    }

    /// A sampler of the model, its pilot done.
    pub fn sampler(&self, settings: SamplerSettings) -> Sampler<'_> {
        let key = Key::new(settings.seed, "a model of the benches");
        match self {
            Self::BuiltIn(case) => {
                Sampler::of_parts(case.sensor(), case.prior(), case.marginal(), case.noise_or_zero(), key, settings)
            }
            Self::Own { sensor, prior, marginal, noise } => {
                Sampler::of_parts(sensor, prior, marginal, noise.clone(), key, settings)
            }
        }
        .expect("the cap is large enough")
    }
}

/// r = |d|, azimuth = atan2(d_y, d_x), elevation = atan2(d_z, sqrt(d_x^2 + d_y^2)) of d = x - station: a sensor of
/// the caller's own.
#[derive(Debug)]
pub struct RangeAzimuthElevation {
    station: [f64; 3],
    outputs: [Output; 3],
}

impl RangeAzimuthElevation {
    fn new(station: [f64; 3]) -> Self {
        let outputs = [Output::plain("range", "m"), Output::angle("azimuth"), Output::plain("elevation", "rad")];
        Self { station, outputs }
    }
}

impl Formula for RangeAzimuthElevation {
    fn reads(&self) -> &[usize] {
        &[0, 1, 2]
    }

    fn outputs(&self) -> &[Output] {
        &self.outputs
    }

    #[inline(always)]
    fn evaluate<T: Number>(&self, x: &[T], y: &mut [T]) {
        let seen = |i: usize| x[i] - T::constant(self.station[i]);
        let (east, north, up) = (seen(0), seen(1), seen(2));
        let ground = east.hypot(north);
        y[0] = ground.hypot(up);
        y[1] = north.atan2(east);
        y[2] = up.atan2(ground);
    }
}

#[derive(Deserialize)]
struct Record {
    sensor: Station,
    prior: Law,
    noise: Noise,
}

#[derive(Deserialize)]
struct Station {
    station: [f64; 3],
}

#[derive(Deserialize)]
struct Law {
    mean: Vec<f64>,
    covariance: Vec<Vec<f64>>,
}

#[derive(Deserialize)]
struct Noise {
    covariance: Vec<Vec<f64>>,
}

fn matrix(rows: &[Vec<f64>]) -> DMatrix<f64> {
    DMatrix::from_fn(rows.len(), rows.len(), |i, k| rows[i][k])
}
