use std::sync::Arc;

use serde_json::{Map, Number, Value};

use crate::wording::{flaw, proposal};

use super::{BuildError, KINDS, Kind, Method, Refusal, Transform};
use crate::sensor::Arithmetic;

/// The key of the arithmetic, which every method has beside its own parameters.
const ARITHMETIC: &str = "arithmetic";
/// How single precision is written.
const SINGLE: &str = "f32";
/// What can be written.
const PRECISIONS: &str = "give \"f64\" (double precision, what is meant without it) or \"f32\" (single)";

/// A method and how it was written.
#[derive(Debug, Clone)]
pub struct MethodSpec {
    kind: Option<&'static Kind>,
    label: String,
    arithmetic: Arithmetic,
    method: Arc<dyn Method>,
}

impl MethodSpec {
    /// Makes the method that a JSON object describes: `id`, its parameters and, for every method, `arithmetic`: `"f32"` for
    /// single precision, `"f64"` (what is meant without it) for double.
    ///
    /// # Errors
    /// [`BuildError`] with the key at fault: no `id`, an unknown one, an unknown parameter, one of wrong type
    /// or value.
    pub fn from_json(mut described: Map<String, Value>) -> Result<Self, BuildError> {
        match described.shift_remove("id") {
            Some(Value::String(id)) => Self::build(&id, described),
            Some(other) => Err(BuildError::new("id", format!("is {other}; give one of {}", known_ids()))),
            None => Err(BuildError::new("id", format!("is missing; give one of {}", known_ids()))),
        }
    }

    /// Makes the method of a command line: `id:parameter=value:parameter=value`.
    ///
    /// # Errors
    /// As [`MethodSpec::from_json`], and if a parameter is not of this form or stands twice.
    ///
    /// ```
    /// use gaussworthy::method::MethodSpec;
    /// let method = MethodSpec::parse("unscented-scaled:beta=2:alpha=5e-1").unwrap();
    /// assert_eq!(method.label(), "unscented-scaled:alpha=0.5:beta=2");
    /// let error = MethodSpec::parse("gauss-hermite:order=21").unwrap_err();
    /// assert_eq!(error.to_string(), "order: is 21; give 2 to 20 points an axis");
    /// ```
    pub fn parse(text: &str) -> Result<Self, BuildError> {
        let mut parts = text.split(':').map(str::trim);
        let id = parts.next().unwrap_or_default();
        let mut parameters = Map::new();
        for part in parts {
            let Some((key, value)) = part.split_once('=') else {
                return Err(BuildError::new(
                    "",
                    format!("`{part}` in `{text}` is not of the form parameter=value"),
                ));
            };
            let (key, value) = (key.trim(), value.trim());
            let value = if key == ARITHMETIC { value.into() } else { number(key, value)? };
            if parameters.insert(key.to_string(), value).is_some() {
                return Err(BuildError::new(key, format!("stands twice in `{text}`")));
            }
        }
        Self::build(id, parameters)
    }

    fn build(id: &str, mut parameters: Map<String, Value>) -> Result<Self, BuildError> {
        let kind = KINDS.iter().find(|k| k.id == id).ok_or_else(|| {
            let near = proposal(id, KINDS.iter().map(|k| k.id));
            BuildError::new("id", format!("there is no method `{id}`; {near}give one of {}", known_ids()))
        })?;
        let arithmetic = match parameters.shift_remove(ARITHMETIC) {
            None => Arithmetic::Double,
            Some(Value::String(name)) if name == "f64" => Arithmetic::Double,
            Some(Value::String(name)) if name == SINGLE => Arithmetic::Single,
            Some(Value::String(name)) => {
                return Err(BuildError::new(ARITHMETIC, format!("is `{name}`; {PRECISIONS}")));
            }
            Some(other) => return Err(BuildError::new(ARITHMETIC, format!("is {other}; {PRECISIONS}"))),
        };
        let (written, method) = (kind.build)(parameters)?;
        let mut label = kind.id.to_string();
        for (key, value) in &written {
            label.push_str(&format!(":{key}={}", shortest(value)));
        }
        if arithmetic == Arithmetic::Single {
            label.push_str(&format!(":{ARITHMETIC}={SINGLE}"));
        }
        Ok(Self { kind: Some(kind), label, arithmetic, method })
    }

