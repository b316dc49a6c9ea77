/// A parameter of a sensor that cannot be meant.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[error("{key}: {message}")]
pub struct ParameterError {
    /// Which parameter, as it is spelled in a suite; with an index where one entry is at fault.
    pub key: String,
    /// What is wrong and what would be right.
    pub message: String,
}

impl ParameterError {
    /// The parameter at fault and what to say about it.
    pub fn new(key: impl Into<String>, message: impl Into<String>) -> Self {
        Self { key: key.into(), message: message.into() }
    }
}

/// The components for which `read` holds; the first one if none does, for a sensor needs an input.
pub(super) fn read_components(n: usize, read: impl Fn(usize) -> bool) -> Vec<usize> {
    let reads: Vec<usize> = (0..n).filter(|&i| read(i)).collect();
    if reads.is_empty() { vec![0] } else { reads }
}

/// Checks length and finiteness of a list of numbers; none at all can only be for a state without components.
pub(super) fn checked_row(key: &str, row: &[f64], length: usize) -> Result<(), ParameterError> {
    if length == 0 {
        return Err(ParameterError::new(key, "a state needs at least one component"));
    }
    if row.len() != length {
        return Err(ParameterError::new(key, format!("has {} numbers; {length} are needed", row.len())));
    }
    match row.iter().position(|v| !v.is_finite()) {
        Some(i) => Err(ParameterError::new(format!("{key}[{i}]"), format!("{} is not a finite number", row[i]))),
        None => Ok(()),
    }
}

/// Checks that a parameter is a finite number.
pub(super) fn finite(key: &str, value: f64) -> Result<(), ParameterError> {
    if value.is_finite() {
        Ok(())
    } else {
        Err(ParameterError::new(key, format!("{value} is not a finite number")))
    }
}

/// Checks that a parameter is a finite number above 0.
pub(super) fn above_zero(key: &str, value: f64) -> Result<(), ParameterError> {
    if value.is_finite() && value > 0.0 {
        Ok(())
    } else {
        Err(ParameterError::new(key, format!("{value} is not a finite number above 0")))
    }
}

/// Checks that a component lies in a state of `n`.
pub(super) fn checked_component(key: &str, component: usize, n: usize) -> Result<(), ParameterError> {
    if component < n {
        return Ok(());
    }
    let message = format!("{component} is outside the state, which has {n} components counted from 0");
    Err(ParameterError::new(key, message))
}

/// Checks that components lie in a state of `n` and that none stands twice.
pub(super) fn checked_components(key: &str, components: &[usize], n: usize) -> Result<(), ParameterError> {
    for (k, &component) in components.iter().enumerate() {
        checked_component(&format!("{key}[{k}]"), component, n)?;
        if components[..k].contains(&component) {
            return Err(ParameterError::new(key, format!("names component {component} twice")));
        }
    }
    Ok(())
}

/// The number, if it is finite and above zero; `right` says what it should be.
pub(super) fn positive(key: &str, value: f64, right: &str) -> Result<f64, ParameterError> {
    if value > 0.0 && value.is_finite() {
        return Ok(value);
    }
    Err(ParameterError::new(key, format!("{value} is not above 0; give {right}")))
}

/// The parameter, if it was given; `right` says what it should be.
pub(super) fn given<T>(key: &str, value: Option<T>, right: &str) -> Result<T, ParameterError> {
    value.ok_or_else(|| ParameterError::new(key, format!("is missing; give {right}")))
}
