//! A study seen by some limits and within some budget: the counts of every method, and the choice at every point of a
//! family's sweeps. The page draws the same in the reader's browser; a test holds the two together.

use std::cmp::Reverse;
use std::collections::BTreeMap;

use super::study::floor_of;
use super::{Budget, Outcome, Study, StudyEntry};
use crate::method::Evaluations;
use crate::trust::{Judge, Limits, Standing, Trust, lower_bound};

/// Confidence of the bounds on shares.
pub const SHARE_CONFIDENCE: f64 = 0.95;

/// A study by limits and a budget.
#[derive(Debug, Clone)]
pub struct View<'a> {
    study: &'a Study,
    judge: Judge,
    budget: Budget,
    /// One list a case, one outcome an entrant.
    outcomes: Vec<Vec<Outcome>>,
}

/// One entrant's counts.
#[derive(Debug, Clone, PartialEq)]
pub struct Ranked {
    /// Its place among the labels.
    pub entrant: usize,
    /// Cases in which it is trusted.
    pub trusted: usize,
    /// Cases in which it is rejected.
    pub rejected: usize,
    /// Cases in which it cannot be told.
    pub undecided: usize,
    /// Cases that it cannot serve.
    pub skipped: usize,
    /// Whether it is within the budget in every case that it serves.
    pub affordable: bool,
    /// Least and most work; `None` where it is not counted.
    pub work: Option<(u64, u64)>,
    /// What it evaluates at the least and at the most.
    pub evaluations: Option<(Evaluations, Evaluations)>,
    /// Median time as a ratio to first-order Taylor.
    pub time: Option<f64>,
    /// What is broken by the largest factor most often, and how often.
    pub breaks_first: Option<(&'static str, usize)>,
}

impl Ranked {
    /// Cases that it could serve.
    pub fn served(&self) -> usize {
        self.trusted + self.rejected + self.undecided
    }

    /// Lower Clopper-Pearson bound on its share of trusted cases: of a suite whose cases are drawn, the share in all that it
    /// might draw.
    pub fn lower_bound(&self) -> f64 {
        lower_bound(self.trusted, self.served(), SHARE_CONFIDENCE)
    }
}

/// The choices of one family over its one or two sweeps.
#[derive(Debug, Clone, PartialEq)]
pub struct FamilyMap {
    /// The family.
    pub family: String,
    /// Columns of its sweeps among the study's headings: one or two.
    pub axes: Vec<usize>,
    /// Values on each axis, rising.
    pub values: Vec<Vec<f64>>,
    /// The points that there are.
    pub cells: Vec<Cell>,
}

/// One point of it.
#[derive(Debug, Clone, PartialEq)]
pub struct Cell {
    /// The place on each axis.
    pub place: Vec<usize>,
    /// Places of its cases in the study: more than one where something is drawn.
    pub cases: Vec<usize>,
    /// Of them those whose floor is above its limit.
    pub beyond_gaussian: usize,
    /// The entrant of least work within the budget that is trusted in all of them.
    pub choice: Option<usize>,
}

impl<'a> View<'a> {
    /// The study by its own limits, whatever the cost.
    pub fn own(study: &'a Study) -> Self {
        Self::new(study, study.provenance.settings.limits, Budget::default())
    }

    /// The study by other limits and within a budget, of which evaluations, time and derivatives are heeded.
    pub fn new(study: &'a Study, limits: Limits, budget: Budget) -> Self {
        let judge = study.judge.with(limits);
        let of_case = |case: &super::StudyCase| case.entries.iter().map(|entry| entry.judged(&judge).0).collect();
        let outcomes = study.cases.iter().map(of_case).collect();
        Self { study, judge, budget, outcomes }
    }

    /// What is said of an entrant on a case.
    pub fn outcome(&self, case: usize, entrant: usize) -> Outcome {
        self.outcomes[case][entrant]
    }

    /// Where the floor of a case stands.
    pub fn floor(&self, case: usize) -> Standing {
        floor_of(&self.study.cases[case], &self.judge)
    }

    /// Cases whose floor is above its limit: no Gaussian should be trusted there.
    pub fn beyond_gaussian(&self) -> usize {
        (0..self.study.cases.len()).filter(|&case| self.floor(case) == Standing::Broken).count()
    }

    /// Cases in which no entrant is trusted.
    pub fn nobody(&self) -> usize {
        self.outcomes.iter().filter(|of_case| !of_case.iter().any(|outcome| outcome.is_trusted())).count()
    }

    fn affords(&self, entrant: usize, entry: &StudyEntry) -> bool {
        let time = self.study.provenance.time_ratio(&self.study.labels[entrant]);
        let within_time = self.budget.time.zip(time).is_none_or(|(most, time)| time <= most);
        let within_counts = entry.evaluations.is_none_or(|e| {
            let all = e.values + e.jacobians + e.hessians + e.exact_moments;
            self.budget.evaluations.is_none_or(|most| all <= most)
                && !(self.budget.no_derivatives && e.jacobians + e.hessians > 0)
        });
        within_time && within_counts
    }

