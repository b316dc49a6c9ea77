use serde::{Deserialize, Serialize};

use super::planar::{checked_position, checked_station, default_position, seen_from};
use super::{Formula, Number, Output, ParameterError};

/// Bearings of a planar position from one or several stations.
///
/// theta_j = atan2(y - sy_j, x - sx_j) \[rad\], counter-clockwise from the x axis, each angular.
///
/// Source: Y. Bar-Shalom, X. R. Li, T. Kirubarajan, Estimation with Applications to Tracking and Navigation
/// (Wiley, 2001), sec. 3.7 (bearings-only measurements; section number from memory).
#[derive(Debug, Clone, PartialEq)]
pub struct BearingOnly {
    stations: Vec<[f64; 2]>,
    position: [usize; 2],
    outputs: Vec<Output>,
}

/// What a suite or a case record says of a [`BearingOnly`]: one of `station` and `stations`.
#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Parameters {
    #[serde(default, skip_serializing_if = "Option::is_none")]
    station: Option<[f64; 2]>,
    #[serde(default, skip_serializing_if = "Option::is_none")]
    stations: Option<Vec<[f64; 2]>>,
    #[serde(default = "default_position")]
    position: [usize; 2],
}

impl BearingOnly {
    /// Stations \[m\] that read the position at the components `position` of a state of `n`.
    ///
    /// # Errors
    /// [`ParameterError`] if there is no station, a coordinate is not finite, or a component is outside the
    /// state or stands twice.
    pub fn new(stations: Vec<[f64; 2]>, position: [usize; 2], n: usize) -> Result<Self, ParameterError> {
        if stations.is_empty() {
            return Err(ParameterError::new("stations", "give at least one station [x, y]"));
        }
        for (j, &station) in stations.iter().enumerate() {
            checked_station(&format!("stations[{j}]"), station)?;
        }
        checked_position(position, n)?;
        let outputs = match stations.len() {
            1 => vec![Output::angle("bearing")],
            several => (1..=several).map(|j| Output::angle(format!("bearing {j}"))).collect(),
        };
        Ok(Self { stations, position, outputs })
    }

    pub(super) fn from_parameters(p: Parameters, n: usize) -> Result<Self, ParameterError> {
        match (p.station, p.stations) {
            (Some(station), None) => Self::new(vec![station], p.position, n),
            (None, Some(stations)) => Self::new(stations, p.position, n),
            (Some(_), Some(_)) => {
                Err(ParameterError::new("stations", "stands beside `station`; give one of the two"))
            }
            (None, None) => {
                Err(ParameterError::new("station", "is missing; give `station` [x, y] or `stations` [[x, y], ...]"))
            }
        }
    }
}

impl Formula for BearingOnly {
    fn reads(&self) -> &[usize] {
        &self.position
    }

    fn outputs(&self) -> &[Output] {
        &self.outputs
    }

    #[inline(always)]
    fn evaluate<T: Number>(&self, x: &[T], y: &mut [T]) {
        for (station, angle) in self.stations.iter().zip(y) {
            let (east, north) = seen_from(x, *station);
            *angle = north.atan2(east);
        }
    }
}
