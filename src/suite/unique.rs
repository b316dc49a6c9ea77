//! JSON in which no key stands twice in one object: of two values the last would win in silence.

use std::cell::RefCell;
use std::fmt;

use serde::de::{DeserializeSeed, Deserializer, Error, MapAccess, SeqAccess, Visitor};
use serde_json::{Map, Value};

/// What is wrong with a line of JSON: the key at fault, if that is known, and the message.
pub(super) type Flaw = (String, String);

/// Reads one line of JSON.
pub(super) fn from_line(bytes: &[u8]) -> Result<Value, Flaw> {
    let twice = RefCell::new(Vec::new());
    let mut line = serde_json::Deserializer::from_slice(bytes);
    let read = Unique { twice: &twice }.deserialize(&mut line).and_then(|value| line.end().map(|()| value));
    read.map_err(|e| {
        let mut path = twice.take();
        path.reverse();
        if !path.is_empty() {
            return (path.concat().trim_start_matches('.').to_owned(), "the key stands twice; delete one".into());
        }
        // The parser knows this one line only; its column is of use, its line number is not.
        let (column, text) = (e.column(), e.to_string());
        let what = text.split(" at line ").next().unwrap_or(&text);
        (String::new(), format!("is not JSON: {what} (column {column})"))
    })
}

/// A value, and where a key stood twice: the steps to it, from the innermost one.
#[derive(Clone, Copy)]
struct Unique<'a> {
    twice: &'a RefCell<Vec<String>>,
}

impl Unique<'_> {
    /// Notes that the trouble below lies on the way through `step`, if a key that stands twice is the trouble.
    fn through(self, step: impl FnOnce() -> String) {
        let mut twice = self.twice.borrow_mut();
        if !twice.is_empty() {
            twice.push(step());
        }
    }
}

impl<'de> DeserializeSeed<'de> for Unique<'_> {
    type Value = Value;

    fn deserialize<D: Deserializer<'de>>(self, deserializer: D) -> Result<Value, D::Error> {
        deserializer.deserialize_any(self)
    }
}

impl<'de> Visitor<'de> for Unique<'_> {
    type Value = Value;

    fn expecting(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str("a JSON value")
    }

    fn visit_unit<E: Error>(self) -> Result<Value, E> {
        Ok(Value::Null)
    }

    fn visit_bool<E: Error>(self, flag: bool) -> Result<Value, E> {
        Ok(flag.into())
    }

    fn visit_u64<E: Error>(self, number: u64) -> Result<Value, E> {
        Ok(number.into())
    }

    fn visit_i64<E: Error>(self, number: i64) -> Result<Value, E> {
        Ok(number.into())
    }

    fn visit_f64<E: Error>(self, number: f64) -> Result<Value, E> {
        Ok(number.into())
    }

    fn visit_str<E: Error>(self, text: &str) -> Result<Value, E> {
        Ok(text.into())
    }

    fn visit_seq<A: SeqAccess<'de>>(self, mut entries: A) -> Result<Value, A::Error> {
        let mut list = Vec::new();
        loop {
            match entries.next_element_seed(self) {
                Ok(Some(entry)) => list.push(entry),
                Ok(None) => return Ok(list.into()),
                Err(e) => {
                    self.through(|| format!("[{}]", list.len()));
                    return Err(e);
                }
            }
        }
    }

    fn visit_map<A: MapAccess<'de>>(self, mut entries: A) -> Result<Value, A::Error> {
        let mut map = Map::new();
        while let Some(key) = entries.next_key::<String>()? {
            if map.contains_key(&key) {
                self.twice.borrow_mut().push(format!(".{key}"));
                return Err(Error::custom("a key stands twice"));
            }
            let value = entries.next_value_seed(self).inspect_err(|_| self.through(|| format!(".{key}")))?;
            map.insert(key, value);
        }
        Ok(map.into())
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_value_is_what_the_plain_reader_makes_of_it() {
        let text = r#"{"a":[1,-2,3.5e-300,0.1,18446744073709551615,true,null,"\u00e9"],"b":{"a":{},"c":[[],[[{"a":1}]]]}}"#;
        assert_eq!(from_line(text.as_bytes()), Ok(serde_json::from_str(text).unwrap()));
    }

    #[test]
    fn a_key_that_stands_twice_is_named_with_its_path() {
        for (text, key) in [
            (r#"{"a":1,"b":2,"a":1}"#, "a"),
            (r#"{"x":{"a":1},"prior":{"mean":[1],"a":{"b":1,"b":2}}}"#, "prior.a.b"),
            (r#"{"x":[{"a":1},{"a":1},{"k":1,"k":2}]}"#, "x[2].k"),
            (r#"[[{"a":1,"a":1}]]"#, "[0][0].a"),
            (r#"{"":1,"":1}"#, ""),
        ] {
            assert_eq!(
                from_line(text.as_bytes()),
                Err((key.into(), "the key stands twice; delete one".into())),
                "{text}"
            );
        }
        let deep = format!("{}1{}", "[".repeat(1000), "]".repeat(1000));
        assert!(from_line(deep.as_bytes()).unwrap_err().1.starts_with("is not JSON: recursion limit"));
        assert_eq!(from_line(b"{} 1").unwrap_err().1, "is not JSON: trailing characters (column 4)");
    }
}
