use serde::{Deserialize, Serialize};
use serde_json::{Map, Value, json};

use super::{Number, Output, ParameterError};
use crate::gaussian::Gaussian;

/// Stations and the components of the state that they see: what all sensors of a position share.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Lookout {
    /// Coordinates of every station \[m\]; in the plane the third is zero and never read.
    pub stations: Vec<[f64; 3]>,
    /// Components of the position, then those of the velocity where one is seen.
    pub reads: Vec<usize>,
}

/// How many coordinates a sensor allows a position to have.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Coordinates {
    /// In the plane.
    Two,
    /// In space.
    Three,
    /// As many as the stations have.
    TwoOrThree,
}

impl Coordinates {
    /// The point as it is written.
    fn point(self) -> &'static str {
        match self {
            Self::Two => "[x, y]",
            Self::Three => "[x, y, z]",
            Self::TwoOrThree => "[x, y(, z)]",
        }
    }

    fn check(self, key: impl Into<String>, length: usize) -> Result<(), ParameterError> {
        let (fits, needed) = match self {
            Self::Two => (length == 2, "2"),
            Self::Three => (length == 3, "3"),
            Self::TwoOrThree => (length == 2 || length == 3, "2 or 3"),
        };
        if fits {
            return Ok(());
        }
        Err(ParameterError::new(key, format!("has length {length}; give a list of length {needed}")))
    }
}

/// What a suite or a case record says of a [`Lookout`] that sees a position: one of `station` and `stations`.
#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Parameters {
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub station: Option<Vec<f64>>,
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub stations: Option<Vec<Vec<f64>>>,
    #[serde(default)]
    pub position: Vec<usize>,
}

/// The same of one that sees a velocity too.
#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct MovingParameters {
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub station: Option<Vec<f64>>,
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub stations: Option<Vec<Vec<f64>>>,
    #[serde(default)]
    pub position: Vec<usize>,
    #[serde(default)]
    pub velocity: Vec<usize>,
}

/// The parameters with the default `position` filled in: the first components of the state, as many as a station
/// has coordinates.
pub(super) fn with_position(mut map: Map<String, Value>) -> Map<String, Value> {
    if !map.contains_key("position") {
        let station = map.get("station").or_else(|| map.get("stations")?.get(0));
        if let Some(length) = station.and_then(Value::as_array).map(Vec::len) {
            map.insert("position".into(), json!((0..length).collect::<Vec<_>>()));
        }
    }
    map
}

/// The same with the default `velocity` too: the components right after the position. A position of scattered
/// components says nothing of where its velocity stands.
pub(super) fn with_motion(map: Map<String, Value>) -> Map<String, Value> {
    let mut map = with_position(map);
    if !map.contains_key("velocity") {
        let position = map.get("position").and_then(|p| serde_json::from_value::<Vec<usize>>(p.clone()).ok());
        if let Some(position) = position
            && position.windows(2).all(|pair| pair[0].checked_add(1) == Some(pair[1]))
            && let Some(after) = position.last().and_then(|last| last.checked_add(1))
            && let Some(end) = after.checked_add(position.len())
        {
            map.insert("velocity".into(), json!((after..end).collect::<Vec<_>>()));
        }
    }
    map
}

impl Parameters {
    /// The stations and the position in a state of `n`.
    pub fn lookout(self, coordinates: Coordinates, n: usize) -> Result<Lookout, ParameterError> {
        let point = coordinates.point();
        match (self.station, self.stations) {
            (Some(station), None) => {
                Lookout::new(vec![station], &self.position, coordinates, n).map_err(of_the_only_station)
            }
            (None, Some(stations)) => Lookout::new(stations, &self.position, coordinates, n),
            (Some(_), Some(_)) => {
                Err(ParameterError::new("stations", "stands beside `station`; give one of the two"))
            }
            (None, None) => Err(ParameterError::new(
                "station",
                format!("is missing; give `station` {point} or `stations` [{point}, ...]"),
            )),
        }
    }
}

