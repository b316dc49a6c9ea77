//! What a suite says beside its cases: seed, precision, cap, limits, methods.

use serde_json::Value;

use super::SuiteError;
use super::node::Node;
use crate::method::MethodSpec;
use crate::trust::{Claim, Limits};
use crate::wording::plain;

/// The whole number of a key, if it stands there.
pub(super) fn whole(root: &Node, key: &str, least: u64) -> Result<Option<u64>, SuiteError> {
    root.get(key).map(|node| node.whole(least)).transpose()
}

/// `precision`: the standardised standard error asked of every moment.
pub(super) fn precision(root: &Node) -> Result<Option<f64>, SuiteError> {
    let Some(node) = root.get("precision") else { return Ok(None) };
    let value = node.number()?;
    if value > 0.0 && value < 1.0 {
        return Ok(Some(value));
    }
    Err(node.error(format!("is {value}; give a standard error above 0 and below 1, as 1e-3")))
}

/// `[limits]`, the usual ones where nothing is said.
pub(super) fn limits(root: &Node) -> Result<Limits, SuiteError> {
    let Some(section) = root.get("limits") else { return Ok(Limits::default()) };
    let limits: Limits = serde_path_to_error::deserialize(Value::Object(section.object()?)).map_err(|e| {
        let at = section.at(&e.path().to_string());
        at.error(plain(&e.inner().to_string()))
    })?;
    limits.check().map_err(|(key, message)| section.at(key).error(message))?;
    Ok(limits)
}

/// `[envelope]`: what envelopes are asked to promise; `None` if none is asked for.
pub(super) fn envelope(root: &Node) -> Result<Option<Claim>, SuiteError> {
    let Some(section) = root.get("envelope") else { return Ok(None) };
    let claim: Claim = serde_path_to_error::deserialize(Value::Object(section.object()?)).map_err(|e| {
        let at = section.at(&e.path().to_string());
        at.error(plain(&e.inner().to_string()))
    })?;
    claim.check().map_err(|(key, message)| section.at(key).error(message))?;
    Ok(Some(claim))
}

/// `[[method]]` tables; `None` if there is none.
pub(super) fn methods(root: &Node) -> Result<Option<Vec<MethodSpec>>, SuiteError> {
    let Some(list) = root.get("method") else { return Ok(None) };
    let mut made: Vec<(MethodSpec, usize)> = Vec::new();
    for table in list.list().map_err(|e| SuiteError { message: format!("{}, as [[method]]", e.message), ..e })? {
        let spec = MethodSpec::from_json(table.object()?).map_err(|e| table.at(&e.key).error(e.message))?;
        if let Some((_, line)) = made.iter().find(|(other, _)| other.label() == spec.label()) {
            return Err(table.error(format!("`{}` stands on line {line} already; delete one", spec.label())));
        }
        made.push((spec, table.place.line));
    }
    Ok(Some(made.into_iter().map(|(spec, _)| spec).collect()))
}
