//! Quantities with units, such as `"1.5 km"`, and what a key takes.

use super::SuiteError;
use super::node::{Item, Node};
use super::unit::{Dimension, UNITS};

/// A number in the base unit of its dimension; a bare number has none.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Quantity {
    pub value: f64,
    pub dimension: Option<Dimension>,
}

impl Quantity {
    /// Reads `NUMBER UNIT`; the error is the message for the reader.
    fn parse(text: &str) -> Result<Self, String> {
        let all = || Dimension::ALL.map(|d| format!("{} in {}", d.name(), d.units())).join("; ");
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
            Some(dimension) => dimension.write(self.value),
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
    /// A quantity of this dimension; a bare number is in its base unit, but an angle or an angular rate must say
    /// its unit.
    Of(Dimension),
    /// A quantity of any dimension but a share, or a bare number in a unit of the author's own.
    Any,
    /// A bare number, for the unit is none that is known here.
    Bare,
}

impl Wanted {
    /// What is measured in `unit`: a base unit, one that is not known here, or none (empty).
    pub(super) fn in_unit(unit: &str) -> Self {
        match Dimension::of_base(unit) {
            Some(dimension) => Self::Of(dimension),
            None if unit.is_empty() => Self::Any,
            None => Self::Bare,
        }
    }

    /// The value at the node in base units.
    pub(super) fn read(self, node: &Node) -> Result<f64, SuiteError> {
        if self == Self::Bare {
            return node.number();
        }
        let quantity = Quantity::of(node)?;
        let given = || node.describe();
        match (self, quantity.dimension) {
            (Self::Of(wanted), None) if wanted.needs_unit() => Err(node.error(format!(
                "{0} has no unit; {1} needs one: {2}",
                given(),
                wanted.name(),
                wanted.examples(&given())
            ))),
            (Self::Of(wanted), Some(is)) if is != wanted => Err(node.error(format!(
                "{} is {}; {} is needed: {}",
                given(),
                is.name(),
                wanted.name(),
                wanted.units()
            ))),
            (Self::Any, Some(Dimension::Share)) => Err(node.error(format!(
                "{} is a share; a number is needed, or a quantity such as \"3 m\" or \"3 deg\"",
                given()
            ))),
            _ => Ok(quantity.value),
        }
    }

    /// As [`Wanted::read`], for a standard deviation.
    pub(super) fn read_sd(self, node: &Node) -> Result<f64, SuiteError> {
        let sd = self.read(node)?;
        checked_sd(node, sd)
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
            ("250 ms", 0.25, Dimension::Time),
            ("3 us", 3e-6, Dimension::Time),
            ("5 ns", 5e-9, Dimension::Time),
            ("2 min", 120.0, Dimension::Time),
            ("0.5 h", 1800.0, Dimension::Time),
            ("18 km/h", 5.0, Dimension::Speed),
            ("0.9 kn", 0.463, Dimension::Speed),
            ("-4m/s", -4.0, Dimension::Speed),
            ("180 deg/s", std::f64::consts::PI, Dimension::AngularRate),
            ("0.1 rad/s", 0.1, Dimension::AngularRate),
            ("50 Hz", 50.0, Dimension::Frequency),
            ("9.4 GHz", 9.4e9, Dimension::Frequency),
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