    /// A method of the caller's own, in double precision, under a label that names it in tables and files.
    ///
    /// # Errors
    /// [`BuildError`] if the label is that of a built-in method, or would break a table.
    pub fn own(label: &str, method: Arc<dyn Method>) -> Result<Self, BuildError> {
        check_own_label(label)?;
        Ok(Self { kind: None, label: label.into(), arithmetic: Arithmetic::Double, method })
    }

    /// The command-line form of what was written, in a fixed order and without what was left to its default;
    /// [`MethodSpec::parse`] makes the same method of it.
    pub fn label(&self) -> &str {
        &self.label
    }

    /// Its entry in [`KINDS`]; `None` for a method of the caller's own.
    pub fn kind(&self) -> Option<&'static Kind> {
        self.kind
    }

    /// The arithmetic that it runs in.
    pub fn arithmetic(&self) -> Arithmetic {
        self.arithmetic
    }

    /// Lays it out for `a` read components and `p` outputs, in its arithmetic.
    ///
    /// # Errors
    /// As [`Method::plan`].
    pub fn plan(&self, a: usize, p: usize) -> Result<Box<dyn Transform>, Refusal> {
        self.method.plan(a, p, self.arithmetic)
    }

    /// The method.
    pub fn method(&self) -> &dyn Method {
        self.method.as_ref()
    }
}

/// Whether a label that is not ours can stand beside ours in tables and files.
pub(crate) fn check_own_label(label: &str) -> Result<(), BuildError> {
    let id = label.split(':').next().unwrap_or_default();
    if KINDS.iter().any(|kind| kind.id == id) {
        return Err(BuildError::new("id", format!("`{id}` is a built-in method; give another label")));
    }
    flaw(label).map_or(Ok(()), |flaw| Err(BuildError::new("id", flaw)))
}

/// What is measured when nobody names methods: every kind with its defaults, and Gauss-Hermite of orders 3
/// and 5.
pub fn default_methods() -> Vec<MethodSpec> {
    let labels = [
        "taylor-1",
        "taylor-2",
        "unscented",
        "unscented-scaled",
        "cubature-3",
        "gauss-hermite:order=3",
        "gauss-hermite:order=5",
    ];
    labels.map(|label| MethodSpec::parse(label).expect("a built-in label names a built-in method")).to_vec()
}

fn known_ids() -> String {
    KINDS.iter().map(|k| k.id).collect::<Vec<_>>().join(", ")
}

fn number(key: &str, text: &str) -> Result<Value, BuildError> {
    if let Ok(whole) = text.parse::<i64>() {
        return Ok(whole.into());
    }
    match text.parse::<f64>().map(Number::from_f64) {
        Ok(Some(number)) => Ok(Value::Number(number)),
        Ok(None) => Err(BuildError::new(key, format!("is {text}; a finite number is needed"))),
        Err(_) => Err(BuildError::new(key, format!("is `{text}`; a number is needed"))),
    }
}

