/// Why a mean or a covariance was refused. Indices count from 0, as they do in a case record.
#[derive(Debug, Clone, Copy, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum GaussianError {
    /// No component at all.
    #[error("it has no component; give at least one")]
    Empty,
    /// The covariance is not square, or does not fit the mean.
    #[error("the covariance is {rows} x {columns}, but {expected} x {expected} is needed")]
    Shape {
        /// Rows given.
        rows: usize,
        /// Columns given.
        columns: usize,
        /// Rows and columns needed.
        expected: usize,
    },
    /// A component of the mean is NaN or infinite.
    #[error("mean[{index}] is {value}; a finite number is needed")]
    MeanNotFinite {
        /// Component.
        index: usize,
        /// What stands there.
        value: f64,
    },
    /// An entry of the covariance is NaN or infinite.
    #[error("covariance[{row}][{column}] is {value}; a finite number is needed")]
    NotFinite {
        /// Row.
        row: usize,
        /// Column.
        column: usize,
        /// What stands there.
        value: f64,
    },
    /// A variance is below zero.
    #[error("covariance[{index}][{index}] is {value}; a variance cannot be negative")]
    NegativeVariance {
        /// Component.
        index: usize,
        /// What stands there.
        value: f64,
    },
    /// Two mirrored entries differ.
    #[error(
        "covariance[{row}][{column}] is {upper}, but covariance[{column}][{row}] is {lower}; a covariance is symmetric"
    )]
    NotSymmetric {
        /// Row.
        row: usize,
        /// Column.
        column: usize,
        /// Entry above the diagonal.
        upper: f64,
        /// Its mirror.
        lower: f64,
    },
    /// The matrix is indefinite: no random vector has this covariance.
    #[error(
        "the covariance is indefinite: its correlation matrix has the eigenvalue {eigenvalue:.3e}; none may be negative"
    )]
    Indefinite {
        /// Least eigenvalue of the matrix scaled to unit variances.
        eigenvalue: f64,
    },
}
