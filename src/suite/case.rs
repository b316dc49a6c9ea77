use std::sync::Arc;

use nalgebra::{DMatrix, DVector};
use serde::{Deserialize, Serialize};
use serde_json::{Map, Value};

use crate::gaussian::{Gaussian, GaussianError, Marginal, checked_covariance};
use crate::sensor::{self, Sensor, SensorSpec, Written};

use super::Setting;
use crate::wording::{flaw, plain};

/// One question: one sensor with its parameters, one prior, one noise.
#[derive(Debug, Clone)]
pub struct Case {
    id: String,
    sensor: SensorSpec,
    prior: Gaussian,
    marginal: Marginal,
    noise: Noise,
    family: Arc<str>,
    settings: Vec<Setting>,
}

/// The noise of a case: what is added to the outputs, and what acts inside the sensor.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Noise {
    /// R (p x p) of y = h(x, v) + w; `None` for none.
    pub additive: Option<DMatrix<f64>>,
    /// Covariance (q x q) of the noise v inside, mean zero; `None` where the sensor has none.
    pub inside: Option<DMatrix<f64>>,
}

impl From<Option<DMatrix<f64>>> for Noise {
    /// Additive noise alone.
    fn from(additive: Option<DMatrix<f64>>) -> Self {
        Self { additive, inside: None }
    }
}

/// What is wrong with a case record, and where in it.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[error("{}{message}", if key.is_empty() { String::new() } else { format!("{key}: ") })]
pub struct CaseError {
    /// Path of the key at fault, such as `sensor.station[1]`; empty for the record as a whole.
    pub key: String,
    /// What is wrong and what would be right.
    pub message: String,
}

impl CaseError {
    /// The key at fault and what to say about it.
    pub fn new(key: impl Into<String>, message: impl Into<String>) -> Self {
        Self { key: key.into(), message: message.into() }
    }
}

/// What a case record holds, for messages.
const KEYS: &str = "`case`, `sensor`, `prior` and perhaps `noise`";

/// A case as it stands in a case record (one JSON object a line).
#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
struct Record {
    case: String,
    sensor: Map<String, Value>,
    prior: PriorRecord,
    #[serde(default, skip_serializing_if = "Option::is_none")]
    noise: Option<NoiseRecord>,
}

#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
struct PriorRecord {
    mean: Vec<f64>,
    covariance: Vec<Vec<f64>>,
}

#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
struct NoiseRecord {
    #[serde(default, skip_serializing_if = "Option::is_none")]
    covariance: Option<Value>,
    #[serde(default, skip_serializing_if = "Option::is_none")]
    inside: Option<InsideRecord>,
}

#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
struct InsideRecord {
    covariance: Value,
}

impl Case {
    /// A case from its parts.
    ///
    /// # Errors
    /// [`CaseError`] if the noise does not fit the sensor or is not a covariance, or the sensor was made for
    /// a state of another size than the prior's, or `id` is no name: 1 to 120 printable characters, no comma, no
    /// quotes, no blank at either end.
    pub fn new(
        id: impl Into<String>,
        sensor: SensorSpec,
        prior: Gaussian,
        noise: impl Into<Noise>,
    ) -> Result<Self, CaseError> {
        let id = id.into();
        if let Some(flaw) = flaw(&id) {
            return Err(CaseError::new("case", flaw));
        }
        let n = prior.dimension();
        if sensor.state_dimension() != n {
            let made_for = sensor.state_dimension();
            return Err(CaseError::new("sensor", format!("is made for {made_for} components; the prior has {n}")));
        }
        let Noise { additive, inside } = noise.into();
        let (p, variables) = (sensor.sensor().outputs().len(), sensor.sensor().noise());
        let checked = |key: &str, covariance: DMatrix<f64>, size| {
            checked_covariance(covariance, size).map_err(|e| CaseError::new(key, e.to_string()))
        };
        let additive = additive.map(|r| checked("noise.covariance", r, p)).transpose()?;
        let (inside, marginal) = match (inside, variables) {
            (None, []) => (None, Marginal::new(&prior, sensor.sensor().reads())),
            (Some(inside), [_, ..]) => {
                let inside = checked("noise.inside.covariance", inside, variables.len())?;
                let marginal = Marginal::with_noise(&prior, &inside, sensor.sensor().reads());
                (Some(inside), marginal)
            }
            (None, _) => {
                let names = variables.join(", ");
                return Err(CaseError::new(
                    "noise",
                    format!("`inside` is missing; the sensor has noise inside: {names}"),
                ));
            }
            (Some(_), []) => {
                return Err(CaseError::new("noise.inside", "stands here, but the sensor names no noise"));
            }
        };
        let noise = Noise { additive, inside };
        Ok(Self { id, sensor, prior, marginal, noise, family: "".into(), settings: Vec::new() })
    }

