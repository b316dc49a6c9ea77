//! How heavy a tail is: the generalised Pareto law fitted to the largest deviations.

/// A generalised Pareto law fitted to exceedances, 1 - F(x) = (1 + shape x / scale)^(-1/shape).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ParetoFit {
    /// Shape xi: moments of order 1/xi and above do not exist; 0 is an exponential tail, below 0 a bounded one.
    pub shape: f64,
    /// Scale sigma, in the unit of the exceedances.
    pub scale: f64,
}

/// Fits a generalised Pareto law to `exceedances` (at least 5 finite numbers above 0, sorted upwards); `None` if
/// they are fewer or not so.
///
/// With n exceedances x and m = 20 + floor(sqrt n) trial values
/// theta_j = 1/x_n + (1 - sqrt(m / (j - 1/2))) / (3 x_q), x_q the first quartile, the profile log-likelihood is
/// l(theta) = n (ln(theta / k) + k - 1) with k(theta) = -mean ln(1 - theta x); theta is the mean of the trial
/// values weighted by their likelihood, the shape -k(theta), the scale k / theta.
///
/// Source: J. Zhang, M. A. Stephens, "A new and efficient estimation method for the generalized Pareto
/// distribution", Technometrics 51 (2009) 316-325 (formulas from memory).
pub fn fit_pareto(exceedances: &[f64]) -> Option<ParetoFit> {
    let n = exceedances.len();
    let (&least, &largest) = (exceedances.first()?, exceedances.last()?);
    if n < 5 || !(least > 0.0 && largest.is_finite()) {
        return None;
    }
    let count = n as f64;
    let quartile = exceedances[(count / 4.0 + 0.5).floor() as usize - 1];
    let trials = 20 + count.sqrt().floor() as usize;
    let k_of = |theta: f64| -exceedances.iter().map(|x| (-theta * x).ln_1p()).sum::<f64>() / count;
    let (thetas, likelihoods): (Vec<f64>, Vec<f64>) = (1..=trials)
        .map(|j| {
            let theta = 1.0 / largest + (1.0 - (trials as f64 / (j as f64 - 0.5)).sqrt()) / (3.0 * quartile);
            let k = k_of(theta);
            (theta, count * ((theta / k).ln() + k - 1.0))
        })
        .unzip();
    let best = likelihoods.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    let weights: Vec<f64> = likelihoods.iter().map(|l| (l - best).exp()).collect();
    let theta = thetas.iter().zip(&weights).map(|(t, w)| t * w).sum::<f64>() / weights.iter().sum::<f64>();
    let k = k_of(theta);
    let fit = ParetoFit { shape: -k, scale: k / theta };
    (fit.shape.is_finite() && fit.scale.is_finite()).then_some(fit)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Quantiles of the law itself, x_i = sigma/xi ((1 - p_i)^-xi - 1), p_i = (i - 1/2)/N: no sampling noise.
    fn quantiles(shape: f64, scale: f64, n: usize) -> Vec<f64> {
        (1..=n).map(|i| scale / shape * ((1.0 - (i as f64 - 0.5) / n as f64).powf(-shape) - 1.0)).collect()
    }

    #[test]
    fn it_agrees_with_an_independent_evaluation() {
        // mpmath, 40 digits, formulas of Zhang & Stephens 2009 from memory: tests/data/f10_kl_bounds_gpd.json,
        // records F10-P11 to F10-P13.
        for (shape, scale, n, found_shape, found_scale) in [
            (0.5, 1.0, 200, 0.5023084638114518, 0.9951171179360775),
            (-0.2, 2.0, 200, -0.18551182763221621, 1.969191948351486),
            (0.9, 0.5, 100, 0.8911635721110528, 0.5011198443539476),
        ] {
            let fit = fit_pareto(&quantiles(shape, scale, n)).unwrap();
            assert!((fit.shape - found_shape).abs() < 1e-12, "{fit:?}");
            assert!((fit.scale / found_scale - 1.0).abs() < 1e-12, "{fit:?}");
        }
    }

    #[test]
    fn what_cannot_be_fitted_is_not() {
        assert_eq!(fit_pareto(&[]), None);
        assert_eq!(fit_pareto(&[1.0, 2.0, 3.0]), None);
        assert_eq!(fit_pareto(&[0.0, 1.0, 2.0, 3.0, 4.0]), None);
        assert_eq!(fit_pareto(&[1.0, 2.0, 3.0, 4.0, f64::INFINITY]), None);
        assert!(fit_pareto(&[1.0; 5]).is_none_or(|f| f.shape.is_finite()));
    }
}
