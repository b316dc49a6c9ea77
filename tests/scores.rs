//! Scores against brute force: divergences from samples of the true joint law, honesty from simulated updates.

use gaussworthy::gaussian::{Moments, joint_divergence, wrap};
use gaussworthy::method::{MethodSpec, Problem};
use gaussworthy::reference::{Reference, Sampler, SamplerSettings};
use gaussworthy::score::{Floor, Invalid, ScoreKind, Scorer};
use gaussworthy::suite::Case;
use nalgebra::{Cholesky, DMatrix, DVector, dmatrix, dvector};
use rand::{RngExt, SeedableRng};
use rand_distr::StandardNormal;
use rand_pcg::Pcg64;
use serde_json::json;

/// The harbour radar sees a buoy at 1 km with 120 m of spread across: bent enough that first-order Taylor is
/// overconfident. Invented figures.
fn radar_case() -> Case {
    Case::from_json(json!({
        "case": "radar", "sensor": {"kind": "range-bearing", "station": [0, 0]},
        "prior": {"mean": [1000, 0], "covariance": [[900, 0], [0, 14400]]},
        "noise": {"covariance": [[100, 0], [0, 4e-4]]},
    }))
    .unwrap()
}

fn reference(case: &Case) -> Reference {
    let settings = SamplerSettings { precision: 2e-4, cap: 1 << 23, ..SamplerSettings::default() };
    Sampler::new(case, settings).unwrap().run()
}

fn moments(case: &Case, method: &str) -> Moments {
    let prior = case.marginal().law();
    let (a, p) = (prior.dimension(), case.sensor().outputs().len());
    let noise = case.noise_or_zero();
    let mut moments = Moments::zeros(a, p);
    let method = MethodSpec::parse(method).unwrap();
    let problem = Problem { sensor: case.sensor(), prior, noise: &noise };
    method.plan(a, p).unwrap().apply(problem, &mut moments);
    moments.cross_covariance = case.marginal().lift(moments.cross_covariance);
    moments
}

/// Samples of (x - m, y) from the true joint law, by a stream of its own.
struct Truth {
    rng: Pcg64,
    root: DMatrix<f64>,
    noise_root: DMatrix<f64>,
}

impl Truth {
    fn new(case: &Case, seed: u64) -> Self {
        let noise_root = Cholesky::new(case.noise_or_zero()).unwrap().l();
        Self { rng: Pcg64::seed_from_u64(seed), root: case.prior().root(), noise_root }
    }

    fn normals(&mut self, n: usize) -> DVector<f64> {
        DVector::from_fn(n, |_, _| self.rng.sample(StandardNormal))
    }

    fn draw(&mut self, case: &Case) -> (DVector<f64>, DVector<f64>, DVector<f64>) {
        let n = self.root.nrows();
        let p = self.noise_root.nrows();
        let (z, w) = (self.normals(n), self.normals(p));
        let dx = &self.root * z;
        let mut h = DVector::zeros(p);
        case.sensor().value((case.prior().mean() + &dx).as_slice(), h.as_mut_slice());
        (dx, h, &self.noise_root * w)
    }
}

/// Mean and standard error of a list of independent numbers.
fn mean_of(values: &[f64]) -> (f64, f64) {
    let n = values.len() as f64;
    let mean = values.iter().sum::<f64>() / n;
    let variance = values.iter().map(|v| (v - mean) * (v - mean)).sum::<f64>() / (n - 1.0);
    (mean, (variance / n).sqrt())
}

/// ln N(d; 0, S) of a deviation d.
fn log_density(d: &DVector<f64>, factor: &Cholesky<f64, nalgebra::Dyn>) -> f64 {
    let quadratic = d.dot(&factor.solve(d));
    -0.5 * (quadratic + factor.ln_determinant() + d.len() as f64 * std::f64::consts::TAU.ln())
}

