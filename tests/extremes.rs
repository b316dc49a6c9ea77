//! Singular and extreme inputs, end to end: each ends in a sound result or in a clear word on its own case, and the
//! other cases of the suite are none the worse.

use std::f64::consts::PI;

use gaussworthy::reference::Soundness;
use gaussworthy::report::{ResultsFolder, write_summary};
use gaussworthy::score::{Floor, ScoreKind};
use gaussworthy::suite::Suite;
use gaussworthy::survey::{CaseResult, SurveyPlan, SurveyResult, SurveySettings, Watch, summarise, survey};
use gaussworthy::trust::Trust;
use nalgebra::{DMatrix, Vector2};

struct Quiet;

impl Watch for Quiet {
    fn case_done(&self, _points: u64) {}

    fn stop(&self) -> bool {
        false
    }
}

/// A radar and a ship that nobody would worry about; every suite here has it among its families.
const HEAD: &str = "cap = 16384\nprecision = 1e-2\nseed = 3\n\
    [sensor]\nkind = \"range-bearing\"\nstation = [0, 0]\n[noise]\nsd = [\"10 m\", \"0.3 deg\"]\n\
    [[family]]\nname = \"ordinary\"\n[family.prior]\nrange = \"2 km\"\nbearing = \"30 deg\"\nalong_sd = \"30 m\"\nacross_sd = \"30 m\"\n";

/// What is written of it is whole: a reference a case, a row a case and method, numbers or nothing in it.
#[track_caller]
fn written(found: &SurveyResult<'_>) {
    let out = tempfile::tempdir().unwrap();
    let folder = ResultsFolder::open(out.path(), "x").unwrap();
    folder.write(found).unwrap();
    let text = |file: &str| std::fs::read_to_string(folder.path().join(file)).unwrap();
    let (references, scores) = (text("references.jsonl"), text("scores.csv"));
    assert_eq!(references.lines().count(), found.cases.len());
    assert!(references.lines().all(|line| serde_json::from_str::<serde_json::Value>(line).is_ok()));
    assert_eq!(scores.lines().count(), 1 + found.cases.len() * found.plan.methods.len());
    for word in ["NaN", "inf"] {
        assert!(!scores.split([',', '\n']).any(|field| field == word), "{scores}");
        assert!(!references.contains(word), "{references}");
    }
    write_summary(found, &summarise(found), &mut std::io::sink()).unwrap();
}

/// The results on the priors that stand after the ordinary one; the ordinary case must come out as it does alone.
#[track_caller]
fn results(families: &[(&str, &str)]) -> Vec<CaseResult> {
    let all: String = families
        .iter()
        .enumerate()
        .map(|(i, (others, prior))| format!("[[family]]\nname = \"f{i}\"\n{others}[family.prior]\n{prior}\n"))
        .collect();
    let run = |text: &str| {
        let suite = Suite::from_text("x", "x.toml", text, None).unwrap_or_else(|e| panic!("{e}"));
        let plan = SurveyPlan::new(&suite, &SurveySettings::default()).unwrap();
        let found = survey(&suite, &plan, false, &Quiet);
        assert!(found.is_complete());
        assert_eq!(summarise(&found).cases, suite.cases.len());
        written(&found);
        found.cases
    };
    let mut found = run(&format!("{HEAD}{all}"));
    let ordinary = found.remove(0);
    let alone = run(HEAD).remove(0);
    assert_eq!(ordinary.reference.soundness, Soundness::Sound);
    assert_eq!(ordinary.reference.moments, alone.reference.moments);
    for (answer, alone) in ordinary.answers.iter().zip(&alone.answers) {
        assert_eq!(answer.as_ref().unwrap().verdict, alone.as_ref().unwrap().verdict);
    }
    assert_eq!(found.len(), families.len());
    found
}

/// The words of all methods' verdicts.
fn verdicts(result: &CaseResult) -> Vec<(Trust, &str)> {
    result.answers.iter().map(|a| a.as_ref().unwrap()).map(|a| (a.verdict.trust, &*a.verdict.reason)).collect()
}

