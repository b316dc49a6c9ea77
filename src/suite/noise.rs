//! The `[noise]` section: `sd`, one for every output or one for all, or `covariance`; `inside`, the same of the noise
//! variables inside a sensor.

use nalgebra::DMatrix;

use super::node::{Item, Node};
use super::numbers::{covariance_error, matrix};
use super::quantity::{Quantity, Wanted, checked_sd};
use super::{Noise, SuiteError};
use crate::gaussian::checked_covariance;
use crate::sensor::{Output, Sensor};

/// The noise of the section.
pub(super) fn read(section: &Node, sensor: &dyn Sensor) -> Result<Noise, SuiteError> {
    section.table(&["sd", "covariance", "inside"])?;
    let outputs = sensor.outputs();
    let names = || outputs.iter().map(|o| o.name.as_str()).collect::<Vec<_>>().join(", ");
    let additive = match (section.get("sd"), section.get("covariance")) {
        (Some(sd), None) => {
            let entries =
                entries(sd, outputs.len(), || format!("the sensor has {} outputs: {}", outputs.len(), names()))?;
            Some(from_sd(&entries, outputs)?)
        }
        (None, Some(covariance)) => Some(from_covariance(covariance, outputs.len())?),
        (Some(_), Some(covariance)) => return Err(covariance.error("stands beside `sd`; give one of the two")),
        (None, None) => None,
    };
    let inside = section.get("inside").map(|inside| read_inside(inside, sensor.noise())).transpose()?;
    if additive.is_none() && inside.is_none() {
        return Err(section.error("says nothing; give `sd` or `covariance`, or leave the noise out"));
    }
    Ok(Noise { additive, inside })
}

/// The covariance (q x q) of the noise variables inside.
fn read_inside(section: &Node, names: &[String]) -> Result<DMatrix<f64>, SuiteError> {
    section.table(&["sd", "covariance"])?;
    let q = names.len();
    if q == 0 {
        return Err(section.error("stands here, but the sensor names no noise"));
    }
    match (section.get("sd"), section.get("covariance")) {
        (Some(sd), None) => {
            let entries = entries(sd, q, || format!("the sensor has {q} noise variables: {}", names.join(", ")))?;
            let mut covariance = DMatrix::zeros(q, q);
            for (k, node) in entries.into_iter().enumerate() {
                covariance[(k, k)] = inside_sd(node)?.powi(2);
            }
            Ok(covariance)
        }
        (None, Some(covariance)) => from_covariance(covariance, q),
        (Some(_), Some(covariance)) => Err(covariance.error("stands beside `sd`; give one of the two")),
        (None, None) => Err(section.error("says nothing; give `sd` or `covariance`")),
    }
}

/// A standard deviation in whatever unit the formula is meant in; a share is a number.
fn inside_sd(node: &Node) -> Result<f64, SuiteError> {
    checked_sd(node, Quantity::of(node)?.value)
}

/// One node for each of `count`, or one for all.
fn entries(node: &Node, count: usize, what: impl Fn() -> String) -> Result<Vec<&Node>, SuiteError> {
    match &node.item {
        Item::List(list) if list.len() == count => Ok(list.iter().collect()),
        Item::List(list) => Err(node.error(format!("has {} entries; {}", list.len(), what()))),
        _ => Ok(vec![node; count]),
    }
}

fn from_sd(nodes: &[&Node], outputs: &[Output]) -> Result<DMatrix<f64>, SuiteError> {
    let p = outputs.len();
    let mut r = DMatrix::zeros(p, p);
    for (j, (node, output)) in nodes.iter().zip(outputs).enumerate() {
        let sd = wanted(output).read_sd(node).map_err(|mut e| {
            e.message.push_str(&format!("; output {j} is the {}", output.name));
            e
        })?;
        r[(j, j)] = sd * sd;
    }
    Ok(r)
}

fn wanted(output: &Output) -> Wanted {
    match (output.angular, output.unit.as_ref()) {
        (true, _) | (_, "rad") => Wanted::Angle,
        (_, "m") => Wanted::Length,
        _ => Wanted::Any,
    }
}

fn from_covariance(node: &Node, p: usize) -> Result<DMatrix<f64>, SuiteError> {
    let r = match node.item {
        Item::List(_) => matrix(node)?,
        _ => DMatrix::from_diagonal_element(p, p, node.number()?),
    };
    checked_covariance(r, p).map_err(|e| covariance_error(node, &e))
}
