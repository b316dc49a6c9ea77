//! References of the sensors that have no test of their own, against moments from outside: quadrature by
//! `tests/oracle/sensor_moments.py` and closed forms of log-normal, sinusoidal and polar readings.

mod common;

use std::collections::BTreeMap;

use common::deviations::{Deviation, deviations};
use common::records::{Record, load, matrix};
use gaussworthy::gaussian::Moments;
use gaussworthy::reference::{Sampler, SamplerSettings, Soundness};
use gaussworthy::suite::Case;
use nalgebra::DVector;
use serde::Deserialize;
use serde_json::{Value, json};

/// Beyond this Student's t law of 31 degrees of freedom, which a deviation follows about, lies with odds of 9.0e-5: the
/// 221 entries give a false alarm in at most 2 % of seeds, and this seed is fixed.
const MOST: f64 = 4.5;

/// What `tests/oracle/sensor_moments.py` writes.
#[derive(Debug, Deserialize)]
struct Quadrature {
    id: String,
    sensor: Value,
    m: Vec<f64>,
    #[serde(rename = "P")]
    prior: Vec<Vec<f64>>,
    mu: Vec<f64>,
    #[serde(rename = "S")]
    s: Vec<Vec<f64>>,
    #[serde(rename = "C")]
    c: Vec<Vec<f64>>,
    /// How far two sizes of the grid differ, in standard deviations.
    apart: f64,
}

/// A case and its exact moments.
fn exact(id: &str, sensor: Value, m: Vec<f64>, p: &[Vec<f64>], moments: Moments) -> (Case, Moments) {
    let record = json!({"case": id, "sensor": sensor, "prior": {"mean": m, "covariance": p}});
    (Case::from_json(record).unwrap_or_else(|e| panic!("{id}: {e}")), moments)
}

fn by_quadrature() -> Vec<(Case, Moments)> {
    let records: Vec<Quadrature> = load("sensor_moments.json");
    records
        .into_iter()
        .map(|r| {
            assert!(r.apart < 1e-10, "{}: the quadrature has not converged", r.id);
            let (covariance, cross_covariance) = (matrix(&r.s), matrix(&r.c));
            let moments = Moments { mean: DVector::from_vec(r.mu), covariance, cross_covariance };
            exact(&r.id, r.sensor, r.m, &r.prior, moments)
        })
        .collect()
}

/// E\[r exp(i b)\] and E\[r^2 exp(2 i b)\] from the characteristic function; the source stands in each record.
fn polar_in_closed_form() -> Vec<(Case, Moments)> {
    let records: Vec<Record> = load("f05_polar_to_cartesian.json");
    let case = |r: Record| {
        let moments = r.moments();
        exact(&r.id, json!({"kind": "polar-to-cartesian"}), r.inputs.m, &r.inputs.prior, moments)
    };
    records.into_iter().map(case).collect()
}

/// Of the log-normal and sinusoidal records those of one component: exp(x) decays with -x, whose mean and
/// cross-covariance have the other sign; sin and cos are one sine in two phases.
fn exponentials_and_sines_in_closed_form() -> Vec<(Case, Moments)> {
    let mut cases = Vec::new();
    for r in load::<Record>("f08_exp_log_trig.json") {
        let moments = r.moments();
        match r.id.as_str() {
            "F08-P01" => {
                let sensor = json!({"kind": "exponential-decay", "amplitude": 1, "scale": 1});
                let m = r.inputs.m.iter().map(|v| -v).collect();
                let mirrored = Moments { cross_covariance: -moments.cross_covariance, ..moments };
                cases.push(exact(&r.id, sensor, m, &r.inputs.prior, mirrored));
            }
            "F08-P07" | "F08-P08" => {
                for (j, phase) in [0.0, std::f64::consts::FRAC_PI_2].into_iter().enumerate() {
                    let sensor = json!({"kind": "phase-sine", "amplitude": 1, "frequency": 1, "phase": phase});
                    let one = Moments {
                        mean: moments.mean.rows(j, 1).into_owned(),
                        covariance: moments.covariance.view((j, j), (1, 1)).into_owned(),
                        cross_covariance: moments.cross_covariance.columns(j, 1).into_owned(),
                    };
                    cases.push(exact(&format!("{}-{j}", r.id), sensor, r.inputs.m.clone(), &r.inputs.prior, one));
                }
            }
            _ => {}
        }
    }
    assert_eq!(cases.len(), 5, "records of one component");
    cases
}