/// What is said of `stations[0]`, said of `station`.
fn of_the_only_station(e: ParameterError) -> ParameterError {
    match e.key.strip_prefix("stations[0]") {
        Some(below) => ParameterError::new(format!("station{below}"), e.message),
        None => e,
    }
}

impl MovingParameters {
    /// The stations, the position and the velocity in a state of `n`.
    pub fn lookout(self, coordinates: Coordinates, n: usize) -> Result<Lookout, ParameterError> {
        let Self { station, stations, position, velocity } = self;
        Parameters { station, stations, position }.lookout(coordinates, n)?.with_velocity(&velocity, n)
    }
}

impl Lookout {
    /// Largest standard deviation of the position, the first `coordinates` components read, over its distance from the nearest
    /// station.
    pub fn spread(&self, prior: &Gaussian, coordinates: usize) -> Option<f64> {
        let position: Vec<usize> = (0..coordinates).collect();
        let distance = |station: &[f64; 3]| {
            position.iter().map(|&i| (prior.mean()[i] - station[i]).powi(2)).sum::<f64>().sqrt()
        };
        let nearest = self.stations.iter().map(distance).fold(f64::INFINITY, f64::min);
        Some(prior.largest_sd(&position)? / nearest)
    }

    /// Stations \[m\] that see the position at the components `position` of a state of `n`.
    ///
    /// # Errors
    /// [`ParameterError`] if there is no station, one has not the right number of coordinates or one that is not
    /// finite, or a component is missing, outside the state or there twice.
    pub fn new(
        stations: Vec<Vec<f64>>,
        position: &[usize],
        coordinates: Coordinates,
        n: usize,
    ) -> Result<Self, ParameterError> {
        let Some(dimension) = stations.first().map(Vec::len) else {
            let point = coordinates.point();
            return Err(ParameterError::new("stations", format!("give at least one station {point}")));
        };
        for (j, station) in stations.iter().enumerate() {
            coordinates.check(format!("stations[{j}]"), station.len())?;
            if station.len() != dimension {
                return Err(ParameterError::new(
                    format!("stations[{j}]"),
                    format!("has {} coordinates, but the first station has {dimension}", station.len()),
                ));
            }
            if let Some(k) = station.iter().position(|v| !v.is_finite()) {
                return Err(ParameterError::new(
                    format!("stations[{j}][{k}]"),
                    format!("{} is not a coordinate", station[k]),
                ));
            }
        }
        if position.len() != dimension {
            return Err(ParameterError::new(
                "position",
                format!("names {} components; give {dimension}, one a coordinate of a station", position.len()),
            ));
        }
        let stations = stations.iter().map(|s| [s[0], s[1], s.get(2).copied().unwrap_or(0.0)]).collect();
        Self { stations, reads: Vec::new() }.reading("position", position, n)
    }

    /// The same, seeing the velocity at the components `velocity` too.
    ///
    /// # Errors
    /// [`ParameterError`] if there are not as many as the position has, or one is outside the state or read
    /// already.
    pub fn with_velocity(self, velocity: &[usize], n: usize) -> Result<Self, ParameterError> {
        let dimension = self.reads.len();
        if velocity.is_empty() {
            return Err(ParameterError::new(
                "velocity",
                format!(
                    "is missing; give its {dimension} components: only after a position of consecutive ones is there a default"
                ),
            ));
        }
        if velocity.len() != dimension {
            return Err(ParameterError::new(
                "velocity",
                format!("names {} components; give {dimension}, as many as the position has", velocity.len()),
            ));
        }
        self.reading("velocity", velocity, n)
    }

