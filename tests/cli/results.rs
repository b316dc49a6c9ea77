//! What a survey leaves in its results folder.

use std::collections::{HashMap, HashSet};

use gaussworthy::method::default_methods;

use crate::contract::{CaseRecord, Manifest, MomentsRecord, Row, Soundness, Verdict};
use crate::desk::{
    CAUTION, Desk, FILES, FILES_WITH_CHOICES, assert_narrow, assert_same, assert_shared_columns_are_same, names,
    smoke_cases,
};

/// The shape of a matrix of optional numbers, all of which must be there.
fn full_shape(rows: &[Vec<Option<f64>>]) -> (usize, usize) {
    let columns = rows.first().map_or(0, Vec::len);
    assert!(rows.iter().all(|row| row.len() == columns && row.iter().all(Option::is_some)), "{rows:?}");
    (rows.len(), columns)
}

#[test]
fn smoke_leaves_every_file_as_the_formats_say() {
    let desk = Desk::new();
    let out = desk.succeed(&["survey", "smoke", "--out", "found"]);

    let all = smoke_cases();
    assert_narrow(&out);
    assert!(out.contains(CAUTION) && out.contains(&format!("{all} of {all} cases")), "{out}");
    assert!(out.contains("Written to found/smoke") || cfg!(windows), "{out}");
    assert_eq!(names(&desk.path("found")), [".references", "smoke"]);
    assert_eq!(names(&desk.path("found/smoke")), FILES_WITH_CHOICES);

    let cases: Vec<CaseRecord> = desk.lines("found/smoke/cases.jsonl");
    let by_name: HashMap<&str, &CaseRecord> = cases.iter().map(|c| (c.case.as_str(), c)).collect();
    assert_eq!((cases.len(), by_name.len()), (all, all));
    for c in &cases {
        let (n, p) = (c.prior.mean.len(), c.sensor.outputs());
        assert!(c.prior.covariance.len() == n && c.prior.covariance.iter().all(|r| r.len() == n), "{c:?}");
        let noise = &c.noise.as_ref().unwrap_or_else(|| panic!("{} has noise", c.case)).covariance;
        assert!(noise.len() == p && noise.iter().all(|r| r.len() == p), "{c:?}");
    }

    let references: Vec<MomentsRecord> = desk.lines("found/smoke/references.jsonl");
    assert_eq!(
        references.iter().map(|r| &r.case).collect::<Vec<_>>(),
        cases.iter().map(|c| &c.case).collect::<Vec<_>>()
    );
    for r in &references {
        let c = by_name[r.case.as_str()];
        let (n, p) = (c.prior.mean.len(), c.sensor.outputs());
        let e = &r.standard_error;
        for (mean, covariance, cross) in
            [(&r.mean, &r.covariance, &r.cross_covariance), (&e.mean, &e.covariance, &e.cross_covariance)]
        {
            assert_eq!(full_shape(std::slice::from_ref(mean)), (1, p), "{r:?}");
            assert_eq!((full_shape(covariance), full_shape(cross)), ((p, p), (n, p)), "{r:?}");
        }
        let errors = e.mean.iter().chain(e.covariance.iter().flatten()).chain(e.cross_covariance.iter().flatten());
        // A linear reading is known but for rounding; of any other, every moment is left to chance.
        let least = if c.sensor.is_polynomial() { 0.0 } else { f64::MIN_POSITIVE };
        assert!(errors.flatten().all(|&e| e >= least), "{r:?}");
        assert_eq!((r.soundness, r.replicates), (Soundness::Sound, 32), "{r:?}");
        assert!(r.points > 0 && r.points.is_multiple_of(32), "{r:?}");
    }

    let rows: Vec<Row> = desk.rows("found/smoke/scores.csv");
    let methods = default_methods();
    let asked: HashSet<(&str, &str)> =
        cases.iter().flat_map(|c| methods.iter().map(|m| (c.case.as_str(), m.label()))).collect();
    let answered: HashSet<(&str, &str)> = rows.iter().map(|r| (r.case.as_str(), r.method.as_str())).collect();
    assert_eq!((answered, rows.len()), (asked, cases.len() * methods.len()));
    for row in &rows {
        assert!(!row.reason.is_empty() && row.verdict != Verdict::Skipped, "{row:?}");
        // Every sensor of the suite reads its whole state and all noise inside.
        let case = &by_name[row.case.as_str()];
        let n = (case.prior.mean.len() + case.sensor.noise()) as u64;
        assert!(row.inputs == n && [row.values, row.jacobians, row.hessians].iter().flatten().sum::<u64>() > 0);
        let linear = by_name[row.case.as_str()].sensor.is_linear();
        let exact = by_name[row.case.as_str()].sensor.is_polynomial();
        let least = if exact { 0.0 } else { f64::MIN_POSITIVE };
        for (value, error) in row.scores() {
            // Smoke has noise everywhere and no method that fails: every score exists.
            let (value, error) = (value.unwrap(), error.unwrap());
            assert!(value.is_finite() && error >= least && error.is_finite(), "{row:?}");
        }
        if case.sensor.noise() > 0 {
            assert_eq!(row.floor, "not defined for noise inside h");
        } else {
            assert!(row.floor.parse::<f64>().unwrap().is_finite() && row.floor_standard_error.unwrap() >= least);
        }
        if linear {
            assert_eq!(row.verdict, Verdict::Trusted, "{row:?}");
        }
        let times = row.times().map(|t| t.unwrap());
        assert!(times.iter().all(|&t| t > 0.0), "{row:?}");
        assert!(times[0] <= times[1] && times[1] <= times[2] && times[3] <= times[4] && times[4] <= times[5]);
    }
    assert!(rows.iter().any(|r| r.verdict == Verdict::Rejected), "smoke has hard cases");

    let manifest: Manifest = serde_json::from_str(&desk.read("found/smoke/manifest.json")).unwrap();
    assert_eq!(manifest.version, env!("CARGO_PKG_VERSION"));
    assert_eq!((manifest.suite.name.as_str(), manifest.seed), ("smoke", 1));
    assert!(manifest.suite.hash.len() == 64 && manifest.suite.hash.chars().all(|c| c.is_ascii_hexdigit()));
    assert_eq!((manifest.settings.precision, manifest.settings.replicates), (2e-3, 32));
    assert_eq!(manifest.settings.methods, methods.iter().map(|m| m.label()).collect::<Vec<_>>());
    assert_eq!(manifest.settings.limits["excess"], 0.05);
    assert_eq!(manifest.samples, references.iter().map(|r| r.points).sum::<u64>());
    let c = &manifest.cases;
    assert_eq!((c.asked, c.finished, c.complete), (all, all, true));
    let cost = manifest.cost.unwrap();
    assert_eq!(cost.len(), methods.len());
    assert!(cost.iter().all(|c| c.time_ratio.is_some() && c.transforms_per_second.unwrap() > 0.0), "{cost:?}");
}

