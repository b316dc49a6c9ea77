//! Against values in 60 digits (tests/oracle/lanes_values.py, which says how they were made).

use std::collections::BTreeMap;
use std::path::Path;

use gaussworthy::lanes::Level;

use crate::functions::{self, Function, map};

/// The rows \[x, y, high, low\] of each function.
fn load() -> BTreeMap<String, Vec<[f64; 4]>> {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/data/lanes_values.json");
    let text = std::fs::read_to_string(&path).expect("the file is there");
    serde_json::from_str(&text).expect("the file is as its generator writes it")
}

/// |value - (high + low)| in units in the last place of high.
fn error_in_ulps(value: f64, [.., high, low]: [f64; 4]) -> f64 {
    let ulp = high.abs().next_up() - high.abs();
    // The difference of two doubles so close together is exact.
    ((value - high) - low).abs() / ulp
}

fn check<F: Function>(name: &str, values: &BTreeMap<String, Vec<[f64; 4]>>) {
    let rows = &values[name];
    assert!(rows.len() > 50, "{name} has only {} rows", rows.len());
    for level in Level::available() {
        let mut worst = 0.0_f64;
        for row in rows {
            let ours = map::<F>(level, &[[row[0]; 8]], &[[row[1]; 8]])[0];
            for value in ours {
                let error = error_in_ulps(value, *row);
                assert!(error <= F::ULPS, "{name} of {row:?}, {level}: {value:e} is {error:.2} ulp off");
                worst = worst.max(error);
            }
        }
        println!("{name}, {level}: at most {worst:.3} ulp off in {} values", rows.len());
    }
}

#[test]
fn functions_have_the_stated_accuracy() {
    let values = load();
    check::<functions::Sin>("Sin", &values);
    check::<functions::Cos>("Cos", &values);
    check::<functions::SinOfPair>("Sin", &values);
    check::<functions::CosOfPair>("Cos", &values);
    check::<functions::Tan>("Tan", &values);
    check::<functions::Atan>("Atan", &values);
    check::<functions::Asin>("Asin", &values);
    check::<functions::Acos>("Acos", &values);
    check::<functions::Atan2>("Atan2", &values);
    check::<functions::Hypot>("Hypot", &values);
    check::<functions::Exp>("Exp", &values);
    check::<functions::Ln>("Ln", &values);
    check::<functions::Log10>("Log10", &values);
    check::<functions::Tanh>("Tanh", &values);
    check::<functions::Powf>("Powf", &values);
}

#[test]
fn the_measure_of_error_sees_one_unit() {
    let row = [0.0, 0.0, 1.0, 0.25 * f64::EPSILON];
    assert_eq!(error_in_ulps(1.0, row), 0.25);
    assert_eq!(error_in_ulps(1.0 + f64::EPSILON, row), 0.75);
    assert_eq!(error_in_ulps(1.0 - f64::EPSILON, row), 1.25);
}
