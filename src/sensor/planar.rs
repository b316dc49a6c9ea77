use super::{Number, ParameterError};

/// Where a planar position stands in a state when nothing is said: its first two components.
pub(super) fn default_position() -> [usize; 2] {
    [0, 1]
}

/// Checks that `position` names two different components of a state of `n`.
pub(super) fn checked_position(position: [usize; 2], n: usize) -> Result<(), ParameterError> {
    if let Some(k) = (0..2).find(|&k| position[k] >= n) {
        return Err(ParameterError::new(
            format!("position[{k}]"),
            format!("{} is outside the state, which has {n} components counted from 0", position[k]),
        ));
    }
    if position[0] == position[1] {
        return Err(ParameterError::new("position", format!("names component {} twice", position[0])));
    }
    Ok(())
}

/// Checks that the coordinates of a station are finite.
pub(super) fn checked_station(key: &str, station: [f64; 2]) -> Result<(), ParameterError> {
    match station.iter().position(|v| !v.is_finite()) {
        Some(k) => Err(ParameterError::new(format!("{key}[{k}]"), format!("{} is not a coordinate", station[k]))),
        None => Ok(()),
    }
}

/// The position seen from a station, (x - sx, y - sy).
#[inline(always)]
pub(super) fn seen_from<T: Number>(position: &[T], station: [f64; 2]) -> (T, T) {
    (position[0] - T::constant(station[0]), position[1] - T::constant(station[1]))
}
