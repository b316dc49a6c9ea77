//! What a suite says of a sensor written out as formulas beside the formulas: the units of its components, and which of them
//! are position and velocity. A case record, whose numbers are bare, needs none of it.

use serde_json::{Map, Value};

use super::SuiteError;
use super::node::{Item, Node};
use super::quantity::{Owner, Wanted};
use crate::wording::proposal;

/// The keys of a suite's `[sensor]` that are not the formulas' own.
pub(super) const KEYS: [&str; 2] = ["position", "velocity"];

/// A state component, or a variable of the noise inside.
#[derive(Debug)]
pub(super) struct Component {
    pub name: String,
    /// Empty for none.
    unit: String,
}

/// State and noise of a sensor written out as formulas.
#[derive(Debug)]
pub(super) struct Outline {
    state: Vec<Component>,
    noise: Vec<Component>,
    /// `position` and `velocity` as lists of indices, as a built-in sensor has them.
    pub geometry: Map<String, Value>,
}

impl Outline {
    /// Reads the section of a sensor that was made already.
    pub(super) fn read(section: &Node) -> Result<Self, SuiteError> {
        let state = components(section.get("state"))?;
        let noise = components(section.get("noise"))?;
        let mut geometry = Map::new();
        for (key, unit) in KEYS.into_iter().zip(["m", "m/s"]) {
            if let Some(node) = section.get(key) {
                geometry.insert(key.into(), places(node, unit, &state)?.into());
            }
        }
        Ok(Self { state, noise, geometry })
    }

    /// The names of the state's components.
    pub(super) fn names(&self) -> impl Iterator<Item = &str> {
        self.state.iter().map(|component| component.name.as_str())
    }

    /// What a number at state component `i` measures.
    pub(super) fn wanted(&self, i: usize) -> Wanted<'_> {
        self.state.get(i).map_or(Wanted::Any, |component| component.wanted(Owner::State))
    }

    /// What a standard deviation of noise variable `k` measures.
    pub(super) fn wanted_inside(&self, k: usize) -> Wanted<'_> {
        self.noise.get(k).map_or(Wanted::Any, |component| component.wanted(Owner::Noise))
    }
}

impl Component {
    fn wanted<'a>(&'a self, owner: impl FnOnce(&'a str) -> Owner<'a>) -> Wanted<'a> {
        if self.unit.is_empty() { Wanted::Bare(owner(&self.name)) } else { Wanted::In(&self.unit) }
    }
}

/// Names, alone or as `{ name, unit }`.
fn components(list: Option<&Node>) -> Result<Vec<Component>, SuiteError> {
    let Some(list) = list else { return Ok(Vec::new()) };
    let text = |node: Option<&Node>| node.map_or(Ok(""), Node::text).map(String::from);
    list.list()?
        .iter()
        .map(|entry| match entry.item {
            Item::Table(_) => Ok(Component { name: text(entry.get("name"))?, unit: text(entry.get("unit"))? }),
            _ => Ok(Component { name: text(Some(entry))?, unit: String::new() }),
        })
        .collect()
}

/// The components that a list names or counts, two or three; what is measured there is in `unit`.
fn places(list: &Node, unit: &str, state: &[Component]) -> Result<Vec<usize>, SuiteError> {
    let all = || state.iter().map(|c| c.name.as_str()).collect::<Vec<_>>().join(", ");
    let entries = list.list()?;
    if !(2..=3).contains(&entries.len()) {
        return Err(list.error(format!(
            "has {} entries; give two or three components of {}",
            entries.len(),
            all()
        )));
    }
    let mut found: Vec<usize> = Vec::new();
    for entry in entries {
        let at = match &entry.item {
            Item::Text(name) => state.iter().position(|c| c.name == *name).ok_or_else(|| {
                let near = proposal(name, state.iter().map(|c| c.name.as_str()));
                entry.error(format!("the state has no component `{name}`; {near}give one of {}", all()))
            })?,
            Item::Whole(index) => usize::try_from(*index).ok().filter(|&i| i < state.len()).ok_or_else(|| {
                entry.error(format!("{index} is outside the state, whose components are 0 to {}", state.len() - 1))
            })?,
            _ => return Err(entry.error(format!("is {}; give one of {}", entry.describe(), all()))),
        };
        let component = &state[at];
        if found.contains(&at) {
            return Err(entry.error(format!("names the component `{}` twice", component.name)));
        }
        if !component.unit.is_empty() && component.unit != unit {
            return Err(entry.error(format!(
                "`{}` is in {}, but a {} is worked in {unit}; give the component `unit = \"{unit}\"`",
                component.name,
                component.unit,
                if unit == "m" { "position" } else { "velocity" }
            )));
        }
        found.push(at);
    }
    Ok(found)
}
