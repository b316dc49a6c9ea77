//! Odd but legal cases: each ends with a word, and none harms the others.

use std::collections::HashMap;

use serde_json::{Value, json};

use crate::contract::{MomentsRecord, Row, Soundness, Verdict};
use crate::desk::{Desk, assert_narrow};

fn case(name: &str, sensor: Value, mean: &[f64], covariance: Value, noise: Value) -> String {
    let mut record = json!({"case": name, "sensor": sensor, "prior": {"mean": mean, "covariance": covariance}});
    if !noise.is_null() {
        record["noise"] = json!({ "covariance": noise });
    }
    format!("{record}\n")
}

fn diagonal(values: &[f64]) -> Value {
    let n = values.len();
    json!((0..n).map(|i| (0..n).map(|j| if i == j { values[i] } else { 0.0 }).collect()).collect::<Vec<Vec<_>>>())
}

/// The case that is as it should be, and whose answers must not depend on its company.
fn easy() -> String {
    let sensor = json!({"kind": "range-bearing", "station": [0, 0]});
    case("easy", sensor, &[3000.0, 400.0], diagonal(&[900.0, 400.0]), json!([[100, 0], [0, 1e-4]]))
}

fn odd_ones() -> String {
    let radar = || json!({"kind": "range-bearing", "station": [0, 0]});
    let buoy = || json!({"kind": "bearing-only", "station": [0, 0]});
    let line = |h: f64| json!({"kind": "linear", "H": [[h]]});
    let square = |a: f64| json!({"kind": "quadratic", "A": [[[a]]]});
    let mut text = String::new();
    for (name, sensor) in [("radar", radar()), ("buoy", buoy())] {
        let mut add = |what: &str, mean: [f64; 2], covariance: Value, noise: Value| {
            text += &case(&format!("{name}-{what}"), sensor.clone(), &mean, covariance, noise);
        };
        add("known", [3.0, 4.0], diagonal(&[0.0, 0.0]), json!(0.1));
        add("known-on-the-cut", [-3.0, -0.0], diagonal(&[0.0, 0.0]), json!(0.1));
        add("known-and-noiseless", [3.0, 4.0], diagonal(&[0.0, 0.0]), Value::Null);
        add("on-the-station", [0.0, 0.0], diagonal(&[1.0, 1.0]), json!(0.1));
        add("known-on-the-station", [0.0, 0.0], diagonal(&[0.0, 0.0]), json!(0.1));
        add("singular", [3.0, 4.0], json!([[1, 1], [1, 1]]), json!(0.1));
        add("zero-noise", [3.0, 4.0], diagonal(&[1.0, 1.0]), json!(0));
        add("tiny", [1e-300, 0.0], diagonal(&[1e-300, 1e-300]), json!(0.1));
        add("huge", [1e300, 1e300], diagonal(&[1e300, 1e300]), json!(0.1));
        add("close-up", [1e-160, 0.0], diagonal(&[1.0, 1.0]), json!(1e-300));
    }
    for size in [1e300, 1e155, 1e-155, 1e-300, 5e-324] {
        let mut add = |what: &str, sensor: Value, mean: f64, variance: f64, noise: f64| {
            text += &case(&format!("{what}-{size:e}"), sensor, &[mean], diagonal(&[variance]), json!(noise));
        };
        add("square-mean", square(1.0), size, 1.0, 0.1);
        add("square-variance", square(1.0), 1.0, size, 0.1);
        add("square-scale", square(size), 1.0, 1.0, 0.1);
        add("square-noise", square(1.0), 1.0, 1.0, size);
        add("line-mean", line(1.0), size, 1.0, 0.1);
        add("line-variance", line(1.0), 1.0, size, 0.1);
        add("line-scale", line(size), 1.0, 1.0, 0.1);
        add("line-noise", line(1.0), 1.0, 1.0, size);
    }
    text += &case("constant", line(0.0), &[1.0], diagonal(&[1.0]), json!(0.1));
    text += &case("noiseless-line", line(2.0), &[1.0], diagonal(&[1.0]), Value::Null);
    let twice = json!({"kind": "linear", "H": [[1, 0], [1, 0]]});
    text += &case("one-output-twice", twice, &[1.0, 2.0], diagonal(&[1.0, 1.0]), Value::Null);
    let twelve = json!({"kind": "quadratic", "A": [diagonal(&[1.0; 12])]});
    text += &case("twelve", twelve, &[1.0; 12], diagonal(&[0.01; 12]), json!(0.1));
    text
}

