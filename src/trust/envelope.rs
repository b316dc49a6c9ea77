use serde::{Deserialize, Serialize};

use super::Part;
use super::binomial::{lower_bound, upper_bound};

/// What an envelope is asked to promise.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(default, deny_unknown_fields)]
#[non_exhaustive]
pub struct Claim {
    /// Largest share of cases inside in which the method is not trusted.
    pub risk: f64,
    /// Confidence of that.
    pub confidence: f64,
}

impl Default for Claim {
    /// One case in twenty, at 95 %: common practice, no source.
    fn default() -> Self {
        Self { risk: 0.05, confidence: 0.95 }
    }
}

impl Claim {
    /// Checks that it can be meant.
    ///
    /// # Errors
    /// The key at fault and what would be right.
    pub fn check(&self) -> Result<(), (&'static str, String)> {
        for (key, value) in [("risk", self.risk), ("confidence", self.confidence)] {
            if !(value > 0.0 && value < 1.0) {
                return Err((key, format!("is {value}; give a share above 0 and below 1")));
            }
        }
        Ok(())
    }
}

/// An index that was computed in every case; NaN where it has no value, which is never inside.
#[derive(Debug, Clone, PartialEq)]
pub struct Measured {
    /// What it is called.
    pub name: String,
    /// One value a case.
    pub values: Vec<f64>,
}

/// One limit of an envelope.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Term {
    /// The index.
    pub index: String,
    /// Inside at or below it.
    pub limit: f64,
}

/// Cases inside an envelope, and how many of them were not trusted.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct Counts {
    /// Cases inside.
    pub inside: usize,
    /// Of them not trusted, undecided ones included.
    pub breached: usize,
    /// Upper Clopper-Pearson bound on the share of breaches, at the claim's confidence.
    pub upper_bound: f64,
}

/// Where a method is trusted, and the evidence.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Envelope {
    /// A case is inside when every one of them is kept.
    pub terms: Vec<Term>,
    /// What is promised.
    pub claim: Claim,
    /// On the cases that decided it.
    pub calibration: Counts,
    /// On the cases that had no part in it.
    pub held_out: Counts,
    /// Share of the trusted cases held out that lie inside; `None` where none is trusted.
    pub caught: Option<f64>,
    /// Whether the cases held out speak against the promise: the lower bound of their share of breaches, at 99.9 %, is above
    /// the risk.
    pub contradicted: bool,
}

/// How sure a contradiction must be to be called one.
const CONTRADICTION: f64 = 0.999;
/// Limits on the grid that the calibration walks.
const STEPS: usize = 40;
/// How far above the risk the selection's share of breaches may be where the grid ends.
const OVERREACH: f64 = 1.5;
/// Quantiles of either index of a pair that set its scales.
const SCALES: usize = 10;

/// The envelope by the one of `indices` that catches most, at its limit; `None` where no limit bears the claim.
///
/// `trusted` says of every case whether the method is trusted in it, `parts` what the case is used for.
///
/// The selection chooses the index and a grid of limits. The calibration walks the grid upwards from the first limit with
/// enough cases inside; at each the upper Clopper-Pearson bound on the share of breaches is held against the risk, and the
/// walk ends at the first failure. The grid is fixed before the calibration is looked at, and in a fixed sequence the first
/// false step is taken with probability 1 - confidence at most: so the whole claim holds at the confidence asked.
///
/// Source: A. N. Angelopoulos, S. Bates, E. J. Candes, M. I. Jordan, L. Lei, "Learn then test: calibrating predictive algorithms
/// to achieve risk control" (2021), fixed-sequence testing; P. Bauer, "Multiple testing in clinical trials", Statistics in
/// Medicine 10 (1991) 871-890 (second from memory).
pub fn single_envelope(indices: &[Measured], trusted: &[bool], parts: &[Part], claim: Claim) -> Option<Envelope> {
    let candidates = (0..indices.len()).map(|i| vec![(i, 1.0)]);
    establish(candidates, indices, trusted, parts, claim)
}

