use std::fmt::Debug;

use super::{Exactness, Method, PointSet, PointTransform, Refusal, Transform};
use crate::sensor::Arithmetic;

/// A method that is a weighted point set: its points and weights are all there is to write.
pub trait PointRule: Debug + Send + Sync {
    /// Points and weights for N(0, I) in `a` components, at least one.
    ///
    /// # Errors
    /// [`Refusal`] says why there are none for `a` components.
    fn lay_out(&self, a: usize) -> Result<PointSet, Refusal>;

    /// Up to which total degree polynomials are integrated exactly, whatever the number of components.
    fn degree(&self) -> u32;
}

impl<R: PointRule> Method for R {
    fn plan(&self, a: usize, p: usize, arithmetic: Arithmetic) -> Result<Box<dyn Transform>, Refusal> {
        Refusal::unless_something_is_read(a)?;
        PointTransform::plan(self.lay_out(a)?, p, arithmetic)
    }

    fn exactness(&self) -> Option<Exactness> {
        Some(Exactness::of_rule(self.degree()))
    }

    fn point_set(&self, a: usize) -> Result<Option<PointSet>, Refusal> {
        Refusal::unless_something_is_read(a)?;
        self.lay_out(a).map(Some)
    }
}
