//! Where a case lies: regime indices of the case, second opinions on every answer.

use std::sync::LazyLock;

use super::entrant::transformed;
use crate::gaussian::Moments;
use crate::method::MethodSpec;
use crate::sensor::Derivatives;
use crate::suite::Case;
use crate::trust::{OPINIONS, RegimeIndex, second_opinion};

/// One value an index of [`RegimeIndex::ALL`]; `None` where it has none.
pub type Indices = [Option<f64>; RegimeIndex::ALL.len()];

/// One value a rule of [`OPINIONS`]; `None` where the rule, or the method, has no answer.
pub type OpinionsOf = [Option<f64>; OPINIONS.len()];

static RULES: LazyLock<[MethodSpec; OPINIONS.len()]> = LazyLock::new(|| {
    OPINIONS.map(|label| MethodSpec::parse(label).expect("a built-in label names a built-in method"))
});

/// What the rules say of one case.
pub(super) struct Panel(Vec<Option<Moments>>);

impl Panel {
    pub fn of(case: &Case) -> Self {
        Self(RULES.iter().map(|rule| transformed(case, rule).ok()?.moments.ok()).collect())
    }

    /// What they say of a method's answer; a rule has no second opinion on itself.
    pub fn on(&self, case: &Case, label: &str, answer: &Moments) -> OpinionsOf {
        let mut opinions = OpinionsOf::default();
        for ((opinion, rule), richer) in opinions.iter_mut().zip(OPINIONS).zip(&self.0) {
            let itself = rule.starts_with(label) && rule[label.len()..].chars().next().is_none_or(|c| c == ':');
            if let (Some(richer), false) = (richer, itself) {
                *opinion = second_opinion(case.prior(), case.sensor().outputs(), richer, answer);
            }
        }
        opinions
    }
}

/// The indices of a case.
pub(super) fn indices(case: &Case) -> Indices {
    let (law, noise) = (case.marginal().law(), case.noise_or_zero());
    let mut at = Derivatives::zeros(law.dimension(), case.sensor().outputs().len());
    case.sensor().hessians(law.mean().as_slice(), &mut at);
    let spread = case.sensor().natural_spread(law);
    RegimeIndex::ALL.map(|index| index.of(&at, law.covariance(), &noise, spread))
}

/// What the opinion of a rule is called in sentences.
pub(crate) fn excess_over(rule: &str) -> String {
    let label = rule.strip_suffix(":max_nodes=5000").unwrap_or(rule);
    format!("excess over {label}")
}

/// Indices and opinions as the columns of a table, in the order of [`RegimeIndex::ALL`] and [`OPINIONS`].
pub(crate) fn regime_columns() -> Vec<String> {
    let indices = RegimeIndex::ALL.iter().map(|index| index.name().to_string());
    indices.chain(OPINIONS.iter().map(|rule| excess_over(rule))).map(|name| name.replace(' ', "_")).collect()
}
