//! The `[noise]` section: `sd`, one for every output or one for all, or `covariance`.

use nalgebra::DMatrix;

use super::SuiteError;
use super::node::{Item, Node};
use super::numbers::{covariance_error, matrix};
use super::quantity::Wanted;
use crate::gaussian::checked_covariance;
use crate::sensor::{Output, Sensor};

/// R (p x p) of the section, for a sensor with p outputs.
pub(super) fn read(section: &Node, sensor: &dyn Sensor) -> Result<DMatrix<f64>, SuiteError> {
    section.table(&["sd", "covariance"])?;
    match (section.get("sd"), section.get("covariance")) {
        (Some(sd), None) => from_sd(sd, sensor.outputs()),
        (None, Some(covariance)) => from_covariance(covariance, sensor.outputs().len()),
        (Some(_), Some(covariance)) => Err(covariance.error("stands beside `sd`; give one of the two")),
        (None, None) => Err(section.error("says nothing; give `sd` or `covariance`, or leave the noise out")),
    }
}

fn from_sd(sd: &Node, outputs: &[Output]) -> Result<DMatrix<f64>, SuiteError> {
    let p = outputs.len();
    let names = || outputs.iter().map(|o| o.name.as_str()).collect::<Vec<_>>().join(", ");
    let nodes: Vec<&Node> = match &sd.item {
        Item::List(list) if list.len() == p => list.iter().collect(),
        Item::List(list) => {
            let entries = list.len();
            return Err(sd.error(format!("has {entries} entries; the sensor has {p} outputs: {}", names())));
        }
        _ => vec![sd; p],
    };
    let mut r = DMatrix::zeros(p, p);
    for (j, (node, output)) in nodes.into_iter().zip(outputs).enumerate() {
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