#[test]
fn references_lie_within_their_standard_errors_of_outside_values() {
    let cases = [by_quadrature(), polar_in_closed_form(), exponentials_and_sines_in_closed_form()].concat();
    let mut largest: BTreeMap<&str, f64> = BTreeMap::new();
    let mut entries = 0;
    for (case, exact) in &cases {
        let settings = SamplerSettings { precision: 1e-9, cap: 1 << 18, ..SamplerSettings::default() };
        let reference = Sampler::new(case, settings).unwrap().run();
        let (id, reason) = (case.id(), &reference.reason);
        assert!(matches!(reference.soundness, Soundness::Sound | Soundness::Wide), "{id}: {reason:?}");
        let outputs: Vec<usize> = (0..exact.mean.len()).collect();
        for Deviation { entry, z, .. } in deviations(case, &reference, exact, &outputs) {
            assert!(z.abs() < MOST, "{entry}: {z:.2} standard errors off");
            let most = largest.entry(case.spec().kind()).or_default();
            *most = most.max(z.abs());
            entries += 1;
        }
    }
    for (kind, z) in &largest {
        println!("{kind}: largest difference {z:.2} standard errors");
    }
    assert_eq!((largest.len(), entries), (10, 221), "sensors and entries");
}

/// How far a closed form may be from an outside value, in standard deviations: quadrature has converged to 1e-10, and the second
/// moments of a position at range r with standard deviation s lose the digits of (r / s)^2, up to 1e4 here.
const CLOSED_FORM: f64 = 1e-9;

#[test]
fn closed_forms_of_the_sensors_are_the_outside_values() {
    let cases = [by_quadrature(), polar_in_closed_form(), exponentials_and_sines_in_closed_form()].concat();
    let mut tried: BTreeMap<&str, usize> = BTreeMap::new();
    for (case, exact) in &cases {
        let Some(closed) = case.sensor().exact_moments() else { continue };
        let prior = case.marginal().law();
        let mut found = Moments::zeros(prior.dimension(), exact.mean.len());
        closed.write_exact(prior, &mut found);
        found.cross_covariance = case.marginal().lift(found.cross_covariance);
        let sd = |j: usize| exact.covariance[(j, j)].sqrt();
        let check = |got: f64, wanted: f64, scale: f64, what: &str| {
            let off = (got - wanted).abs() / scale;
            assert!(off < CLOSED_FORM, "{} {what}: {got}, not {wanted}: {off:.1e} sd", case.id());
        };
        for j in 0..exact.mean.len() {
            check(found.mean[j], exact.mean[j], sd(j), "mean");
            for l in 0..exact.mean.len() {
                check(found.covariance[(j, l)], exact.covariance[(j, l)], sd(j) * sd(l), "covariance");
            }
            for i in 0..case.prior().dimension() {
                let scale = case.prior().covariance()[(i, i)].sqrt() * sd(j);
                let (got, wanted) = (found.cross_covariance[(i, j)], exact.cross_covariance[(i, j)]);
                check(got, wanted, scale, "cross-covariance");
            }
        }
        *tried.entry(case.spec().kind()).or_default() += 1;
    }
    let kinds: Vec<_> = tried.keys().copied().collect();
    assert_eq!(kinds, ["exponential-decay", "line-offset", "phase-sine", "polar-to-cartesian"]);
}
