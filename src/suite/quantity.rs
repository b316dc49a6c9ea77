//! Quantities with units, such as `"1.5 km"`, and what a key takes.

use super::SuiteError;
use super::node::{Item, Node};
use super::unit::{Dimension, UNITS, meant};

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
        let number = text.trim().trim_end_matches(|c: char| c.is_alphabetic() || matches!(c, '%' | '/' | '°'));
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
            None => Err(format!(
                "there is no unit `{unit}` (\"{text}\"); {}give {} (what is measured in another unit is a bare number in it)",
                meant(unit),
                all()
            )),
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
pub(super) enum Wanted<'a> {
    /// A quantity of this dimension; a bare number is in its base unit, but an angle or an angular rate must say
    /// its unit.
    Of(Dimension),
    /// What is measured in this unit of the author's choice, known here or not: a bare number is in it, and so is the value.
    In(&'a str),
    /// A quantity of any dimension but a share, or a bare number in a unit of the author's own.
    Any,
    /// A bare number, for its owner has no unit that a text could be in.
    Bare(Owner<'a>),
}

/// What could have a unit and has none, by its name in a sensor that is written out.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Owner<'a> {
    State(&'a str),
    Noise(&'a str),
    Output(&'a str),
}

impl Owner<'_> {
    /// What to say of a quantity that is given for it, in a unit like `unit`.
    fn refuses(self, given: &str, unit: &str) -> String {
        let (what, name, list) = match self {
            Self::State(name) => ("state component", name, "state"),
            Self::Noise(name) => ("noise variable", name, "noise"),
            Self::Output(name) => {
                return format!(
                    "{given} has a unit, but the output `{name}` has none; give a bare number, or the output its `unit`"
                );
            }
        };
        format!(
            "{given} has a unit, but the {what} `{name}` has none; give a bare number, or its unit in the sensor's `{list}`: \
             {{ name = \"{name}\", unit = \"{unit}\" }}"
        )
    }
}

impl<'a> Wanted<'a> {
    /// What is measured in `unit`: a base unit, another one, or none (empty).
    pub(super) fn in_unit(unit: &'a str) -> Self {
        match Dimension::of_base(unit) {
            Some(dimension) => Self::Of(dimension),
            None if unit.is_empty() => Self::Any,
            None => Self::In(unit),
        }
    }

    /// The value at the node in base units, or in the unit that was asked for.
    pub(super) fn read(self, node: &Node) -> Result<f64, SuiteError> {
        let given = || node.describe();
        match self {
            Self::In(unit) => read_in(unit, node),
            Self::Bare(owner) => {
                let quantity = Quantity::of(node)?;
                match (owner, quantity.dimension) {
                    // A share is a pure number, which is what noise without a unit is.
                    (_, None) | (Owner::Noise(_), Some(Dimension::Share)) => Ok(quantity.value),
                    (_, Some(is)) => Err(node.error(owner.refuses(&given(), is.base().unwrap_or("%")))),
                }
            }
            Self::Of(wanted) => {
                let quantity = Quantity::of(node)?;
                match quantity.dimension {
                    None if wanted.needs_unit() => Err(node.error(format!(
                        "{0} has no unit; {1} needs one: {2}",
                        given(),
                        wanted.name(),
                        wanted.examples(&given())
                    ))),
                    Some(is) if is != wanted => Err(unlike(node, is, wanted)),
                    _ => Ok(quantity.value),
                }
            }
            Self::Any => {
                let quantity = Quantity::of(node)?;
                match quantity.dimension {
                    Some(Dimension::Share) => Err(node.error(format!(
                        "{} is a share; a number is needed, or a quantity such as \"3 m\" or \"3 deg\"",
                        given()
                    ))),
                    _ => Ok(quantity.value),
                }
            }
        }
    }

    /// As [`Wanted::read`], for a standard deviation.
    pub(super) fn read_sd(self, node: &Node) -> Result<f64, SuiteError> {
        let sd = self.read(node)?;
        checked_sd(node, sd)
    }
}

/// The value in `unit` at a node: a bare number is in it, a quantity of the same dimension is converted. Of a unit that is not
/// known here only itself is understood.
fn read_in(unit: &str, node: &Node) -> Result<f64, SuiteError> {
    if let Item::Text(text) = &node.item {
        // As it is written, without a factor that rounds.
        let own = text.trim().strip_suffix(unit).and_then(|number| number.trim().parse().ok());
        if let Some(value) = own.filter(|value: &f64| value.is_finite()) {
            return Ok(value);
        }
    }
    let Some(&(_, dimension, size)) = UNITS.iter().find(|u| u.0 == unit) else {
        return match node.item {
            Item::Text(_) | Item::Quantity(_) => {
                let given = node.describe();
                Err(node.error(format!("is {given}; give a bare number, or a text in {unit}, as \"2 {unit}\"")))
            }
            _ => node.number(),
        };
    };
    let quantity = Quantity::of(node)?;
    match quantity.dimension {
        None => Ok(quantity.value),
        Some(is) if is == dimension => Ok(quantity.value / size),
        Some(is) => Err(unlike(node, is, dimension)),
    }
}

fn unlike(node: &Node, is: Dimension, wanted: Dimension) -> SuiteError {
    let given = node.describe();
    node.error(format!("{given} is {}; {} is needed: {}", is.name(), wanted.name(), wanted.units()))
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
