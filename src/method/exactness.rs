use std::fmt::{self, Display, Formatter};

/// Up to which total degree of a polynomial sensor the moments of a method are exact, whatever the Gaussian prior.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Exactness {
    /// Of the mean.
    pub mean: Degree,
    /// Of the state-measurement cross-covariance.
    pub cross_covariance: Degree,
    /// Of the covariance.
    pub covariance: Degree,
}

/// A total degree.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Degree {
    /// Polynomials of this total degree and all below.
    UpTo(u32),
    /// Every sensor that the method serves, polynomial or not.
    Every,
}

impl Exactness {
    /// Exact for polynomials up to these total degrees.
    pub const fn up_to(mean: u32, cross_covariance: u32, covariance: u32) -> Self {
        Self {
            mean: Degree::UpTo(mean),
            cross_covariance: Degree::UpTo(cross_covariance),
            covariance: Degree::UpTo(covariance),
        }
    }

    /// What a rule does that integrates polynomials of total degree `degree` exactly: the cross-covariance multiplies
    /// the sensor by one component, the covariance by itself.
    pub const fn of_rule(degree: u32) -> Self {
        Self::up_to(degree, degree.saturating_sub(1), degree / 2)
    }
}

impl Degree {
    /// Whether a polynomial of this total degree is within.
    pub fn covers(self, degree: u32) -> bool {
        match self {
            Self::UpTo(most) => degree <= most,
            Self::Every => true,
        }
    }
}

impl Display for Degree {
    fn fmt(&self, f: &mut Formatter<'_>) -> fmt::Result {
        match self {
            Self::UpTo(degree) => degree.fmt(f),
            Self::Every => f.write_str("all"),
        }
    }
}
