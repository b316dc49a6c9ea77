//! Where a sensor's parameters say that position and velocity stand in the state, and from where it looks.

use serde::de::DeserializeOwned;
use serde_json::{Map, Value};

use super::SuiteError;
use super::node::Node;
use super::outline::Outline;
use super::quantity::Wanted;
use super::unit::Dimension;
use crate::sensor::SensorSpec;

/// The parameters of a sensor, asked by their names: `position` and `velocity` are lists of components, `station` a
/// point, `stations` several.
#[derive(Debug, Clone, Copy)]
pub(super) struct Layout<'a> {
    /// The sensor's name, for messages.
    pub sensor: &'a str,
    pub parameters: &'a Map<String, Value>,
    /// What is said of a sensor written out as formulas beside them.
    pub outline: Option<&'a Outline>,
}

impl<'a> Layout<'a> {
    pub(super) fn of(spec: &'a SensorSpec, outline: Option<&'a Outline>) -> Self {
        let parameters = outline.map_or(spec.parameters(), |outline| &outline.geometry);
        Self { sensor: spec.kind(), parameters, outline }
    }

    /// The components of the position that the sensor reads, if it names them.
    pub(super) fn position(self) -> Option<Vec<usize>> {
        read(self.parameters.get("position"))
    }

    /// The components of the velocity that the sensor reads, if it names them.
    pub(super) fn velocity(self) -> Option<Vec<usize>> {
        read(self.parameters.get("velocity"))
    }

    /// The components of a position of `places` in a state of `n` where the sensor names none: the first ones. Formulas tell
    /// nothing of which component is what, so theirs must be named unless the position is all there is; `at` is what asks.
    pub(super) fn unnamed_position(self, places: usize, n: usize, at: &Node) -> Result<Vec<usize>, SuiteError> {
        match self.outline.filter(|_| n > places) {
            Some(outline) => Err(unnamed("position", ["x", "y", "z"], places, outline, at)),
            None => Ok(free(places, &[])),
        }
    }

    /// The components of a velocity of `speeds` where the sensor names none: the first that are not of the position; as for
    /// [`Layout::unnamed_position`].
    pub(super) fn unnamed_velocity(
        self,
        speeds: usize,
        position: &[usize],
        at: &Node,
    ) -> Result<Vec<usize>, SuiteError> {
        match self.outline {
            Some(outline) => Err(unnamed("velocity", ["vx", "vy", "vz"], speeds, outline, at)),
            None => Ok(free(speeds, position)),
        }
    }

    /// Its station, or the first of several.
    pub(super) fn station(self) -> Option<Vec<f64>> {
        let first = || self.parameters.get("stations")?.get(0);
        read(self.parameters.get("station").filter(|station| !station.is_null()).or_else(first))
    }

    /// What a number at component `i` measures.
    pub(super) fn wanted(self, i: usize) -> Wanted<'a> {
        let holds = |components: Option<Vec<usize>>| components.is_some_and(|c| c.contains(&i));
        if holds(self.position()) {
            Wanted::Of(Dimension::Length)
        } else if holds(self.velocity()) {
            Wanted::Of(Dimension::Speed)
        } else {
            self.outline.map_or(Wanted::Any, |outline| outline.wanted(i))
        }
    }
}

/// That nobody can know which components of formulas are the position or the velocity; `usual` are their usual names.
fn unnamed(key: &str, usual: [&str; 3], count: usize, outline: &Outline, at: &Node) -> SuiteError {
    let names: Vec<&str> = outline.names().collect();
    let usual = &usual[..count.min(3)];
    let example =
        if usual.iter().all(|name| names.contains(name)) { usual } else { &["..", "..", ".."][..usual.len()] };
    let example = example.iter().map(|name| format!("\"{name}\"")).collect::<Vec<_>>().join(", ");
    at.error(format!(
        "gives a {key}, but nothing says which components of the state {} it is; give `{key} = [{example}]` in [sensor]",
        names.join(", ")
    ))
}

fn read<T: DeserializeOwned>(value: Option<&Value>) -> Option<T> {
    serde_json::from_value(value?.clone()).ok()
}

/// The first `count` components of a state that are not `taken`.
pub(super) fn free(count: usize, taken: &[usize]) -> Vec<usize> {
    (0..).filter(|i| !taken.contains(i)).take(count).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn parameters_are_found_in_the_plane_and_in_space() {
        let ask = |parameters: Value| {
            let Value::Object(parameters) = parameters else { panic!("no object") };
            let layout = Layout { sensor: "invented", parameters: &parameters, outline: None };
            let wanted = if let Wanted::Of(dimension) = layout.wanted(4) { Some(dimension) } else { None };
            (layout.station(), layout.position(), layout.velocity(), wanted)
        };
        assert_eq!(
            ask(serde_json::json!({ "station": [1, 2.5], "position": [4, 2] })),
            (Some(vec![1.0, 2.5]), Some(vec![4, 2]), None, Some(Dimension::Length))
        );
        assert_eq!(
            ask(serde_json::json!({ "station": null, "stations": [[1, 2, 3], [4, 5, 6]], "velocity": [3, 4, 5] })),
            (Some(vec![1.0, 2.0, 3.0]), None, Some(vec![3, 4, 5]), Some(Dimension::Speed))
        );
        assert_eq!(ask(serde_json::json!({ "position": "here" })), (None, None, None, None));
    }

    #[test]
    fn free_components_skip_what_is_taken() {
        assert_eq!(free(2, &[0, 2]), [1, 3]);
        assert_eq!(free(3, &[2, 1, 0]), [3, 4, 5]);
        assert_eq!(free(0, &[]), [0; 0]);
    }
}
