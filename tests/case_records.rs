//! Case records: what is read is what was written, and every mistake is answered with its key.

use gaussworthy::suite::Case;
use nalgebra::DMatrix;
use serde_json::{Value, json};

/// A record that is right in every part.
fn record() -> Value {
    json!({
        "case": "k-017",
        "sensor": {"kind": "range-bearing", "station": [0.5, -1.0], "position": [2, 0]},
        "prior": {"mean": [30.0, 10.0, -4.0], "covariance": [[9.0, 2.0, 0.1], [2.0, 4.0, 0.0], [0.1, 0.0, 1.0]]},
        "noise": {"covariance": [[0.01, 0.0], [0.0, 1e-4]]}
    })
}

#[track_caller]
fn read(record: &Value) -> Case {
    Case::from_json(record.clone()).unwrap_or_else(|e| panic!("{record} was refused: {e}"))
}

#[test]
fn a_record_comes_back_as_it_was() {
    let sensors = [
        json!({"kind": "range-bearing", "station": [0.5, -1.0], "position": [2, 0]}),
        json!({"kind": "bearing-only", "station": [0.1, 0.2], "position": [0, 1]}),
        json!({"kind": "bearing-only", "stations": [[0.1, 0.2], [3.0, 1e-300]], "position": [1, 2]}),
        json!({"kind": "range-only", "station": [0.1, 0.2, 1e-300], "position": [2, 0, 1]}),
        json!({"kind": "azimuth-elevation", "stations": [[0.1, 0.2, 0.3]], "position": [0, 1, 2]}),
        json!({"kind": "time-difference", "stations": [[0.1, 0.2], [3.0, 4.0]], "position": [0, 2], "wave_speed": 0.3}),
        json!({"kind": "received-strength", "station": [0.1, 0.2], "position": [0, 1], "strength": -40.0, "reference_distance": 0.1, "exponent": 2.4}),
        json!({"kind": "quadratic", "A": [[[1.0, 0.0, 0.3], [0.0, 0.0, 0.0], [0.0, 2.0, 0.1]]]}),
        json!({"kind": "quadratic", "A": [[[1.0, 0.0, 0.3], [0.0, 0.0, 0.0], [0.0, 2.0, 0.1]]], "b": [[1.0, 2.0, 3.0]], "c": [0.7]}),
        json!({"kind": "linear", "H": [[1.0, 0.0, 0.5]]}),
        json!({"kind": "linear", "H": [[1.0, 0.0, 0.5]], "offset": [0.1]}),
    ];
    for sensor in sensors {
        let mut written = record();
        written["sensor"] = sensor;
        written.as_object_mut().unwrap().remove("noise");
        let case = read(&written);
        assert_eq!(case.to_json(), written);
        assert_eq!(case.noise(), None);
        let outputs = case.sensor().outputs().len();
        written["noise"] = json!({"covariance": DMatrix::<f64>::identity(outputs, outputs).row_iter()
            .map(|r| r.iter().map(|v| 0.1 * v).collect::<Vec<_>>()).collect::<Vec<_>>()});
        assert_eq!(read(&written).to_json(), written);
    }
}

#[test]
fn what_may_be_left_out_is_filled_in() {
    let mut short = record();
    short["sensor"] = json!({"kind": "range-bearing", "station": [0, 0]});
    short["noise"] = json!({"covariance": 0.25});
    let case = read(&short);
    assert_eq!(case.sensor().reads(), [0, 1]);
    assert_eq!(case.noise(), Some(&DMatrix::from_diagonal_element(2, 2, 0.25)));
    let long = case.to_json();
    assert_eq!(long["sensor"]["position"], json!([0, 1]));
    assert_eq!(long["noise"]["covariance"], json!([[0.25, 0.0], [0.0, 0.25]]));
    assert_eq!(read(&long).to_json(), long);
}

