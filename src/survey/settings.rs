use super::{Earlier, Shard};
use crate::method::{MethodSpec, default_methods};
use crate::outside::Outside;
use crate::reference::{SamplerError, SamplerSettings, Store};
use crate::suite::Suite;
use crate::trust::{Judge, Limits};

/// What the user asked for beyond what the suite says; what is given here wins.
#[derive(Debug, Clone, Default)]
pub struct SurveySettings {
    /// Seed of the references (and of a suite's draws, which were made before).
    pub seed: Option<u64>,
    /// Largest standardised standard error of every reference moment.
    pub precision: Option<f64>,
    /// Most samples a case may take.
    pub cap: Option<u64>,
    /// Methods to score.
    pub methods: Option<Vec<MethodSpec>>,
    /// The part of the cases to do; all of them unless given.
    pub shard: Option<Shard>,
    /// Where references are kept for later surveys; nowhere unless given.
    pub store: Option<Store>,
}

/// What a survey of one suite will do: the user's word, else the suite's, else the default.
#[derive(Debug, Clone)]
pub struct SurveyPlan {
    /// How references are sampled.
    pub sampler: SamplerSettings,
    /// Methods, in the order of rows.
    pub methods: Vec<MethodSpec>,
    /// Outside implementations, whose rows come after; see [`SurveyPlan::admit`].
    pub outside: Vec<Outside>,
    /// Limits of trust.
    pub limits: Limits,
    /// Who judges.
    pub judge: Judge,
    /// The part of the cases to do.
    pub shard: Option<Shard>,
    /// Where references are kept.
    pub store: Option<Store>,
    /// Answers of an earlier survey, which are scored on the same references for comparison; none unless given.
    pub earlier: Earlier,
}

/// Why a survey cannot begin.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum SurveyError {
    /// The precision is not above 0 and below 1.
    #[error(
        "precision {0} is not above 0 and below 1; give the standardised standard error to reach, such as 1e-3"
    )]
    Precision(f64),
    /// Nothing can be sampled under these settings.
    #[error(transparent)]
    Sampler(#[from] SamplerError),
    /// Two methods carry the same label.
    #[error("method `{0}` stands twice; its rows could not be told apart")]
    MethodTwice(String),
    /// No method at all.
    #[error("no method to score; leave the list out for the default methods")]
    NoMethod,
}

impl SurveyPlan {
    /// The plan for `suite` under `settings`.
    ///
    /// # Errors
    /// [`SurveyError`] if precision, cap or methods cannot be meant.
    pub fn new(suite: &Suite, settings: &SurveySettings) -> Result<Self, SurveyError> {
        let default = SamplerSettings::default();
        let sampler = SamplerSettings {
            seed: settings.seed.or(suite.seed).unwrap_or(default.seed),
            precision: settings.precision.or(suite.precision).unwrap_or(default.precision),
            cap: settings.cap.or(suite.cap).unwrap_or(default.cap),
            replicates: default.replicates,
            level: default.level,
        };
        if !(sampler.precision > 0.0 && sampler.precision < 1.0) {
            return Err(SurveyError::Precision(sampler.precision));
        }
        sampler.check()?;
        let methods = settings.methods.clone().or_else(|| suite.methods.clone()).unwrap_or_else(default_methods);
        if methods.is_empty() {
            return Err(SurveyError::NoMethod);
        }
        for (i, method) in methods.iter().enumerate() {
            if methods[..i].iter().any(|m| m.label() == method.label()) {
                return Err(SurveyError::MethodTwice(method.label().into()));
            }
        }
        let judge = Judge::new(suite.limits, sampler.replicates, sampler.looks());
        let (shard, store) = (settings.shard, settings.store.clone());
        let (limits, outside, earlier) = (suite.limits, Vec::new(), Earlier::default());
        Ok(Self { sampler, methods, outside, limits, judge, shard, store, earlier })
    }

    /// Takes an outside implementation in, with its answers to this plan's suite and part of it.
    ///
    /// # Errors
    /// [`SurveyError::MethodTwice`] if its name is taken.
    pub fn admit(&mut self, outside: Outside) -> Result<(), SurveyError> {
        if self.entrants().any(|entrant| entrant.label() == outside.name()) {
            return Err(SurveyError::MethodTwice(outside.name().into()));
        }
        self.outside.push(outside);
        Ok(())
    }
}