/// Results are passed on: they must not say where or by whom they were made.
#[test]
fn no_file_tells_of_folders_users_or_hosts() {
    let desk = Desk::new();
    let folder = desk.path("out");
    desk.write("mine.toml", include_str!("../../suites/smoke.toml"));
    let suite = desk.path("mine.toml");
    desk.succeed(&["survey", suite.to_str().unwrap(), "--out", folder.to_str().unwrap(), "--no-timing"]);
    let mut telling = vec![desk.path("").to_string_lossy().trim_end_matches('/').to_string()];
    telling.extend(["HOME", "USERPROFILE", "HOSTNAME", "PWD"].iter().filter_map(|key| std::env::var(key).ok()));
    telling.extend(std::fs::read_to_string("/etc/hostname").ok().map(|name| name.trim().to_string()));
    for name in FILES {
        let text = desk.read(&format!("out/mine/{name}"));
        for word in telling.iter().filter(|word| word.len() > 2) {
            assert!(!text.contains(word.as_str()), "{name} holds {word}");
        }
    }
}

#[test]
fn threads_do_not_matter_and_seeds_do() {
    let desk = Desk::new();
    let survey = |out: &str, more: &[&str]| {
        desk.succeed(&[&["survey", "smoke", "--no-timing", "--out", out], more].concat());
    };
    survey("one", &["--threads", "1"]);
    survey("two", &["--threads", "2"]);
    survey("other", &["--seed", "2"]);
    assert_same(&desk, "one/smoke", "two/smoke");
    let threads = |out| -> u64 {
        serde_json::from_str::<Manifest>(&desk.read(&format!("{out}/smoke/manifest.json"))).unwrap().machine.threads
    };
    assert_eq!((threads("one"), threads("two")), (1, 2));

    assert_eq!(desk.read("one/smoke/cases.jsonl"), desk.read("other/smoke/cases.jsonl"), "nothing is drawn here");
    let cases: Vec<CaseRecord> = desk.lines("one/smoke/cases.jsonl");
    let (one, other) = (desk.read("one/smoke/references.jsonl"), desk.read("other/smoke/references.jsonl"));
    for ((case, a), b) in cases.iter().zip(one.lines()).zip(other.lines()) {
        assert!(case.sensor.is_linear() || a != b, "{a}");
    }
}

#[test]
fn the_cases_of_a_survey_fed_back_give_the_same_answers() {
    let desk = Desk::new();
    desk.succeed(&["survey", "smoke", "--no-timing", "--out", "first"]);
    // Precision is the suite's, not the case's; everything else comes back from the records alone.
    desk.succeed(&[
        "survey",
        "--cases",
        "first/smoke/cases.jsonl",
        "--precision",
        "2e-3",
        "--no-timing",
        "--out",
        "again",
    ]);
    assert_eq!(names(&desk.path("again")), [".references", "cases"]);
    for name in ["cases.jsonl", "references.jsonl"] {
        assert!(desk.read(&format!("first/smoke/{name}")) == desk.read(&format!("again/cases/{name}")), "{name}");
    }
    assert_shared_columns_are_same(&desk, "first/smoke/scores.csv", "again/cases/scores.csv");
}

/// Two suites of one name share a folder: what is replaced is said, and it is no error, for a suite that is edited has its name.
#[test]
fn results_of_another_suite_of_the_name_are_replaced_with_a_word() {
    let desk = Desk::new();
    let suite = |sd: f64| {
        format!("[sensor]\nkind = \"linear\"\nH = [[1]]\n[prior]\nmean = [0]\nsd = [{sd}]\n[noise]\nsd = 1\n")
    };
    for (folder, sd) in [("a", 1.0), ("b", 2.0)] {
        std::fs::create_dir_all(desk.path(folder)).unwrap();
        desk.write(&format!("{folder}/mine.toml"), &suite(sd));
    }
    let said = |path: &str| desk.run(&["survey", path, "--no-timing", "--out", "out"]).err;
    let word =
        "holds results of another suite of this name, or of this one before it was changed; they are replaced";
    for (path, replaced) in
        [("a/mine.toml", false), ("a/mine.toml", false), ("b/mine.toml", true), ("b/mine.toml", false)]
    {
        let said = said(path);
        assert_eq!(
            said.lines().filter(|line| line.ends_with(word)).count(),
            usize::from(replaced),
            "{path}: {said}"
        );
    }
}
