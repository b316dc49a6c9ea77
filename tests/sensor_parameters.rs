//! Mistakes in the parameters of sensors: each is answered with the key at fault and what would be right.

use gaussworthy::sensor::{
    AttitudeVector, DipoleField, ExponentialDecay, KINDS, LineOffset, PhaseSine, Pinhole, Saturating, SensorSpec,
    StereoDisparity,
};
use serde_json::{Map, Value, json};

fn object(described: Value) -> Map<String, Value> {
    let Value::Object(map) = described else { panic!("{described} is no object") };
    map
}

/// What is said of this sensor on a state of `n`.
fn refused(described: Value, n: usize) -> String {
    let sensor = object(described.clone());
    SensorSpec::from_json(sensor, n).expect_err(&format!("{described} was let through")).to_string()
}

#[test]
fn mistakes_are_named() {
    let outside = "is outside the state, which has 2 components counted from 0";
    for (described, n, said) in [
        (json!({"kind": "dipole-field", "place": [0, 0, 0]}), 3, "`moment` is missing".into()),
        (
            json!({"kind": "dipole-field", "moment": [1, 2], "place": [0, 0, 0]}),
            3,
            "moment: has length 2; give a list of length 3".into(),
        ),
        (
            json!({"kind": "dipole-field", "moment": [1, 2, 3], "place": [0, 0, 0], "backgruond": [0, 0, 1]}),
            3,
            "backgruond: unknown key `backgruond`; did you mean `background`? allowed: moment, place, background, \
             position"
                .into(),
        ),
        (
            json!({"kind": "dipole-field", "moment": [1, 2, 3], "place": [0, 0, 0]}),
            2,
            format!("position[2]: 2 {outside}"),
        ),
        (json!({"kind": "pinhole"}), 3, "`focal_length` is missing".into()),
        (json!({"kind": "pinhole", "focal_length": 0}), 3, "focal_length: 0 is not a finite number above 0".into()),
        (
            json!({"kind": "pinhole", "focal_length": 800, "position": [0, 1, 0]}),
            3,
            "position: names component 0 twice".into(),
        ),
        (json!({"kind": "pinhole", "focal_length": 800}), 2, format!("position[2]: 2 {outside}")),
        (
            json!({"kind": "stereo-disparity", "focal_length": 800, "baseline": -0.5}),
            3,
            "baseline: -0.5 is not a finite number above 0".into(),
        ),
        (
            json!({"kind": "line-offset", "through": [[3, 4], [3, 4]]}),
            2,
            "through: its two points are 0 m apart; give two different points of the line".into(),
        ),
        (
            json!({"kind": "line-offset", "through": [[3, 4]]}),
            2,
            "through: has length 1; give a list of length 2".into(),
        ),
        (json!({"kind": "line-feature"}), 2, format!("line[0]: 2 {outside}")),
        (
            json!({"kind": "line-feature", "position": [0, 1], "line": [2, 1]}),
            4,
            "line[1]: names component 1, which is part of the position; give another".into(),
        ),
        (
            json!({"kind": "attitude-vector", "direction": [0, 0, 0]}),
            3,
            "direction: is zero, which points nowhere; give a vector".into(),
        ),
        (
            json!({"kind": "attitude-vector", "direction": [1, 0, 0], "attitude": [1, 1, 2]}),
            3,
            "attitude: names component 1 twice".into(),
        ),
        (
            json!({"kind": "exponential-decay", "amplitude": 1, "scale": -2}),
            1,
            "scale: -2 is not a finite number above 0".into(),
        ),
        (
            json!({"kind": "exponential-decay", "amplitude": 1, "scale": 2, "component": 2}),
            2,
            format!("component: 2 {outside}"),
        ),
        (json!({"kind": "saturating", "limit": 0}), 1, "limit: 0 is not a finite number above 0".into()),
        (
            json!({"kind": "phase-sine", "amplitude": 1, "frequency": "1 Hz"}),
            1,
            "frequency: is the text \"1 Hz\"; give a number".into(),
        ),
        (json!({"kind": "polar-to-cartesian", "bearing": 2}), 2, format!("bearing: 2 {outside}")),
        (
            json!({"kind": "polar-to-cartesian", "range": 1}),
            2,
            "bearing: names component 1, which is the range; give another".into(),
        ),
    ] {
        assert_eq!(refused(described.clone(), n), said, "{described}");
    }
}

/// No JSON holds such numbers, but callers of the library may.
#[test]
fn numbers_that_are_not_finite_are_named() {
    let (nan, inf) = (f64::NAN, f64::INFINITY);
    for (said, key) in [
        (DipoleField::new([nan, 0.0, 1.0], [0.0; 3], [0.0; 3], [0, 1, 2], 3).unwrap_err(), "moment[0]"),
        (DipoleField::new([1.0; 3], [0.0, inf, 0.0], [0.0; 3], [0, 1, 2], 3).unwrap_err(), "place[1]"),
        (DipoleField::new([1.0; 3], [0.0; 3], [0.0, 0.0, nan], [0, 1, 2], 3).unwrap_err(), "background[2]"),
        (Pinhole::new(nan, [0.0; 2], [0, 1, 2], 3).unwrap_err(), "focal_length"),
        (Pinhole::new(1.0, [0.0, nan], [0, 1, 2], 3).unwrap_err(), "centre[1]"),
        (StereoDisparity::new(1.0, inf, [0.0; 2], [0, 1, 2], 3).unwrap_err(), "baseline"),
        (LineOffset::new([[0.0, nan], [1.0, 1.0]], [0, 1], 2).unwrap_err(), "through[0][1]"),
        (LineOffset::new([[-1.7e308, 0.0], [1.7e308, 0.0]], [0, 1], 2).unwrap_err(), "through"),
        (AttitudeVector::new([nan, 0.0, 1.0], [0, 1, 2], 3).unwrap_err(), "direction[0]"),
        (ExponentialDecay::new(nan, 1.0, 0.0, 0, String::new(), 1).unwrap_err(), "amplitude"),
        (ExponentialDecay::new(1.0, nan, 0.0, 0, String::new(), 1).unwrap_err(), "scale"),
        (Saturating::new(1.0, inf, 0.0, 0, String::new(), 1).unwrap_err(), "gain"),
        (PhaseSine::new(1.0, 1.0, nan, 0.0, 0, String::new(), 1).unwrap_err(), "phase"),
    ] {
        assert_eq!(said.key, key, "{said}");
        assert!(said.message.contains("finite") || said.message.contains("inf m apart"), "{said}");
    }
}

/// A sensor that is written again with its defaults is the same sensor.
#[test]
fn what_is_left_out_is_written_again() {
    for kind in KINDS {
        let record: Value = serde_json::from_str(kind.example).unwrap();
        let (sensor, n) = (object(record["sensor"].clone()), record["prior"]["mean"].as_array().unwrap().len());
        let first = SensorSpec::from_json(sensor, n).unwrap();
        let mut again = first.parameters().clone();
        again.insert("kind".into(), first.kind().into());
        let second = SensorSpec::from_json(again, n).unwrap();
        assert_eq!(first.parameters(), second.parameters());
        assert_eq!(first.sensor().reads(), second.sensor().reads(), "{}", kind.name);
    }
}
