use std::f64::consts::LN_10;

use serde::{Deserialize, Serialize};

use super::kinds::{Kind, built};
use super::lookout::{self, Coordinates, Lookout, squared_range, with_position};
use super::parameter::{given, positive};
use super::{Formula, Number, Output, ParameterError};
use crate::gaussian::Gaussian;

pub(super) const KIND: Kind = Kind {
    name: "received-strength",
    summary: "strength received of an emitter in the plane or in space at one or several stations, by log-distance path loss",
    formula: "y_j = strength - 10 exponent log10(|p - s_j| / d0) [dB]",
    parameters: "station [x, y(, z)] m or stations [[x, y(, z)], ...] m; strength dB received at reference_distance \
                 d0 m; exponent (2 in free space); position [i, j(, k)] = [0, 1(, 2)]",
    quantities: &[("station", "m"), ("stations", "m"), ("reference_distance", "m")],
    source: "Rappaport 2002",
    example: r#"{"case":"beacon","sensor":{"kind":"received-strength","stations":[[0,0],[900,0]],"strength":-40,"reference_distance":1,"exponent":2.4},"prior":{"mean":[400,600],"covariance":[[10000,0],[0,10000]]},"noise":{"covariance":9}}"#,
    build: |map, n| built(with_position(map), n, ReceivedStrength::from_parameters),
};

/// Strength received of an emitter at one or several stations by the log-distance law, in the plane or in space.
///
/// y_j = strength - 10 exponent log10(|p - s_j| / d0) \[dB\]: what is received at the reference distance d0, less
/// 10 exponent dB a decade of distance. Infinite at a station itself.
///
/// Source: T. S. Rappaport, Wireless Communications: Principles and Practice, 2nd ed. (Prentice Hall, 2002),
/// sec. 4.9.1 (log-distance path loss; section number from memory).
#[derive(Debug, Clone, PartialEq)]
pub struct ReceivedStrength {
    lookout: Lookout,
    /// Strength at one metre \[dB\].
    at_one_metre: f64,
    /// dB lost for each unit of ln(r^2).
    loss: f64,
    outputs: Vec<Output>,
}

/// What a suite or a case record says of a [`ReceivedStrength`].
#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Parameters {
    #[serde(default, skip_serializing_if = "Option::is_none")]
    station: Option<Vec<f64>>,
    #[serde(default, skip_serializing_if = "Option::is_none")]
    stations: Option<Vec<Vec<f64>>>,
    #[serde(default)]
    position: Vec<usize>,
    strength: Option<f64>,
    reference_distance: Option<f64>,
    exponent: Option<f64>,
}

/// The log-distance law of path loss.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct PathLoss {
    /// What is received at the reference distance \[dB\].
    pub strength: f64,
    /// The reference distance \[m\].
    pub reference_distance: f64,
    /// How fast it falls: 2 in free space.
    pub exponent: f64,
}

impl ReceivedStrength {
    /// Stations \[m\] of two or three coordinates that receive an emitter by this `law` from the position at the
    /// components `position`, as many, of a state of `n`.
    ///
    /// # Errors
    /// [`ParameterError`] if there is no station, a coordinate or the strength is not finite, lengths do not fit,
    /// reference distance or exponent is not above zero, or a component is outside the state or stands twice.
    pub fn new(
        stations: Vec<Vec<f64>>,
        position: &[usize],
        law: PathLoss,
        n: usize,
    ) -> Result<Self, ParameterError> {
        Self::over(Lookout::new(stations, position, Coordinates::TwoOrThree, n)?, law)
    }

    fn over(lookout: Lookout, law: PathLoss) -> Result<Self, ParameterError> {
        let PathLoss { strength, reference_distance, exponent } = law;
        if !strength.is_finite() {
            return Err(ParameterError::new("strength", format!("{strength} is not finite; give dB")));
        }
        let reference_distance =
            positive("reference_distance", reference_distance, "the length in m at which `strength` holds")?;
        let exponent = positive("exponent", exponent, "how fast it falls, 2 in free space")?;
        let outputs = lookout.outputs(|called| vec![Output::plain(called("strength"), "dB")]);
        let at_one_metre = strength + 10.0 * exponent * reference_distance.log10();
        Ok(Self { lookout, at_one_metre, loss: 5.0 * exponent / LN_10, outputs })
    }

    pub(super) fn from_parameters(p: Parameters, n: usize) -> Result<Self, ParameterError> {
        let Parameters { station, stations, position, strength, reference_distance, exponent } = p;
        let lookout = lookout::Parameters { station, stations, position }.lookout(Coordinates::TwoOrThree, n)?;
        let law = PathLoss {
            strength: given("strength", strength, "what is received at `reference_distance` in dB")?,
            reference_distance: given(
                "reference_distance",
                reference_distance,
                "the length in m at which `strength` holds",
            )?,
            exponent: given("exponent", exponent, "how fast it falls, 2 in free space")?,
        };
        Self::over(lookout, law)
    }
}

impl Formula for ReceivedStrength {
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
        let (at_one_metre, loss) = (T::constant(self.at_one_metre), T::constant(self.loss));
        for (station, strength) in self.lookout.stations.iter().zip(y) {
            *strength = at_one_metre - loss * squared_range(x, station).ln();
        }
    }
}
