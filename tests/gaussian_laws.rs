//! Laws that every Gaussian must keep, one generic helper a law, on seeded random covariances of 1 to 8
//! components whose units lie up to 12 orders apart.
//!
//! Tolerances scale with size, rounding and the condition number kappa of the correlation matrix (units do
//! not count): c * n * kappa * 2^-52, with one c for all laws.

mod common;

use std::ops::AddAssign;

use common::close::{assert_within, scaled_difference, standard_deviations};
use common::random;
use gaussworthy::gaussian::{Gaussian, Moments, Support, divergence, joint_divergence};
use nalgebra::{DMatrix, DVector};

/// c above.
const ROUNDINGS: f64 = 16.0;
/// Random laws for each dimension.
const TRIALS: u64 = 25;

fn tolerance(covariance: &DMatrix<f64>) -> f64 {
    ROUNDINGS * covariance.nrows() as f64 * random::condition(covariance) * f64::EPSILON
}

/// F F' = A.
fn root_rebuilds(law: &Gaussian) {
    let sd = standard_deviations(law.covariance());
    let f = law.root();
    let difference = scaled_difference(&(&f * f.transpose()), law.covariance(), &sd, &sd);
    assert_within(difference, tolerance(law.covariance()), format!("F F' of {}", law.covariance()));
}

/// W A W' = I, W F = I and F F' = A on the support.
fn support_whitens(law: &Gaussian) {
    let a = law.covariance();
    let support = Support::of(a);
    let (f, w) = (support.factor(), support.whitener());
    let one = DMatrix::identity(support.rank(), support.rank());
    let sd = standard_deviations(a);
    assert_eq!(support.rank(), a.nrows());
    assert_within((w * a * w.transpose() - &one).amax(), tolerance(a), format!("W A W' of {a}"));
    assert_within((w * f - one).amax(), tolerance(a), format!("W F of {a}"));
    assert_within(scaled_difference(&(f * f.transpose()), a, &sd, &sd), tolerance(a), format!("F F' of {a}"));
}

/// A joint of a state of `n` and `p` outputs: the prior, the moments, and the joint as one law.
struct Joint {
    prior: Gaussian,
    moments: Moments,
    whole: Gaussian,
}

impl Joint {
    fn of(whole: Gaussian, n: usize) -> Self {
        let p = whole.dimension() - n;
        let a = whole.covariance();
        let prior =
            Gaussian::new(whole.mean().rows(0, n).into_owned(), a.view((0, 0), (n, n)).into_owned()).unwrap();
        let moments = Moments {
            mean: whole.mean().rows(n, p).into_owned(),
            covariance: a.view((n, n), (p, p)).into_owned(),
            cross_covariance: a.view((0, n), (n, p)).into_owned(),
        };
        Self { prior, moments, whole }
    }

    /// A random one.
    fn random(n: usize, p: usize, rng: &mut rand_pcg::Pcg64) -> Self {
        Self::of(random::law(n + p, rng), n)
    }
}

/// C = P B' and S = B P B' + Omega: the regression form is the same joint.
fn regression_rebuilds(joint: &Joint) {
    let regression = joint.moments.regression(&joint.prior);
    let p = joint.prior.covariance();
    let (sd_x, sd_y) = (standard_deviations(p), standard_deviations(&joint.moments.covariance));
    let cross = p * regression.slope.transpose();
    let whole = &regression.slope * p * regression.slope.transpose() + &regression.residual;
    let tolerance = tolerance(joint.whole.covariance());
    assert_within(scaled_difference(&cross, &joint.moments.cross_covariance, &sd_x, &sd_y), tolerance, "P B'");
    assert_within(scaled_difference(&whole, &joint.moments.covariance, &sd_y, &sd_y), tolerance, "B P B' + Omega");
}