/// The components of the position are as many as the coordinates of a station, those of the velocity follow them.
#[test]
fn default_components_follow_the_stations() {
    let described = |kind: &str, station: Value, position: Value| {
        let mut sensor = json!({"kind": kind, "station": station});
        if !position.is_null() {
            sensor["position"] = position;
        }
        let identity: Vec<Vec<f64>> =
            (0..6).map(|i| (0..6).map(|j| f64::from(u8::from(i == j))).collect()).collect();
        let prior = json!({"mean": [9, 8, 7, 6, 5, 4], "covariance": identity});
        let case = read(&json!({"case": "d", "sensor": sensor, "prior": prior}));
        let told = case.to_json()["sensor"].clone();
        (case.sensor().reads().to_vec(), told["position"].clone(), told["velocity"].clone())
    };
    let nothing = Value::Null;
    let (reads, position, _) = described("range-only", json!([0, 0, 0]), nothing.clone());
    assert_eq!((reads, position), (vec![0, 1, 2], json!([0, 1, 2])));
    let (reads, _, velocity) = described("range-doppler", json!([0, 0]), nothing.clone());
    assert_eq!((reads, velocity), (vec![0, 1, 2, 3], json!([2, 3])));
    let (reads, _, velocity) = described("range-doppler", json!([0, 0, 0]), nothing);
    assert_eq!((reads, velocity), (vec![0, 1, 2, 3, 4, 5], json!([3, 4, 5])));
    let (reads, _, velocity) = described("bearing-rate", json!([0, 0]), json!([2, 3]));
    assert_eq!((reads, velocity), (vec![2, 3, 4, 5], json!([4, 5])));
}

/// Puts `value` at the JSON pointer `path` of a good record, reads it and returns the key at fault and the
/// message. `null` in place of an object's entry removes it.
#[track_caller]
fn fault(path: &str, value: Value) -> (String, String) {
    let mut wrong = record();
    if path.is_empty() {
        wrong = value;
    } else {
        let (parent, name) = path.rsplit_once('/').unwrap();
        match wrong.pointer_mut(parent).unwrap() {
            Value::Object(map) if value.is_null() => drop(map.shift_remove(name).unwrap()),
            Value::Object(map) => drop(map.insert(name.into(), value)),
            Value::Array(list) => list[name.parse::<usize>().unwrap()] = value,
            _ => panic!("{path} is not in a record"),
        }
    }
    let e = Case::from_json(wrong.clone()).expect_err(&format!("{wrong} was let through"));
    (e.key, e.message)
}

