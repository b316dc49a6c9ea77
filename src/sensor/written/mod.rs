//! Sensors that are written out as formulas in a suite or a case record.

mod compile;
mod component;
mod functions;
mod program;

use std::collections::{BTreeMap, BTreeSet};

use serde::{Deserialize, Serialize};

use self::compile::{Compiler, Flaw, names_in};
use self::component::Component;
use self::functions::{CONSTANTS, FUNCTIONS, IF};
use self::program::{Program, Step};
use super::kinds::{Kind, built};
use super::parameter::read_components;
use super::{Formula, Number, Output, ParameterError};
use crate::lanes::Simd;
use crate::wording::proposal;

pub(super) const KIND: Kind = Kind {
    name: "formula",
    summary: "any sensor, written out as formulas",
    formula: "y_j = the formula of output j, of state components, noise inside, parameters and definitions. Operators by \
              rising strength: or; and; not; < <= > >= == !=; + -; * /; signs; ^. Functions: sqrt, sin, cos, tan, asin, acos, \
              atan, atan2, hypot, exp, ln, log10, sinh, cosh, tanh, abs, min, max, if(condition, a, b). Constants: pi, e. \
              Angles are radians",
    parameters: "state: n names; outputs: p of {name, formula, unit = \"\", angular = false}; parameters {name = number} = \
                 none; definitions {name = formula or condition} = none, in any order; noise: q names = none. In a suite a \
                 component of state or noise may be {name, unit}, and position and velocity name the components that are \
                 meant by a prior in range, bearing, speed and course",
    quantities: &[],
    source: "the author's own",
    example: r#"{"case":"echo","sensor":{"state":["x","y"],"parameters":{"sx":0,"sy":0},"noise":["haze"],"definitions":{"dx":"x - sx","dy":"y - sy","r":"hypot(dx, dy)"},"outputs":[{"name":"range","formula":"r * (1 + haze)","unit":"m"},{"name":"bearing","formula":"atan2(dy, dx)","angular":true}]},"prior":{"mean":[3000,1000],"covariance":[[2500,0],[0,40000]]},"noise":{"covariance":[[4,0],[0,2.7e-5]],"inside":{"covariance":0.0004}}}"#,
    build: |map, n| built(map, n, Written::from_parameters),
};

/// A sensor written out as formulas: y_j = f_j(x, v) of named state components x, named noise v inside, parameters and
/// definitions. A definition may be a condition. What no formula names is refused, but for state components, of which a
/// sensor may read a few.
///
/// Operators by rising strength: `or`; `and`; `not`; `< <= > >= == !=`; `+ -`; `* /`; signs; `^`. Functions: sqrt, sin, cos,
/// tan, asin, acos, atan, atan2, hypot, exp, ln, log10, sinh, cosh, tanh, abs, min, max, and if(condition, a, b). Constants:
/// pi, e. Angles are radians. Derivatives are exact (dual numbers); at the seam of an `if`, `min`, `max` they are those of the
/// side taken. Where a formula is undefined (ln of a negative number) its value is NaN, never a panic.
///
/// The formulas become one list of steps: what occurs twice is worked once, what depends on no input beforehand.
#[derive(Debug, Clone, PartialEq)]
pub struct Written {
    program: Program,
    /// State components read, then n + k for noise k.
    reads: Vec<usize>,
    noise: Vec<String>,
    outputs: Vec<Output>,
}

/// What a suite or a case record says of a [`Written`].
#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Parameters {
    state: Vec<Component>,
    #[serde(default, skip_serializing_if = "BTreeMap::is_empty")]
    parameters: BTreeMap<String, f64>,
    #[serde(default, skip_serializing_if = "Vec::is_empty")]
    noise: Vec<Component>,
    #[serde(default, skip_serializing_if = "BTreeMap::is_empty")]
    definitions: BTreeMap<String, String>,
    outputs: Vec<WrittenOutput>,
}

#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
struct WrittenOutput {
    name: String,
    formula: String,
    #[serde(default, skip_serializing_if = "String::is_empty")]
    unit: String,
    #[serde(default, skip_serializing_if = "std::ops::Not::not")]
    angular: bool,
}

