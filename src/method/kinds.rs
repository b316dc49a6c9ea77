use std::sync::Arc;

use serde::de::{DeserializeOwned, Error};
use serde::{Deserialize, Deserializer, Serialize};
use serde_json::{Map, Value};

use crate::wording::plain;

use super::{Method, cubature, gauss_hermite, taylor, unscented};

/// A method that a suite or the command line can name.
#[derive(Debug, Clone, Copy)]
pub struct Kind {
    /// Its name there.
    pub id: &'static str,
    /// Its published name.
    pub name: &'static str,
    /// Parameters with defaults.
    pub parameters: &'static str,
    /// Sensor and derivative evaluations as a function of the number a of read components.
    pub evaluations: &'static str,
    /// Where it is published.
    pub source: &'static str,
    pub(super) build: fn(Map<String, Value>) -> Result<Built, BuildError>,
}

/// The parameters that were written, in the order of their declaration, and the method.
pub(super) type Built = (Map<String, Value>, Arc<dyn Method>);

/// Every built-in method. A new one is one line here.
pub const KINDS: &[Kind] = &[
    Kind {
        id: "taylor-1",
        name: "first-order Taylor (extended Kalman filter)",
        parameters: "none",
        evaluations: "1 Jacobian",
        source: "Jazwinski 1970",
        build: |map| built(map, taylor::FirstOrderTaylor::from_parameters),
    },
    Kind {
        id: "taylor-2",
        name: "second-order Taylor",
        parameters: "none",
        evaluations: "1 Hessian set",
        source: "Athans, Wishner, Bertolini 1968",
        build: |map| built(map, taylor::SecondOrderTaylor::from_parameters),
    },
    Kind {
        id: "unscented",
        name: "unscented transform",
        parameters: "kappa = 3 - a",
        evaluations: "2a + 1",
        source: "Julier, Uhlmann, Durrant-Whyte 2000",
        build: |map| built(map, unscented::Unscented::from_parameters),
    },
    Kind {
        id: "unscented-scaled",
        name: "scaled unscented transform",
        parameters: "alpha = 1e-3, beta = 2, kappa = 0",
        evaluations: "2a + 1",
        source: "Wan, van der Merwe 2000; Julier 2002",
        build: |map| built(map, unscented::ScaledUnscented::from_parameters),
    },
    Kind {
        id: "cubature-3",
        name: "third-degree spherical-radial cubature",
        parameters: "none",
        evaluations: "2a, and 1 where an output is angular",
        source: "Arasaratnam, Haykin 2009",
        build: |map| built(map, cubature::ThirdDegreeCubature::from_parameters),
    },
    Kind {
        id: "gauss-hermite",
        name: "Gauss-Hermite product rule",
        parameters: "order = 3 (2 to 20), max_nodes = 100000",
        evaluations: "order^a, and 1 where an output is angular and the order even",
        source: "Ito, Xiong 2000; Golub, Welsch 1969",
        build: |map| built(map, gauss_hermite::GaussHermite::from_parameters),
    },
];

/// Why a method could not be made from what a suite or the command line says.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[error("{}{message}", prefix(.key))]
pub struct BuildError {
    /// The key at fault; empty for the method as a whole.
    pub key: String,
    /// What is wrong and what would be right.
    pub message: String,
}

impl BuildError {
    /// The key at fault and what to say about it.
    pub fn new(key: impl Into<String>, message: impl Into<String>) -> Self {
        Self { key: key.into(), message: message.into() }
    }
}

fn prefix(key: &str) -> String {
    if key.is_empty() { String::new() } else { format!("{key}: ") }
}

fn built<P, M>(map: Map<String, Value>, make: impl Fn(P) -> Result<M, BuildError>) -> Result<Built, BuildError>
where
    P: DeserializeOwned + Serialize,
    M: Method + 'static,
{
    let parameters: P = serde_path_to_error::deserialize(Value::Object(map)).map_err(|e| {
        let path = e.path().to_string();
        BuildError::new(if path == "." { String::new() } else { path }, plain(&e.into_inner().to_string()))
    })?;
    let written = match serde_json::to_value(&parameters) {
        Ok(Value::Object(map)) => map,
        // Every parameter came from JSON a moment ago.
        _ => Map::new(),
    };
    Ok((written, Arc::new(make(parameters)?)))
}

/// Reads a parameter that may be left out but not be null: a NaN of a suite arrives as null, and must not
/// pass for the default.
pub(super) fn given<'de, D: Deserializer<'de>>(from: D) -> Result<Option<f64>, D::Error> {
    f64::deserialize(from).map(Some)
}

/// As [`given`], for a count; 5.0 counts as 5.
pub(super) fn given_whole<'de, D: Deserializer<'de>>(from: D) -> Result<Option<usize>, D::Error> {
    let number = f64::deserialize(from)?;
    // Beyond 2^53 a number does not count any more.
    if number.fract() == 0.0 && (0.0..9_007_199_254_740_992.0).contains(&number) {
        Ok(Some(number as usize))
    } else {
        Err(D::Error::custom(format!("is {number}; a whole number is needed")))
    }
}

/// Checks that a parameter is a finite number.
pub(super) fn finite(key: &str, value: f64) -> Result<(), BuildError> {
    if value.is_finite() {
        Ok(())
    } else {
        Err(BuildError::new(key, format!("is {value}; a finite number is needed")))
    }
}