#[test]
fn every_odd_case_ends_with_a_word_and_harms_no_other() {
    let desk = Desk::new();
    desk.write("alone.jsonl", &easy());
    desk.write("among.jsonl", &(odd_ones() + &easy()));
    // Alone it is timed, too: timing must survive the odd ones as sampling does.
    for name in ["alone", "among"] {
        let file = format!("{name}.jsonl");
        let out = desk.succeed(&["survey", "--cases", &file, "--cap", "131072", "--threads", "2"]);
        assert_narrow(&out);
    }
    let rows: Vec<Row> = desk.rows("results/among/scores.csv");
    let references: Vec<MomentsRecord> = desk.lines("results/among/references.jsonl");
    assert_eq!(rows.len(), 7 * references.len());
    assert_eq!(references.len(), odd_ones().lines().count() + 1);
    for row in &rows {
        assert!(!row.reason.is_empty() && row.reason.len() < 200, "{row:?}");
        let numbers = row.scores().into_iter().flat_map(|(value, error)| [value, error]).flatten();
        assert!(numbers.into_iter().all(f64::is_finite), "{row:?}");
    }

    let easy = |name: &str| -> String {
        let text = desk.read(&format!("results/{name}/references.jsonl"));
        text.lines().find(|line| line.contains("\"easy\"")).unwrap().into()
    };
    assert_eq!(easy("alone"), easy("among"));

    let soundness: HashMap<&str, Soundness> = references.iter().map(|r| (r.case.as_str(), r.soundness)).collect();
    let said = |name: &str| -> Vec<&Row> { rows.iter().filter(|row| row.case == name).collect() };
    assert!(said("easy").iter().all(|row| row.verdict == Verdict::Trusted), "{:?}", said("easy"));
    for (name, sound, word) in [
        // A state known exactly leaves nothing to update: that is said, and the reference stands.
        ("radar-known", Soundness::Sound, "knows the state exactly: no measurement updates it"),
        ("buoy-known", Soundness::Sound, "knows the state exactly: no measurement updates it"),
        ("radar-known-on-the-cut", Soundness::Sound, "knows the state exactly: no measurement updates it"),
        ("buoy-known-on-the-cut", Soundness::Sound, "knows the state exactly: no measurement updates it"),
        ("buoy-on-the-station", Soundness::Refused, "no mean direction"),
        ("radar-on-the-station", Soundness::Refused, "no mean direction"),
        ("square-mean-1e300", Soundness::Refused, "is not a finite number"),
        ("line-mean-1e300", Soundness::Refused, "the digits of a number do not show it"),
        ("noiseless-line", Soundness::Sound, "undefined: the joint of state and measurement is singular"),
        ("one-output-twice", Soundness::Sound, "add noise or drop an output"),
    ] {
        assert_eq!(soundness[name], sound, "{name}");
        for row in said(name) {
            assert!(row.verdict == Verdict::Undecided && row.reason.contains(word), "{row:?}");
        }
    }
    // Without spread and noise there is only rounding; what a method makes of it, nobody can trust.
    for name in ["radar-known-and-noiseless", "buoy-known-and-noiseless"] {
        assert!(said(name).iter().all(|row| row.verdict != Verdict::Trusted), "{:?}", said(name));
    }
}