impl Written {
    /// What a suite may call it; a sensor with `outputs` and no `kind` is one too.
    pub const KIND: &'static str = KIND.name;

    pub(super) fn from_parameters(p: Parameters, n: usize) -> Result<Self, ParameterError> {
        if p.state.len() != n {
            let message = format!("names {} components; the prior has {n}", p.state.len());
            return Err(ParameterError::new("state", message));
        }
        if p.outputs.is_empty() {
            return Err(ParameterError::new("outputs", "give at least one output with `name` and `formula`"));
        }
        let mut names = Names::default();
        let mut compiler = Compiler::default();
        for (key, list, first) in [("state", &p.state, 0), ("noise", &p.noise, n)] {
            for (k, Component { name, unit }) in list.iter().enumerate() {
                let key = format!("{key}[{k}]");
                check_unit(unit).map_err(|message| ParameterError::new(format!("{key}.unit"), message))?;
                names.take(name, key)?;
                let place = compiler.program.push(Step::Input(first + k));
                compiler.define(name, place);
            }
        }
        let mut used = Used::default();
        for (name, &value) in &p.parameters {
            let key = format!("parameters.{name}");
            names.take(name, key.clone())?;
            if !value.is_finite() {
                return Err(ParameterError::new(key, format!("{value} is not a finite number")));
            }
            let place = compiler.program.push(Step::Constant(value));
            compiler.define(name, place);
        }
        define(&p.definitions, &mut names, &mut compiler, &mut used)?;
        let mut results = Vec::with_capacity(p.outputs.len());
        let mut outputs: Vec<Output> = Vec::with_capacity(p.outputs.len());
        for (j, output) in p.outputs.into_iter().enumerate() {
            let flawed =
                |flaw: Flaw| ParameterError::new(format!("outputs[{j}].formula"), flaw.shown_in(&output.formula));
            used.0.extend(names_in(&output.formula).map_err(flawed)?);
            results.push(compiler.formula(&output.formula).map_err(flawed)?);
            outputs.push(checked_output(j, output, &outputs)?);
        }
        for name in p.parameters.keys() {
            used.check("parameter", name, format!("parameters.{name}"))?;
        }
        for name in p.definitions.keys() {
            used.check("definition", name, format!("definitions.{name}"))?;
        }
        for (k, variable) in p.noise.iter().enumerate() {
            used.check("noise variable", &variable.name, format!("noise[{k}]"))?;
        }
        let mut program = compiler.program;
        let mut reads = program.finish(&results);
        if reads.is_empty() {
            // A sensor needs an input.
            reads = read_components(n, |_| false);
        }
        Ok(Self { program, reads, noise: p.noise.into_iter().map(|v| v.name).collect(), outputs })
    }
}

/// Compiles the definitions, each after those that it needs, in whatever order they are written.
fn define(
    definitions: &BTreeMap<String, String>,
    names: &mut Names,
    compiler: &mut Compiler,
    used: &mut Used,
) -> Result<(), ParameterError> {
    let key = |name: &str| format!("definitions.{name}");
    let mut waiting = Vec::new();
    for (name, formula) in definitions {
        names.take(name, key(name))?;
        let needs = names_in(formula).map_err(|flaw| ParameterError::new(key(name), flaw.shown_in(formula)))?;
        used.0.extend(needs.iter().cloned());
        waiting.push((name, formula, needs));
    }
    while !waiting.is_empty() {
        let unknown: BTreeSet<String> = waiting.iter().map(|(name, _, _)| (*name).clone()).collect();
        let (ready, rest): (Vec<_>, Vec<_>) =
            waiting.into_iter().partition(|(_, _, needs)| needs.is_disjoint(&unknown));
        if let ([], [(name, _, _), ..]) = (ready.as_slice(), rest.as_slice()) {
            let circle = unknown.iter().map(|name| format!("`{name}`")).collect::<Vec<_>>().join(", ");
            let message =
                format!("goes round in a circle: {circle} need each other; define one without the others");
            return Err(ParameterError::new(key(name), message));
        }
        for (name, formula, _) in ready {
            compiler
                .definition(name, formula)
                .map_err(|flaw| ParameterError::new(key(name), flaw.shown_in(formula)))?;
        }
        waiting = rest;
    }
    Ok(())
}

