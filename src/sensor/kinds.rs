use std::sync::Arc;

use serde::Serialize;
use serde::de::DeserializeOwned;
use serde_json::{Map, Value};

use crate::wording::{plain, unknown_name};

use super::{
    ParameterError, Sensor, attitude_vector, azimuth_elevation, bearing_only, bearing_rate, dipole_field,
    exponential_decay, frequency_difference, line_feature, line_offset, linear, phase_sine, pinhole,
    polar_to_cartesian, quadratic, range_azimuth_elevation, range_bearing, range_doppler, range_only,
    received_strength, saturating, stereo_disparity, time_difference, written,
};

/// A sensor that a suite or a case record can name.
#[derive(Debug, Clone, Copy)]
pub struct Kind {
    /// Its name there.
    pub name: &'static str,
    /// One sentence.
    pub summary: &'static str,
    /// The measurement function.
    pub formula: &'static str,
    /// Its parameters with shapes and units.
    pub parameters: &'static str,
    /// Parameters that are quantities, each with its base unit: a suite may give them in any unit of the same dimension.
    pub quantities: &'static [(&'static str, &'static str)],
    /// Where the formula is published.
    pub source: &'static str,
    /// A case record to start from, one line of JSON.
    pub example: &'static str,
    pub(super) build: fn(Map<String, Value>, usize) -> Result<Built, BuildError>,
}

/// Parameters with their defaults filled in, and the sensor that they make.
pub(super) type Built = (Map<String, Value>, Arc<dyn Sensor>);

/// Every built-in sensor. A new one is one line here.
///
/// A static, not a constant: what is constant is compiled again, with every formula in it, in each program that names it.
pub static KINDS: &[Kind] = &[
    range_bearing::KIND,
    bearing_only::KIND,
    range_only::KIND,
    range_doppler::KIND,
    bearing_rate::KIND,
    range_azimuth_elevation::KIND,
    azimuth_elevation::KIND,
    time_difference::KIND,
    frequency_difference::KIND,
    received_strength::KIND,
    polar_to_cartesian::KIND,
    line_offset::KIND,
    line_feature::KIND,
    pinhole::KIND,
    stereo_disparity::KIND,
    attitude_vector::KIND,
    dipole_field::KIND,
    exponential_decay::KIND,
    saturating::KIND,
    phase_sine::KIND,
    quadratic::KIND,
    linear::KIND,
    written::KIND,
];

/// Why a sensor could not be made from what a suite or a case record says.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[error("{}{message}", if key.is_empty() { String::new() } else { format!("{key}: ") })]
pub struct BuildError {
    /// Path of the key at fault below `sensor`, such as `station[1]`; empty for the sensor as a whole.
    pub key: String,
    /// What is wrong and what would be right.
    pub message: String,
}

impl From<ParameterError> for BuildError {
    fn from(e: ParameterError) -> Self {
        Self { key: e.key, message: e.message }
    }
}

/// A sensor and how it was written: kind and parameters, defaults filled in.
#[derive(Debug, Clone)]
pub struct SensorSpec {
    kind: &'static str,
    parameters: Map<String, Value>,
    state_dimension: usize,
    sensor: Arc<dyn Sensor>,
}