/// Every method undecided, in these words.
#[track_caller]
fn all_undecided(result: &CaseResult, word: &str) {
    for (trust, reason) in verdicts(result) {
        assert_eq!(trust, Trust::Undecided);
        assert!(reason.contains(word), "{reason}");
    }
}

/// How far standard errors may be off: odds of 2e-6 a comparison in Student's law with 31 degrees of freedom, so 1e-4
/// over the fifty or so comparisons of this file.
const FAR: f64 = 5.8;
/// Rounding of sums over 16,384 samples, relative to the size of what is summed.
const ROUNDING: f64 = 1e-12;

#[track_caller]
fn agree(found: f64, exact: f64, standard_error: f64, size: f64, what: &str) {
    let bound = FAR * standard_error + ROUNDING * size;
    assert!((found - exact).abs() <= bound, "{what}: {found} is not {exact} within {bound:.1e}");
}

/// A prior on a line, m + t d with t a unit normal: one direction has variance, another has none. The moments of range
/// and bearing are integrals over t, by the trapezoidal rule, which on smooth functions under a normal weight converges
/// faster than any power of the step (L. N. Trefethen, J. A. C. Weideman, SIAM Rev. 56 (2014) 385-458).
#[test]
fn a_component_or_a_direction_known_exactly() {
    let (sine, cosine) = 33_f64.to_radians().sin_cos();
    let ahead = 2000.0 * Vector2::new(cosine, sine);
    let lines = [
        ("mean = [2000, 300]\nsd = [0, 30]", Vector2::new(2000.0, 300.0), Vector2::new(0.0, 30.0)),
        ("mean = [2000, 300]\nsd = [30, 0]", Vector2::new(2000.0, 300.0), Vector2::new(30.0, 0.0)),
        (
            "range = \"2 km\"\nbearing = \"33 deg\"\nalong_sd = 0\nacross_sd = \"30 m\"",
            ahead,
            30.0 * Vector2::new(-sine, cosine),
        ),
        (
            "range = \"2 km\"\nbearing = \"33 deg\"\nframe_covariance = [[900, 900], [900, 900]]",
            ahead,
            30.0 * Vector2::new(cosine - sine, sine + cosine),
        ),
    ];
    let found = results(&lines.map(|(prior, ..)| ("", prior)));
    for (result, (prior, m, d)) in found.iter().zip(lines) {
        assert_eq!(result.reference.soundness, Soundness::Sound, "{prior}");
        // E h, E h h', E t h over t = -9 .. 9 in steps of 1/64; beyond lie 1e-19.
        let (mut first, mut second, mut slope) = (Vector2::zeros(), DMatrix::zeros(2, 2), Vector2::zeros());
        for k in -576..=576 {
            let t = f64::from(k) / 64.0;
            let weight = (-0.5 * t * t).exp() / (2.0 * PI).sqrt() / 64.0;
            let x = m + t * d;
            // About m, where digits are not lost.
            let h = Vector2::new(x.norm() - m.norm(), x.y.atan2(x.x) - m.y.atan2(m.x));
            first += weight * h;
            second += weight * h * h.transpose();
            slope += weight * t * h;
        }
        let noise = [100.0, 0.3_f64.to_radians().powi(2)];
        let (moments, error) = (&result.reference.moments, &result.reference.standard_error);
        let sd = |j: usize| moments.covariance[(j, j)].sqrt();
        for j in 0..2 {
            let mean = [m.norm(), m.y.atan2(m.x)][j] + first[j];
            agree(moments.mean[j], mean, error.mean[j], sd(j) + mean, prior);
            for i in 0..2 {
                let variance = second[(i, j)] - first[i] * first[j] + if i == j { noise[i] } else { 0.0 };
                agree(moments.covariance[(i, j)], variance, error.covariance[(i, j)], sd(i) * sd(j), prior);
                agree(
                    moments.cross_covariance[(i, j)],
                    d[i] * slope[j],
                    error.cross_covariance[(i, j)],
                    30.0 * sd(j),
                    prior,
                );
            }
        }
        // Known exactly is known exactly: no rounding in that row.
        for i in (0..2).filter(|&i| d[i] == 0.0) {
            assert!(moments.cross_covariance.row(i).iter().all(|&c| c == 0.0), "{prior}");
        }
        for (trust, reason) in verdicts(result) {
            assert_eq!(trust, Trust::Trusted, "{prior}: {reason}");
        }
    }
}