    /// The same case, as one of a family of a suite.
    pub(super) fn in_family(self, family: Arc<str>, settings: Vec<Setting>) -> Self {
        Self { family, settings, ..self }
    }

    /// The family of a suite that it comes from; empty for a case record.
    pub fn family(&self) -> &str {
        &self.family
    }

    /// The values that its family sweeps or draws, as they stand in this case; none for a case record.
    pub fn settings(&self) -> &[Setting] {
        &self.settings
    }

    /// Reads a case record: an object with `case`, `sensor`, `prior` and perhaps `noise`.
    ///
    /// # Errors
    /// [`CaseError`] with the key at fault.
    pub fn from_json(record: Value) -> Result<Self, CaseError> {
        // Serde would take a list for an object, its entries by position: not what the format says.
        if !record.is_object() {
            return Err(CaseError::new("", format!("give an object with {KEYS}")));
        }
        if record.get("prior").is_some_and(|prior| !prior.is_object()) {
            return Err(CaseError::new("prior", "give an object with `mean` and `covariance`"));
        }
        if record.get("noise").is_some_and(|noise| !noise.is_object() && !noise.is_null()) {
            return Err(CaseError::new("noise", "give an object with `covariance`, `inside` or both"));
        }
        let record: Record = serde_path_to_error::deserialize(record)
            .map_err(|e| CaseError::new(path(&e), plain(&e.inner().to_string())))?;
        let n = record.prior.mean.len();
        let covariance = matrix(&record.prior.covariance, "prior.covariance")?;
        let prior = Gaussian::new(DVector::from_vec(record.prior.mean), covariance).map_err(|e| {
            let key = if matches!(e, GaussianError::MeanNotFinite { .. } | GaussianError::Empty) {
                "prior.mean"
            } else {
                "prior.covariance"
            };
            CaseError::new(key, e.to_string())
        })?;
        let sensor = SensorSpec::from_json(record.sensor, n).map_err(sensor_error)?;
        let (p, q) = (sensor.sensor().outputs().len(), sensor.sensor().noise().len());
        if let Some(NoiseRecord { covariance: None, inside: None }) = record.noise {
            return Err(CaseError::new("noise", "`covariance` is missing"));
        }
        let NoiseRecord { covariance, inside } =
            record.noise.unwrap_or(NoiseRecord { covariance: None, inside: None });
        let noise = Noise {
            additive: covariance.map(|r| covariance_of(r, p, "noise.covariance")).transpose()?,
            inside: inside.map(|v| covariance_of(v.covariance, q, "noise.inside.covariance")).transpose()?,
        };
        Self::new(record.case, sensor, prior, noise)
    }

    /// The case record: everything needed to ask the same question again.
    pub fn to_json(&self) -> Value {
        let mut sensor = Map::new();
        // A sensor that is written out needs no name.
        if self.sensor.kind() != Written::KIND {
            sensor.insert("kind".into(), self.sensor.kind().into());
        }
        sensor.extend(self.sensor.parameters().clone());
        let record = Record {
            case: self.id.clone(),
            sensor,
            prior: PriorRecord {
                mean: self.prior.mean().iter().copied().collect(),
                covariance: rows(self.prior.covariance()),
            },
            noise: self.noise_record(),
        };
        serde_json::to_value(record).unwrap_or(Value::Null)
    }