/// K S = C, and P+ + K S K' = P (the law of total variance).
fn conditional_rebuilds(joint: &Joint) {
    let p = joint.moments.mean.len();
    let after = joint.moments.conditional(&joint.prior, &DVector::zeros(p)).unwrap();
    let s = &joint.moments.covariance;
    let (sd_x, sd_y) = (standard_deviations(joint.prior.covariance()), standard_deviations(s));
    let tolerance = tolerance(joint.whole.covariance());
    let cross = scaled_difference(&(&after.gain * s), &joint.moments.cross_covariance, &sd_x, &sd_y);
    assert_within(cross, tolerance, "K S");
    let total = after.covariance + &after.gain * s * after.gain.transpose();
    assert_within(scaled_difference(&total, joint.prior.covariance(), &sd_x, &sd_x), tolerance, "P+ + K S K'");
    assert_eq!(&after.mean, joint.prior.mean(), "no innovation, no shift");
}

/// KL(a || a) = 0, KL(a || b) > 0, and KL does not see a change of units and axes.
fn divergence_is_one(a: &Gaussian, b: &Gaussian, map: &DMatrix<f64>) {
    let nats = divergence(a, b).unwrap();
    let tolerance = (tolerance(a.covariance()) + tolerance(b.covariance())) * (1.0 + nats);
    assert_within(divergence(a, a).unwrap().abs(), tolerance, "KL(a || a)");
    assert!(nats > 0.0, "KL of different laws is {nats}");
    let mapped = |law: &Gaussian| {
        Gaussian::new(map * law.mean(), random::symmetric(map * law.covariance() * map.transpose())).unwrap()
    };
    let moved = divergence(&mapped(a), &mapped(b)).unwrap();
    assert_within((moved - nats).abs(), tolerance, format!("KL {nats} after a change of axes"));
}

/// The regression form of two joints with one prior is the divergence of the whole joints.
fn joint_divergence_is_the_whole(of: &Joint, from: &Joint) {
    let nats = divergence(&of.whole, &from.whole).unwrap();
    let by_regression = joint_divergence(&of.prior, &of.moments, &from.moments).unwrap();
    let tolerance = (tolerance(of.whole.covariance()) + tolerance(from.whole.covariance())) * (1.0 + nats);
    assert_within((by_regression - nats).abs(), tolerance, format!("KL {nats}"));
}

/// Another joint with the prior of `joint` and other moments, of the same size: y' = T y + c with T near the
/// identity in units of the outputs, and fresh noise.
fn neighbour(joint: &Joint, rng: &mut rand_pcg::Pcg64) -> Joint {
    let (n, p) = joint.moments.cross_covariance.shape();
    let sd = DVector::from_vec(standard_deviations(&joint.moments.covariance));
    let into = DMatrix::from_diagonal(&sd);
    let out = DMatrix::from_diagonal(&sd.map(|v| 1.0 / v));
    let t = &into * (DMatrix::identity(p, p) + 0.1 * random::normal_matrix(p, p, rng)) * out;
    let mut map = DMatrix::identity(n + p, n + p);
    map.view_mut((n, n), (p, p)).copy_from(&t);
    let mut covariance = &map * joint.whole.covariance() * map.transpose();
    for j in 0..p {
        covariance[(n + j, n + j)] += 0.1 * sd[j] * sd[j];
    }
    let shift = sd.component_mul(&random::normal_vector(p, rng));
    let mut mean = joint.whole.mean().clone();
    mean.rows_mut(n, p).add_assign(&shift);
    // The state block is the prior's, to the bit.
    covariance.view_mut((0, 0), (n, n)).copy_from(joint.prior.covariance());
    Joint::of(Gaussian::new(mean, random::symmetric(covariance)).unwrap(), n)
}

fn each_dimension(check: impl Fn(usize, &mut rand_pcg::Pcg64)) {
    for n in 1..=8 {
        for trial in 0..TRIALS {
            check(n, &mut random::stream(1000 * n as u64 + trial));
        }
    }
}

