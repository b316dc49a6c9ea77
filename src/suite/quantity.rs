//! Quantities with units, such as `"1.5 km"`. A new dimension or unit is one line in the tables here.

use super::SuiteError;
use super::node::{Item, Node};

/// What a quantity measures.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Dimension {
    /// In metres.
    Length,
    /// In radians.
    Angle,
    /// A share of something else, 1 for the whole.
    Share,
}

/// Unit, what it measures, and its size in the base unit of that.
const UNITS: &[(&str, Dimension, f64)] = &[
    ("m", Dimension::Length, 1.0),
    ("km", Dimension::Length, 1e3),
    ("cm", Dimension::Length, 1e-2),
    ("mm", Dimension::Length, 1e-3),
    ("deg", Dimension::Angle, std::f64::consts::PI / 180.0),
    ("rad", Dimension::Angle, 1.0),
    ("mrad", Dimension::Angle, 1e-3),
    ("%", Dimension::Share, 1e-2),
];

impl Dimension {
    /// Its name with an article.
    pub(super) fn name(self) -> &'static str {
        match self {
            Self::Length => "a length",
            Self::Angle => "an angle",
            Self::Share => "a share",
        }
    }

    /// The units that measure it.
    pub(super) fn units(self) -> String {
        let units: Vec<_> = UNITS.iter().filter(|u| u.1 == self).map(|u| u.0).collect();
        units.join(", ")
    }
}

/// A number in the base unit of its dimension; a bare number has none.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Quantity {
    pub value: f64,
    pub dimension: Option<Dimension>,
}

impl Quantity {
    /// Reads `NUMBER UNIT`; the error is the message for the reader.
    fn parse(text: &str) -> Result<Self, String> {
        let all = || {
            [Dimension::Length, Dimension::Angle, Dimension::Share]
                .map(|d| format!("{} in {}", d.name(), d.units()))
                .join("; ")
        };
        let number = text.trim().trim_end_matches(|c: char| c.is_alphabetic() || matches!(c, '%' | '/'));
        let unit = &text.trim()[number.len()..];
        let value: f64 = match number.trim().parse() {
            Ok(value) if f64::is_finite(value) => value,
            _ => return Err(format!("\"{text}\" is not a quantity; give a number and a unit: {}", all())),
        };
        if unit.is_empty() {
            return Err(format!(
                "\"{text}\" is a text without a unit; give the bare number {value}, or: {}",
                all()
            ));
        }
        match UNITS.iter().find(|u| u.0 == unit) {
            Some(&(_, dimension, size)) if f64::is_finite(value * size) => {
                Ok(Self { value: value * size, dimension: Some(dimension) })
            }
            Some(_) => Err(format!("\"{text}\" is too large for a number")),
            None => Err(format!("there is no unit `{unit}` (\"{text}\"); give {}", all())),
        }
    }

    /// The quantity that stands at a node: a number, or a text with a unit.
    pub(super) fn of(node: &Node) -> Result<Self, SuiteError> {
        match &node.item {
            Item::Quantity(quantity) => Ok(*quantity),
            Item::Text(text) => Self::parse(text).map_err(|message| node.error(message)),
            _ => Ok(Self { value: node.number()?, dimension: None }),
        }
    }

    /// Value and base unit.
    pub(super) fn describe(self) -> String {
        match self.dimension {
            None => self.value.to_string(),
            Some(Dimension::Length) => format!("\"{} m\"", self.value),
            Some(Dimension::Angle) => format!("\"{} rad\"", self.value),
            Some(Dimension::Share) => format!("\"{} %\"", 100.0 * self.value),
        }
    }

    /// The item that holds it.
    pub(super) fn item(self) -> Item {
        match self.dimension {
            None => Item::Number(self.value),
            Some(_) => Item::Quantity(self),
        }
    }
}

/// What a key takes.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Wanted {
    /// A length; a bare number is metres.
    Length,
    /// An angle; its unit must be said, for degrees and radians are mistaken too easily.
    Angle,
    /// A length, an angle, or a bare number in a unit of the author's own.
    Any,
}

impl Wanted {
    /// The value at the node in base units.
    pub(super) fn read(self, node: &Node) -> Result<f64, SuiteError> {
        let quantity = Quantity::of(node)?;
        let fits = match self {
            Self::Length => matches!(quantity.dimension, None | Some(Dimension::Length)),
            Self::Angle => quantity.dimension == Some(Dimension::Angle),
            Self::Any => quantity.dimension != Some(Dimension::Share),
        };
        if fits { Ok(quantity.value) } else { Err(node.error(self.complaint(node, quantity))) }
    }

    /// As [`Wanted::read`], for a standard deviation.
    pub(super) fn read_sd(self, node: &Node) -> Result<f64, SuiteError> {
        let sd = self.read(node)?;
        checked_sd(node, sd)
    }

    fn complaint(self, node: &Node, quantity: Quantity) -> String {
        let given = node.describe();
        match (quantity.dimension, self) {
            (None, _) => format!("{given} has no unit; an angle needs one: \"{given} deg\" or \"{given} rad\""),
            (Some(is), Self::Any) => format!("{given} is {}; a number, a length or an angle is needed", is.name()),
            (Some(is), wanted) => {
                let needed = if wanted == Self::Length { Dimension::Length } else { Dimension::Angle };
                format!("{given} is {}; {} is needed: {}", is.name(), needed.name(), needed.units())
            }
        }
    }
}

/// The standard deviation, unless it is below zero.
pub(super) fn checked_sd(node: &Node, sd: f64) -> Result<f64, SuiteError> {
    if sd < 0.0 {
        return Err(node.error(format!("{} is below 0; a standard deviation is 0 or above", node.describe())));
    }
    Ok(sd)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn units_are_read() {
        // Exact to the last bit but for the degrees, whose factor is pi / 180.
        for (text, value, dimension) in [
            ("25 m", 25.0, Dimension::Length),
            ("1.5 km", 1500.0, Dimension::Length),
            ("-1e3 m", -1000.0, Dimension::Length),
            ("180 deg", std::f64::consts::PI, Dimension::Angle),
            ("0.01 rad", 0.01, Dimension::Angle),
            ("8 mrad", 0.008, Dimension::Angle),
            (" 20% ", 0.2, Dimension::Share),
        ] {
            assert_eq!(Quantity::parse(text), Ok(Quantity { value, dimension: Some(dimension) }), "{text}");
        }
    }

    #[test]
    fn what_is_no_quantity_is_refused() {
        for text in ["", "m", "nan m", "inf deg", "1e400 m", "1e307 km", "3", "3 furlong", "3 m m", "three m"] {
            let message = Quantity::parse(text).unwrap_err();
            assert!(!message.is_empty(), "{text} was let through");
        }
        assert!(Quantity::parse("3 furlong").unwrap_err().starts_with("there is no unit `furlong`"));
    }
}