impl SensorSpec {
    /// Makes the sensor that a JSON object describes (`kind` and its parameters) for a state of `n`
    /// components.
    ///
    /// # Errors
    /// [`BuildError`] with the key at fault: no `kind`, an unknown one, an unknown or missing parameter, one
    /// of wrong shape or value.
    pub fn from_json(mut described: Map<String, Value>, n: usize) -> Result<Self, BuildError> {
        let names = || KINDS.iter().map(|k| k.name).collect::<Vec<_>>().join(", ");
        let error = |key: &str, message: String| BuildError { key: key.into(), message };
        let formulas = ["outputs", "state", "definitions"].into_iter().find(|key| described.contains_key(*key));
        let kind = match described.shift_remove("kind") {
            Some(Value::String(kind)) => {
                if let Some(key) = formulas.filter(|_| kind != written::KIND.name) {
                    let message = format!(
                        "`{key}` belongs to a sensor that is written out as formulas, which has no `kind`; leave out one of the two"
                    );
                    return Err(error(key, message));
                }
                kind
            }
            Some(other) => return Err(error("kind", format!("is {other}; give one of {}", names()))),
            // A sensor that is written out says so by what it holds.
            None if formulas.is_some() => written::KIND.name.to_owned(),
            None => return Err(error("", format!("`kind` is missing; give one of {}", names()))),
        };
        if let Some(missing) = ["state", "outputs"].into_iter().find(|key| !described.contains_key(*key))
            && kind == written::KIND.name
        {
            let message = format!(
                "`{missing}` is missing; a sensor that is written out as formulas needs `state`, a list of names, and `outputs`, \
                 each with `name` and `formula`"
            );
            return Err(error("", message));
        }
        let kind = KINDS.iter().find(|k| k.name == kind).ok_or_else(|| {
            let names: Vec<_> = KINDS.iter().map(|k| k.name).collect();
            error("kind", unknown_name("sensor", &kind, &names))
        })?;
        let (parameters, sensor) = (kind.build)(described, n)?;
        Ok(Self { kind: kind.name, parameters, state_dimension: n, sensor })
    }

    /// A sensor of the caller's own, for a state of `n` components. What it answers is kept under `kind` and `parameters`:
    /// they must tell it from every other sensor. A case record of it can be written, not read back.
    ///
    /// # Errors
    /// [`BuildError`] if `kind` is that of a built-in sensor, or a component that the sensor reads is outside state and
    /// noise, or stands twice.
    pub fn own(
        kind: &'static str,
        parameters: Map<String, Value>,
        n: usize,
        sensor: Arc<dyn Sensor>,
    ) -> Result<Self, BuildError> {
        let error = |key: &str, message: String| Err(BuildError { key: key.into(), message });
        if KINDS.iter().any(|known| known.name == kind) {
            return error("kind", format!("`{kind}` is a built-in sensor; give another name"));
        }
        let (reads, all) = (sensor.reads(), n + sensor.noise().len());
        if let Some(outside) = reads.iter().find(|&&i| i >= all) {
            return error("reads", format!("{outside} is outside state and noise, which have {all} components"));
        }
        if let Some(k) = (1..reads.len()).find(|&k| reads[..k].contains(&reads[k])) {
            return error("reads", format!("names component {} twice", reads[k]));
        }
        Ok(Self { kind, parameters, state_dimension: n, sensor })
    }

    /// The sensor's name, among [`KINDS`] unless it is the caller's own.
    pub fn kind(&self) -> &'static str {
        self.kind
    }

    /// The parameters, defaults filled in.
    pub fn parameters(&self) -> &Map<String, Value> {
        &self.parameters
    }

    /// Number n of components of the state that it was made for.
    pub fn state_dimension(&self) -> usize {
        self.state_dimension
    }

    /// The sensor.
    pub fn sensor(&self) -> &dyn Sensor {
        self.sensor.as_ref()
    }
}

/// Reads the parameters of a kind and makes its sensor.
pub(super) fn built<P, S>(
    map: Map<String, Value>,
    n: usize,
    make: impl Fn(P, usize) -> Result<S, ParameterError>,
) -> Result<Built, BuildError>
where
    P: DeserializeOwned + Serialize,
    S: Sensor + 'static,
{
    let parameters: P = serde_path_to_error::deserialize(Value::Object(map)).map_err(|e| {
        let path = e.path().to_string();
        let key = if path == "." { String::new() } else { path };
        BuildError { key, message: plain(&e.into_inner().to_string()) }
    })?;
    let echoed = match serde_json::to_value(&parameters) {
        Ok(Value::Object(map)) => map,
        // A parameter that is not finite has no JSON form; the constructor names it.
        _ => Map::new(),
    };
    let sensor = make(parameters, n)?;
    Ok((echoed, Arc::new(sensor)))
}
