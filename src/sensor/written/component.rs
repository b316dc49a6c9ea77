use std::fmt;

use serde::de::value::MapAccessDeserializer;
use serde::de::{Error, MapAccess, Visitor};
use serde::{Deserialize, Deserializer, Serialize, Serializer};

/// A state component or a variable of the noise inside: its name, or `{ name, unit }`.
///
/// Formulas work with bare numbers, so the unit is the reader's (and the suite's, whose texts are read in it); what is
/// written back is the name alone.
#[derive(Debug, Clone)]
pub(super) struct Component {
    pub name: String,
    /// Empty for none.
    pub unit: String,
}

#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct Whole {
    name: String,
    #[serde(default)]
    unit: String,
}

impl Serialize for Component {
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        serializer.serialize_str(&self.name)
    }
}

impl<'de> Deserialize<'de> for Component {
    fn deserialize<D: Deserializer<'de>>(deserializer: D) -> Result<Self, D::Error> {
        deserializer.deserialize_any(Either)
    }
}

/// Takes a text or a table.
struct Either;

impl<'de> Visitor<'de> for Either {
    type Value = Component;

    fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str("a name, or { name, unit }")
    }

    fn visit_str<E: Error>(self, name: &str) -> Result<Component, E> {
        Ok(Component { name: name.into(), unit: String::new() })
    }

    fn visit_map<A: MapAccess<'de>>(self, map: A) -> Result<Component, A::Error> {
        let Whole { name, unit } = Whole::deserialize(MapAccessDeserializer::new(map))?;
        Ok(Component { name, unit })
    }
}
