//! A parsed TOML file in which every value knows its key and its line.

use std::rc::Rc;

use serde_json::{Map, Value};
use toml::Spanned;
use toml::de::{DeTable, DeValue};

use super::SuiteError;
use super::quantity::Quantity;
use crate::wording::unknown_key;

/// Where a value stands.
#[derive(Debug, Clone)]
pub(super) struct Place {
    /// Full path of its key; empty for the file.
    pub key: Rc<str>,
    /// Line of the key, from 1.
    pub line: usize,
    /// Byte in the file: the order in which things were written.
    pub offset: usize,
}

impl Place {
    pub(super) fn error(&self, message: impl Into<String>) -> SuiteError {
        SuiteError::at(self.line, &*self.key, message)
    }
}

/// A value and where it stands.
#[derive(Debug, Clone)]
pub(super) struct Node {
    pub place: Place,
    pub item: Item,
}

/// A value.
#[derive(Debug, Clone)]
pub(super) enum Item {
    Number(f64),
    Whole(i128),
    Flag(bool),
    Text(String),
    List(Vec<Node>),
    /// Name and value of every key, in the order written.
    Table(Vec<(String, Node)>),
    /// A swept or drawn value that carries a unit.
    Quantity(Quantity),
    /// Number of the sweep or draw that stands here.
    Varied(usize),
}

impl Node {
    /// Parses a TOML document.
    pub(super) fn parse(text: &str) -> Result<Self, SuiteError> {
        let lines = Lines::of(text);
        let root = DeTable::parse(text).map_err(|e| {
            let line = e.span().map_or(1, |span| lines.line(span.start));
            let mut message = format!("is not TOML: {}", e.message().replace('\n', "; "));
            if let Some(key) = e.span().filter(|_| e.message() == "duplicate key").and_then(|span| text.get(span)) {
                message.push_str(&format!(" `{key}`; delete one"));
            }
            SuiteError::at(line, "", message)
        })?;
        let place = Place { key: "".into(), line: 1, offset: 0 };
        let item = lines.table(root.get_ref(), &place)?;
        Ok(Self { place, item })
    }

    pub(super) fn error(&self, message: impl Into<String>) -> SuiteError {
        self.place.error(message)
    }

    /// The value as a reader would recognise it.
    pub(super) fn describe(&self) -> String {
        match &self.item {
            Item::Number(number) => number.to_string(),
            Item::Whole(number) => number.to_string(),
            Item::Flag(flag) => flag.to_string(),
            Item::Text(text) => format!("\"{text}\""),
            Item::List(list) => format!("a list of {}", list.len()),
            Item::Table(_) | Item::Varied(_) => "a table".into(),
            Item::Quantity(quantity) => quantity.describe(),
        }
    }

    /// The bare number here.
    pub(super) fn number(&self) -> Result<f64, SuiteError> {
        match self.item {
            Item::Number(number) => Ok(number),
            Item::Whole(number) => Ok(number as f64),
            _ => Err(self.error(format!("is {}; give a bare number", self.describe()))),
        }
    }

    /// The whole number here, `least` or above.
    pub(super) fn whole(&self, least: u64) -> Result<u64, SuiteError> {
        let number = if let Item::Whole(number) = self.item { u64::try_from(number).ok() } else { None };
        number
            .filter(|&number| number >= least)
            .ok_or_else(|| self.error(format!("is {}; give a whole number, {least} or above", self.describe())))
    }

    /// The text here.
    pub(super) fn text(&self) -> Result<&str, SuiteError> {
        match &self.item {
            Item::Text(text) => Ok(text),
            _ => Err(self.error(format!("is {}; give a text in quotes", self.describe()))),
        }
    }

    /// The entries of the list here.
    pub(super) fn list(&self) -> Result<&[Node], SuiteError> {
        match &self.item {
            Item::List(list) => Ok(list),
            _ => Err(self.error(format!("is {}; give a list [..]", self.describe()))),
        }
    }

    /// The entries of the table here, all among `allowed`.
    pub(super) fn table(&self, allowed: &[&str]) -> Result<&[(String, Node)], SuiteError> {
        let entries = self.entries()?;
        match entries.iter().find(|(name, _)| !allowed.contains(&name.as_str())) {
            Some((name, node)) => Err(node.error(unknown_key(name, allowed))),
            None => Ok(entries),
        }
    }

    /// The entries of the table here, whatever they are.
    pub(super) fn entries(&self) -> Result<&[(String, Node)], SuiteError> {
        match &self.item {
            Item::Table(entries) => Ok(entries),
            _ => Err(self.error(format!("is {}; give a table", self.describe()))),
        }
    }

    /// The value of a key of the table here.
    pub(super) fn get(&self, name: &str) -> Option<&Node> {
        match &self.item {
            Item::Table(entries) => entries.iter().find(|(key, _)| key == name).map(|(_, node)| node),
            _ => None,
        }
    }

    /// The value of a key that must be there; `right` says what it would be.
    pub(super) fn need(&self, name: &str, right: &str) -> Result<&Node, SuiteError> {
        self.get(name).ok_or_else(|| self.error(format!("`{name}` is missing; {right}")))
    }

    /// The deepest node on a path such as `stations[1][0]` below this one.
    pub(super) fn at(&self, path: &str) -> &Node {
        let mut node = self;
        for step in path.split(['.', '[']).filter(|step| !step.is_empty()) {
            let below = match (&node.item, step.strip_suffix(']')) {
                (Item::List(list), Some(index)) => index.parse().ok().and_then(|i: usize| list.get(i)),
                _ => node.get(step),
            };
            match below {
                Some(below) => node = below,
                None => break,
            }
        }
        node
    }