    /// Every entrant: those within the budget first, by falling count of trusted cases, then by work.
    pub fn ranking(&self) -> Vec<Ranked> {
        self.ranking_of(&|_| true)
    }

    /// The same over the cases of one family.
    pub fn ranking_in(&self, family: &str) -> Vec<Ranked> {
        self.ranking_of(&|case| self.study.cases[case].family == family)
    }

    fn ranking_of(&self, within: &dyn Fn(usize) -> bool) -> Vec<Ranked> {
        let mut ranked: Vec<Ranked> =
            (0..self.study.labels.len()).map(|entrant| self.ranked(entrant, within)).collect();
        ranked.sort_by_key(|r| {
            (!r.affordable, Reverse(r.trusted), r.work.map_or(u64::MAX, |(_, most)| most), r.entrant)
        });
        ranked
    }

    fn ranked(&self, entrant: usize, within: &dyn Fn(usize) -> bool) -> Ranked {
        let mut ranked = Ranked {
            entrant,
            trusted: 0,
            rejected: 0,
            undecided: 0,
            skipped: 0,
            affordable: true,
            work: None,
            evaluations: None,
            time: self.study.provenance.time_ratio(&self.study.labels[entrant]),
            breaks_first: None,
        };
        let mut faults: BTreeMap<&'static str, usize> = BTreeMap::new();
        for (k, case) in self.study.cases.iter().enumerate().filter(|(k, _)| within(*k)) {
            let entry = &case.entries[entrant];
            match self.outcome(k, entrant) {
                Outcome::Skipped => {
                    ranked.skipped += 1;
                    continue;
                }
                Outcome::Judged(Trust::Trusted) => ranked.trusted += 1,
                Outcome::Judged(Trust::Undecided) => ranked.undecided += 1,
                Outcome::Judged(Trust::Rejected) => {
                    ranked.rejected += 1;
                    *faults.entry(self.fault(entry)).or_default() += 1;
                }
            }
            ranked.affordable &= self.affords(entrant, entry);
            if let Some(work) = entry.work {
                let (least, most) = ranked.work.unwrap_or((work, work));
                ranked.work = Some((least.min(work), most.max(work)));
            }
            if let Some(here) = entry.evaluations {
                let (least, most) = ranked.evaluations.unwrap_or((here, here));
                ranked.evaluations = Some((
                    if here.values < least.values { here } else { least },
                    if here.values > most.values { here } else { most },
                ));
            }
        }
        ranked.breaks_first = faults.into_iter().max_by_key(|&(_, count)| count);
        ranked
    }

    /// What a rejected entry breaks by the largest factor.
    fn fault(&self, entry: &StudyEntry) -> &'static str {
        match entry.judged(&self.judge).1.and_then(|verdict| verdict.finding) {
            Some(finding) => finding.fault(),
            None => "no Gaussian",
        }
    }

    /// The choices of every family with one or two sweeps.
    pub fn maps(&self) -> Vec<FamilyMap> {
        self.study.families().into_iter().filter_map(|family| self.map(family)).collect()
    }

    fn map(&self, family: &str) -> Option<FamilyMap> {
        let axes = self.study.sweeps(family);
        if !(1..=2).contains(&axes.len()) {
            return None;
        }
        let of_family: Vec<usize> =
            (0..self.study.cases.len()).filter(|&k| self.study.cases[k].family == family).collect();
        let value = |case: usize, axis: usize| self.study.cases[case].settings[axis].unwrap_or(f64::NAN);
        let values = axes.iter().map(|&axis| {
            let mut values: Vec<f64> = of_family.iter().map(|&case| value(case, axis)).collect();
            values.sort_by(f64::total_cmp);
            values.dedup();
            values
        });
        let values: Vec<Vec<f64>> = values.collect();
        let mut points: BTreeMap<Vec<usize>, Vec<usize>> = BTreeMap::new();
        for &case in &of_family {
            let place = axes.iter().zip(&values);
            let place =
                place.map(|(&axis, values)| values.partition_point(|v| v.total_cmp(&value(case, axis)).is_lt()));
            points.entry(place.collect()).or_default().push(case);
        }
        let cells = points.into_iter().map(|(place, cases)| Cell {
            beyond_gaussian: cases.iter().filter(|&&case| self.floor(case) == Standing::Broken).count(),
            choice: self.choice(&cases),
            place,
            cases,
        });
        let cells = cells.collect();
        Some(FamilyMap { family: family.into(), axes, values, cells })
    }

    /// The entrant of least work that is within the budget and trusted in all of these cases; of equals the first.
    pub fn choice(&self, cases: &[usize]) -> Option<usize> {
        let candidates = (0..self.study.labels.len()).filter_map(|entrant| {
            let entries = || cases.iter().map(|&case| &self.study.cases[case].entries[entrant]);
            let work = entries().filter_map(|entry| entry.work).max()?;
            let trusted = cases.iter().all(|&case| self.outcome(case, entrant).is_trusted());
            (trusted && entries().all(|entry| self.affords(entrant, entry))).then_some((work, entrant))
        });
        candidates.min().map(|(_, entrant)| entrant)
    }
}
