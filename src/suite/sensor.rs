//! The `[sensor]` section: `kind` and parameters; those that are quantities may carry units.

use super::SuiteError;
use super::node::{Item, Node};
use super::outline::{self, Outline};
use super::quantity::{Quantity, Wanted};
use crate::sensor::{KINDS, SensorSpec, Written};

/// A sensor, and what a suite says of one written out as formulas beside them.
#[derive(Debug)]
pub(super) struct Described {
    pub spec: SensorSpec,
    pub outline: Option<Outline>,
}

/// Makes the sensor of the section for a state of `n` components.
pub(super) fn read(section: &Node, n: usize) -> Result<Described, SuiteError> {
    let kind = section.get("kind").and_then(|kind| kind.text().ok());
    let quantities = KINDS.iter().find(|k| Some(k.name) == kind).map_or(&[][..], |k| k.quantities);
    let written = match section.get("kind") {
        Some(_) => kind == Some(Written::KIND),
        None => ["outputs", "state", "definitions"].iter().any(|key| section.get(key).is_some()),
    };
    let entries = section
        .entries()?
        .iter()
        .filter(|(name, _)| !(written && outline::KEYS.contains(&name.as_str())))
        .map(|(name, node)| {
            let node = match quantities.iter().find(|(key, _)| key == name) {
                Some((_, unit)) => in_base_units(node, Wanted::in_unit(unit))?,
                None if written && name == "parameters" => parameters_of_formulas(node)?,
                None => node.clone(),
            };
            Ok((name.clone(), node))
        })
        .collect::<Result<_, SuiteError>>()?;
    let described = Node { place: section.place.clone(), item: Item::Table(entries) };
    let spec = SensorSpec::from_json(described.object()?, n).map_err(|e| {
        let at = section.at(&e.key);
        let missing_below = format!("{}.{}", section.place.key, e.key) != *at.place.key && !e.key.is_empty();
        // A parameter that is only there by default, or not at all, is named in the message.
        at.error(if missing_below { format!("`{}` {}", e.key, e.message) } else { e.message })
    })?;
    let outline = written.then(|| Outline::read(section)).transpose()?;
    Ok(Described { spec, outline })
}

/// The parameters of formulas, each in the base unit of whatever it is.
fn parameters_of_formulas(node: &Node) -> Result<Node, SuiteError> {
    let item = match &node.item {
        Item::Table(entries) => {
            let entries = entries.iter().map(|(name, node)| Ok((name.clone(), parameters_of_formulas(node)?)));
            Item::Table(entries.collect::<Result<_, SuiteError>>()?)
        }
        Item::Text(_) | Item::Quantity(_) => Quantity { value: Quantity::of(node)?.value, dimension: None }.item(),
        other => other.clone(),
    };
    Ok(Node { place: node.place.clone(), item })
}

/// The numbers at a node, alone or in lists, as bare numbers in the base unit of what is wanted. What is no number
/// at all is left for the sensor to refuse.
fn in_base_units(node: &Node, wanted: Wanted<'_>) -> Result<Node, SuiteError> {
    let item = match &node.item {
        Item::List(list) => {
            Item::List(list.iter().map(|entry| in_base_units(entry, wanted)).collect::<Result<_, _>>()?)
        }
        Item::Number(_) | Item::Whole(_) | Item::Text(_) | Item::Quantity(_) => {
            Quantity { value: wanted.read(node)?, dimension: None }.item()
        }
        other => other.clone(),
    };
    Ok(Node { place: node.place.clone(), item })
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::suite::unit::Dimension;

    #[test]
    fn the_units_of_every_kind_are_known() {
        for kind in KINDS {
            for (key, unit) in kind.quantities {
                assert!(Dimension::of_base(unit).is_some(), "{}: {key} is in {unit}, no base unit", kind.name);
            }
        }
    }

    #[test]
    fn quantities_come_in_the_base_unit_of_their_key() {
        let text = "a = [[\"2 km\", 3], \"40 cm\"]\nb = \"90 deg\"\nc = [\"250 ms\", 2]\nd = \"36 km/h\"\ne = \"5 kHz\"\n\
            f = \"2 rad/s\"\ng = 3\nh = true\n";
        let root = Node::parse(text).unwrap();
        let read = |key: &str, unit| in_base_units(root.get(key).unwrap(), Wanted::in_unit(unit));
        let json = |key: &str, unit| read(key, unit).unwrap().json().unwrap().to_string();
        assert_eq!(json("a", "m"), "[[2000.0,3.0],0.4]");
        assert_eq!(json("b", "rad"), std::f64::consts::FRAC_PI_2.to_string());
        assert_eq!(json("c", "s"), "[0.25,2.0]");
        assert_eq!(json("d", "m/s"), "10.0");
        assert_eq!(json("e", "Hz"), "5000.0");
        assert_eq!(json("f", "rad/s"), "2.0");
        assert_eq!((json("g", "dB"), json("g", "Hz"), json("h", "m")), ("3.0".into(), "3.0".into(), "true".into()));
        for (key, unit, said) in [
            ("a", "s", ":1: a[0][0]: \"2 km\" is a length; a time is needed: s, ms, us, ns, min, h"),
            ("b", "rad/s", ":2: b: \"90 deg\" is an angle; an angular rate is needed: deg/s, rad/s"),
            ("c", "m/s", ":3: c[0]: \"250 ms\" is a time; a speed is needed: m/s, km/h, kn"),
            ("d", "Hz", ":4: d: \"36 km/h\" is a speed; a frequency is needed: Hz, kHz, MHz, GHz"),
            ("e", "nT", ":5: e: is \"5 kHz\"; give a bare number, or a text in nT, as \"2 nT\""),
            ("g", "rad/s", ":7: g: 3 has no unit; an angular rate needs one: \"3 deg/s\" or \"3 rad/s\""),
        ] {
            assert_eq!(read(key, unit).unwrap_err().to_string(), said);
        }
    }
}