/// As [`single_envelope`], by two indices together: inside where both are under their limits. The selection also chooses the
/// ratio of the two limits, out of the quantiles of both.
pub fn pair_envelope(indices: &[Measured], trusted: &[bool], parts: &[Part], claim: Claim) -> Option<Envelope> {
    let scales: Vec<Vec<f64>> = indices.iter().map(|index| scales(index, parts)).collect();
    let pairs = (0..indices.len()).flat_map(|i| (0..i).map(move |k| (k, i)));
    let candidates = pairs.flat_map(|(k, i)| {
        let of_second = scales[i].clone();
        scales[k]
            .iter()
            .flat_map(move |&s| of_second.clone().into_iter().map(move |t| vec![(k, s), (i, t)]))
            .collect::<Vec<_>>()
    });
    establish(candidates, indices, trusted, parts, claim)
}

/// Quantiles of an index over the selection, without its zeros.
fn scales(index: &Measured, parts: &[Part]) -> Vec<f64> {
    let of_selection = index.values.iter().zip(parts).filter(|(v, part)| **part == Part::Selection && **v > 0.0);
    let mut values: Vec<f64> = of_selection.map(|(v, _)| *v).filter(|v| v.is_finite()).collect();
    values.sort_by(f64::total_cmp);
    values.dedup();
    let last = values.len().saturating_sub(1);
    let mut scales: Vec<f64> = (1..=SCALES).filter_map(|k| values.get(k * last / SCALES).copied()).collect();
    scales.dedup();
    scales
}

/// Indices with their scales: one number a case, the largest index in units of its scale.
type Candidate = Vec<(usize, f64)>;

fn combined(candidate: &Candidate, indices: &[Measured], case: usize) -> f64 {
    candidate.iter().map(|&(i, scale)| indices[i].values[case] / scale).fold(f64::NEG_INFINITY, |worst, value| {
        // A NaN must win: max() would drop it.
        if worst.is_nan() || value.is_nan() { f64::NAN } else { worst.max(value) }
    })
}

fn establish(
    candidates: impl Iterator<Item = Candidate>,
    indices: &[Measured],
    trusted: &[bool],
    parts: &[Part],
    claim: Claim,
) -> Option<Envelope> {
    let enough = Enough::new(claim, parts.len());
    let walk = |candidate: &Candidate, part: Part| {
        let of_part = (0..parts.len()).filter(|&case| parts[case] == part);
        Walk::new(of_part.map(|case| (combined(candidate, indices, case), trusted[case])))
    };
    // The first of equals, so that a pair which adds nothing is not taken for another.
    let mut best: Option<(usize, Candidate, Vec<f64>)> = None;
    for candidate in candidates {
        let selection = walk(&candidate, Part::Selection);
        let limits = selection.limits(claim.risk);
        let caught = selection.furthest(&limits, &enough).map_or(0, |limit| selection.trusted_inside(limit));
        if caught > 0 && best.as_ref().is_none_or(|(most, ..)| caught > *most) {
            best = Some((caught, candidate, limits));
        }
    }
    let (_, candidate, limits) = best?;
    let calibration = walk(&candidate, Part::Calibration);
    let limit = calibration.furthest(&limits, &enough)?;
    let held_out = walk(&candidate, Part::HeldOut);
    let terms =
        candidate.iter().map(|&(i, scale)| Term { index: indices[i].name.clone(), limit: limit * scale }).collect();
    let counts = |walk: &Walk| {
        let (inside, breached) = walk.inside(limit);
        Counts { inside, breached, upper_bound: upper_bound(breached, inside, claim.confidence) }
    };
    let (calibrated, counted) = (counts(&calibration), counts(&held_out));
    let all_trusted = held_out.trusted;
    Some(Envelope {
        terms,
        claim,
        calibration: calibrated,
        held_out: counted,
        caught: (all_trusted > 0).then(|| held_out.trusted_inside(limit) as f64 / all_trusted as f64),
        contradicted: lower_bound(counted.breached, counted.inside, CONTRADICTION) > claim.risk,
    })
}

