use crate::score::{Estimate, ScoreKind};

/// How bad a score is: its distance from the score of a method without error. Ratios are as bad above 1 as below, in logarithms; everything
/// else is at best 0.
pub(super) fn badness(kind: ScoreKind, value: f64) -> f64 {
    match kind {
        ScoreKind::VarianceRatioLow
        | ScoreKind::VarianceRatioHigh
        | ScoreKind::NeesRatio
        | ScoreKind::WorstNees => value.max(f64::MIN_POSITIVE).ln().abs(),
        ScoreKind::MeanError
        | ScoreKind::CovarianceError
        | ScoreKind::CrossCovarianceError
        | ScoreKind::Excess
        | ScoreKind::InformationLost => value,
    }
}

/// A number for people: six digits, an exponent where it is small or large.
pub(super) fn figure(value: f64) -> String {
    match value.abs() {
        0.0 => "0".into(),
        size if (1e-3..1e5).contains(&size) => {
            let decimals = (5 - size.log10().floor() as i32).clamp(0, 8) as usize;
            format!("{value:.decimals$}")
        }
        _ => format!("{value:.4e}"),
    }
}

/// A score with its standard error.
pub(super) fn with_error(e: Estimate) -> String {
    format!("{} +- {:.0e}", figure(e.value), e.standard_error)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn figures_are_short() {
        for (value, text) in [
            (0.0, "0"),
            (1.0105, "1.01050"),
            (-12.5, "-12.5000"),
            (0.00123456, "0.00123456"),
            (99_999.9, "99999.9"),
            (1e-9, "1.0000e-9"),
            (123_456.0, "1.2346e5"),
        ] {
            assert_eq!(figure(value), text);
        }
        assert_eq!(with_error(Estimate { value: 1.0105, standard_error: 2.9e-5 }), "1.01050 +- 3e-5");
    }

    #[test]
    fn a_ratio_is_as_bad_on_either_side_of_one() {
        let bad = |v| badness(ScoreKind::NeesRatio, v);
        assert!((bad(0.5) - bad(2.0)).abs() < 1e-15 && bad(1.0) == 0.0 && bad(0.0) > 100.0);
        assert_eq!(badness(ScoreKind::Excess, 0.02), 0.02);
    }
}
