use std::sync::Arc;

use serde_json::{Map, Value};

use super::Method;

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
    build: fn(Map<String, Value>) -> Result<Arc<dyn Method>, BuildError>,
}

/// Every built-in method. A new one is one line here.
pub const KINDS: &[Kind] = &[];

/// Why a method could not be made from what a suite or the command line says.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[error("{key}: {message}")]
pub struct BuildError {
    /// The key at fault; empty for the method as a whole.
    pub key: String,
    /// What is wrong and what would be right.
    pub message: String,
}

/// A method and how it was written.
#[derive(Debug, Clone)]
pub struct MethodSpec {
    label: String,
    method: Arc<dyn Method>,
}