#[test]
fn a_state_known_exactly() {
    let quadratic = "[family.sensor]\nkind = \"quadratic\"\nA = [[[1, 0], [0, 1]]]\n[family.noise]\nsd = 1\n";
    let silent = "[family.sensor]\nkind = \"linear\"\nH = [[1, 2]]\n[family.noise]\ncovariance = 0\n";
    let prior = "mean = [2000, 300]\nsd = [0, 0]";
    let found = results(&[("", prior), (quadratic, prior), (silent, prior), ("", "mean = [0, 0]\nsd = [0, 0]")]);
    let exact = [
        (vec![2000_f64.hypot(300.0), 300_f64.atan2(2000.0)], vec![100.0, 0.3_f64.to_radians().powi(2)]),
        (vec![4_090_000.0], vec![1.0]),
        (vec![2600.0], vec![0.0]),
    ];
    for (result, (mean, variances)) in found.iter().zip(exact) {
        assert_eq!(result.reference.soundness, Soundness::Sound);
        let moments = &result.reference.moments;
        for j in 0..mean.len() {
            agree(moments.mean[j], mean[j], 0.0, mean[j], "mean");
            agree(moments.covariance[(j, j)], variances[j], 0.0, variances[j], "variance");
        }
        assert_eq!(moments.cross_covariance.amax(), 0.0);
        for answer in &result.answers {
            let answer = answer.as_ref().unwrap();
            assert!(
                (&answer.moments.as_ref().unwrap().mean - &moments.mean).amax() <= ROUNDING * moments.mean.amax()
            );
        }
    }
    all_undecided(&found[0], "the prior knows the state exactly: no measurement updates it");
    all_undecided(&found[1], "the prior knows the state exactly: no measurement updates it");
    all_undecided(&found[2], "the covariance of the measurement is singular: add noise or drop an output");
    assert_eq!(found[2].floor, Floor::Unbounded);
    // On the station itself, where a bearing of atan2(0, 0) is a convention.
    assert_eq!(found[3].reference.soundness, Soundness::Refused);
    all_undecided(&found[3], "output `bearing` has no direction at the one state that the prior knows");
}

/// The square of a variance, which the spread of variances needs, leaves the numbers of a computer at spreads of 1e77 and
/// of 1e-81.
#[test]
fn spreads_beyond_the_numbers_of_a_computer() {
    let linear = "[family.sensor]\nkind = \"linear\"\nH = [[1]]\n[family.noise]\nsd = ";
    for sd in ["1e150", "1e80", "1e-80", "1e-150"] {
        let others = format!("{linear}{sd}\n");
        let found = results(&[(&others, &format!("mean = [0]\nsd = [{sd}]"))]);
        assert_eq!(found[0].reference.soundness, Soundness::Refused, "{sd}");
        all_undecided(&found[0], "measure it in another unit");
    }
    for sd in ["1e60", "1e-60"] {
        let others = format!("{linear}{sd}\n");
        let found = results(&[(&others, &format!("mean = [0]\nsd = [{sd}]"))]);
        assert_eq!(found[0].reference.soundness, Soundness::Sound, "{sd}");
        assert!(verdicts(&found[0]).iter().all(|(trust, _)| *trust == Trust::Trusted), "{sd}");
    }
}

