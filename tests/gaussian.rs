//! Gaussians against outside values: the exact Kalman update and divergences computed in exact or 40-digit
//! arithmetic, and the update of a state of which a part is known exactly.

mod common;

use common::close::{assert_within, scaled_difference, scaled_vector_difference, standard_deviations};
use common::random;
use common::records::{Record, load, matrix};
use gaussworthy::gaussian::{Gaussian, Marginal, Moments, divergence, joint_divergence};
use nalgebra::{DMatrix, DVector, dmatrix, dvector};
use serde::Deserialize;

/// Claim for the exact update, in units of the standard deviations involved.
const UPDATE_TOLERANCE: f64 = 1e-12;
/// Claim for a divergence \[nats a component\]: each component adds terms of order one that cancel.
const DIVERGENCE_TOLERANCE: f64 = 1e-14;

/// Family 9: R. E. Kalman 1960 in exact rational arithmetic, confirmed by the information form.
#[test]
fn the_linear_update_is_the_exact_kalman_update() {
    for record in load::<Record>("f09_linear_update.json") {
        let inputs = &record.inputs;
        let prior = Gaussian::new(DVector::from_vec(inputs.m.clone()), matrix(&inputs.prior)).unwrap();
        let h = matrix(inputs.rows.as_ref().unwrap());
        let moments = Moments {
            mean: &h * prior.mean(),
            covariance: &h * prior.covariance() * h.transpose() + matrix(inputs.noise.as_ref().unwrap()),
            cross_covariance: prior.covariance() * h.transpose(),
        };
        let (sd_x, sd_y) = (standard_deviations(prior.covariance()), standard_deviations(&moments.covariance));
        let innovation = DVector::from_vec(inputs.y_observed.clone().unwrap()) - &moments.mean;
        let after = moments.conditional(&prior, &innovation).unwrap();

        let extra = |key: &str| -> DMatrix<f64> {
            matrix(&serde_json::from_value::<Vec<Vec<f64>>>(record.extra[key].clone()).unwrap())
        };
        let mean: Vec<f64> = serde_json::from_value(record.extra["conditional_mean"].clone()).unwrap();
        let per_sd_y: Vec<f64> = sd_y.iter().map(|sd| 1.0 / sd).collect();
        let check = |difference, what| assert_within(difference, UPDATE_TOLERANCE, format!("{} {what}", record.id));
        check(scaled_difference(&moments.covariance, &extra("S_with_noise"), &sd_y, &sd_y), "S + R");
        check(scaled_difference(&moments.cross_covariance, &matrix(&record.c), &sd_x, &sd_y), "C");
        check(scaled_difference(&after.gain, &extra("gain_K"), &sd_x, &per_sd_y), "gain");
        check(scaled_vector_difference(&after.mean, &DVector::from_vec(mean), &sd_x), "posterior mean");
        let covariance = extra("conditional_covariance");
        check(scaled_difference(&after.covariance, &covariance, &sd_x, &sd_x), "posterior covariance");
    }
}

/// A record of family 10 that holds a divergence of two Gaussians.
#[derive(Debug, Deserialize)]
struct DivergenceRecord {
    id: String,
    inputs: Pair,
    #[serde(rename = "value_nats_KL_N0_given_N1")]
    nats: f64,
}

#[derive(Debug, Deserialize)]
struct Pair {
    m0: Vec<f64>,
    #[serde(rename = "P0")]
    p0: Vec<Vec<f64>>,
    m1: Vec<f64>,
    #[serde(rename = "P1")]
    p1: Vec<Vec<f64>>,
}

fn divergence_records() -> Vec<DivergenceRecord> {
    load::<serde_json::Value>("f10_kl_bounds_gpd.json")
        .into_iter()
        .filter(|record| record["kind"] == "kl_divergence")
        .map(|record| serde_json::from_value(record).unwrap())
        .collect()
}

/// Family 10: S. Kullback 1959, 40 digits, confirmed by the expectation of the log ratio.
#[test]
fn divergences_agree_with_forty_digits() {
    let records = divergence_records();
    assert_eq!(records.len(), 3, "the file holds three divergences");
    for DivergenceRecord { id, inputs, nats } in records {
        let of = Gaussian::new(DVector::from_vec(inputs.m0), matrix(&inputs.p0)).unwrap();
        let from = Gaussian::new(DVector::from_vec(inputs.m1), matrix(&inputs.p1)).unwrap();
        let tolerance = DIVERGENCE_TOLERANCE * of.dimension() as f64;
        assert_within((divergence(&of, &from).unwrap() - nats).abs(), tolerance, id);
    }
}