/// The cases of one part in the order of their index.
struct Walk {
    /// Index, and how many cases up to and including this one are not trusted; cases without an index are left out.
    steps: Vec<(f64, usize)>,
    /// Trusted cases, those without an index included.
    trusted: usize,
}

impl Walk {
    fn new(cases: impl Iterator<Item = (f64, bool)>) -> Self {
        let mut cases: Vec<(f64, bool)> = cases.collect();
        let trusted = cases.iter().filter(|(_, trusted)| *trusted).count();
        cases.retain(|(index, _)| index.is_finite());
        cases.sort_by(|a, b| a.0.total_cmp(&b.0));
        let mut breached = 0;
        let steps = cases.into_iter().map(|(index, trusted)| {
            breached += usize::from(!trusted);
            (index, breached)
        });
        Self { steps: steps.collect(), trusted }
    }

    /// Cases at or below the limit, and how many of them are not trusted.
    fn inside(&self, limit: f64) -> (usize, usize) {
        let inside = self.steps.partition_point(|(index, _)| *index <= limit);
        (inside, inside.checked_sub(1).map_or(0, |last| self.steps[last].1))
    }

    fn trusted_inside(&self, limit: f64) -> usize {
        let (inside, breached) = self.inside(limit);
        inside - breached
    }

    /// The grid of limits to try, rising: from where the share of breaches lies most clearly under the risk to where it has
    /// gone beyond.
    fn limits(&self, risk: f64) -> Vec<f64> {
        // In standard deviations of the binomial law at the risk itself.
        let clearness = |rank: usize| {
            let n = (rank + 1) as f64;
            (risk * n - self.steps[rank].1 as f64) / (n * risk * (1.0 - risk)).sqrt()
        };
        let ranks = 0..self.steps.len();
        let Some(first) = ranks.clone().max_by(|&a, &b| clearness(a).total_cmp(&clearness(b))) else {
            return Vec::new();
        };
        let within = |rank: &usize| self.steps[*rank].1 as f64 <= OVERREACH * risk * (rank + 1) as f64;
        let last = ranks.rev().find(within).unwrap_or(first).max(first);
        let mut limits: Vec<f64> = (0..=STEPS).map(|k| self.steps[first + k * (last - first) / STEPS].0).collect();
        // Where the clearest is also the last there is still room below it.
        limits.dedup();
        limits
    }

    /// The last limit of the walk that bears the claim: the walk begins at the first limit with cases enough, and ends before
    /// the first failure.
    fn furthest(&self, limits: &[f64], enough: &Enough) -> Option<f64> {
        let mut furthest = None;
        for &limit in limits {
            let (inside, breached) = self.inside(limit);
            if !enough.could_pass(inside) {
                continue;
            }
            if !enough.passes(inside, breached) {
                break;
            }
            furthest = Some(limit);
        }
        furthest
    }
}

/// How many cases it takes for a number of breaches to bear the claim.
struct Enough {
    /// By number of breaches: the least number of cases whose upper bound is at or under the risk.
    least: Vec<usize>,
}

impl Enough {
    fn new(claim: Claim, most: usize) -> Self {
        let mut least = Vec::new();
        let mut cases = 1;
        for breached in 0.. {
            let bears = |cases: usize| upper_bound(breached, cases, claim.confidence) <= claim.risk;
            // Bounds fall with the number of cases: double, then halve the interval.
            let mut high = cases.max(breached + 1);
            while high <= most && !bears(high) {
                high *= 2;
            }
            let mut low = cases;
            while low < high {
                let middle = low.midpoint(high);
                if bears(middle) { high = middle } else { low = middle + 1 }
            }
            if high > most {
                break;
            }
            least.push(high);
            cases = high;
        }
        Self { least }
    }

