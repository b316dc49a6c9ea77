//! Sampled references of the sensors of a position against outside values.

mod common;

use std::collections::{BTreeMap, BTreeSet};

use common::deviations::deviations;
use common::records::{Record, load, matrix};
use gaussworthy::gaussian::{Gaussian, Moments};
use gaussworthy::reference::{Sampler, SamplerSettings};
use gaussworthy::sensor::{KINDS, SensorSpec};
use gaussworthy::suite::Case;
use nalgebra::DVector;
use serde::Deserialize;
use serde_json::{Map, Value, json};

/// A case, and the exact moments of some of its outputs.
struct Check {
    case: Case,
    exact: Moments,
    outputs: Vec<usize>,
}

/// A record of `position_moments.json`: Gauss-Hermite tensor grids of two sizes that agree to 1e-9 at least.
#[derive(Deserialize)]
struct Quadrature {
    id: String,
    sensor: Map<String, Value>,
    m: Vec<f64>,
    #[serde(rename = "P")]
    p: Vec<Vec<f64>>,
    mu: Vec<f64>,
    #[serde(rename = "S")]
    s: Vec<Vec<f64>>,
    #[serde(rename = "C")]
    c: Vec<Vec<f64>>,
}

/// A record of the log-distance law among those of family 8; the others have other keys.
#[derive(Deserialize)]
struct Strength {
    id: String,
    inputs: StrengthInputs,
    mu: Vec<f64>,
    #[serde(rename = "S")]
    s: Vec<Vec<f64>>,
    #[serde(rename = "C")]
    c: Vec<Vec<f64>>,
}

#[derive(Deserialize)]
struct StrengthInputs {
    m: Vec<f64>,
    #[serde(rename = "P")]
    p: Vec<Vec<f64>>,
    sensor: Option<Vec<f64>>,
    y0: Option<f64>,
    eta: Option<f64>,
    d0: Option<f64>,
}

fn case(id: &str, sensor: Map<String, Value>, mean: &[f64], covariance: &[Vec<f64>]) -> Case {
    let sensor = SensorSpec::from_json(sensor, mean.len()).unwrap_or_else(|e| panic!("{id}: {e}"));
    let prior = Gaussian::new(DVector::from_row_slice(mean), matrix(covariance)).unwrap();
    Case::new(id, sensor, prior, None).unwrap_or_else(|e| panic!("{id}: {e}"))
}

fn moments(mean: &[f64], covariance: &[Vec<f64>], cross: &[Vec<f64>]) -> Moments {
    Moments { mean: DVector::from_row_slice(mean), covariance: matrix(covariance), cross_covariance: matrix(cross) }
}

fn object(value: Value) -> Map<String, Value> {
    let Value::Object(map) = value else { panic!("{value} is no object") };
    map
}

/// Quadrature of all; closed forms of the range (Rice, noncentral chi); integration to 16 digits of range, azimuth and
/// elevation, and of the log-distance law, near their singularities too. The sources stand in the files.
fn checks() -> Vec<Check> {
    let mut checks = Vec::new();
    for r in load::<Quadrature>("position_moments.json") {
        let exact = moments(&r.mu, &r.s, &r.c);
        checks.push(Check { case: case(&r.id, r.sensor, &r.m, &r.p), outputs: (0..r.mu.len()).collect(), exact });
    }
    let mut add = |record: &Record, kind: &str, of: &[usize], outputs: &[usize]| {
        let inputs = &record.inputs;
        let sensor = object(json!({"kind": kind, "station": inputs.sensor}));
        let all = record.moments();
        let exact = Moments {
            mean: all.mean.select_rows(of),
            covariance: all.covariance.select_rows(of).select_columns(of),
            cross_covariance: all.cross_covariance.select_columns(of),
        };
        let case = case(&record.id, sensor, &inputs.m, &inputs.prior);
        checks.push(Check { case, exact, outputs: outputs.to_vec() });
    };
    for record in load::<Record>("f03_range_isotropic.json") {
        // A range along one axis is not one of a position.
        if record.inputs.n > 1 {
            add(&record, "range-only", &[0], &[0]);
        }
    }
    for record in load::<Record>("f07_range_az_el_3d.json") {
        add(&record, "range-azimuth-elevation", &[0, 1, 2], &[0, 1, 2]);
        add(&record, "azimuth-elevation", &[1, 2], &[0, 1]);
    }
    for r in load::<Strength>("f08_exp_log_trig.json") {
        let StrengthInputs { m, p, sensor: Some(station), y0: Some(y0), eta: Some(eta), d0: Some(d0) } = r.inputs
        else {
            continue;
        };
        let sensor = object(json!({"kind": "received-strength", "station": station,
            "strength": y0, "reference_distance": d0, "exponent": eta}));
        checks.push(Check {
            case: case(&r.id, sensor, &m, &p),
            exact: moments(&r.mu, &r.s, &r.c),
            outputs: vec![0],
        });
    }
    checks
}

/// False alarms over seeds: a deviation follows about the t law of 31 degrees of freedom, beyond 4.5 with odds of
/// 9e-5; the 400 or so entries that are left to chance give a false alarm in at most 4 % of seeds, and this seed is fixed.
/// Of the deviations 5 % lie beyond 2.04; more than 12 % would say that the standard errors are too small (odds far
/// below 1e-3 for 400 independent entries; entries of one case are correlated).
#[test]
fn outside_values_lie_within_four_and_a_half_standard_errors() {
    let mut largest: BTreeMap<&str, (f64, String)> = BTreeMap::new();
    let (mut chance, mut beyond) = (0_u32, 0_u32);
    for check in checks() {
        let settings = SamplerSettings { precision: 1e-9, cap: 1 << 18, ..SamplerSettings::default() };
        let reference = Sampler::new(&check.case, settings).unwrap().run();
        for deviation in deviations(&check.case, &reference, &check.exact, &check.outputs) {
            let z = deviation.z.abs();
            // A wide standard error would let any value pass: widest is an azimuth with mass on its cut, 6e-4.
            assert!(deviation.share < 2e-3, "{deviation:?} has too wide a standard error to tell anything");
            assert!(z <= 4.5, "{deviation:?}: {}", check.case.spec().kind());
            chance += u32::from(z > 0.0);
            beyond += u32::from(z > 2.04);
            let worst = largest.entry(check.case.spec().kind()).or_default();
            if z >= worst.0 {
                *worst = (z, deviation.entry);
            }
        }
    }
    for (kind, (z, entry)) in &largest {
        println!("{kind}: largest difference {z:.2} standard errors ({entry})");
    }
    println!("{chance} entries left to chance, {beyond} beyond 2.04");
    assert!(chance > 300, "only {chance} entries were left to chance");
    assert!(f64::from(beyond) <= 0.12 * f64::from(chance), "{beyond} of {chance} beyond 2.04");
    let known: BTreeSet<&str> = KINDS
        .iter()
        .filter(|kind| {
            kind.parameters.contains("station") && !["range-bearing", "bearing-only"].contains(&kind.name)
        })
        .map(|kind| kind.name)
        .collect();
    assert_eq!(
        largest.keys().copied().collect::<BTreeSet<_>>(),
        known,
        "a sensor of a position without an outside value"
    );
}