/// The record whose two joints share mean and covariance of the first three components: the regression form
/// must give the divergence of the whole joints.
#[test]
fn the_regression_form_is_the_divergence_of_the_joints() {
    const N: usize = 3;
    let shared: Vec<DivergenceRecord> = divergence_records()
        .into_iter()
        .filter(|r| {
            let head = |m: &[f64]| m.iter().take(N).copied().collect::<Vec<_>>();
            let block = |p: &[Vec<f64>]| p.iter().take(N).map(|row| head(row)).collect::<Vec<_>>();
            r.inputs.m0.len() > N
                && head(&r.inputs.m0) == head(&r.inputs.m1)
                && block(&r.inputs.p0) == block(&r.inputs.p1)
        })
        .collect();
    assert_eq!(shared.len(), 1, "one record has a common state");
    let DivergenceRecord { id, inputs, nats } = &shared[0];
    let split = |m: &[f64], p: &[Vec<f64>]| {
        let (m, p) = (DVector::from_column_slice(m), matrix(p));
        let q = m.len() - N;
        let prior = Gaussian::new(m.rows(0, N).into_owned(), p.view((0, 0), (N, N)).into_owned()).unwrap();
        let moments = Moments {
            mean: m.rows(N, q).into_owned(),
            covariance: p.view((N, N), (q, q)).into_owned(),
            cross_covariance: p.view((0, N), (N, q)).into_owned(),
        };
        (prior, moments)
    };
    let (prior, of) = split(&inputs.m0, &inputs.p0);
    let (_, from) = split(&inputs.m1, &inputs.p1);
    let got = joint_divergence(&prior, &of, &from).unwrap();
    assert_within((got - nats).abs(), DIVERGENCE_TOLERANCE * inputs.m0.len() as f64, id);
}

/// x = m + G z with fewer z than x: the state lies on a plane, and everything must follow from z alone.
#[test]
fn a_state_on_a_plane_updates_as_its_free_part_does() {
    const TOLERANCE: f64 = 1e-12;
    let known_exactly = dmatrix![1.0, 0.0; 0.0, 0.0; 0.3, 1.0];
    let a_sum = dmatrix![1.0, 0.0; 0.0, 1.0; 1.0, 1.0];
    let units_apart = dmatrix![1e6, 2e5; 0.0, 1e-6; 0.0, 0.0];
    for g in [known_exactly, a_sum, units_apart] {
        let free = Gaussian::new(dvector![0.5, -2.0], dmatrix![1.0, 0.4; 0.4, 2.0]).unwrap();
        let covariance = random::symmetric(&g * free.covariance() * g.transpose());
        let state = Gaussian::new(&g * free.mean(), covariance).unwrap();
        let noise = dmatrix![0.5, 0.1; 0.1, 0.25];
        // A reading of z, and the same one written for x.
        let moments = |h_z: DMatrix<f64>, spread: f64| Moments {
            mean: &h_z * free.mean(),
            covariance: &h_z * free.covariance() * h_z.transpose() + &noise * spread,
            cross_covariance: free.covariance() * h_z.transpose(),
        };
        let of_z = moments(dmatrix![1.0, -0.5; 0.2, 1.5], 1.0);
        let from_z = moments(dmatrix![1.1, -0.4; 0.1, 1.4], 1.2);
        let lifted = |m: &Moments| Moments { cross_covariance: &g * &m.cross_covariance, ..m.clone() };
        let (of_x, from_x) = (lifted(&of_z), lifted(&from_z));

        let innovation = dvector![0.7, -1.1];
        let z = of_z.conditional(&free, &innovation).unwrap();
        let x = of_x.conditional(&state, &innovation).unwrap();
        let sd = standard_deviations(state.covariance());
        assert_within(scaled_vector_difference(&x.mean, &(&g * z.mean), &sd), TOLERANCE, "mean");
        let covariance = &g * z.covariance * g.transpose();
        assert_within(scaled_difference(&x.covariance, &covariance, &sd, &sd), TOLERANCE, "covariance");

        let (on_z, on_x) = (of_z.regression(&free), of_x.regression(&state));
        let sd_y = standard_deviations(&of_z.covariance);
        assert_within(scaled_difference(&on_x.residual, &on_z.residual, &sd_y, &sd_y), TOLERANCE, "residual");
        // Slopes agree on the plane: B_x G = B_z.
        let sd_z = standard_deviations(free.covariance());
        let per_sd_z: Vec<f64> = sd_z.iter().map(|sd| 1.0 / sd).collect();
        assert_within(scaled_difference(&(on_x.slope * &g), &on_z.slope, &sd_y, &per_sd_z), TOLERANCE, "slope");
        let nats = joint_divergence(&free, &of_z, &from_z).unwrap();
        assert!(nats > 1e-3, "the two readings differ, or this compares nothing");
        assert_within((joint_divergence(&state, &of_x, &from_x).unwrap() - nats).abs(), TOLERANCE, "divergence");
    }
}

