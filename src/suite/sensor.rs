//! The `[sensor]` section: `kind` and parameters; lengths may carry units.

use super::SuiteError;
use super::node::{Item, Node};
use super::quantity::{Quantity, Wanted};
use crate::sensor::{KINDS, SensorSpec};

/// Makes the sensor of the section for a state of `n` components.
pub(super) fn read(section: &Node, n: usize) -> Result<SensorSpec, SuiteError> {
    let kind = section.get("kind").and_then(|kind| kind.text().ok());
    let quantities = KINDS.iter().find(|k| Some(k.name) == kind).map_or(&[][..], |k| k.quantities);
    let entries = section
        .entries()?
        .iter()
        .map(|(name, node)| {
            let is_length = quantities.iter().any(|(key, base)| key == name && *base == "m");
            let node = if is_length { in_metres(node)? } else { node.clone() };
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

fn in_metres(node: &Node) -> Result<Node, SuiteError> {
    let item = match &node.item {
        Item::List(list) => Item::List(list.iter().map(in_metres).collect::<Result<_, _>>()?),
        Item::Text(_) | Item::Quantity(_) => Quantity { value: Wanted::Length.read(node)?, dimension: None }.item(),
        other => other.clone(),
    };
    Ok(Node { place: node.place.clone(), item })
}