/// The shortest text that reads back as the same number.
fn shortest(value: &Value) -> String {
    match value.as_f64() {
        Some(number) => {
            let text = format!("{number:?}");
            text.strip_suffix(".0").unwrap_or(&text).to_string()
        }
        None => value.to_string(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use serde_json::json;

    fn from(described: Value) -> Result<MethodSpec, BuildError> {
        let Value::Object(map) = described else { panic!("write an object") };
        MethodSpec::from_json(map)
    }

    #[test]
    fn a_label_reads_back_as_the_same_method() {
        let described = [
            (json!({"id": "taylor-1"}), "taylor-1"),
            (json!({"id": "unscented", "kappa": 0}), "unscented:kappa=0"),
            (json!({"id": "unscented", "kappa": -0.1}), "unscented:kappa=-0.1"),
            (json!({"id": "unscented", "kappa": 1e300}), "unscented:kappa=1e300"),
            (json!({"id": "unscented", "kappa": 0.1 + 0.2}), "unscented:kappa=0.30000000000000004"),
            (json!({"beta": 0.0, "alpha": 1e-7, "id": "unscented-scaled"}), "unscented-scaled:alpha=1e-7:beta=0"),
            (json!({"id": "gauss-hermite"}), "gauss-hermite"),
            (json!({"id": "taylor-1", "arithmetic": "f64"}), "taylor-1"),
            (
                json!({"arithmetic": "f32", "id": "unscented-scaled", "alpha": 1}),
                "unscented-scaled:alpha=1:arithmetic=f32",
            ),
            (
                json!({"id": "gauss-hermite", "max_nodes": 5e5, "order": 7}),
                "gauss-hermite:order=7:max_nodes=500000",
            ),
        ];
        for (described, label) in described {
            let spec = from(described).unwrap();
            assert_eq!(spec.label(), label);
            let again = MethodSpec::parse(label).unwrap();
            assert_eq!(again.label(), label);
            assert_eq!(again.kind().unwrap().id, spec.kind().unwrap().id);
            assert_eq!(again.arithmetic(), spec.arithmetic());
            assert_eq!(format!("{:?}", again.method()), format!("{:?}", spec.method()));
        }
    }

    #[test]
    fn the_defaults_cover_every_kind() {
        let methods = default_methods();
        for kind in KINDS {
            assert!(methods.iter().any(|m| m.kind().is_some_and(|k| k.id == kind.id)), "{} is missing", kind.id);
        }
    }

    #[test]
    fn what_is_wrong_is_named() {
        let known = format!("give one of {}", KINDS.iter().map(|k| k.id).collect::<Vec<_>>().join(", "));
        let texts = [
            ("", "id", format!("there is no method ``; {known}")),
            ("ekf", "id", format!("there is no method `ekf`; {known}")),
            ("unscented:3", "", "`3` in `unscented:3` is not of the form parameter=value".into()),
            ("unscented:kappa=1:kappa=1", "kappa", "stands twice in `unscented:kappa=1:kappa=1`".into()),
            ("unscented:kappa=nan", "kappa", "is nan; a finite number is needed".into()),
            ("unscented:kappa=-inf", "kappa", "is -inf; a finite number is needed".into()),
            ("unscented:kappa=", "kappa", "is ``; a number is needed".into()),
            ("unscented:kapa=1", "kapa", "unknown key `kapa`; did you mean `kappa`? allowed: kappa".into()),
            ("unscented:id=1", "id", "unknown key `id`; allowed: kappa".into()),
            ("taylor-1:order=1", "order", "unknown key `order`; none is allowed here".into()),
            ("unscented-scaled:alpha=0", "alpha", "is 0; the spread of the points is above zero, 1e-3 to 1".into()),
            ("taylor-1:arithmetic=f16", "arithmetic", format!("is `f16`; {PRECISIONS}")),
            ("gauss-hermite:order=1", "order", "is 1; give 2 to 20 points an axis".into()),
            ("gauss-hermite:order=2.5", "order", "is 2.5; a whole number is needed".into()),
            ("gauss-hermite:order=-3", "order", "is -3; a whole number is needed".into()),
            (
                "gauss-hermite:max_nodes=2",
                "max_nodes",
                "is 2; give a cap from 3 (one axis of this order) to 10000000".into(),
            ),
        ];
        for (text, key, message) in texts {
            assert_eq!(MethodSpec::parse(text).unwrap_err(), BuildError::new(key, message), "{text}");
        }
        let objects = [
            (json!({"kappa": 1}), "id", format!("is missing; {known}")),
            (json!({"id": "taylor-1", "arithmetic": 32}), "arithmetic", format!("is 32; {PRECISIONS}")),
            (json!({"id": 3}), "id", format!("is 3; {known}")),
            // A NaN of a TOML file arrives as null: it must not pass for the default.
            (json!({"id": "unscented", "kappa": null}), "kappa", "is null; give a number".into()),
            (json!({"id": "unscented", "kappa": "1"}), "kappa", "is the text \"1\"; give a number".into()),
        ];
        for (object, key, message) in objects {
            assert_eq!(from(object.clone()).unwrap_err(), BuildError::new(key, message), "{object}");
        }
    }
}