/// The marginal of a state of which a read component is known exactly lifts as the conditional law says.
#[test]
fn a_component_known_exactly_takes_no_part_in_the_lift() {
    let p = dmatrix![0.0, 0.0, 0.0; 0.0, 4.0, 1.2; 0.0, 1.2, 9.0];
    let law = Gaussian::new(dvector![5.0, 1.0, 2.0], p).unwrap();
    let marginal = Marginal::new(&law, &[0, 1]);
    let lifted = marginal.lift(dmatrix![0.0; 2.0]);
    // C_2 = P_21 P_11^-1 C_1 = 1.2 / 4 * 2.
    assert!((lifted - dmatrix![0.0; 2.0; 0.6]).amax() < 1e-15);
}

/// A matrix that is singular but for rounding has no divergence and no conditional, rather than a number made
/// of rounding: 0.1, 0.2 and their like leave pivots of 1e-17.
#[test]
fn rounding_does_not_pass_for_variance() {
    let v = dmatrix![0.1, 0.3; 0.2, 0.7; 0.3, 1.0];
    let flat = Gaussian::new(DVector::zeros(3), random::symmetric(&v * v.transpose())).unwrap();
    let round = Gaussian::new(DVector::zeros(3), DMatrix::identity(3, 3)).unwrap();
    assert_eq!(divergence(&flat, &round), None);
    assert_eq!(divergence(&round, &flat), None);

    let moments = Moments {
        mean: DVector::zeros(3),
        covariance: flat.covariance().clone(),
        cross_covariance: flat.covariance().clone(),
    };
    assert_eq!(moments.conditional(&round, &DVector::zeros(3)), None);
}

/// A reading without noise that is linear leaves no residual: the divergence between two such joints is not a
/// finite number, whatever rounding leaves behind.
#[test]
fn a_reading_without_noise_has_no_divergence() {
    let mut rng = random::stream(5);
    for trial in 0..200 {
        let n = 1 + trial % 5;
        let prior = random::law(n, &mut rng);
        let units = DMatrix::from_diagonal(&prior.covariance().diagonal().map(|v| 1.0 / v.sqrt()));
        let h = random::normal_matrix(1, n, &mut rng) * units;
        let moments = |h: &DMatrix<f64>| Moments {
            mean: h * prior.mean(),
            covariance: h * prior.covariance() * h.transpose(),
            cross_covariance: prior.covariance() * h.transpose(),
        };
        let (of, from) = (moments(&h), moments(&(&h * 1.5)));
        assert_eq!(joint_divergence(&prior, &of, &from), None, "trial {trial}, n = {n}");
    }
}

/// A reading a million times finer than the prior is not mistaken for one without noise: y = x + v with
/// R = 1e-12 P against 2 R is 1/2 (1/2 - 1 + ln 2) nats. R is the difference of numbers of size P, which
/// leaves 2^-52 / 1e-12 of it uncertain.
#[test]
fn a_very_precise_reading_has_a_divergence() {
    let prior = Gaussian::new(dvector![0.0], dmatrix![9.0]).unwrap();
    let read = |r: f64| Moments {
        mean: dvector![0.0],
        covariance: dmatrix![9.0 * (1.0 + r)],
        cross_covariance: dmatrix![9.0],
    };
    let nats = joint_divergence(&prior, &read(1e-12), &read(2e-12)).unwrap();
    assert_within((nats - 0.5 * (2f64.ln() - 0.5)).abs(), f64::EPSILON / 1e-12, "precise reading");
}