/// excess + floor = KL( true joint || method joint ), here as the mean over 400,000 samples of the true joint of
/// ln p(y | x) - ln q(y | x): p(y | x) is the noise law around h(x), q the method's regression of y on x (the
/// prior is common to both).
///
/// False alarms over seeds: three comparisons at four standard errors of both sides, 2e-4.
#[test]
fn excess_and_floor_are_the_divergence_of_the_true_joint() {
    let case = radar_case();
    let reference = reference(&case);
    let scorer = Scorer::new(case.prior(), case.sensor().outputs(), &reference);
    let Floor::Known(floor) = scorer.floor(case.noise()) else { panic!("the noise is definite") };
    let noise = Cholesky::new(case.noise_or_zero()).unwrap();
    for method in ["taylor-1", "cubature-3", "gauss-hermite:order=5"] {
        let moments = moments(&case, method);
        let excess = scorer.score(&moments).unwrap().get(ScoreKind::Excess).unwrap();
        let regression = moments.regression(case.prior());
        let residual = Cholesky::new(regression.residual.clone()).unwrap();
        let mut truth = Truth::new(&case, 20);
        let gains: Vec<f64> = (0..400_000)
            .map(|_| {
                let (dx, h, v) = truth.draw(&case);
                let mut d = h + &v - &moments.mean - &regression.slope * dx;
                d[1] = wrap(d[1]);
                log_density(&v, &noise) - log_density(&d, &residual)
            })
            .collect();
        let (divergence, error) = mean_of(&gains);
        let found = excess.value + floor.value;
        let off = (found - divergence) / (error.hypot(excess.standard_error).hypot(floor.standard_error));
        assert!(off.abs() < 4.0, "{method}: {found} against {divergence} +- {error}: {off:.1} standard errors");
        assert!(error < 0.02 * divergence, "too coarse to tell: {divergence} +- {error}");
    }
}

/// Expected NEES ratio, worst direction and information lost against 400,000 simulated updates: the gain and the
/// claimed covariance are the method's, the errors are those of the true state.
///
/// False alarms over seeds: two means at four standard errors, 1.3e-4; the worst direction and the lost
/// information come from the same error covariance and are held to 1 %, six of its standard errors.
#[test]
fn nees_scores_are_those_of_simulated_updates() {
    let case = radar_case();
    let reference = reference(&case);
    let scorer = Scorer::new(case.prior(), case.sensor().outputs(), &reference);
    for method in ["taylor-1", "unscented:kappa=1"] {
        let moments = moments(&case, method);
        let scores = scorer.score(&moments).unwrap();
        let update = moments.conditional(case.prior(), &dvector![0.0, 0.0]).unwrap();
        let claimed = Cholesky::new(update.covariance.clone()).unwrap();
        let mut truth = Truth::new(&case, 30);
        let mut outer = DMatrix::zeros(2, 2);
        const N: usize = 400_000;
        let nees: Vec<f64> = (0..N)
            .map(|_| {
                let (dx, h, v) = truth.draw(&case);
                let mut innovation = h + v - &moments.mean;
                innovation[1] = wrap(innovation[1]);
                let error = dx - &update.gain * innovation;
                outer.ger(1.0 / N as f64, &error, &error, 1.0);
                error.dot(&claimed.solve(&error)) / 2.0
            })
            .collect();
        let (simulated, error) = mean_of(&nees);
        let ratio = scores.get(ScoreKind::NeesRatio).unwrap();
        let off = (ratio.value - simulated) / error.hypot(ratio.standard_error);
        assert!(off.abs() < 4.0, "{method}: {ratio:?} against {simulated} +- {error}");

        let l_inverse = claimed.l().try_inverse().unwrap();
        let worst = (&l_inverse * &outer * l_inverse.transpose()).symmetric_eigenvalues().max();
        let found = scores.get(ScoreKind::WorstNees).unwrap().value;
        assert!((found / worst - 1.0).abs() < 0.01, "{method}: worst direction {found} against {worst}");

        let best = reference.moments.conditional(case.prior(), &dvector![0.0, 0.0]).unwrap().covariance;
        let lost = 0.5 * (outer.determinant() / best.determinant()).ln();
        let found = scores.get(ScoreKind::InformationLost).unwrap().value;
        assert!((found - lost).abs() < 0.01, "{method}: lost {found} against {lost}");
    }
}

/// A reference without sampling error: replicates that agree.
fn exact(moments: Moments) -> Reference {
    let (n, p) = moments.cross_covariance.shape();
    Reference {
        standard_error: Moments::zeros(n, p),
        replicates: vec![moments.clone(); 4],
        moments,
        points: 0,
        source: gaussworthy::reference::PointSource::Nets,
        worst_error: 0.0,
        soundness: gaussworthy::reference::Soundness::Sound,
        reason: None,
    }
}

fn plain_case(prior: DMatrix<f64>) -> Case {
    let rows: Vec<Vec<f64>> = prior.row_iter().map(|r| r.iter().copied().collect()).collect();
    let n = rows.len();
    Case::from_json(json!({
        "case": "plain", "sensor": {"kind": "linear", "H": [vec![1.0; n]]},
        "prior": {"mean": vec![0.0; n], "covariance": rows}, "noise": {"covariance": 1.0},
    }))
    .unwrap()
}