/// y = (x / a)^2 + x z + (a z)^2 with a = 1e-6, x ~ N(a, a^2) and z ~ N(1 / a, 1 / a^2), beside the same in units of one:
/// y = u^2 + u v + v^2 with u, v ~ N(1, 1), whose moments are E y = tr A + m' A m = 5, Var y = 2 tr A A + g' g = 23,
/// Cov((u, v), y) = g = 2 A m = (3, 3) (Mathai, Provost 1992, ch. 3; chapter from memory).
#[test]
fn units_twelve_orders_apart_change_nothing() {
    let sensor = |a: &str| format!("[family.sensor]\nkind = \"quadratic\"\nA = {a}\n[family.noise]\nsd = 1\n");
    let (apart, together) = (sensor("[[[1e12, 1], [0, 1e-12]]]"), sensor("[[[1, 1], [0, 1]]]"));
    let found = results(&[
        (&apart, "mean = [1e-6, 1e6]\nsd = [1e-6, 1e6]"),
        (&together, "mean = [1, 1]\nsd = [1, 1]"),
        // A ship's position and a number of size 1e-11 that goes with it.
        ("", "mean = [2000, 300, 1e-9]\nsd = [30, 20, 3e-11]\ncorrelation = [[0, 2, 0.5]]"),
    ]);
    for (result, units) in found.iter().zip([[1e-6, 1e6], [1.0, 1.0]]) {
        let moments = &result.reference.moments;
        assert_eq!(result.reference.soundness, Soundness::Sound);
        agree(moments.mean[0], 5.0, result.reference.standard_error.mean[0], 5.0, "mean");
        agree(
            moments.covariance[(0, 0)],
            24.0,
            result.reference.standard_error.covariance[(0, 0)],
            24.0,
            "variance",
        );
        for (i, unit) in units.into_iter().enumerate() {
            let error = result.reference.standard_error.cross_covariance[(i, 0)] / unit;
            agree(moments.cross_covariance[(i, 0)] / unit, 3.0, error, 3.0, "cross-covariance");
        }
    }
    for (apart, together) in found[0].answers.iter().zip(&found[1].answers) {
        let (apart, together) = (apart.as_ref().unwrap(), together.as_ref().unwrap());
        assert_eq!(apart.verdict.trust, together.verdict.trust);
        let nees = |scores: &Result<gaussworthy::score::Scores, _>| {
            scores.as_ref().unwrap().get(ScoreKind::NeesRatio).unwrap().value
        };
        // The scaled transform's weights of 1e6 cost six digits.
        const SCALED: f64 = 1e-7;
        let (a, b) = (nees(&apart.scores), nees(&together.scores));
        assert!((a - b).abs() < SCALED * b, "{a} {b}");
    }
    // The third component is reached through the first alone: its row is the first one's, times rho s3 / s1.
    let ship = &found[2];
    assert_eq!(ship.reference.soundness, Soundness::Sound);
    let c = &ship.reference.moments.cross_covariance;
    for j in 0..2 {
        let expected = c[(0, j)] * 0.5 * 3e-11 / 30.0;
        assert!((c[(2, j)] - expected).abs() <= ROUNDING * expected.abs(), "{c}");
    }
    assert!(verdicts(ship).iter().all(|(trust, _)| *trust == Trust::Trusted), "{:?}", verdicts(ship));
}

#[test]
fn a_target_on_top_of_the_station_has_no_bearing() {
    let bearing = "[family.sensor]\nkind = \"bearing-only\"\nstation = [0, 0]\n[family.noise]\nsd = \"1 deg\"\n";
    let found = results(&[
        ("", "mean = [0, 0]\nsd = [30, 30]"),
        ("", "mean = [0, 0]\nsd = [30, 3]"),
        ("", "mean = [0, 0]\nsd = [30, 0]"),
        (bearing, "mean = [0, 0]\nsd = [30, 30]"),
        ("", "mean = [1, -2]\nsd = [\"100 km\", \"100 km\"]"),
    ]);
    for result in &found {
        assert_eq!(result.reference.soundness, Soundness::Refused);
        let reason = result.reference.reason.as_ref().unwrap();
        assert!(reason.contains("output `bearing` has no mean direction"), "{reason}");
        all_undecided(result, &format!("no verdict rests on this reference: {reason}"));
    }
}

