//! Values that run through a grid: `{ from, to, steps }`, with `scale = "log"`, or `{ list }`.

use super::SuiteError;
use super::node::{Item, Node, Place};
use super::quantity::Quantity;
use super::unit::Dimension;
use crate::wording::proposal;

/// The two ends between which a value is swept or drawn.
#[derive(Debug, Clone, Copy)]
pub(super) struct Bounds {
    from: f64,
    to: f64,
    dimension: Option<Dimension>,
    log: bool,
}

impl Bounds {
    /// Reads `from` and `to` of the table.
    pub(super) fn read(table: &Node, log: bool) -> Result<Self, SuiteError> {
        let right = "give `from` and `to`";
        let (from_node, to_node) = (table.need("from", right)?, table.need("to", right)?);
        let (from, to) = (Quantity::of(from_node)?, Quantity::of(to_node)?);
        if from.dimension != to.dimension {
            let name = |q: Quantity| q.dimension.map_or("a bare number", Dimension::name);
            return Err(to_node.error(format!(
                "{} is {}, but `from` is {}; give both alike",
                to_node.describe(),
                name(to),
                name(from)
            )));
        }
        if from.value > to.value {
            let on = match from.dimension {
                Some(Dimension::Angle) => ", or go on past the cut, as from \"170 deg\" to \"190 deg\"",
                _ => "",
            };
            let (from, to) = (from_node.describe(), to_node.describe());
            return Err(from_node.error(format!("{from} is above `to` = {to}; exchange the two{on}")));
        }
        if log && from.value <= 0.0 {
            return Err(from_node
                .error(format!("{} cannot stand on a log scale; give a bound above 0", from_node.describe())));
        }
        Ok(Self { from: from.value, to: to.value, dimension: from.dimension, log })
    }

    /// The value at the share `t` in [0, 1] of the way, both ends exact.
    pub(super) fn at(&self, t: f64) -> Item {
        let value = if t <= 0.0 {
            self.from
        } else if t >= 1.0 {
            self.to
        } else if self.log {
            self.from * (t * (self.to.ln() - self.from.ln())).exp()
        } else {
            // Not from + t (to - from): the difference of two huge bounds could overflow.
            (1.0 - t) * self.from + t * self.to
        };
        Quantity { value: value.clamp(self.from, self.to), dimension: self.dimension }.item()
    }
}

/// A value that runs through a grid.
#[derive(Debug, Clone)]
pub(super) enum Sweep {
    /// Equal steps from one bound to the other, linear or logarithmic.
    Spaced { bounds: Bounds, steps: u64, place: Place },
    /// Values written out.
    Listed(Vec<Node>),
}

impl Sweep {
    pub(super) fn read(table: &Node) -> Result<Self, SuiteError> {
        if table.get("list").is_some() {
            table.table(&["list"])?;
            return Self::listed(table.at("list"));
        }
        table.table(&["from", "to", "steps", "scale", "list", "draw"])?;
        let log = match table.get("scale") {
            None => false,
            Some(scale) => match scale.text()? {
                "linear" => false,
                "log" => true,
                other => {
                    let near = proposal(other, ["linear", "log"]);
                    return Err(scale.error(format!("\"{other}\" is no scale; {near}give \"linear\" or \"log\"")));
                }
            },
        };
        let bounds = Bounds::read(table, log)?;
        let steps_node =
            table.need("steps", "say how many values the sweep has (or `draw = \"uniform\"` for a random one)")?;
        let steps = steps_node.whole(0)?;
        match steps {
            0 => Err(steps_node.error("the sweep is empty; give at least 2 steps")),
            1 if bounds.from < bounds.to => {
                Err(steps_node
                    .error("one step cannot reach from `from` to `to`; give at least 2, or the value alone"))
            }
            _ => Ok(Self::Spaced { bounds, steps, place: table.place.clone() }),
        }
    }

    fn listed(list: &Node) -> Result<Self, SuiteError> {
        let values = list.list()?;
        if values.is_empty() {
            return Err(list.error("the sweep is empty; give at least one value"));
        }
        match values.iter().find(|value| matches!(value.item, Item::Table(_))) {
            Some(table) => Err(table.error("is a table; a list holds values, no further sweeps")),
            None => Ok(Self::Listed(values.to_vec())),
        }
    }

    /// How many values it has, at least 1.
    pub(super) fn len(&self) -> u64 {
        match self {
            Self::Spaced { steps, .. } => *steps,
            Self::Listed(values) => values.len() as u64,
        }
    }

    /// Value `i` of [`Sweep::len`].
    pub(super) fn value(&self, i: u64) -> Node {
        match self {
            Self::Spaced { bounds, steps, place } => {
                let t = if *steps > 1 { i as f64 / (steps - 1) as f64 } else { 0.0 };
                Node { place: place.clone(), item: bounds.at(t) }
            }
            Self::Listed(values) => values[i as usize].clone(),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn sweep(text: &str) -> Result<Vec<f64>, SuiteError> {
        let root = Node::parse(text).unwrap();
        let sweep = Sweep::read(root.get("x").unwrap())?;
        (0..sweep.len()).map(|i| Ok(Quantity::of(&sweep.value(i))?.value)).collect()
    }

    #[test]
    fn grids_keep_their_ends_and_their_spacing() {
        assert_eq!(sweep("x = { from = -1, to = 3, steps = 5 }").unwrap(), [-1.0, 0.0, 1.0, 2.0, 3.0]);
        assert_eq!(sweep("x = { from = 2, to = 2, steps = 1 }").unwrap(), [2.0]);
        assert_eq!(sweep("x = { list = [3, 1, 2] }").unwrap(), [3.0, 1.0, 2.0]);
        let log = sweep("x = { from = \"10 m\", to = \"1 km\", steps = 3, scale = \"log\" }").unwrap();
        assert_eq!((log[0], log[2]), (10.0, 1000.0));
        // exp of half a logarithm: a few units in the last place.
        const ROUNDING: f64 = 1e-14;
        assert!((log[1] / 100.0 - 1.0).abs() < ROUNDING, "{log:?}");
    }

    #[test]
    fn sweeps_that_cannot_be_meant_are_refused() {
        for (text, expected) in [
            ("x = { from = 1, to = 2, steps = 0 }", ":1: x.steps: the sweep is empty; give at least 2 steps"),
            ("x = { list = [] }", ":1: x.list: the sweep is empty; give at least one value"),
            ("x = { from = 2, to = 1, steps = 3 }", ":1: x.from: 2 is above `to` = 1; exchange the two"),
            (
                "x = { from = 0, to = 1, steps = 3, scale = \"log\" }",
                ":1: x.from: 0 cannot stand on a log scale; give a bound above 0",
            ),
            (
                "x = { from = \"1 m\", to = 2, steps = 3 }",
                ":1: x.to: 2 is a bare number, but `from` is a length; give both alike",
            ),
            ("x = { from = 1, to = 2, steps = 2.5 }", ":1: x.steps: is 2.5; give a whole number, 0 or above"),
            ("x = { from = 1, to = 2, steps = -1 }", ":1: x.steps: is -1; give a whole number, 0 or above"),
            (
                "x = { list = [1, { from = 1 }] }",
                ":1: x.list[1]: is a table; a list holds values, no further sweeps",
            ),
        ] {
            assert_eq!(sweep(text).unwrap_err().to_string(), expected);
        }
    }
}
