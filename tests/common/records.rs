//! The check files of `tests/data/`: outside values of the moments of y = h(x) + v (see the README there).

use std::fs::File;
use std::io::BufReader;
use std::path::Path;

use gaussworthy::gaussian::{Gaussian, Moments};
use gaussworthy::sensor::SensorSpec;
use gaussworthy::suite::Case;
use nalgebra::{DMatrix, DVector};
use serde::Deserialize;
use serde::de::DeserializeOwned;
use serde_json::{Map, Value, json};

/// The records of `tests/data/{file}`.
#[track_caller]
pub fn load<T: DeserializeOwned>(file: &str) -> Vec<T> {
    #[derive(Deserialize)]
    struct Family<T> {
        records: Vec<T>,
    }
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/data").join(file);
    let opened = File::open(&path).unwrap_or_else(|e| panic!("{}: {e}", path.display()));
    let family: Family<T> =
        serde_json::from_reader(BufReader::new(opened)).unwrap_or_else(|e| panic!("{}: {e}", path.display()));
    assert!(!family.records.is_empty(), "{} has no record", path.display());
    family.records
}

/// Exact moments of one case, with the source of the values.
#[derive(Debug, Clone, Deserialize)]
pub struct Record {
    pub id: String,
    pub family: u32,
    pub inputs: Inputs,
    /// E[h(x)], in the chart at the circular mean direction where an output is angular.
    pub mu: Vec<f64>,
    /// Cov(h(x)), without measurement noise.
    #[serde(rename = "S")]
    pub s: Vec<Vec<f64>>,
    /// Cov(x, h(x)), n rows.
    #[serde(rename = "C")]
    pub c: Vec<Vec<f64>>,
    /// Numbers of this family only.
    pub extra: Map<String, Value>,
    /// Formula and publication, or how it was integrated.
    pub source: String,
    /// Significant digits, relative to sd_i sd_j (S) and sd(x_k) sd_i (C).
    pub digits_trusted: u32,
}

/// What a [`Record`] was computed for; the optional ones belong to some families only.
#[derive(Debug, Clone, Deserialize)]
pub struct Inputs {
    pub n: usize,
    pub p: usize,
    pub m: Vec<f64>,
    #[serde(rename = "P")]
    pub prior: Vec<Vec<f64>>,
    pub note: String,
    #[serde(rename = "A")]
    pub quadratic: Option<Vec<Vec<Vec<f64>>>>,
    #[serde(rename = "b")]
    pub linear: Option<Vec<Vec<f64>>>,
    #[serde(rename = "c")]
    pub constant: Option<Vec<f64>>,
    pub sensor: Option<Vec<f64>>,
    pub position_indices: Option<Vec<usize>>,
    #[serde(rename = "H")]
    pub rows: Option<Vec<Vec<f64>>>,
    #[serde(rename = "R")]
    pub noise: Option<Vec<Vec<f64>>>,
    pub y_observed: Option<Vec<f64>>,
}

impl Record {
    /// The moments that the case of this record must have, noise included; they speak of [`Record::outputs`].
    pub fn moments(&self) -> Moments {
        let noise = self.inputs.noise.as_ref().map_or(DMatrix::zeros(self.inputs.p, self.inputs.p), |r| matrix(r));
        Moments {
            mean: DVector::from_vec(self.mu.clone()),
            covariance: matrix(&self.s) + noise,
            cross_covariance: matrix(&self.c),
        }
    }

    /// Which outputs of the case's sensor the record speaks of: all, except that a range alone (family 3) is
    /// output 0 of range and bearing.
    pub fn outputs(&self) -> Vec<usize> {
        (0..self.inputs.p).collect()
    }

    /// A number of `extra`.
    #[track_caller]
    pub fn extra_number(&self, key: &str) -> f64 {
        self.extra.get(key).and_then(Value::as_f64).unwrap_or_else(|| panic!("{} has no number {key}", self.id))
    }
}

/// The case that a record asks about, or `None` where no sensor expresses it (a range in 1 or 3 dimensions).
#[track_caller]
pub fn case_of(record: &Record) -> Option<Case> {
    let inputs = &record.inputs;
    let position = inputs.position_indices.clone().unwrap_or(vec![0, 1]);
    let sensor = match record.family {
        2 => json!({"kind": "quadratic", "A": inputs.quadratic, "b": inputs.linear, "c": inputs.constant}),
        3 if inputs.n == 2 => json!({"kind": "range-bearing", "station": inputs.sensor}),
        4 => json!({"kind": "bearing-only", "station": inputs.sensor, "position": position}),
        6 => json!({"kind": "range-bearing", "station": inputs.sensor, "position": position}),
        9 => json!({"kind": "linear", "H": inputs.rows}),
        _ => return None,
    };
    let Value::Object(sensor) = sensor else { unreachable!("json! of braces is an object") };
    let sensor = SensorSpec::from_json(sensor, inputs.n).unwrap_or_else(|e| panic!("{}: {e}", record.id));
    let prior = Gaussian::new(DVector::from_vec(inputs.m.clone()), matrix(&inputs.prior))
        .unwrap_or_else(|e| panic!("{}: {e}", record.id));
    let noise = inputs.noise.as_ref().map(|r| matrix(r));
    Some(Case::new(record.id.clone(), sensor, prior, noise).unwrap_or_else(|e| panic!("{}: {e}", record.id)))
}

/// The matrix with these rows.
#[track_caller]
pub fn matrix(rows: &[Vec<f64>]) -> DMatrix<f64> {
    let columns = rows.first().map_or(0, Vec::len);
    assert!(rows.iter().all(|r| r.len() == columns), "rows of different length");
    DMatrix::from_row_iterator(rows.len(), columns, rows.iter().flatten().copied())
}
