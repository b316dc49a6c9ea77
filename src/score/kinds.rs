/// One score: what is measured of a method on a case.
///
/// mu, S, C are the reference's moments, hatted ones (^) the method's, b = mu - mu^ (wrapped), P the prior,
/// R the noise, n the number of state components, p of outputs.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum ScoreKind {
    /// Bias of the mean.
    MeanError,
    /// Distance of the covariances.
    CovarianceError,
    /// Least ratio of variances.
    VarianceRatioLow,
    /// Greatest ratio of variances.
    VarianceRatioHigh,
    /// Distance of the cross-covariances.
    CrossCovarianceError,
    /// Divergence that the method adds.
    Excess,
    /// Honesty of the updated state on average.
    NeesRatio,
    /// Honesty of the updated state in its worst direction.
    WorstNees,
    /// What the update wastes.
    InformationLost,
}

impl ScoreKind {
    /// How many there are.
    pub const COUNT: usize = 9;

    /// All of them, in the order of columns.
    pub const ALL: [Self; Self::COUNT] = [
        Self::MeanError,
        Self::CovarianceError,
        Self::VarianceRatioLow,
        Self::VarianceRatioHigh,
        Self::CrossCovarianceError,
        Self::Excess,
        Self::NeesRatio,
        Self::WorstNees,
        Self::InformationLost,
    ];

    /// Its name in files.
    pub fn id(self) -> &'static str {
        match self {
            Self::MeanError => "mean_error",
            Self::CovarianceError => "covariance_error",
            Self::VarianceRatioLow => "variance_ratio_low",
            Self::VarianceRatioHigh => "variance_ratio_high",
            Self::CrossCovarianceError => "cross_covariance_error",
            Self::Excess => "excess",
            Self::NeesRatio => "nees_ratio",
            Self::WorstNees => "worst_nees",
            Self::InformationLost => "information_lost",
        }
    }

    /// Its name in tables and sentences.
    pub fn name(self) -> &'static str {
        match self {
            Self::MeanError => "mean error",
            Self::CovarianceError => "covariance error",
            Self::VarianceRatioLow => "least variance ratio",
            Self::VarianceRatioHigh => "greatest variance ratio",
            Self::CrossCovarianceError => "cross-covariance error",
            Self::Excess => "excess",
            Self::NeesRatio => "expected NEES ratio",
            Self::WorstNees => "worst NEES direction",
            Self::InformationLost => "information lost",
        }
    }

    /// Its unit, or what it is counted in.
    pub fn unit(self) -> &'static str {
        match self {
            Self::MeanError => "reference sd",
            Self::CovarianceError
            | Self::VarianceRatioLow
            | Self::VarianceRatioHigh
            | Self::NeesRatio
            | Self::WorstNees => "ratio",
            Self::CrossCovarianceError => "correlation",
            Self::Excess | Self::InformationLost => "nats",
        }
    }

    /// Its formula.
    pub fn formula(self) -> &'static str {
        match self {
            Self::MeanError => "sqrt(b' S^-1 b)",
            Self::CovarianceError => "|| S^-1/2 S^ S^-1/2 - I ||_F",
            Self::VarianceRatioLow => "least eigenvalue of S^-1/2 S^ S^-1/2",
            Self::VarianceRatioHigh => "greatest eigenvalue of S^-1/2 S^ S^-1/2",
            Self::CrossCovarianceError => "|| P^-1/2 (C^ - C) S^-1/2 ||_F",
            Self::Excess => {
                "1/2 [tr(O^^-1 O) - p + ln det O^ - ln det O + tr(O^^-1 (B-B^) P (B-B^)') + b' O^^-1 b], \
                 O = S - C' P^-1 C, B = C' P^-1"
            }
            Self::NeesRatio => {
                "tr(P+^^-1 M) / n, K^ = C^ S^^-1, P+^ = P - K^ S^ K^', \
                 M = P - K^ C' - C K^' + K^ (S + b b') K^'"
            }
            Self::WorstNees => "greatest eigenvalue of P+^^-1/2 M P+^^-1/2",
            Self::InformationLost => "1/2 (ln det M - ln det M*), M* = P - C S^-1 C'",
        }
    }

    /// How it reads.
    pub fn reads_as(self) -> &'static str {
        match self {
            Self::MeanError => "bias of the predicted measurement in reference standard deviations",
            Self::CovarianceError => "relative error of the predicted covariance, affine-invariant",
            Self::VarianceRatioLow => "below 1: overconfident in some direction of the measurement",
            Self::VarianceRatioHigh => "above 1: too cautious in some direction of the measurement",
            Self::CrossCovarianceError => "error of the state-measurement coupling in correlation units",
            Self::Excess => "KL divergence that the method adds to the best Gaussian: everything at once",
            Self::NeesRatio => "1 honest, above 1: the updated state is overconfident",
            Self::WorstNees => "the direction in which the updated state lies most",
            Self::InformationLost => "what the update wastes against the best linear one",
        }
    }
}