#[test]
fn every_mistake_is_answered_with_its_key() {
    let sensor = |v: Value| ("/sensor", v);
    let table: Vec<((&str, Value), &str, &str)> = vec![
        // (where, what), key, part of the message
        (("", json!([1, 2])), "", "object"),
        (("", json!(["k", {"kind": "linear", "H": [[1]]}, [[0], [[1]]]])), "", "object"),
        (("", json!("k-017")), "", "object"),
        (("/prior", json!([[0], [[1]]])), "prior", "`mean` and `covariance`"),
        (("/noise", json!([[1]])), "noise", "`covariance`"),
        (("/noise", json!(0.1)), "noise", "`covariance`"),
        (("/case", json!(null)), "", "`case` is missing"),
        (("/sensor", json!(null)), "", "`sensor` is missing"),
        (("/prior", json!(null)), "", "`prior` is missing"),
        (("/colour", json!(1)), "colour", "unknown key `colour`"),
        (("/case", json!(17)), "case", "text in quotes"),
        (("/prior/mean", json!(null)), "prior", "`mean` is missing"),
        (("/prior/sd", json!([1])), "prior.sd", "unknown key `sd`"),
        (("/prior/mean/1", json!("ten")), "prior.mean[1]", "give a number"),
        (("/prior/mean", json!([])), "prior.mean", "at least one"),
        (("/prior/mean", json!([1.0, 2.0])), "prior.covariance", "3 x 3, but 2 x 2"),
        (("/prior/covariance/2", json!([0.1, 0.0])), "prior.covariance[2]", "2 numbers"),
        (("/prior/covariance/2/1", json!("x")), "prior.covariance[2][1]", "give a number"),
        (("/prior/covariance/2/1", json!(0.5)), "prior.covariance", "covariance[1][2] is 0"),
        (("/prior/covariance/1/1", json!(-4.0)), "prior.covariance", "negative"),
        (("/prior/covariance/1/1", json!(0.1)), "prior.covariance", "indefinite"),
        (("/noise/covariance", json!(null)), "noise", "`covariance` is missing"),
        (("/noise/sd", json!(0.1)), "noise.sd", "unknown key `sd`"),
        (("/noise/covariance", json!(-1.0)), "noise.covariance", "negative"),
        (("/noise/covariance", json!("0.1")), "noise.covariance", "2 x 2 matrix or one number"),
        (("/noise/covariance", json!([[0.01]])), "noise.covariance", "1 x 1, but 2 x 2"),
        (("/noise/covariance/1", json!([0.0])), "noise.covariance[1]", "1 numbers"),
        (("/noise/covariance/1/0", json!("x")), "noise.covariance[1][0]", "give a number"),
        (("/noise/covariance/1/0", json!(1.0)), "noise.covariance", "symmetric"),
        (sensor(json!(3)), "sensor", "give a table"),
        (sensor(json!({})), "sensor", "`kind` is missing"),
        (("/sensor/kind", json!(3)), "sensor.kind", "give one of"),
        (("/sensor/kind", json!("sonar")), "sensor.kind", "no sensor `sonar`"),
        (("/sensor/colour", json!(3)), "sensor.colour", "unknown key `colour`"),
        (("/sensor/station", json!(null)), "sensor.station", "is missing; give `station` [x, y] or"),
        (("/sensor/station", json!([1.0])), "sensor.station", "length"),
        (("/sensor/station/1", json!("y")), "sensor.station[1]", "give a number"),
        (("/sensor/position", json!([0, 3])), "sensor.position[1]", "3 components counted from 0"),
        (("/sensor/position", json!([1, 1])), "sensor.position", "twice"),
        (("/sensor/position/0", json!(-1)), "sensor.position[0]", "give a whole number"),
        (sensor(json!({"kind": "bearing-only"})), "sensor.station", "is missing"),
        (sensor(json!({"kind": "bearing-only", "stations": []})), "sensor.stations", "at least one"),
        (sensor(json!({"kind": "bearing-only", "stations": [[0, 0], [1]]})), "sensor.stations[1]", "length"),
        (
            sensor(json!({"kind": "bearing-only", "station": [0, 0], "stations": [[0, 0]]})),
            "sensor.stations",
            "one of the two",
        ),
        (sensor(json!({"kind": "range-only"})), "sensor.station", "give `station` [x, y(, z)] or"),
        (sensor(json!({"kind": "range-only", "station": [1]})), "sensor.station", "give a list of length 2 or 3"),
        (
            sensor(json!({"kind": "range-only", "stations": [[1, 2], [1, 2, 3]]})),
            "sensor.stations[1]",
            "the first station has 2",
        ),
        (
            sensor(json!({"kind": "range-only", "station": [1, 2, 3], "position": [0, 1]})),
            "sensor.position",
            "names 2 components; give 3",
        ),
        (
            sensor(json!({"kind": "range-only", "station": [1, 2], "velocity": [0, 1]})),
            "sensor.velocity",
            "unknown key `velocity`",
        ),
        (
            sensor(json!({"kind": "azimuth-elevation", "station": [1, 2]})),
            "sensor.station",
            "give a list of length 3",
        ),
        (
            sensor(json!({"kind": "range-azimuth-elevation", "stations": [[1, 2]]})),
            "sensor.stations[0]",
            "give a list of length 3",
        ),
        (
            sensor(json!({"kind": "bearing-rate", "station": [1, 2, 3]})),
            "sensor.station",
            "give a list of length 2",
        ),
        // The state has three components.
        (
            sensor(json!({"kind": "range-doppler", "station": [1, 2]})),
            "sensor.velocity[1]",
            "3 is outside the state",
        ),
        (
            sensor(json!({"kind": "range-doppler", "station": [1, 2], "position": [0, 2]})),
            "sensor.velocity",
            "is missing; give its 2 components",
        ),
        (
            sensor(json!({"kind": "range-doppler", "station": [1, 2], "velocity": [2]})),
            "sensor.velocity",
            "names 1 components; give 2",
        ),
        (
            sensor(json!({"kind": "range-doppler", "station": [1, 2], "velocity": [2, 1]})),
            "sensor.velocity[1]",
            "one of the position",
        ),
        (
            sensor(json!({"kind": "bearing-rate", "station": [1, 2], "position": [0, u64::MAX]})),
            "sensor.position[1]",
            "outside the state",
        ),
        (
            sensor(json!({"kind": "time-difference", "wave_speed": 1490})),
            "sensor.stations",
            "is missing; give two or more",
        ),
        (
            sensor(json!({"kind": "time-difference", "stations": [[0, 0], [1, 0]]})),
            "sensor.wave_speed",
            "is missing; give the speed",
        ),
        (
            sensor(json!({"kind": "time-difference", "stations": [[0, 0]], "wave_speed": 1490})),
            "sensor.stations",
            "give at least 2",
        ),
        (
            sensor(json!({"kind": "time-difference", "stations": [[0, 0], [1, 0], [0, 0]], "wave_speed": 1490})),
            "sensor.stations[2]",
            "stands where stations[0] does",
        ),
        (
            sensor(json!({"kind": "time-difference", "stations": [[0, 0], [1, 0]], "wave_speed": -1})),
            "sensor.wave_speed",
            "-1 is not above 0",
        ),
        (
            sensor(json!({"kind": "time-difference", "station": [0, 0], "wave_speed": 1})),
            "sensor.station",
            "did you mean `stations`",
        ),
        (
            sensor(json!({"kind": "frequency-difference", "stations": [[0], [1]], "wave_speed": 1, "carrier": 1})),
            "sensor.stations[0]",
            "length 2 or 3",
        ),
        (
            sensor(json!({"kind": "received-strength", "station": [0, 0], "strength": 1, "exponent": 2})),
            "sensor.reference_distance",
            "is missing; give the length in m",
        ),
        (
            sensor(
                json!({"kind": "received-strength", "station": [0, 0], "strength": 1, "exponent": 0, "reference_distance": 1}),
            ),
            "sensor.exponent",
            "0 is not above 0; give how fast",
        ),
        (sensor(json!({"kind": "quadratic"})), "sensor", "`A` is missing"),
        (sensor(json!({"kind": "quadratic", "A": []})), "sensor.A", "at least one"),
        (sensor(json!({"kind": "quadratic", "A": [[[1.0]]]})), "sensor.A[0]", "1 rows; the state has 3"),
        (
            sensor(json!({"kind": "quadratic", "A": [[[1, 0, 0], [0, 1], [0, 0, 1]]]})),
            "sensor.A[0][1]",
            "2 numbers; 3",
        ),
        (
            sensor(json!({"kind": "quadratic", "A": [[[1, 0, 0], [0, 1, 0], [0, 0, 1]]], "b": [[1, 2]]})),
            "sensor.b[0]",
            "2 numbers; 3",
        ),
        (
            sensor(json!({"kind": "quadratic", "A": [[[1, 0, 0], [0, 1, 0], [0, 0, 1]]], "b": []})),
            "sensor.b",
            "0 rows; 1",
        ),
        (
            sensor(json!({"kind": "quadratic", "A": [[[1, 0, 0], [0, 1, 0], [0, 0, 1]]], "c": [1, 2]})),
            "sensor.c",
            "2 numbers; 1",
        ),
        (sensor(json!({"kind": "linear", "H": []})), "sensor.H", "at least one"),
        (sensor(json!({"kind": "linear", "H": [[1, 2, 3], [1]]})), "sensor.H[1]", "1 numbers; 3"),
        (sensor(json!({"kind": "linear", "H": [[1, 2, 3]], "offset": []})), "sensor.offset", "0 numbers; 1"),
    ];
    let mut wrong = Vec::new();
    for ((path, value), key, part) in table {
        let (got_key, message) = fault(path, value.clone());
        if got_key != key || !message.contains(part) {
            wrong.push(format!("{path} = {value}\n   wanted {key}: …{part}…\n   got    {got_key}: {message}"));
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

/// A sensor asked for on a state without components is an error, too.
#[test]
fn a_state_without_components_has_no_sensor() {
    for sensor in [
        json!({"kind": "range-bearing", "station": [0, 0]}),
        json!({"kind": "bearing-only", "station": [0, 0]}),
        json!({"kind": "quadratic", "A": [[]]}),
        json!({"kind": "linear", "H": [[]]}),
    ] {
        let Value::Object(map) = sensor.clone() else { unreachable!() };
        assert!(gaussworthy::sensor::SensorSpec::from_json(map, 0).is_err(), "{sensor}");
    }
}

/// A sensor made for one state and a prior of another do not make a case.
#[test]
fn a_sensor_belongs_to_its_state() {
    use gaussworthy::gaussian::Gaussian;
    use nalgebra::DVector;
    let Value::Object(map) = json!({"kind": "linear", "H": [[1.0, 2.0]]}) else { unreachable!() };
    let sensor = gaussworthy::sensor::SensorSpec::from_json(map, 2).unwrap();
    for n in [1, 3] {
        let prior = Gaussian::new(DVector::zeros(n), DMatrix::identity(n, n)).unwrap();
        let e = Case::new("k", sensor.clone(), prior, None).unwrap_err();
        assert_eq!(e.key, "sensor", "{e}");
    }
}