    fn reading(mut self, key: &str, components: &[usize], n: usize) -> Result<Self, ParameterError> {
        for (k, &component) in components.iter().enumerate() {
            if component >= n {
                return Err(ParameterError::new(
                    format!("{key}[{k}]"),
                    format!("{component} is outside the state, which has {n} components counted from 0"),
                ));
            }
            if components[..k].contains(&component) {
                return Err(ParameterError::new(key, format!("names component {component} twice")));
            }
            if self.reads.contains(&component) {
                return Err(ParameterError::new(
                    format!("{key}[{k}]"),
                    format!("names component {component}, which is one of the position"),
                ));
            }
        }
        self.reads.extend_from_slice(components);
        Ok(self)
    }

    /// Outputs of every station in turn, numbered from 1 where there are several.
    pub fn outputs(&self, of_one: impl Fn(&dyn Fn(&str) -> String) -> Vec<Output>) -> Vec<Output> {
        numbered(self.stations.len(), of_one)
    }

    /// Outputs of every station but the first, which the others are compared with.
    ///
    /// # Errors
    /// [`ParameterError`] if there is no other station, or one stands where the first one does: their difference
    /// would always be zero.
    pub fn differences(&self, name: &str, unit: &'static str) -> Result<Vec<Output>, ParameterError> {
        let [reference, others @ ..] = self.stations.as_slice() else { return Ok(Vec::new()) };
        if others.is_empty() {
            return Err(ParameterError::new(
                "stations",
                "has 1 station; give at least 2, the first is the reference",
            ));
        }
        if let Some(j) = others.iter().position(|station| station == reference) {
            return Err(ParameterError::new(
                format!("stations[{}]", j + 1),
                "stands where stations[0] does: their difference is always zero; give another place",
            ));
        }
        Ok(numbered(others.len(), |called| vec![Output::plain(called(name), unit)]))
    }
}

/// Outputs of `count` in turn, numbered from 1 where there are several.
fn numbered(count: usize, of_one: impl Fn(&dyn Fn(&str) -> String) -> Vec<Output>) -> Vec<Output> {
    let called = |j: usize, name: &str| if count > 1 { format!("{name} {j}") } else { name.into() };
    (1..=count).flat_map(|j| of_one(&|name| called(j, name))).collect()
}

/// The horizontal part of the position seen from a station, (x - sx, y - sy).
#[inline(always)]
pub(super) fn seen_from<T: Number>(position: &[T], station: &[f64; 3]) -> (T, T) {
    (position[0] - T::constant(station[0]), position[1] - T::constant(station[1]))
}

/// |p - s|^2 of a position in the plane or in space.
#[inline(always)]
pub(super) fn squared_range<T: Number>(position: &[T], station: &[f64; 3]) -> T {
    let mut sum = T::constant(0.0);
    for (&coordinate, &origin) in position.iter().zip(station) {
        let offset = coordinate - T::constant(origin);
        sum = sum + offset * offset;
    }
    sum
}

/// |p - s| and its rate (p - s)'v / |p - s| of a state that holds p, then v.
#[inline(always)]
pub(super) fn range_and_rate<T: Number>(state: &[T], station: &[f64; 3]) -> (T, T) {
    let (position, velocity) = state.split_at(state.len() / 2);
    let mut square = T::constant(0.0);
    let mut product = T::constant(0.0);
    for ((&coordinate, &origin), &speed) in position.iter().zip(station).zip(velocity) {
        let offset = coordinate - T::constant(origin);
        square = square + offset * offset;
        product = product + offset * speed;
    }
    let range = square.sqrt();
    // By the reciprocal, as dual numbers divide: the value beside a Jacobian is then the value to the bit.
    (range, product * (T::constant(1.0) / range))
}

/// Azimuth atan2(y, x) and elevation atan2(z, hypot(x, y)) of a position in space seen from a station.
#[inline(always)]
pub(super) fn azimuth_and_elevation<T: Number>(position: &[T], station: &[f64; 3]) -> (T, T) {
    let (east, north) = seen_from(position, station);
    let up = position[2] - T::constant(station[2]);
    (north.atan2(east), up.atan2(east.hypot(north)))
}