    /// The value as JSON; quantities must have been read before.
    pub(super) fn json(&self) -> Result<Value, SuiteError> {
        Ok(match &self.item {
            Item::Number(number) => Value::from(*number),
            Item::Whole(number) => match (u64::try_from(*number), i64::try_from(*number)) {
                (Ok(number), _) => Value::from(number),
                (_, Ok(number)) => Value::from(number),
                _ => Value::from(*number as f64),
            },
            Item::Flag(flag) => Value::from(*flag),
            Item::Text(text) => Value::from(text.as_str()),
            Item::List(list) => Value::Array(list.iter().map(Node::json).collect::<Result<_, _>>()?),
            Item::Table(_) => Value::Object(self.object()?),
            Item::Quantity(_) | Item::Varied(_) => {
                return Err(
                    self.error(format!("is {}; no unit is known here, give a bare number", self.describe()))
                );
            }
        })
    }

    /// The table here as a JSON object.
    pub(super) fn object(&self) -> Result<Map<String, Value>, SuiteError> {
        self.entries()?.iter().map(|(name, node)| Ok((name.clone(), node.json()?))).collect()
    }
}

/// Where the lines of a text begin.
struct Lines(Vec<usize>);

impl Lines {
    fn of(text: &str) -> Self {
        Self(std::iter::once(0).chain(text.match_indices('\n').map(|(i, _)| i + 1)).collect())
    }

    fn line(&self, offset: usize) -> usize {
        self.0.partition_point(|&start| start <= offset)
    }

    fn table(&self, table: &DeTable<'_>, parent: &Place) -> Result<Item, SuiteError> {
        let mut entries = Vec::with_capacity(table.len());
        for (name, value) in table {
            let dot = if parent.key.is_empty() { "" } else { "." };
            let key = format!("{}{dot}{}", parent.key, name.get_ref());
            let node = self.node(value, self.place(key, name.span().start))?;
            entries.push((name.get_ref().to_string(), node));
        }
        entries.sort_by_key(|(_, node)| node.place.offset);
        Ok(Item::Table(entries))
    }

    fn place(&self, key: String, offset: usize) -> Place {
        Place { key: key.into(), line: self.line(offset), offset }
    }

    fn node(&self, value: &Spanned<DeValue<'_>>, place: Place) -> Result<Node, SuiteError> {
        let item = match value.get_ref() {
            DeValue::String(text) => Item::Text(text.to_string()),
            DeValue::Boolean(flag) => Item::Flag(*flag),
            DeValue::Integer(whole) => match i128::from_str_radix(whole.as_str(), whole.radix()) {
                Ok(number) => Item::Whole(number),
                Err(_) => return Err(place.error(format!("{whole} is too large a whole number"))),
            },
            DeValue::Float(float) => match float.as_str().parse::<f64>() {
                Ok(number) if number.is_finite() => Item::Number(number),
                _ => return Err(place.error(format!("is {float}; give a finite number"))),
            },
            DeValue::Datetime(date) => {
                return Err(place.error(format!("is the date {date}; a suite has no use for dates")));
            }
            DeValue::Array(list) => {
                let entry = |(i, entry): (usize, &Spanned<DeValue<'_>>)| {
                    self.node(entry, self.place(format!("{}[{i}]", place.key), entry.span().start))
                };
                Item::List(list.iter().enumerate().map(entry).collect::<Result<_, _>>()?)
            }
            DeValue::Table(table) => self.table(table, &place)?,
        };
        Ok(Node { place, item })
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_value_knows_its_key_and_its_line() {
        let text = "b = 1\na = [1,\n 2.5]\n[[family]]\nname = \"x\"\n[family.prior]\nq.r = { from = 1 }\n";
        let root = Node::parse(text).unwrap();
        for (path, line) in [("b", 1), ("a", 2), ("a[1]", 3), ("family[0]", 4), ("family[0].prior.q.r.from", 7)] {
            let node = root.at(path);
            assert_eq!((&*node.place.key, node.place.line), (path, line));
        }
        let order: Vec<_> = root.entries().unwrap().iter().map(|(name, _)| name.as_str()).collect();
        assert_eq!(order, ["b", "a", "family"]);
        assert_eq!(&*root.at("a[7].x").place.key, "a");
    }

    #[test]
    fn numbers_are_read_as_toml_writes_them() {
        let root = Node::parse("a = 1_000.5\nb = +2\nc = 0xff\nd = -1e-3\ne = 18446744073709551615").unwrap();
        let number = |key: &str| root.get(key).unwrap().number().unwrap();
        assert_eq!([number("a"), number("b"), number("c"), number("d")], [1000.5, 2.0, 255.0, -1e-3]);
        assert_eq!(root.get("e").unwrap().whole(0), Ok(u64::MAX));
    }

    #[test]
    fn what_is_not_finite_or_not_toml_is_refused() {
        for (text, expected) in [
            ("a = 1\nb = nan", ":2: b: is nan; give a finite number"),
            ("b = [1, -inf]", ":1: b[1]: is -inf; give a finite number"),
            ("b = 1e999", ":1: b: is 1e999; give a finite number"),
            ("b = 2020-01-01", ":1: b: is the date 2020-01-01; a suite has no use for dates"),
            ("a = 1\n\na = 2", ":3: is not TOML: duplicate key `a`; delete one"),
            ("[s]\n\"a b\" = 1\n\"a b\" = 2", ":3: is not TOML: duplicate key `\"a b\"`; delete one"),
            ("[s]\nx = 1\n[s]\nx = 2", ":3: is not TOML: duplicate key `s`; delete one"),
        ] {
            assert_eq!(Node::parse(text).unwrap_err().to_string(), expected);
        }
    }
}