/// One state of variance 4, one output of variance 5 = 4 + 1, worked by hand: a method that claims 2.5 and the
/// same coupling has variance ratio 1/2, gain 4/2.5 = 1.6, claimed 4 - 6.4 < 0: an indefinite joint.
#[test]
fn hand_worked_scores() {
    let case = plain_case(dmatrix![4.0]);
    let truth = exact(Moments { mean: dvector![0.0], covariance: dmatrix![5.0], cross_covariance: dmatrix![4.0] });
    let scorer = Scorer::new(case.prior(), case.sensor().outputs(), &truth);
    let indefinite = Moments { mean: dvector![0.0], covariance: dmatrix![2.5], cross_covariance: dmatrix![4.0] };
    assert!(matches!(scorer.score(&indefinite), Err(Invalid::Joint(_))));
    // Claims S^ = 6, C^ = 3, mean off by 0.5.
    let method = Moments { mean: dvector![-0.5], covariance: dmatrix![6.0], cross_covariance: dmatrix![3.0] };
    let scores = scorer.score(&method).unwrap();
    // K = 1/2, claimed 4 - 1.5 = 2.5, actual 4 - 2 * 2 + (5 + 1/4) / 4 = 1.3125, best 4 - 16/5 = 0.8.
    let (b, c, c_hat): (f64, f64, f64) = (0.5, 4.0, 3.0);
    let (omega, omega_hat) = (5.0 - c * c / 4.0, 6.0 - c_hat * c_hat / 4.0);
    let slope = (c - c_hat) / 4.0;
    let excess =
        0.5 * (omega / omega_hat - 1.0 + f64::ln(omega_hat / omega) + (4.0 * slope * slope + b * b) / omega_hat);
    for (kind, expected) in [
        (ScoreKind::MeanError, 0.5 / 5f64.sqrt()),
        (ScoreKind::CovarianceError, 0.2),
        (ScoreKind::VarianceRatioLow, 1.2),
        (ScoreKind::VarianceRatioHigh, 1.2),
        (ScoreKind::CrossCovarianceError, 1.0 / (2.0 * 5f64.sqrt())),
        (ScoreKind::Excess, excess),
        (ScoreKind::NeesRatio, 1.3125 / 2.5),
        (ScoreKind::WorstNees, 1.3125 / 2.5),
        (ScoreKind::InformationLost, 0.5 * f64::ln(1.3125 / 0.8)),
    ] {
        let found = scores.get(kind).unwrap();
        assert!((found.value - expected).abs() < 1e-14, "{}: {found:?}, {expected} expected", kind.id());
        assert!(found.standard_error < 1e-14, "{}: {found:?}", kind.id());
    }
    let divergence = joint_divergence(case.prior(), &truth.moments, &method).unwrap();
    assert!((divergence - excess).abs() < 1e-14);
}

/// Scores do not depend on the units of the state or the measurement.
#[test]
fn scores_are_free_of_units() {
    let truth = Moments {
        mean: dvector![1.0, -2.0],
        covariance: dmatrix![5.0, 0.3; 0.3, 2.0],
        cross_covariance: dmatrix![1.5, 0.2; 0.1, 0.7],
    };
    let method = Moments {
        mean: dvector![1.2, -2.1],
        covariance: dmatrix![4.0, 0.1; 0.1, 2.5],
        cross_covariance: dmatrix![1.2, 0.3; 0.2, 0.6],
    };
    let prior = dmatrix![4.0, 0.5; 0.5, 1.0];
    let (state, output) = (dmatrix![1e6, 0.0; 0.0, 1e-6], dmatrix![0.0, 1e3; 1e-6, 0.0]);
    let scaled = |m: &Moments| Moments {
        mean: &output * &m.mean,
        covariance: &output * &m.covariance * output.transpose(),
        cross_covariance: &state * &m.cross_covariance * output.transpose(),
    };
    let scores = |prior: DMatrix<f64>, truth: Moments, method: Moments| {
        let case = Case::from_json(json!({
            "case": "units", "sensor": {"kind": "linear", "H": [[1, 0], [0, 1]]},
            "prior": {"mean": [0, 0], "covariance": [[1, 0], [0, 1]]},
        }))
        .unwrap();
        let prior = gaussworthy::gaussian::Gaussian::new(dvector![0.0, 0.0], prior).unwrap();
        let truth = exact(truth);
        Scorer::new(&prior, case.sensor().outputs(), &truth).score(&method).unwrap()
    };
    let plain = scores(prior.clone(), truth.clone(), method.clone());
    let far = scores(&state * &prior * state.transpose(), scaled(&truth), scaled(&method));
    for kind in ScoreKind::ALL {
        let (a, b) = (plain.get(kind).unwrap().value, far.get(kind).unwrap().value);
        assert!((a - b).abs() < 1e-12 * a.abs().max(1.0), "{}: {a} and {b}", kind.id());
    }
}

