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
            let Some((key, written)) = part.split_once('=') else {
                return Err(BuildError::new(
                    "",
                    format!("`{part}` in `{text}` is not of the form parameter=value"),
                ));
            };
            let (key, written) = (key.trim(), written.trim());
            let value = if key == ARITHMETIC { written.into() } else { value(key, written)? };
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

/// What is measured when nobody names methods: the usual seven, so that a survey stays quick.
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

/// Every kind with its defaults and with its examples of other parameters.
pub fn every_method() -> Vec<MethodSpec> {
    let labels = KINDS.iter().flat_map(|kind| std::iter::once(&kind.id).chain(kind.examples));
    labels.map(|label| MethodSpec::parse(label).expect("a test holds that every example names a method")).collect()
}

fn known_ids() -> String {
    KINDS.iter().map(|k| k.id).collect::<Vec<_>>().join(", ")
}

/// A number, or a word for the parameter that wants one.
fn value(key: &str, text: &str) -> Result<Value, BuildError> {
    if let Ok(whole) = text.parse::<i64>() {
        return Ok(whole.into());
    }
    match text.parse::<f64>().map(Number::from_f64) {
        Ok(Some(number)) => Ok(Value::Number(number)),
        Ok(None) => Err(BuildError::new(key, format!("is {text}; a finite number is needed"))),
        Err(_) if text.is_empty() => Err(BuildError::new(key, "is empty; a value is needed")),
        Err(_) => Ok(text.into()),
    }
}

/// The shortest text that reads back as the same value.
fn shortest(value: &Value) -> String {
    match (value.as_f64(), value) {
        (Some(number), _) => {
            let text = format!("{number:?}");
            text.strip_suffix(".0").unwrap_or(&text).to_string()
        }
        (None, Value::String(word)) => word.clone(),
        (None, other) => other.to_string(),
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
            (
                json!({"id": "bayesian-quadrature", "order": 4, "nodes": "gauss-hermite"}),
                "bayesian-quadrature:nodes=gauss-hermite:order=4",
            ),
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
    fn every_kind_is_read_with_its_defaults_and_its_examples() {
        let methods = every_method();
        for kind in KINDS {
            let labels =
                methods.iter().filter(|m| m.kind().is_some_and(|k| k.id == kind.id)).map(MethodSpec::label);
            let wanted: Vec<_> = std::iter::once(kind.id).chain(kind.examples.iter().copied()).collect();
            assert_eq!(labels.collect::<Vec<_>>(), wanted);
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
            ("unscented:kappa=", "kappa", "is empty; a value is needed".into()),
            ("unscented:kappa=one", "kappa", "is the text \"one\"; give a number".into()),
            (
                "bayesian-quadrature:nodes=cubature",
                "nodes",
                "is `cubature`; give `unscented` or `gauss-hermite`".into(),
            ),
            ("bayesian-quadrature:order=4", "order", "has no meaning for unscented nodes; leave it out".into()),
            ("bayesian-quadrature:length_scale=0", "length_scale", "is 0; a length scale is above zero".into()),
            ("bayesian-quadrature:amplitude=-1", "amplitude", "is -1; an amplitude is zero or above".into()),
            ("central-difference-1:step=0", "step", "is 0; a step is above zero, sqrt(3) for a Gaussian".into()),
            (
                "central-difference-2:step=0.9",
                "step",
                "is 0.9; the second order needs a step of 1 or above, sqrt(3) for a Gaussian".into(),
            ),
            ("simplex:w0=1", "w0", "is 1; the weight of the centre is 0 or above and below 1".into()),
            (
                "minimal-skew-simplex:w0=-0.1",
                "w0",
                "is -0.1; the weight of the centre is 0 or above and below 1".into(),
            ),
            ("conjugate-4:w0=1", "w0", "is 1; the weight of the centre is 0 or above and below 1".into()),
            ("sparse-gauss-hermite:level=5", "level", "is 5; give 2, 3 or 4".into()),
            ("stochastic-5:iterations=0", "iterations", "is 0; give 1 or more draws to average over".into()),
            ("monte-carlo:points=1", "points", "is 1; give 2 to 1000000".into()),
            ("monte-carlo:seed=-1", "seed", "is -1; a whole number is needed".into()),
            ("quasi-monte-carlo:points=100", "points", "is 100; give a power of two from 2 to 524288".into()),
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
