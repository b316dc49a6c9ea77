//! The cases that the benches share. All numbers are invented.

// Every bench compiles this module whole and uses a part of it.
#![allow(dead_code)]

use gaussworthy::suite::Case;
use serde_json::{Value, json};

/// A ship 3 km off the harbour radar, its bearing known to a few degrees: no sample comes near the cut.
pub fn range_bearing() -> Case {
    case(json!({
        "case": "radar",
        "sensor": {"kind": "range-bearing", "station": [0, 0]},
        "prior": {"mean": [2900, 900], "covariance": [[2.5e4, 4e3], [4e3, 1.6e4]]},
        "noise": {"covariance": [[100, 0], [0, 3e-5]]},
    }))
}

/// Two listening buoys and a ship with position and velocity, state [x, y, vx, vy].
pub fn two_bearings() -> Case {
    case(json!({
        "case": "buoys",
        "sensor": {"kind": "bearing-only", "stations": [[0, 0], [1500, -200]]},
        "prior": {
            "mean": [900, 1100, 3, -2],
            "covariance": [[1e4, 2e3, 90, 0], [2e3, 2e4, 0, 120], [90, 0, 4, 0], [0, 120, 0, 4]],
        },
        "noise": {"covariance": 3e-4},
    }))
}

/// A power meter on three phases, state [v1, v2, v3, i1, i2, i3]: total power beside the current's sum of squares.
pub fn quadratic() -> Case {
    let power: Vec<Vec<f64>> =
        (0..6_usize).map(|i| (0..6).map(|j| if i.abs_diff(j) == 3 { 0.5 } else { 0.0 }).collect()).collect();
    let squares: Vec<Vec<f64>> =
        (0..6).map(|i| (0..6).map(|j| if i == j && i >= 3 { 1.0 } else { 0.0 }).collect()).collect();
    let covariance: Vec<Vec<f64>> =
        (0..6).map(|i| (0..6).map(|j| if i == j { 0.01 } else { 0.0 }).collect()).collect();
    case(json!({
        "case": "meter",
        "sensor": {"kind": "quadratic", "A": [power, squares]},
        "prior": {"mean": [1, -0.5, -0.5, 0.8, -0.4, -0.4], "covariance": covariance},
        "noise": {"covariance": 2.5e-3},
    }))
}

fn case(record: Value) -> Case {
    Case::from_json(record).expect("a case of ours is a case")
}