/// Where the state is known exactly in one component, scores speak of the rest.
#[test]
fn a_component_known_exactly_changes_nothing() {
    let truth = |c: DMatrix<f64>| Moments { mean: dvector![0.0], covariance: dmatrix![5.0], cross_covariance: c };
    let method = |c: DMatrix<f64>| Moments { mean: dvector![0.3], covariance: dmatrix![4.5], cross_covariance: c };
    let one = plain_case(dmatrix![4.0]);
    let two = plain_case(dmatrix![4.0, 0.0; 0.0, 0.0]);
    let (t1, t2) = (exact(truth(dmatrix![4.0])), exact(truth(dmatrix![4.0; 0.0])));
    let alone = Scorer::new(one.prior(), one.sensor().outputs(), &t1).score(&method(dmatrix![3.5])).unwrap();
    let beside = Scorer::new(two.prior(), two.sensor().outputs(), &t2).score(&method(dmatrix![3.5; 0.0])).unwrap();
    for kind in ScoreKind::ALL {
        let (a, b) = (alone.get(kind).unwrap().value, beside.get(kind).unwrap().value);
        assert!((a - b).abs() < 1e-14, "{}: {a} and {b}", kind.id());
    }
}

#[test]
fn an_answer_that_is_no_gaussian_is_named() {
    let case = plain_case(dmatrix![4.0]);
    let truth = exact(Moments { mean: dvector![0.0], covariance: dmatrix![5.0], cross_covariance: dmatrix![4.0] });
    let scorer = Scorer::new(case.prior(), case.sensor().outputs(), &truth);
    let answer = |s: f64, c: f64| {
        scorer.score(&Moments { mean: dvector![0.0], covariance: dmatrix![s], cross_covariance: dmatrix![c] })
    };
    assert!(matches!(answer(f64::NAN, 4.0), Err(Invalid::NotFinite)));
    assert!(matches!(answer(-1.0, 4.0), Err(Invalid::Covariance(e)) if (e + 0.2).abs() < 1e-14));
    assert!(matches!(answer(3.0, 4.0), Err(Invalid::Joint(_))));
    assert!(answer(5.0, 4.0).is_ok());
}

/// Two outputs that repeat each other without noise: S is singular, and rounding leaves its last pivot at 1e-18 of
/// either sign. Whitened by such a pivot every score is a finite number without sense, and an exact method was
/// rejected as "no Gaussian: its covariance has the eigenvalue -2.400e-1".
#[test]
fn outputs_that_repeat_each_other_leave_nothing_to_score() {
    for [first, second] in [[1.0, 0.3], [0.1, 0.3], [0.7, 0.1], [1.0 / 3.0, 0.7]] {
        let case = Case::from_json(json!({
            "case": "twice", "sensor": {"kind": "linear", "H": [[first], [second]]},
            "prior": {"mean": [0.1], "covariance": [[0.37]]},
        }));
        let case = case.unwrap();
        let settings = SamplerSettings { cap: 1 << 17, ..SamplerSettings::default() };
        let reference = Sampler::new(&case, settings).unwrap().run();
        let scorer = Scorer::new(case.prior(), case.sensor().outputs(), &reference);
        assert!(!scorer.is_defined(), "{first} and {second}");
        let scores = scorer.score(&moments(&case, "taylor-1")).unwrap();
        assert!(ScoreKind::ALL.iter().all(|&kind| scores.get(kind).is_none()), "{first} and {second}: {scores:?}");
    }
}

/// On a linear sensor the floor is zero. Where the noise is so small beside the spread that Omega is the rounding
/// of S - C'P^-1 C, it is undefined; it was -0.07 +- 0 at a ratio of 1e-15. What is given as known is right to a
/// thousandth of a nat.
#[test]
fn a_floor_that_drowns_in_rounding_is_not_given() {
    let mut known = 0;
    for exponent in -20..=-6 {
        for h in [1.0 / 3.0, 0.7, 1.1, 2.9] {
            let noise = 10f64.powi(exponent);
            let case = Case::from_json(json!({
                "case": "still", "sensor": {"kind": "linear", "H": [[h, 0.3], [0.2, h]]},
                "prior": {"mean": [0, 0], "covariance": [[1, 0.3], [0.3, 2]]}, "noise": {"covariance": noise},
            }));
            let case = case.unwrap();
            let settings = SamplerSettings { cap: 1 << 17, ..SamplerSettings::default() };
            let reference = Sampler::new(&case, settings).unwrap().run();
            match Scorer::new(case.prior(), case.sensor().outputs(), &reference).floor(case.noise()) {
                Floor::Known(floor) => {
                    known += 1;
                    assert!(floor.value.abs() < 1e-3, "R = {noise:e}, h = {h}: {floor:?}");
                }
                Floor::Undefined => assert!(noise < 1e-10, "undefined at R = {noise:e}"),
                Floor::Unbounded | Floor::NoiseInside => panic!("this noise is definite and outside"),
            }
        }
    }
    assert!(known >= 20, "only {known} floors were known");
}
