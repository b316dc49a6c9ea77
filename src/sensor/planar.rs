use serde::{Deserialize, Serialize};

use super::parameter::checked_components;
use super::{Number, Output, ParameterError};

/// Stations in the plane and where the position that they see stands in the state: what all sensors of a planar
/// position share.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Lookout {
    pub stations: Vec<[f64; 2]>,
    pub position: [usize; 2],
}

/// What a suite or a case record says of a [`Lookout`]: one of `station` and `stations`.
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

impl Parameters {
    /// The stations and the position.
    pub fn places(self) -> Result<(Vec<[f64; 2]>, [usize; 2]), ParameterError> {
        match (self.station, self.stations) {
            (Some(station), None) => Ok((vec![station], self.position)),
            (None, Some(stations)) => Ok((stations, self.position)),
            (Some(_), Some(_)) => {
                Err(ParameterError::new("stations", "stands beside `station`; give one of the two"))
            }
            (None, None) => {
                Err(ParameterError::new("station", "is missing; give `station` [x, y] or `stations` [[x, y], ...]"))
            }
        }
    }
}

/// Where a planar position stands in a state when nothing is said: its first two components.
pub(super) fn default_position() -> [usize; 2] {
    [0, 1]
}

impl Lookout {
    /// Stations \[m\] that see the position at the components `position` of a state of `n`.
    ///
    /// # Errors
    /// [`ParameterError`] if there is no station, a coordinate is not finite, or a component is outside the
    /// state or stands twice.
    pub fn new(stations: Vec<[f64; 2]>, position: [usize; 2], n: usize) -> Result<Self, ParameterError> {
        if stations.is_empty() {
            return Err(ParameterError::new("stations", "give at least one station [x, y]"));
        }
        for (j, station) in stations.iter().enumerate() {
            if let Some(k) = station.iter().position(|v| !v.is_finite()) {
                let key = if stations.len() == 1 { format!("station[{k}]") } else { format!("stations[{j}][{k}]") };
                return Err(ParameterError::new(key, format!("{} is not a coordinate", station[k])));
            }
        }
        checked_components("position", &position, n)?;
        Ok(Self { stations, position })
    }

    /// Outputs of every station in turn, numbered from 1 where there are several.
    pub fn outputs(&self, of_one: impl Fn(&dyn Fn(&str) -> String) -> Vec<Output>) -> Vec<Output> {
        let several = self.stations.len() > 1;
        (1..=self.stations.len())
            .flat_map(|j| of_one(&|name| if several { format!("{name} {j}") } else { name.into() }))
            .collect()
    }
}

/// The position seen from a station, (x - sx, y - sy).
#[inline(always)]
pub(super) fn seen_from<T: Number>(position: &[T], station: &[f64; 2]) -> (T, T) {
    (position[0] - T::constant(station[0]), position[1] - T::constant(station[1]))
}
