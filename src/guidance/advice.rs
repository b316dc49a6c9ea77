//! Advice for one case: which method to take, what it would cost, and what to do where none can be trusted.

use std::cmp::Ordering;

use serde::Serialize;

use super::{Budget, MethodEnvelopes};
use crate::gaussian::Gaussian;
use crate::method::MethodSpec;
use crate::reference::Soundness;
use crate::score::{Estimate, Floor, ScoreKind};
use crate::suite::{Case, CaseError, Noise, Suite, SuiteError};
use crate::survey::{
    Answered, CaseResult, Indices, OpinionsOf, SurveyError, SurveyPlan, SurveyResult, SurveySettings, Unwatched,
    excess_over, survey,
};
use crate::trust::{Envelope, OPINIONS, RegimeIndex, Standing, Trust};

/// What is advised on one case.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Advice {
    /// The case.
    pub case: String,
    /// How far its reference can be believed, and why not further.
    pub soundness: Soundness,
    /// The reason, if the reference is not sound.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub doubt: Option<String>,
    /// What any Gaussian loses, in nats; `None` where it is not defined.
    pub floor: Option<Estimate>,
    /// Whether the floor is kept, broken or open.
    pub floor_standing: &'static str,
    /// Where it lies: every index that has a value.
    pub indices: Vec<IndexValue>,
    /// The budget.
    pub budget: Budget,
    /// Every method, those that can be recommended first, by rising cost.
    pub methods: Vec<MethodAdvice>,
    /// Methods that no other one beats in excess and work, by rising work.
    pub pareto_work: Vec<String>,
    /// Methods that no other one beats in excess and time, by rising time; empty where nothing was timed.
    pub pareto_time: Vec<String>,
    /// What to take, if anything.
    pub recommendation: Option<String>,
    /// Why, in sentences.
    pub reasons: Vec<String>,
}

/// An index and its value.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct IndexValue {
    /// Its name.
    pub index: String,
    /// Its value.
    pub value: f64,
}

/// How one method fares.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct MethodAdvice {
    /// Its label.
    pub method: String,
    /// `trusted`, `rejected`, `undecided` or `skipped`.
    pub verdict: &'static str,
    /// The reason in one sentence.
    pub reason: String,
    /// The leading cause of a rejection.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub cause: Option<String>,
    /// Why it is beyond the budget, if it is.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub beyond_budget: Option<String>,
    /// Evaluations of any sort.
    pub evaluations: Option<u64>,
    /// Numbers that the sensor computes in one transform, see [`Evaluations::work`](crate::method::Evaluations::work).
    pub work: Option<u64>,
    /// Time of a transform as a ratio to first-order Taylor.
    pub time: Option<f64>,
    /// Excess in nats.
    pub excess: Option<Estimate>,
    /// Envelopes that were given for it: whether the case lies inside.
    pub envelopes: Vec<EnvelopeAdvice>,
}

/// One envelope of a method, and the case against it.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct EnvelopeAdvice {
    /// Every index of it: its value here and its limit.
    pub terms: Vec<TermAdvice>,
    /// Whether every one is at or below its limit.
    pub inside: bool,
}

/// One index of an envelope.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct TermAdvice {
    /// The index.
    pub index: String,
    /// Its value in this case, if it has one.
    pub value: Option<f64>,
    /// Its limit.
    pub limit: f64,
}

