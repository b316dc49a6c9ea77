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
        let wanted = Wanted::in_unit(&output.unit);
        let sd = wanted.read_sd(node).map_err(|mut e| {
            let unit = if wanted == Wanted::Bare { format!(", in {}", output.unit) } else { String::new() };
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
            from_sd(root.get("sd").unwrap(), &outputs).map_err(|e| e.to_string())
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
                "[1, 1, \"1 deg/s\", 1, \"3 dB\", 1]",
                ":1: sd[4]: is \"3 dB\"; give a bare number; output 4 is the level, in dB",
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
