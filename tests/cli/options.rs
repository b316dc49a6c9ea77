//! Options do what they say.

use crate::contract::{CaseRecord, Manifest, MomentsRecord, Row, Soundness, Verdict};
use crate::desk::{Desk, assert_narrow};

fn manifest(desk: &Desk, folder: &str) -> Manifest {
    serde_json::from_str(&desk.read(&format!("{folder}/manifest.json"))).unwrap()
}

#[test]
fn methods_are_those_asked_for_under_their_labels() {
    let desk = Desk::new();
    let asked = "unscented-scaled:beta=2:alpha=5e-1,taylor-1";
    let out = desk.succeed(&["survey", "smoke", "--no-timing", "--methods", asked]);
    let labels = ["unscented-scaled:alpha=0.5:beta=2", "taylor-1"];
    assert_eq!(manifest(&desk, "results/smoke").settings.methods, labels);
    let rows: Vec<Row> = desk.rows("results/smoke/scores.csv");
    assert!(rows.iter().zip(labels.iter().cycle()).all(|(row, label)| row.method == *label));
    assert!(out.contains(labels[0]) && !out.contains("cubature"), "{out}");
    assert!(rows.iter().all(|row| row.times().iter().all(Option::is_none)), "not timed");
    assert!(manifest(&desk, "results/smoke").cost.is_none());
}

/// The worst standard error of a mean in standard deviations of its output.
fn worst(record: &MomentsRecord) -> f64 {
    let errors = record.standard_error.mean.iter().enumerate();
    errors.map(|(j, e)| e.unwrap() / record.covariance[j][j].unwrap().sqrt()).fold(0.0, f64::max)
}

#[test]
fn precision_is_reached_and_the_cap_is_kept() {
    let desk = Desk::new();
    let survey = |out: &str, more: &[&str]| -> (Vec<MomentsRecord>, String) {
        let said = desk.succeed(&[&["survey", "smoke", "--no-timing", "--out", out], more].concat());
        (desk.lines(&format!("{out}/smoke/references.jsonl")), said)
    };
    let (fine, _) = survey("fine", &["--precision", "3e-5"]);
    let (coarse, _) = survey("coarse", &["--precision", "5e-2"]);
    let (capped, said) = survey("capped", &["--precision", "1e-10", "--cap", "40000"]);
    let cases: Vec<CaseRecord> = desk.lines("fine/smoke/cases.jsonl");
    assert_eq!(manifest(&desk, "fine/smoke").settings.precision, 3e-5);
    assert_eq!(manifest(&desk, "capped/smoke").settings.cap, 40_000);
    let samples = |records: &[MomentsRecord]| records.iter().map(|r| r.points).sum::<u64>();
    assert!(samples(&fine) > 2 * samples(&coarse), "{} and {}", samples(&fine), samples(&coarse));
    for (record, limit) in fine.iter().map(|r| (r, 3e-5)).chain(coarse.iter().map(|r| (r, 5e-2))) {
        assert!(record.soundness == Soundness::Sound && worst(record) <= limit, "{record:?}");
    }
    for (record, case) in capped.iter().zip(&cases) {
        assert!(record.points <= 40_000, "{record:?}");
        let soundness = if case.sensor.is_polynomial() { Soundness::Sound } else { Soundness::Wide };
        assert_eq!(record.soundness, soundness, "{record:?}");
    }
    assert_narrow(&said);
    let short = cases.iter().filter(|case| !case.sensor.is_polynomial()).count();
    let note = format!("{short} references fell short of the asked precision at the cap of 40000 samples");
    assert!(said.contains(&note), "{said}");
    // What was asked is not what was reached: covariances have errors, too, so the worst is no less than that of a mean.
    let flat = said.split_whitespace().collect::<Vec<_>>().join(" ");
    let (_, told) = flat.split_once("; worst standardised standard error ").unwrap();
    let reached: f64 = told.split_once(" (1e-10 asked)").unwrap().0.parse().unwrap();
    let means = capped.iter().map(worst).fold(0.0, f64::max);
    // Two digits are printed.
    assert!(reached >= 0.95 * means && reached < 1.0, "{reached} reached at worst, {means} in a mean");
}

/// Too large a state for a product rule is nobody's mistake: the method is skipped and says why.
#[test]
fn a_method_on_too_large_a_state_is_skipped_with_its_reason() {
    let desk = Desk::new();
    let diagonal = |n: usize, v: f64| -> Vec<Vec<f64>> {
        (0..n).map(|i| (0..n).map(|j| if i == j { v } else { 0.0 }).collect()).collect()
    };
    let record = serde_json::json!({
        "case": "twelve",
        "sensor": {"kind": "quadratic", "A": [diagonal(12, 1.0)]},
        "prior": {"mean": vec![1.0; 12], "covariance": diagonal(12, 0.01)},
        "noise": {"covariance": 0.1},
    });
    desk.write("large.jsonl", &record.to_string());
    let methods = ["--methods", "gauss-hermite:order=5,cubature-3"];
    let out =
        desk.succeed(&[&["survey", "--cases", "large.jsonl", "--precision", "1e-2"][..], &methods[..]].concat());
    assert_narrow(&out);
    let said = out.split_whitespace().collect::<Vec<_>>().join(" ");
    assert!(said.contains("gauss-hermite:order=5 was skipped in 1 cases: order 5 on 12 read components"), "{out}");
    let rows: Vec<Row> = desk.rows("results/large/scores.csv");
    assert_eq!(rows.iter().map(|r| r.verdict).collect::<Vec<_>>(), [Verdict::Skipped, Verdict::Trusted]);
    let skipped = &rows[0];
    assert!(skipped.reason.contains("5^12 = 244140625 nodes; the cap max_nodes is 100000"), "{skipped:?}");
    assert!(skipped.scores().iter().all(|s| *s == (None, None)) && skipped.times().iter().all(Option::is_none));
    assert_eq!((skipped.values, skipped.jacobians, skipped.hessians), (None, None, None));
}
