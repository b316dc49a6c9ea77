use std::sync::Arc;

use serde::de::{DeserializeOwned, Error};
use serde::{Deserialize, Deserializer, Serialize};
use serde_json::{Map, Value};

use crate::wording::plain;

use super::{
    Method, bayesian, central_differences, conjugate, cubature, fifth_degree, gauss_hermite, linearisation,
    monte_carlo, simplex, sparse_grid, stochastic, taylor, unscented,
};

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
    /// Other parameters that are worth a try, as a command line has them; the laws of the tests hold for these too.
    pub examples: &'static [&'static str],
    pub(super) build: fn(Map<String, Value>) -> Result<Built, BuildError>,
}

/// The parameters that were written, in the order of their declaration, and the method.
pub(super) type Built = (Map<String, Value>, Arc<dyn Method>);

/// Every built-in method. A new one is one line here.
///
/// A static, not a constant: what is constant is compiled again, with every formula in it, in each program that names it.
pub static KINDS: &[Kind] = &[
    taylor::FIRST,
    taylor::SECOND,
    central_differences::FIRST,
    central_differences::SECOND,
    linearisation::KIND,
    unscented::PLAIN,
    unscented::SCALED,
    simplex::SPHERICAL,
    simplex::MINIMAL_SKEW,
    conjugate::KIND,
    cubature::KIND,
    fifth_degree::CUBATURE,
    fifth_degree::FULLY_SYMMETRIC,
    gauss_hermite::KIND,
    sparse_grid::KIND,
    bayesian::KIND,
    stochastic::THIRD_DEGREE,
    stochastic::FIFTH_DEGREE,
    monte_carlo::PLAIN,
    monte_carlo::QUASI,
];

/// No parameter at all.
#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct NoParameters {}

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

/// Reads the parameters of a kind and makes its method.
pub(super) fn built<P, M>(
    map: Map<String, Value>,
    make: impl Fn(P) -> Result<M, BuildError>,
) -> Result<Built, BuildError>
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
