//! The `[noise]` section: `sd`, one for every output or one for all, or `covariance`; `inside`, the same of the noise
//! variables inside a sensor.

use nalgebra::DMatrix;

use super::node::{Item, Node};
use super::numbers::{covariance_error, matrix};
use super::outline::Outline;
use super::quantity::{Owner, Wanted};
use super::sensor::Described;
use super::{Noise, SuiteError};
use crate::gaussian::checked_covariance;
use crate::sensor::Output;

/// The noise of the section.
pub(super) fn read(section: &Node, described: &Described) -> Result<Noise, SuiteError> {
    section.table(&["sd", "covariance", "inside"])?;
    let (sensor, outline) = (described.spec.sensor(), described.outline.as_ref());
    let outputs = sensor.outputs();
    let names = || outputs.iter().map(|o| o.name.as_str()).collect::<Vec<_>>().join(", ");
    let additive = match (section.get("sd"), section.get("covariance")) {
        (Some(sd), None) => {
            let entries =
                entries(sd, outputs.len(), || format!("the sensor has {} outputs: {}", outputs.len(), names()))?;
            Some(from_sd(&entries, outputs, outline.is_some())?)
        }
        (None, Some(covariance)) => Some(from_covariance(covariance, outputs.len())?),
        (Some(_), Some(covariance)) => return Err(covariance.error("stands beside `sd`; give one of the two")),
        (None, None) => None,
    };
    let inside = section.get("inside").map(|inside| read_inside(inside, sensor.noise(), outline)).transpose()?;
    if additive.is_none() && inside.is_none() {
        return Err(section.error("says nothing; give `sd` or `covariance`, or leave the noise out"));
    }
    Ok(Noise { additive, inside })
}

/// The covariance (q x q) of the noise variables inside.
fn read_inside(section: &Node, names: &[String], outline: Option<&Outline>) -> Result<DMatrix<f64>, SuiteError> {
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
                let wanted = outline.map_or(Wanted::Any, |outline| outline.wanted_inside(k));
                covariance[(k, k)] = wanted.read_sd(node)?.powi(2);
            }
            Ok(covariance)
        }
        (None, Some(covariance)) => from_covariance(covariance, q),
        (Some(_), Some(covariance)) => Err(covariance.error("stands beside `sd`; give one of the two")),
        (None, None) => Err(section.error("says nothing; give `sd` or `covariance`")),
    }
}

/// One node for each of `count`, or one for all.
fn entries(node: &Node, count: usize, what: impl Fn() -> String) -> Result<Vec<&Node>, SuiteError> {
    match &node.item {
        Item::List(list) if list.len() == count => Ok(list.iter().collect()),
        Item::List(list) => Err(node.error(format!("has {} entries; {}", list.len(), what()))),
        _ => Ok(vec![node; count]),
    }
}

/// `written`: whether the outputs are those of formulas, which have no unit but what is said of them.
fn from_sd(nodes: &[&Node], outputs: &[Output], written: bool) -> Result<DMatrix<f64>, SuiteError> {
    let p = outputs.len();
    let mut r = DMatrix::zeros(p, p);
    for (j, (node, output)) in nodes.iter().zip(outputs).enumerate() {
        let wanted = match output.unit.as_ref() {
            "" if written => Wanted::Bare(Owner::Output(&output.name)),
            unit => Wanted::in_unit(unit),
        };
        let sd = wanted.read_sd(node).map_err(|mut e| {
            let unit = if let Wanted::In(unit) = wanted { format!(", in {unit}") } else { String::new() };
            e.message.push_str(&format!("; output {j} is the {}{unit}", output.name));
            e
        })?;
        r[(j, j)] = sd * sd;
    }
    Ok(r)
}

fn from_covariance(node: &Node, p: usize) -> Result<DMatrix<f64>, SuiteError> {
    let r = match node.item {
        Item::List(_) => matrix(node)?,
        _ => DMatrix::from_diagonal_element(p, p, node.number()?),
    };
    checked_covariance(r, p).map_err(|e| covariance_error(node, &e))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn noise_is_read_in_the_unit_of_its_output() {
        let outputs =
            [("time", "s"), ("drift", "m/s"), ("turn", "rad/s"), ("tone", "Hz"), ("level", "dB"), ("y", "")]
                .map(|(name, unit)| Output::plain(name, unit));
        let read = |sd: &str| {
            let root = Node::parse(&format!("sd = {sd}")).unwrap();
            let nodes = entries(root.get("sd").unwrap(), outputs.len(), String::new).unwrap();
            from_sd(&nodes, &outputs, false).map_err(|e| e.to_string())
        };
        let r = read("[\"250 ms\", \"7.2 km/h\", \"0.5 rad/s\", \"1 kHz\", 3, \"4 m\"]").unwrap();
        assert_eq!(r.diagonal().as_slice(), [0.0625, 4.0, 0.25, 1e6, 9.0, 16.0]);
        for (sd, said) in [
            (
                "[1, 1, 1, 1, 1, 1]",
                ":1: sd[2]: 1 has no unit; an angular rate needs one: \"1 deg/s\" or \"1 rad/s\"; output 2 is the turn",
            ),
            (
                "[\"1 m\", 1, \"1 deg/s\", 1, 1, 1]",
                ":1: sd[0]: \"1 m\" is a length; a time is needed: s, ms, us, ns, min, h; output 0 is the time",
            ),
            (
                "[1, 1, \"1 deg/s\", 1, \"3 lux\", 1]",
                ":1: sd[4]: is \"3 lux\"; give a bare number, or a text in dB, as \"2 dB\"; output 4 is the level, in dB",
            ),
            (
                "[1, 1, \"1 deg/s\", 1, -3, 1]",
                ":1: sd[4]: -3 is below 0; a standard deviation is 0 or above; output 4 is the level, in dB",
            ),
        ] {
            assert_eq!(read(sd).unwrap_err(), said);
        }
    }
}
