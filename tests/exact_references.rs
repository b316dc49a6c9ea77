//! Cases whose exact moments are known from outside, ready to be asked: every record that a sensor can
//! express becomes a case, and the loader itself is held against closed forms.

mod common;

use common::close::{assert_within, scaled_difference, scaled_vector_difference, standard_deviations};
use common::records::{Record, case_of, load, matrix};
use gaussworthy::sensor::Derivatives;
use nalgebra::{DMatrix, DVector};

/// File, records, and how many of them are a case: a range in 1 or 3 dimensions is not.
const FAMILIES: [(&str, usize, usize); 5] = [
    ("f02_quadratic_forms.json", 14, 14),
    ("f03_range_isotropic.json", 10, 6),
    ("f04_bearing.json", 9, 9),
    ("f06_range_bearing_2d.json", 10, 10),
    ("f09_linear_update.json", 1, 1),
];

/// Claim for a closed form, in units of the standard deviations involved.
const CLOSED_FORM_TOLERANCE: f64 = 1e-12;

#[test]
fn every_expressible_record_becomes_a_case() {
    for (file, records, cases) in FAMILIES {
        let records_read: Vec<Record> = load(file);
        assert_eq!(records_read.len(), records, "records in {file}");
        let mut converted = 0;
        for record in &records_read {
            assert!(!record.source.is_empty(), "{} names no source", record.id);
            assert!(record.digits_trusted >= 15, "{}: {} digits", record.id, record.digits_trusted);
            let Some(case) = case_of(record) else { continue };
            converted += 1;
            let (n, outputs) = (record.inputs.n, case.sensor().outputs().len());
            assert_eq!(case.prior().dimension(), n, "{}", record.id);
            assert!(record.outputs().iter().all(|&j| j < outputs), "{}", record.id);
            let moments = record.moments();
            assert_eq!(moments.cross_covariance.shape(), (n, record.inputs.p), "{}", record.id);
            // The case as it is written down asks the same question.
            let again = gaussworthy::suite::Case::from_json(case.to_json()).unwrap();
            assert_eq!((again.prior(), again.noise()), (case.prior(), case.noise()), "{}", record.id);
        }
        assert_eq!(converted, cases, "cases from {file}");
    }
}

/// E = tr(A P) + m'Am + b'm + c, Cov(y_i, y_j) = 2 tr(A_i P A_j P) + g_i' P g_j, Cov(x, y_j) = P g_j with
/// g = 2 A m + b. Source: A. M. Mathai, S. B. Provost, Quadratic Forms in Random Variables (Dekker, 1992),
/// ch. 3 (chapter from memory). Value, gradient g and Hessian 2 A are taken from the case's own sensor, so
/// that a parameter lost on the way into the case is seen.
#[test]
fn quadratic_records_have_the_moments_of_their_closed_form() {
    for record in load::<Record>("f02_quadratic_forms.json") {
        let case = case_of(&record).unwrap();
        let sensor = case.sensor();
        let prior = case.marginal().law();
        let (a, p) = (prior.dimension(), sensor.outputs().len());
        let mut at = Derivatives::zeros(a, p);
        sensor.hessians(prior.mean().as_slice(), &mut at);
        let covariance = prior.covariance();
        // H P with H = 2 A.
        let hp: Vec<DMatrix<f64>> = at.hessians.iter().map(|h| h * covariance).collect();
        let mean = DVector::from_fn(p, |j, _| at.value[j] + 0.5 * hp[j].trace());
        let first = &at.jacobian * covariance * at.jacobian.transpose();
        let s = DMatrix::from_fn(p, p, |i, j| 0.5 * (&hp[i] * &hp[j]).trace() + first[(i, j)]);
        let c = case.marginal().lift(covariance * at.jacobian.transpose());

        let exact = record.moments();
        let (sd_x, sd_y) = (standard_deviations(case.prior().covariance()), standard_deviations(&exact.covariance));
        let check = |difference, what| {
            assert_within(difference, CLOSED_FORM_TOLERANCE, format!("{} {what}", record.id));
        };
        check(scaled_vector_difference(&exact.mean, &mean, &sd_y), "mean");
        check(scaled_difference(&exact.covariance, &s, &sd_y, &sd_y), "covariance");
        check(scaled_difference(&exact.cross_covariance, &c, &sd_x, &sd_y), "cross-covariance");
    }
}

/// JCGM 101:2008, clause 9.4: comparison loss y = x1^2 + x2^2 with u = 0.005 in both and correlation r has
/// E = x1^2 + 2 u^2 and Var = 4 u^4 (1 + r^2) + 4 u^2 x1^2. The values printed in the tables there (in units
/// of 1e-6, from memory) are these, rounded.
#[test]
fn the_comparison_loss_records_are_those_of_the_standard() {
    let mut seen = 0;
    for record in load::<Record>("f02_quadratic_forms.json") {
        if !record.inputs.note.contains("JCGM 101:2008 9.4") {
            continue;
        }
        seen += 1;
        let (x1, p) = (record.inputs.m[0], matrix(&record.inputs.prior));
        let (u2, r) = (p[(0, 0)], p[(0, 1)] / p[(0, 0)]);
        let exact = record.moments();
        let sd = exact.covariance[(0, 0)].sqrt();
        let variance = 4.0 * u2 * u2 * (1.0 + r * r) + 4.0 * u2 * x1 * x1;
        assert_within((exact.mean[0] - (x1 * x1 + 2.0 * u2)).abs() / sd, CLOSED_FORM_TOLERANCE, &record.id);
        assert_within((sd - variance.sqrt()).abs() / sd, CLOSED_FORM_TOLERANCE, &record.id);
        assert_within((sd - record.extra_number("exact_sd")).abs() / sd, CLOSED_FORM_TOLERANCE, &record.id);
        let printed = |key: &str| record.extra_number(&format!("standard_rounded_{key}_1e-6_FROM_MEMORY"));
        assert_eq!((exact.mean[0] * 1e6).round(), printed("estimate"), "{} estimate", record.id);
        // Half a unit in the last digit, in units of 1e-6.
        assert_within((sd * 1e6 - printed("u")).abs(), 0.5, format!("{} u", record.id));
    }
    assert_eq!(seen, 6, "x1 = 0, 0.010, 0.050 with r = 0 and 0.9");
}

/// The one record with noise: R reaches the case, and the moments hold S + R.
#[test]
fn the_linear_record_carries_its_noise() {
    let record = load::<Record>("f09_linear_update.json").remove(0);
    let case = case_of(&record).unwrap();
    let moments = record.moments();
    assert_eq!(case.noise(), record.inputs.noise.as_ref().map(|r| matrix(r)).as_ref());
    let s_with_noise: Vec<Vec<f64>> = serde_json::from_value(record.extra["S_with_noise"].clone()).unwrap();
    let sd = standard_deviations(&moments.covariance);
    let difference = scaled_difference(&moments.covariance, &matrix(&s_with_noise), &sd, &sd);
    assert_within(difference, CLOSED_FORM_TOLERANCE, "S + R");
}