    fn noise_record(&self) -> Option<NoiseRecord> {
        let Noise { additive, inside } = &self.noise;
        let written = |m: &DMatrix<f64>| serde_json::json!(rows(m));
        (additive.is_some() || inside.is_some()).then(|| NoiseRecord {
            covariance: additive.as_ref().map(written),
            inside: inside.as_ref().map(|v| InsideRecord { covariance: written(v) }),
        })
    }

    /// The case record without its name: what the answer depends on, as one line of text.
    pub fn question(&self) -> String {
        let mut record = self.to_json();
        if let Value::Object(fields) = &mut record {
            fields.shift_remove("case");
        }
        record.to_string()
    }

    /// Name of the case, unique in its suite.
    pub fn id(&self) -> &str {
        &self.id
    }

    /// How the sensor was written.
    pub fn spec(&self) -> &SensorSpec {
        &self.sensor
    }

    /// The sensor.
    pub fn sensor(&self) -> &dyn Sensor {
        self.sensor.sensor()
    }

    /// Prior of the whole state (n).
    pub fn prior(&self) -> &Gaussian {
        &self.prior
    }

    /// Law of the read components (a) of state and noise inside, and the way back to the whole state.
    pub fn marginal(&self) -> &Marginal {
        &self.marginal
    }

    /// R (p x p); `None` when there is no additive noise.
    pub fn noise(&self) -> Option<&DMatrix<f64>> {
        self.noise.additive.as_ref()
    }

    /// Covariance (q x q) of the noise inside the sensor; `None` where it has none.
    pub fn noise_inside(&self) -> Option<&DMatrix<f64>> {
        self.noise.inside.as_ref()
    }

    /// R (p x p), zero when there is none.
    pub fn noise_or_zero(&self) -> DMatrix<f64> {
        let p = self.sensor().outputs().len();
        self.noise.additive.clone().unwrap_or_else(|| DMatrix::zeros(p, p))
    }
}

fn sensor_error(e: sensor::BuildError) -> CaseError {
    let key = if e.key.is_empty() { "sensor".into() } else { format!("sensor.{}", e.key) };
    CaseError::new(key, e.message)
}

/// Path of the key at fault; the whole is called `.` by the deserialiser.
fn path<E>(e: &serde_path_to_error::Error<E>) -> String {
    let path = e.path().to_string();
    if path == "." { String::new() } else { path }
}

/// The rows of a matrix, as JSON writes them.
pub(crate) fn rows(m: &DMatrix<f64>) -> Vec<Vec<f64>> {
    m.row_iter().map(|r| r.iter().copied().collect()).collect()
}

/// A matrix from its rows, all of one length.
pub(crate) fn matrix(rows: &[Vec<f64>], key: &str) -> Result<DMatrix<f64>, CaseError> {
    let columns = rows.first().map_or(0, Vec::len);
    if let Some(i) = rows.iter().position(|r| r.len() != columns) {
        return Err(CaseError::new(
            format!("{key}[{i}]"),
            format!("has {} numbers, but the first row has {columns}", rows[i].len()),
        ));
    }
    Ok(DMatrix::from_row_iterator(rows.len(), columns, rows.iter().flatten().copied()))
}

/// A covariance from a matrix, or from a single number that stands for itself times the identity.
fn covariance_of(value: Value, size: usize, key: &str) -> Result<DMatrix<f64>, CaseError> {
    if let Some(variance) = value.as_f64() {
        return Ok(DMatrix::from_diagonal_element(size, size, variance));
    }
    if !value.is_array() {
        return Err(CaseError::new(key, format!("is {value}; give a {size} x {size} matrix or one number")));
    }
    let rows: Vec<Vec<f64>> = serde_path_to_error::deserialize(value)
        .map_err(|e| CaseError::new(format!("{key}{}", path(&e)), plain(&e.inner().to_string())))?;
    matrix(&rows, key)
}
