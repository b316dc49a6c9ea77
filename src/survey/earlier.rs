use std::collections::HashMap;
use std::sync::Arc;

use crate::gaussian::Moments;

/// Answers of an earlier survey, by case and entrant. Scored on the reference of today, beside the answer of today, they
/// show a change of the method alone: what a reference leaves to chance is common to both and falls out.
#[derive(Debug, Clone, Default)]
pub struct Earlier(Arc<HashMap<String, HashMap<String, Moments>>>);

impl Earlier {
    /// The moments that `label` once gave of `case`.
    pub fn get(&self, case: &str, label: &str) -> Option<&Moments> {
        self.0.get(case)?.get(label)
    }
}

/// Triples of case, entrant and moments, which must have the dimensions of the case.
impl FromIterator<(String, String, Moments)> for Earlier {
    fn from_iter<I: IntoIterator<Item = (String, String, Moments)>>(answers: I) -> Self {
        let mut by_case: HashMap<String, HashMap<String, Moments>> = HashMap::new();
        for (case, label, moments) in answers {
            by_case.entry(case).or_default().insert(label, moments);
        }
        Self(Arc::new(by_case))
    }
}