/// Why no advice can be given.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum AdviceError {
    /// The case cannot be made into a survey.
    #[error(transparent)]
    Suite(#[from] SuiteError),
    /// The settings cannot be meant.
    #[error(transparent)]
    Survey(#[from] SurveyError),
    /// A scaled case cannot be made.
    #[error(transparent)]
    Case(#[from] CaseError),
}

/// Least scale of a prior's standard deviations that is tried.
const LEAST_SCALE: f64 = 1e-6;
/// Steps down to it, equal in the logarithm.
const STEPS: u32 = 24;
/// Halvings of the step in which trust begins: to within 1 %.
const HALVINGS: usize = 6;

/// Samples a case, scores `methods` on it and draws conclusions; `envelopes` are those of the same sensor, if there are any.
///
/// # Errors
/// [`AdviceError`] if the case or the settings cannot be meant.
pub fn advise(
    case: &Case,
    suite: &Suite,
    settings: &SurveySettings,
    budget: Budget,
    envelopes: &[MethodEnvelopes],
    timed: bool,
) -> Result<Advice, AdviceError> {
    let alone = alone(case.clone(), suite)?;
    let plan = SurveyPlan::new(&alone, settings)?;
    let found = survey(&alone, &plan, timed, &Unwatched);
    let Some(result) = found.cases.first() else {
        // Nobody stops an unwatched survey.
        return Ok(Advice::nothing(case, budget));
    };
    let mut advice = Advice::of(case, &found, result, budget, envelopes);
    if advice.recommendation.is_none() && result.reference.soundness.bears_verdicts() {
        advice.reasons.extend(shrink(case, suite, settings, &plan.methods, &advice)?);
    }
    Ok(advice)
}

/// A suite of this case alone, with the limits and precision of the one that it comes from.
fn alone(case: Case, suite: &Suite) -> Result<Suite, SuiteError> {
    let single = Suite::of_cases(&suite.name, vec![case])?;
    Ok(Suite { seed: suite.seed, precision: suite.precision, cap: suite.cap, limits: suite.limits, ..single })
}

impl Advice {
    fn nothing(case: &Case, budget: Budget) -> Self {
        Self {
            case: case.id().into(),
            soundness: Soundness::Refused,
            doubt: None,
            floor: None,
            floor_standing: Standing::Open.name(),
            indices: Vec::new(),
            budget,
            methods: Vec::new(),
            pareto_work: Vec::new(),
            pareto_time: Vec::new(),
            recommendation: None,
            reasons: Vec::new(),
        }
    }

    fn of(
        case: &Case,
        found: &SurveyResult<'_>,
        result: &CaseResult,
        budget: Budget,
        envelopes: &[MethodEnvelopes],
    ) -> Self {
        let inputs = case.marginal().law().dimension();
        let mut methods: Vec<MethodAdvice> = Vec::new();
        for (m, (spec, answer)) in found.plan.methods.iter().zip(&result.answers).enumerate() {
            let time = found.timing.as_ref().and_then(|t| t.cases.first()?.1.get(m).copied().flatten());
            methods.push(match answer {
                Ok(answered) => {
                    let time = time.map(|cost| cost.ratio.median);
                    MethodAdvice::of(spec, answered, result, inputs, time, budget, envelopes)
                }
                Err(refusal) => MethodAdvice::skipped(spec.label(), refusal.to_string()),
            });
        }
        // A stable sort: equal ones stay in the order in which they were named.
        methods.sort_by(|a, b| {
            let group = |m: &MethodAdvice| (!m.can_be_recommended(), m.verdict != Trust::Trusted.name());
            group(a).cmp(&group(b)).then_with(|| a.compare(b))
        });
        let recommendation = methods.first().filter(|m| m.can_be_recommended()).map(|m| m.method.clone());
        let indices = RegimeIndex::ALL
            .iter()
            .zip(&result.indices)
            .filter_map(|(index, value)| Some(IndexValue { index: index.name().into(), value: (*value)? }));
        let mut advice = Self {
            case: case.id().into(),
            soundness: result.reference.soundness,
            doubt: result.reference.reason.clone(),
            floor: match result.floor {
                Floor::Known(estimate) => Some(estimate),
                _ => None,
            },
            floor_standing: result.floor_standing.name(),
            indices: indices.collect(),
            budget,
            pareto_work: pareto(&methods, |m| m.work.map(|w| w as f64)),
            pareto_time: pareto(&methods, |m| m.time),
            methods,
            recommendation,
            reasons: Vec::new(),
        };
        advice.reasons = advice.explained();
        advice
    }

    /// Why this is recommended, or why nothing is.
    fn explained(&self) -> Vec<String> {
        let mut reasons = Vec::new();
        match (&self.recommendation, self.methods.first()) {
            (Some(method), Some(first)) => {
                let trusted = self.methods.iter().filter(|m| m.verdict == Trust::Trusted.name()).count();
                reasons.push(format!(
                    "Take {method}: of the methods that keep every limit here, {trusted} in all, it takes the least work{}: {}.",
                    if self.budget == Budget::default() { "" } else { " within the budget" },
                    first.price()
                ));
                if !first.envelopes.is_empty() && first.envelopes.iter().all(|e| !e.inside) {
                    reasons.push("The case lies outside every envelope of it: they promise nothing here.".into());
                }
            }
            _ if self.doubt.is_some() => {
                reasons.push("No method can be recommended: no verdict rests on this reference.".into());
            }
            _ => {
                let beyond = |m: &&MethodAdvice| m.verdict == Trust::Trusted.name() && m.beyond_budget.is_some();
                if let Some(method) = self.methods.iter().find(beyond) {
                    reasons.push(format!(
                        "No method within the budget keeps every limit; the cheapest beyond it that does is {}: {}.",
                        method.method,
                        method.beyond_budget.clone().unwrap_or_default()
                    ));
                } else if let Some(open) = self.within_budget(Trust::Undecided) {
                    reasons.push(format!(
                        "No method within the budget is known to keep every limit. {} is undecided: {}; where the limit is near, \
                         more samples (--cap) may tell.",
                        open.method, open.reason
                    ));
                } else {
                    reasons.push("No method within the budget keeps every limit.".into());
                }
                if let Some(nearest) = self.within_budget(Trust::Rejected) {
                    reasons.push(format!("The nearest is {}: {}.", nearest.method, nearest.reason));
                }
            }
        }
        if self.floor_standing == Standing::Broken.name() {
            let floor =
                self.floor.map_or(String::new(), |f| format!(" ({:.3} +- {:.1e} nats)", f.value, f.standard_error));
            reasons.push(format!(
                "The floor is above its limit{floor}: no Gaussian is near the true law here, whatever its moments; a method \
                 that keeps moments and regression exact (a mixture, particles) may be what is needed."
            ));
        }
        reasons
    }

    /// The one of least excess within the budget of which this is said.
    fn within_budget(&self, trust: Trust) -> Option<&MethodAdvice> {
        let of_them = self.methods.iter().filter(|m| m.verdict == trust.name() && m.beyond_budget.is_none());
        let excess = |m: &MethodAdvice| m.excess.map_or(f64::INFINITY, |e| e.value);
        of_them.min_by(|a, b| excess(a).total_cmp(&excess(b)))
    }
}

impl MethodAdvice {
    fn skipped(label: &str, reason: String) -> Self {
        Self {
            method: label.into(),
            verdict: "skipped",
            reason,
            cause: None,
            beyond_budget: None,
            evaluations: None,
            work: None,
            time: None,
            excess: None,
            envelopes: Vec::new(),
        }
    }

    fn of(
        spec: &MethodSpec,
        answered: &Answered,
        result: &CaseResult,
        inputs: usize,
        time: Option<f64>,
        budget: Budget,
        envelopes: &[MethodEnvelopes],
    ) -> Self {
        let counted = answered.evaluations;
        let of_method = envelopes.iter().find(|found| found.method == spec.label());
        let all = of_method.into_iter().flat_map(|e| [&e.index, &e.pair, &e.second_opinion]).flatten();
        Self {
            method: spec.label().into(),
            verdict: answered.verdict.trust.name(),
            reason: answered.verdict.reason.clone(),
            cause: answered.cause.clone(),
            beyond_budget: counted.and_then(|e| budget.objection(spec, e, inputs, time)),
            evaluations: counted.map(|e| e.values + e.jacobians + e.hessians + e.exact_moments),
            work: counted.map(|e| e.work(inputs)),
            time,
            excess: answered.scores.as_ref().ok().and_then(|s| s.get(ScoreKind::Excess)),
            envelopes: all.map(|e| EnvelopeAdvice::of(e, &result.indices, &answered.opinions)).collect(),
        }
    }

    /// Whether it is trusted and within the budget.
    pub fn can_be_recommended(&self) -> bool {
        self.verdict == Trust::Trusted.name() && self.beyond_budget.is_none()
    }

    /// By work, and of equal work by excess; times are of one machine.
    fn compare(&self, other: &Self) -> Ordering {
        let key = |m: &Self| (m.work.unwrap_or(u64::MAX), m.excess.map_or(f64::INFINITY, |e| e.value));
        let ((work, excess), (others_work, others_excess)) = (key(self), key(other));
        work.cmp(&others_work).then(excess.total_cmp(&others_excess))
    }

    fn price(&self) -> String {
        let work = self.work.map_or("unknown".into(), |n| n.to_string());
        let evaluations = self.evaluations.map_or("unknown".into(), |n| n.to_string());
        let time = self.time.map_or(String::new(), |t| format!(", {t:.1} times the time of first-order Taylor"));
        format!("{work}, evaluations {evaluations}{time}")
    }
}

impl EnvelopeAdvice {
    fn of(envelope: &Envelope, indices: &Indices, opinions: &OpinionsOf) -> Self {
        let value = |name: &str| {
            let index = RegimeIndex::ALL.iter().position(|index| index.name() == name);
            let rule = OPINIONS.iter().position(|rule| excess_over(rule) == name);
            index.and_then(|i| indices[i]).or_else(|| rule.and_then(|i| opinions[i]))
        };
        let terms: Vec<TermAdvice> = envelope
            .terms
            .iter()
            .map(|term| TermAdvice { index: term.index.clone(), value: value(&term.index), limit: term.limit })
            .collect();
        let inside = terms.iter().all(|term| term.value.is_some_and(|v| v <= term.limit));
        Self { terms, inside }
    }
}

impl TermAdvice {
    /// The value against the limit, in words.
    pub fn against(&self) -> String {
        match self.value {
            Some(value) if value <= self.limit => format!("{} {value:.3e} <= {:.3e}", self.index, self.limit),
            Some(value) => format!("{} {value:.3e} > {:.3e}", self.index, self.limit),
            None => format!("{} has no value", self.index),
        }
    }
}

/// The methods that no other one beats both in excess and in this cost, by rising cost.
fn pareto(methods: &[MethodAdvice], cost: impl Fn(&MethodAdvice) -> Option<f64>) -> Vec<String> {
    let mut priced: Vec<(f64, f64, &str)> =
        methods.iter().filter_map(|m| Some((cost(m)?, m.excess?.value, m.method.as_str()))).collect();
    priced.sort_by(|a, b| a.0.total_cmp(&b.0).then(a.1.total_cmp(&b.1)));
    let mut least = f64::INFINITY;
    let mut front = Vec::new();
    for (_, excess, label) in priced {
        if excess < least {
            least = excess;
            front.push(label.to_string());
        }
    }
    front
}

/// How far the prior would have to shrink until the cheapest method within the budget is trusted.
fn shrink(
    case: &Case,
    suite: &Suite,
    settings: &SurveySettings,
    methods: &[MethodSpec],
    advice: &Advice,
) -> Result<Vec<String>, AdviceError> {
    let within = advice.methods.iter().filter(|m| m.beyond_budget.is_none() && m.work.is_some());
    let Some(cheapest) = within.min_by(|a, b| a.compare(b)) else { return Ok(Vec::new()) };
    let Some(spec) = methods.iter().find(|m| m.label() == cheapest.method) else { return Ok(Vec::new()) };
    let settings = SurveySettings { methods: Some(vec![spec.clone()]), ..settings.clone() };
    let trusted = |scale: f64| -> Result<bool, AdviceError> {
        let Some(case) = scaled(case, scale)? else { return Ok(false) };
        let alone = alone(case, suite)?;
        let plan = SurveyPlan::new(&alone, &settings)?;
        let found = survey(&alone, &plan, false, &Unwatched);
        let answer = found.cases.first().and_then(|c| c.answers.first());
        Ok(matches!(answer, Some(Ok(a)) if a.verdict.trust == Trust::Trusted))
    };
    let label = spec.label();
    // Trust need not grow with every step down (a method that rounds, or draws its points): walk, and stop at the first.
    let (mut high, mut low) = (0.0_f64, None);
    for step in 1..=STEPS {
        let next = LEAST_SCALE.ln() * f64::from(step) / f64::from(STEPS);
        if trusted(next.exp())? {
            low = Some(next);
            break;
        }
        high = next;
    }
    let Some(mut low) = low else {
        return Ok(vec![format!(
            "{label}, the method of least work, is trusted at none of {STEPS} smaller scales of the prior, down to a \
             millionth of its standard deviations."
        )]);
    };
    for _ in 0..HALVINGS {
        let middle = 0.5 * (low + high);
        if trusted(middle.exp())? { low = middle } else { high = middle }
    }
    // Rounded to the safe side: what is said to be trusted is.
    let (low, high) = (three_digits(low.exp(), f64::floor), three_digits(high.exp(), f64::ceil));
    Ok(vec![format!(
        "{label}, the method of least work, would be trusted with every standard deviation of the prior at {low} of what it is \
         (found by bisection: trusted at {low}, not at {high})."
    )])
}

/// Three significant digits, rounded by `rounding`.
fn three_digits(value: f64, rounding: impl Fn(f64) -> f64) -> f64 {
    let step = 10_f64.powi(value.log10().floor() as i32 - 2);
    let digits = rounding(value / step);
    // By the inverse, which is whole: 221 / 1000 is the nearest number to 0.221, 221 * 0.001 is not.
    digits / (1.0 / step).round()
}

/// The case with every standard deviation of its prior scaled; `None` where that leaves no prior.
fn scaled(case: &Case, scale: f64) -> Result<Option<Case>, CaseError> {
    let prior = case.prior();
    let Ok(prior) = Gaussian::new(prior.mean().clone(), prior.covariance() * (scale * scale)) else {
        return Ok(None);
    };
    let noise = Noise { additive: case.noise().cloned(), inside: case.noise_inside().cloned() };
    Case::new(case.id(), case.spec().clone(), prior, noise).map(Some)
}
