use statrs::distribution::{Beta, ContinuousCDF};

/// Upper confidence bound on a probability of which `count` of `trials` were seen: the p at which so few or fewer come with
/// probability 1 - `confidence`. One where nothing was tried.
///
/// Source: C. J. Clopper, E. S. Pearson, "The use of confidence or fiducial limits illustrated in the case of the binomial",
/// Biometrika 26 (1934) 404-413; as a quantile of the beta law, NIST/SEMATECH e-Handbook of Statistical Methods, sec. 7.2.4.1
/// (section from memory).
pub fn upper_bound(count: usize, trials: usize, confidence: f64) -> f64 {
    debug_assert!(count <= trials);
    if count >= trials {
        return 1.0;
    }
    quantile((count + 1) as f64, (trials - count) as f64, confidence)
}

/// Lower confidence bound, as [`upper_bound`]: the p at which so many or more come with probability 1 - `confidence`.
pub fn lower_bound(count: usize, trials: usize, confidence: f64) -> f64 {
    debug_assert!(count <= trials);
    if count == 0 {
        return 0.0;
    }
    quantile(count as f64, (trials - count + 1) as f64, 1.0 - confidence)
}

fn quantile(a: f64, b: f64, probability: f64) -> f64 {
    // Both shapes are at least one, for which the law exists.
    Beta::new(a, b).map_or(f64::NAN, |law| law.inverse_cdf(probability))
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The tail of the binomial law at the bound is what the confidence leaves, summed term by term.
    #[test]
    fn a_bound_leaves_the_tail_that_it_must() {
        for trials in [1_usize, 7, 59, 93, 500, 2000] {
            for count in [0, 1, 2, trials / 3, trials.saturating_sub(1)].into_iter().filter(|&k| k < trials) {
                let tail = |p: f64, most: usize| {
                    let mut term = (trials as f64 * (-p).ln_1p()).exp();
                    let mut sum = term;
                    for k in 0..most {
                        term *= (trials - k) as f64 / (k + 1) as f64 * p / (1.0 - p);
                        sum += term;
                    }
                    sum
                };
                let upper = upper_bound(count, trials, 0.95);
                if upper < 0.3 {
                    assert!((tail(upper, count) - 0.05).abs() < 1e-8, "{count} of {trials}: {upper}");
                }
                let lower = lower_bound(count, trials, 0.95);
                if count > 0 && lower < 0.3 {
                    assert!((1.0 - tail(lower, count - 1) - 0.05).abs() < 1e-8, "{count} of {trials}: {lower}");
                }
                assert!(lower <= count as f64 / trials as f64 && count as f64 / trials as f64 <= upper);
            }
        }
    }

    /// 59 trials without a failure, the well-known least number for 95 % / 95 %: 0.95^59 = 0.0485 (S. S. Wilks, "Determination of
    /// sample sizes for setting tolerance limits", Ann. Math. Stat. 12 (1941) 91-96).
    #[test]
    fn fifty_nine_without_a_failure_are_enough() {
        assert!(upper_bound(0, 59, 0.95) <= 0.05 && upper_bound(0, 58, 0.95) > 0.05);
        assert!(upper_bound(1, 93, 0.95) <= 0.05 && upper_bound(1, 92, 0.95) > 0.05);
        assert_eq!((upper_bound(0, 0, 0.95), lower_bound(0, 0, 0.95)), (1.0, 0.0));
    }
}