/// The station one standard deviation from the mean: the range has Rice's law (S. O. Rice, Bell Syst. Tech. J. 24 (1945)
/// 46-156, eq. 3.10; number from memory), E r = s sqrt(pi / 2) exp(-k / 2) [(1 + k) I0(k / 2) + k I1(k / 2)] with
/// k = m^2 / 2 s^2, E r^2 = m^2 + 2 s^2, and the bearing is symmetric about the mean's. On a line through the station range
/// is a folded normal and the bearing 0 or pi, pi with probability Phi(-1).
#[test]
fn a_prior_that_covers_the_station_is_measured_as_it_is() {
    let found = results(&[("", "mean = [30, 0]\nsd = [30, 30]"), ("", "mean = [30, 0]\nsd = [30, 0]")]);
    // I0(1/4) and I1(1/4) by their series, four terms to 1e-10.
    let x: f64 = 1.0 / 64.0;
    let (i0, i1) = (
        1.0 + x + x.powi(2) / 4.0 + x.powi(3) / 36.0,
        0.125 * (1.0 + x / 2.0 + x.powi(2) / 12.0 + x.powi(3) / 144.0),
    );
    let rice = 30.0 * (PI / 2.0).sqrt() * (-0.25_f64).exp() * (1.5 * i0 + 0.5 * i1);
    let beyond = 0.5 * statrs::function::erf::erfc(0.5_f64.sqrt());
    let folded = 30.0 * ((2.0 / PI).sqrt() * (-0.5_f64).exp() + 1.0 - 2.0 * beyond);
    let bearing_noise = 0.3_f64.to_radians().powi(2);
    let on_line = PI * PI * beyond * (1.0 - beyond) + bearing_noise;
    // Mean and variance of range, mean of bearing, and its variance where it has a closed form.
    let exact = [
        (rice, 2700.0 - rice * rice + 100.0, 0.0, None),
        (folded, 1800.0 - folded * folded + 100.0, PI * beyond, Some(on_line)),
    ];
    for (result, (range, variance, bearing, spread)) in found.iter().zip(exact) {
        assert_eq!(result.reference.soundness, Soundness::Sound);
        let (moments, error) = (&result.reference.moments, &result.reference.standard_error);
        agree(moments.mean[0], range, error.mean[0], range, "range");
        agree(moments.covariance[(0, 0)], variance, error.covariance[(0, 0)], variance, "variance of range");
        agree(moments.mean[1], bearing, error.mean[1], PI, "bearing");
        if let Some(spread) = spread {
            agree(moments.covariance[(1, 1)], spread, error.covariance[(1, 1)], spread, "variance of bearing");
        }
        // No Gaussian is near such a law, and no method is called trusted for want of looking.
        assert!(matches!(result.floor, Floor::Known(floor) if floor.value > 1.0), "{:?}", result.floor);
        for (trust, reason) in verdicts(result) {
            assert_eq!(trust, Trust::Rejected, "{reason}");
        }
    }
}

#[test]
fn a_place_too_far_for_its_digits_is_refused() {
    let found = results(&[("", "mean = [1e60, 1]\nsd = [1e45, 1]")]);
    assert_eq!(found[0].reference.soundness, Soundness::Refused);
    let reason = found[0].reference.reason.as_ref().unwrap();
    assert!(
        reason.contains("the digits of a number do not show it; measure it from an origin nearer by"),
        "{reason}"
    );
    all_undecided(&found[0], "no verdict rests on this reference: ");
    // Where a square is beyond what a number holds already in the prior, the suite is not read.
    let huge = format!("{HEAD}[[family]]\nname = \"huge\"\n[family.prior]\nmean = [1, 1]\nsd = [1e160, 1]\n");
    let said = Suite::from_text("x", "x.toml", &huge, None).unwrap_err().to_string();
    assert_eq!(said, "x.toml:20: family[1].prior.sd[0]: covariance[0][0] is inf; a finite number is needed");
}
