/// What a change does to the gate.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Effect {
    /// Something got worse, or is gone. Fails.
    Worse,
    /// Something that should stand still has moved, and it cannot be told for better or worse. Fails.
    Moved,
    /// Something got better.
    Better,
    /// Something to know: new, or within what chance explains.
    Noted,
}

impl Effect {
    /// All of them, worst first.
    pub const ALL: [Self; 4] = [Self::Worse, Self::Moved, Self::Better, Self::Noted];

    /// Whether the gate stays shut.
    pub fn fails(self) -> bool {
        matches!(self, Self::Worse | Self::Moved)
    }

    /// Its name in tables and files.
    pub fn name(self) -> &'static str {
        match self {
            Self::Worse => "worse",
            Self::Moved => "moved",
            Self::Better => "better",
            Self::Noted => "noted",
        }
    }
}

/// What has changed, weightiest first.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Topic {
    /// A case, a method or an answer came or went.
    Presence,
    /// Whether an answer is a Gaussian.
    Validity,
    /// A verdict.
    Verdict,
    /// A score.
    Score,
    /// The moments of a method.
    Moments,
    /// The moments of a reference, its floor or its soundness.
    Reference,
    /// What a transform evaluates.
    Evaluations,
    /// What a transform takes in time.
    Time,
}

impl Topic {
    /// Its name in files.
    pub fn name(self) -> &'static str {
        match self {
            Self::Presence => "presence",
            Self::Validity => "validity",
            Self::Verdict => "verdict",
            Self::Score => "score",
            Self::Moments => "moments",
            Self::Reference => "reference",
            Self::Evaluations => "evaluations",
            Self::Time => "time",
        }
    }
}

/// What a change is said of: a case, a method, or one on the other.
#[derive(Debug, Clone, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Subject {
    /// The case; `None` for a method as a whole.
    pub case: Option<String>,
    /// The method or outside implementation; `None` for the case and its reference.
    pub method: Option<String>,
}

/// One thing that is otherwise than in the baseline.
#[derive(Debug, Clone, PartialEq)]
pub struct Change {
    /// Of what.
    pub subject: Subject,
    /// What kind of thing.
    pub topic: Topic,
    /// What it does to the gate.
    pub effect: Effect,
    /// What, in words: a score, a moment, `verdict`.
    pub what: String,
    /// The baseline's side.
    pub before: String,
    /// Today's side.
    pub now: String,
    /// For the order among changes of one topic: the larger, the earlier.
    pub size: f64,
}

impl Change {
    /// The change in one line.
    pub fn sentence(&self) -> String {
        format!("{}: {} was {}, is {}", self.effect.name(), self.what, self.before, self.now)
    }
}
