/// A number known by sampling, with its standard error.
#[derive(Debug, Clone, Copy, PartialEq, serde::Serialize)]
pub struct Estimate {
    /// The estimate.
    pub value: f64,
    /// Its standard error, in the same unit.
    pub standard_error: f64,
}

/// The estimate from all replicates and its delete-one jackknife standard error:
/// sqrt( (R - 1)/R sum_r (t_(r) - mean t)^2 ), t_(r) the statistic without replicate r.
///
/// `None` when the statistic is undefined with or without some replicate.
///
/// Source: B. Efron, C. Stein, "The jackknife estimate of variance", Ann. Statist. 9 (1981) 586-596.
pub(super) fn jackknife(whole: f64, left_out: &[f64]) -> Option<Estimate> {
    let count = left_out.len() as f64;
    let mean = left_out.iter().sum::<f64>() / count;
    let sum: f64 = left_out.iter().map(|t| (t - mean) * (t - mean)).sum();
    let standard_error = ((count - 1.0) / count * sum).sqrt();
    (whole.is_finite() && standard_error.is_finite()).then_some(Estimate { value: whole, standard_error })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn of_a_mean_it_is_the_classical_standard_error() {
        // For the mean of x the jackknife is exactly s / sqrt(R) (Efron, Stein 1981, sec. 1).
        let x = [3.0, 1.0, 4.0, 1.0, 5.0, 9.0, 2.0, 6.0];
        let total: f64 = x.iter().sum();
        let mean = total / 8.0;
        let left_out: Vec<f64> = x.iter().map(|v| (total - v) / 7.0).collect();
        let s2 = x.iter().map(|v| (v - mean) * (v - mean)).sum::<f64>() / 7.0;
        let estimate = jackknife(mean, &left_out).unwrap();
        assert!((estimate.standard_error - (s2 / 8.0).sqrt()).abs() < 1e-14);
    }

    #[test]
    fn an_undefined_statistic_has_no_estimate() {
        assert_eq!(jackknife(f64::NAN, &[1.0, 2.0]), None);
        assert_eq!(jackknife(1.0, &[1.0, f64::NAN]), None);
    }
}
