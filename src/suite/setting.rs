use std::sync::Arc;

use super::node::Node;
use super::quantity::Quantity;
use super::unit::Dimension;

/// One value of a case that its family sweeps or draws.
#[derive(Debug, Clone, PartialEq)]
pub struct Setting {
    /// Its key in the family, such as `prior.range`.
    pub key: Arc<str>,
    /// The value, in the unit.
    pub value: f64,
    /// Base unit, such as `m` or `rad`; empty for a bare number or a share.
    pub unit: &'static str,
    /// Whether it runs through a grid; else it is drawn.
    pub swept: bool,
}

impl Setting {
    /// What stands at a key, if it is a number: a list can also hold texts and lists.
    pub(super) fn of(key: &Arc<str>, value: &Node, swept: bool) -> Option<Self> {
        let Quantity { value, dimension } = Quantity::of(value).ok()?;
        let unit = dimension.and_then(Dimension::base_unit).unwrap_or_default();
        Some(Self { key: Arc::clone(key), value, unit, swept })
    }

    /// What the heading of a drawn value ends with.
    pub const DRAWN: &str = ", drawn";

    /// Key and unit, as a heading: `prior.range [m]`, or `prior.range [m], drawn`.
    pub fn heading(&self) -> String {
        let unit = if self.unit.is_empty() { String::new() } else { format!(" [{}]", self.unit) };
        format!("{}{unit}{}", self.key, if self.swept { "" } else { Self::DRAWN })
    }
}