    fn could_pass(&self, inside: usize) -> bool {
        self.least.first().is_some_and(|&least| inside >= least)
    }

    fn passes(&self, inside: usize, breached: usize) -> bool {
        self.least.get(breached).is_some_and(|&least| inside >= least)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn so_many_cases_bear_so_many_breaches() {
        let enough = Enough::new(Claim::default(), 700);
        // The least sample sizes at 95 % and 5 %, as in tables of discovery and acceptance sampling: 59, 93, 124, 153, 181.
        // Common practice, no source; the first by 0.95^59.
        assert_eq!(enough.least[..5], [59, 93, 124, 153, 181]);
        assert!(!enough.could_pass(58) && enough.could_pass(59));
        assert!(enough.passes(93, 1) && !enough.passes(92, 1) && !enough.passes(699, 200));
        for (k, &n) in enough.least.iter().enumerate() {
            assert!(upper_bound(k, n, 0.95) <= 0.05 && upper_bound(k, n - 1, 0.95) > 0.05);
        }
    }

    /// Every third case to each part, sound below an index of one.
    fn world(cases: usize) -> (Vec<Measured>, Vec<bool>, Vec<Part>) {
        let values: Vec<f64> = (0..cases).map(|i| 2.0 * i as f64 / cases as f64).collect();
        let trusted = values.iter().map(|v| *v < 1.0).collect();
        let parts = [Part::Selection, Part::Calibration, Part::HeldOut];
        let parts = (0..cases).map(|i| parts[i % 3]).collect();
        let blind = (0..cases).map(|i| (i * 7919 % cases) as f64).collect();
        let never = vec![f64::NAN; cases];
        let measured = |name: &str, values| Measured { name: name.into(), values };
        (vec![measured("blind", blind), measured("never", never), measured("true", values)], trusted, parts)
    }

    #[test]
    fn the_index_that_sees_is_taken_up_to_where_it_breaks() {
        let (indices, trusted, parts) = world(1500);
        let envelope = single_envelope(&indices, &trusted, &parts, Claim::default()).unwrap();
        assert_eq!(envelope.terms.len(), 1);
        assert_eq!(envelope.terms[0].index, "true");
        // 250 sound cases a part; with 250 sound ones seven breaches still bear the claim, 2 / 500 apart.
        let limit = envelope.terms[0].limit;
        assert!((0.97..1.04).contains(&limit), "{limit}");
        assert!(envelope.calibration.upper_bound <= 0.05 && !envelope.contradicted);
        assert!(envelope.caught.unwrap() > 0.96);
        let pair = pair_envelope(&indices, &trusted, &parts, Claim::default()).unwrap();
        assert!(pair.terms.iter().any(|t| t.index == "true"));
        assert!(pair.caught.unwrap() > 0.9);
    }

    #[test]
    fn where_nothing_bears_the_claim_there_is_none() {
        let (indices, trusted, parts) = world(1500);
        assert_eq!(single_envelope(&indices[..2], &trusted, &parts, Claim::default()), None);
        let (few, trusted, parts) = world(300);
        // 50 sound cases a part: not enough for any claim at 5 %.
        assert_eq!(single_envelope(&few, &trusted, &parts, Claim::default()), None);
        assert_eq!(single_envelope(&[], &trusted, &parts, Claim::default()), None);
    }

    #[test]
    fn cases_held_out_that_speak_against_it_are_heard() {
        let (indices, mut trusted, parts) = world(1500);
        for (t, part) in trusted.iter_mut().zip(&parts) {
            if *part == Part::HeldOut {
                *t = false;
            }
        }
        let envelope = single_envelope(&indices, &trusted, &parts, Claim::default()).unwrap();
        assert!(envelope.contradicted);
        assert_eq!((envelope.held_out.inside, envelope.caught), (envelope.held_out.breached, None));
    }
}