#[test]
fn roots_rebuild_their_covariance() {
    each_dimension(|n, rng| root_rebuilds(&random::law(n, rng)));
}

#[test]
fn supports_whiten() {
    each_dimension(|n, rng| support_whitens(&random::law(n, rng)));
}

#[test]
fn regressions_rebuild_the_joint() {
    each_dimension(|n, rng| {
        for p in 1..=3 {
            regression_rebuilds(&Joint::random(n, p, rng));
        }
    });
}

#[test]
fn conditionals_rebuild_the_prior() {
    each_dimension(|n, rng| {
        for p in 1..=3 {
            conditional_rebuilds(&Joint::random(n, p, rng));
        }
    });
}

#[test]
fn divergences_are_divergences() {
    each_dimension(|n, rng| {
        let a = random::law(n, rng);
        let scale = DMatrix::from_diagonal(&a.covariance().diagonal().map(f64::sqrt));
        let b_covariance = {
            let g = random::normal_matrix(n, 2 * n, rng);
            random::symmetric(&scale * (&g * g.transpose()) * &scale)
        };
        let b = Gaussian::new(a.mean() + &scale * random::normal_vector(n, rng), b_covariance).unwrap();
        // Out of the units of `a`, mixed by a well-conditioned matrix, into others.
        let mix = DMatrix::identity(n, n) + 0.2 / n as f64 * random::normal_matrix(n, n, rng);
        let units = DMatrix::from_diagonal(&random::normal_vector(n, rng).map(|z| 10f64.powf(2.0 * z)));
        let map = units * mix * scale.map(|v| if v > 0.0 { 1.0 / v } else { 0.0 });
        divergence_is_one(&a, &b, &map);
    });
}

#[test]
fn the_regression_form_is_the_divergence_of_the_joints() {
    each_dimension(|n, rng| {
        for p in 1..=3 {
            let of = Joint::random(n, p, rng);
            let from = neighbour(&of, rng);
            joint_divergence_is_the_whole(&of, &from);
        }
    });
}

/// Rank r of n components, whatever the units: the root rebuilds, the support has rank r.
#[test]
fn semi_definite_laws_keep_the_laws_of_their_support() {
    each_dimension(|n, rng| {
        let rank = 1 + n / 2;
        let units = DMatrix::from_diagonal(&random::normal_vector(n, rng).map(|z| 10f64.powf(2.0 * z)));
        let g = units * random::normal_matrix(n, rank, rng);
        let a = random::symmetric(&g * g.transpose());
        let law = Gaussian::new(DVector::zeros(n), a.clone()).unwrap();
        let sd = standard_deviations(&a);
        let f = law.root();
        // Dropped eigenvalues are at most 1e-13 n of the largest, which is at most n.
        let tolerance = 2e-13 * (n * n) as f64;
        assert_within(scaled_difference(&(&f * f.transpose()), &a, &sd, &sd), tolerance, "F F'");
        assert_eq!(Support::of(&a).rank(), rank, "rank of {a}");
    });
}

/// The comparison itself: it sees a difference in the scale it was given, and no floor hides one.
#[test]
fn the_comparison_rejects_what_differs() {
    let a = DMatrix::from_row_slice(1, 2, &[1.0, 1e-12]);
    let b = DMatrix::from_row_slice(1, 2, &[1.0, 1.1e-12]);
    assert!((scaled_difference(&a, &b, &[1e-6], &[1.0, 1e-6]) - 0.1).abs() < 1e-12);
    assert_eq!(scaled_difference(&a, &b, &[0.0], &[1.0, 1.0]), f64::INFINITY);
    let nan = DMatrix::from_row_slice(1, 2, &[f64::NAN, 1e-12]);
    assert_eq!(scaled_difference(&nan, &b, &[1.0], &[1.0, 1.0]), f64::INFINITY);
    assert_eq!(scaled_difference(&a, &a, &[0.0], &[0.0, 0.0]), 0.0);
}