fn checked_output(j: usize, output: WrittenOutput, before: &[Output]) -> Result<Output, ParameterError> {
    let WrittenOutput { name, unit, angular, .. } = output;
    let error = |key: &str, message: String| ParameterError::new(format!("outputs[{j}].{key}"), message);
    if name.trim().is_empty() || name.chars().any(char::is_control) {
        return Err(error("name", format!("{name:?} is no name; give printable characters")));
    }
    if before.iter().any(|known| known.name == name) {
        return Err(error("name", format!("an output `{name}` stands before it already; rename one")));
    }
    check_unit(&unit).map_err(|message| error("unit", message))?;
    match (angular, unit.as_str()) {
        (true, "" | "rad") => Ok(Output::angle(name)),
        (true, _) => Err(error("unit", format!("is \"{unit}\", but an angular output is in \"rad\""))),
        (false, _) => Ok(Output::plain(name, unit)),
    }
}

fn check_unit(unit: &str) -> Result<(), String> {
    match unit.chars().any(char::is_control) {
        true => Err(format!("{unit:?} is no unit; give printable characters")),
        false => Ok(()),
    }
}

/// Names that are taken, and by what.
#[derive(Debug, Default)]
struct Names(BTreeMap<String, String>);

impl Names {
    fn take(&mut self, name: &str, key: String) -> Result<(), ParameterError> {
        let mut characters = name.chars();
        let starts = characters.next().is_some_and(|c| c.is_ascii_alphabetic() || c == '_');
        if !starts || !characters.all(|c| c.is_ascii_alphanumeric() || c == '_') {
            let message = format!("{name:?} is no name; give a letter or `_`, then letters, digits and `_`");
            return Err(ParameterError::new(key, message));
        }
        let reserved = FUNCTIONS.iter().map(|f| f.name).chain(CONSTANTS.iter().map(|c| c.0));
        if reserved.chain([IF, "and", "or", "not"]).any(|known| known == name) {
            return Err(ParameterError::new(key, format!("`{name}` means something in every formula; rename it")));
        }
        match self.0.insert(name.into(), key.clone()) {
            Some(other) => {
                Err(ParameterError::new(key, format!("`{name}` is also the name of {other}; rename one")))
            }
            None => Ok(()),
        }
    }
}

/// Every name that a formula uses.
#[derive(Debug, Default)]
struct Used(BTreeSet<String>);

impl Used {
    /// What nobody uses was meant to be used: a parameter with a slip in its name, a noise that is forgotten.
    fn check(&self, what: &str, name: &str, key: String) -> Result<(), ParameterError> {
        if self.0.contains(name) {
            return Ok(());
        }
        let near = proposal(name, self.0.iter().map(String::as_str));
        Err(ParameterError::new(
            key,
            format!("the {what} `{name}` is named in no formula; {near}name it, or delete it"),
        ))
    }
}

impl Formula for Written {
    fn reads(&self) -> &[usize] {
        &self.reads
    }

    fn noise(&self) -> &[String] {
        &self.noise
    }

    fn outputs(&self) -> &[Output] {
        &self.outputs
    }

    #[inline(always)]
    fn evaluate<T: Number>(&self, x: &[T], y: &mut [T]) {
        self.program.run(x, y);
    }

    #[inline(always)]
    fn evaluate_block<S: Simd>(&self, length: usize, x: &[f64], y: &mut [f64]) {
        self.program.run_block::<S>(length, x, y);
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_catalogue_tells_every_function_and_constant() {
        let told: BTreeSet<&str> = KIND.formula.split(|c: char| !c.is_ascii_alphanumeric()).collect();
        for name in FUNCTIONS.iter().map(|f| f.name).chain(CONSTANTS.iter().map(|c| c.0)).chain([IF]) {
            assert!(told.contains(name), "{name}");
        }
    }
}
