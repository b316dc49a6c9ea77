use nalgebra::DMatrix;

use super::{Gaussian, Support};

/// The marginal of a Gaussian on some of its components, and the way back.
///
/// A sensor that reads 2 of 6 state components needs 2 dimensions of points. The cross-covariance of the
/// others follows exactly, because x_o given x_a is linear in x_a: C_o = P_oa P_aa^+ C_a.
#[derive(Debug, Clone, PartialEq)]
pub struct Marginal {
    law: Gaussian,
    lift: Option<DMatrix<f64>>,
}

impl Marginal {
    /// The marginal of `law` (n) on the components `kept` (a), in their order.
    ///
    /// # Panics
    /// If an index in `kept` is not below n or stands twice.
    #[track_caller]
    pub fn new(law: &Gaussian, kept: &[usize]) -> Self {
        let n = law.dimension();
        assert!(kept.iter().all(|&i| i < n), "components {kept:?} of a state of {n}");
        assert!((1..kept.len()).all(|i| !kept[..i].contains(&kept[i])), "a component stands twice in {kept:?}");
        if kept.iter().copied().eq(0..n) {
            return Self { law: law.clone(), lift: None };
        }
        let mean = law.mean().select_rows(kept);
        let p = law.covariance();
        let block = p.select_rows(kept).select_columns(kept);
        let support = Support::of(&block);
        // P_xa P_aa^+ with P_aa^+ = W'W; on the kept components themselves this is the projection on the
        // support, which leaves every C_a of a measurement as it is, so identity stands there exactly.
        let mut lift = p.select_columns(kept) * support.whitener().transpose() * support.whitener();
        for (column, &i) in kept.iter().enumerate() {
            lift.row_mut(i).fill(0.0);
            lift[(i, column)] = 1.0;
        }
        Self { law: Gaussian::from_checked(mean, block), lift: Some(lift) }
    }

    /// The marginal on the components `kept` of a state (n) and of noise with this covariance (q x q), mean zero and
    /// independent of the state, which follows it as components n to n + q. The way back leads to the state alone.
    ///
    /// # Panics
    /// As [`Marginal::new`], with n + q for n.
    #[track_caller]
    pub fn with_noise(law: &Gaussian, noise: &DMatrix<f64>, kept: &[usize]) -> Self {
        let (n, q) = (law.dimension(), noise.nrows());
        let mean = law.mean().clone().resize_vertically(n + q, 0.0);
        let mut covariance = law.covariance().clone().resize(n + q, n + q, 0.0);
        covariance.view_mut((n, n), (q, q)).copy_from(noise);
        let Self { law, lift } = Self::new(&Gaussian::from_checked(mean, covariance), kept);
        let lift = lift.unwrap_or_else(|| DMatrix::identity(n + q, n + q));
        Self { law, lift: Some(lift.rows(0, n).into_owned()) }
    }

    /// The marginal law (a components).
    pub fn law(&self) -> &Gaussian {
        &self.law
    }

    /// The cross-covariance of the whole state (n x p) from that of the kept components (a x p).
    pub fn lift(&self, cross_covariance: DMatrix<f64>) -> DMatrix<f64> {
        match &self.lift {
            None => cross_covariance,
            Some(lift) => lift * cross_covariance,
        }
    }

    /// As [`Marginal::lift`], written into `whole` (n x p); where every component is kept in order there is
    /// nothing to do and `whole` is left alone.
    pub fn lift_into(&self, cross_covariance: &DMatrix<f64>, whole: &mut DMatrix<f64>) {
        if let Some(lift) = &self.lift {
            lift.mul_to(cross_covariance, whole);
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use nalgebra::{dmatrix, dvector};

    #[test]
    fn the_lift_is_the_regression_of_the_others() {
        let p = dmatrix![4.0, 0.6, 1.2; 0.6, 9.0, -0.3; 1.2, -0.3, 1.0];
        let law = Gaussian::new(dvector![1.0, 2.0, 3.0], p.clone()).unwrap();
        let marginal = Marginal::new(&law, &[2, 0]);
        assert_eq!(marginal.law().mean(), &dvector![3.0, 1.0]);
        // A linear reading h x of components 2 and 0 has C = P h' on the whole state.
        let h_full = dvector![-0.5, 0.0, 2.0];
        let c_kept = marginal.law().covariance() * dvector![2.0, -0.5];
        let c = marginal.lift(DMatrix::from_column_slice(2, 1, c_kept.as_slice()));
        assert!((c.column(0) - &p * h_full).amax() < 1e-14);
    }
}
