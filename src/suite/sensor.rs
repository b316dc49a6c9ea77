//! The `[sensor]` section: `kind` and parameters; lengths and angles may carry units.

use super::SuiteError;
use super::node::{Item, Node};
use super::quantity::{Quantity, Wanted};
use crate::sensor::{KINDS, SensorSpec, Written};

/// Makes the sensor of the section for a state of `n` components.
pub(super) fn read(section: &Node, n: usize) -> Result<SensorSpec, SuiteError> {
    let kind = section.get("kind").and_then(|kind| kind.text().ok());
    let quantities = KINDS.iter().find(|k| Some(k.name) == kind).map_or(&[][..], |k| k.quantities);
    let written = kind == Some(Written::KIND) || section.get("outputs").is_some();
    let entries = section
        .entries()?
        .iter()
        .map(|(name, node)| {
            let node = match quantities.iter().find(|(key, _)| key == name) {
                Some(&(_, unit)) => in_base_unit(node, if unit == "rad" { Wanted::Angle } else { Wanted::Length })?,
                None if written && name == "parameters" => in_base_units(node)?,
                None => node.clone(),
            };
            Ok((name.clone(), node))
        })
        .collect::<Result<_, SuiteError>>()?;
    let described = Node { place: section.place.clone(), item: Item::Table(entries) };
    SensorSpec::from_json(described.object()?, n).map_err(|e| {
        let at = section.at(&e.key);
        let missing_below = format!("{}.{}", section.place.key, e.key) != *at.place.key && !e.key.is_empty();
        // A parameter that is only there by default, or not at all, is named in the message.
        at.error(if missing_below { format!("`{}` {}", e.key, e.message) } else { e.message })
    })
}

/// The parameters of formulas, each in the base unit of whatever it is.
fn in_base_units(node: &Node) -> Result<Node, SuiteError> {
    let item = match &node.item {
        Item::Table(entries) => {
            let entries = entries.iter().map(|(name, node)| Ok((name.clone(), in_base_units(node)?)));
            Item::Table(entries.collect::<Result<_, SuiteError>>()?)
        }
        Item::Text(_) | Item::Quantity(_) => Quantity { value: Quantity::of(node)?.value, dimension: None }.item(),
        other => other.clone(),
    };
    Ok(Node { place: node.place.clone(), item })
}

fn in_base_unit(node: &Node, wanted: Wanted) -> Result<Node, SuiteError> {
    let item = match &node.item {
        Item::List(list) => {
            Item::List(list.iter().map(|entry| in_base_unit(entry, wanted)).collect::<Result<_, _>>()?)
        }
        Item::Text(_) | Item::Quantity(_) => Quantity { value: wanted.read(node)?, dimension: None }.item(),
        other => other.clone(),
    };
    Ok(Node { place: node.place.clone(), item })
}
