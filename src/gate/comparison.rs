use std::collections::BTreeMap;

use super::baseline::{Baseline, KeptAnswer, KeptCase, KeptReference, question};
use super::change::{Change, Effect, Subject, Topic};
use super::moments::{Units, in_order};
use super::rules::{REFERENCE_ROUNDING, Rules, joint_error, score_rounding};
use super::scores::{badness, figure, with_error};
use crate::gaussian::Moments;
use crate::method::Evaluations;
use crate::reference::Soundness;
use crate::score::{Estimate, ScoreKind, Scores};
use crate::suite::Case;
use crate::survey::{CaseResult, SurveyResult};
use crate::trust::{Standing, Trust};

/// A suite against its baseline.
#[derive(Debug, Clone, PartialEq)]
pub struct Comparison {
    /// Name of the suite.
    pub suite: String,
    /// What is otherwise in how the two were made.
    pub notes: Vec<String>,
    /// What is otherwise in what was found: worst first, then by topic and size.
    pub changes: Vec<Change>,
    /// Everything that was held against the baseline.
    pub compared: Vec<Subject>,
    /// Differences beyond this many joint standard errors are no chance.
    pub quantile: f64,
}

impl Comparison {
    /// Whether the gate stays shut.
    pub fn fails(&self) -> bool {
        self.changes.iter().any(|change| change.effect.fails())
    }

    /// How many changes have this effect.
    pub fn count(&self, effect: Effect) -> usize {
        self.changes.iter().filter(|change| change.effect == effect).count()
    }
}

/// Holds what a survey found, whole and with the plan's [`earlier`](crate::survey::SurveyPlan::earlier) answers taken from
/// `baseline` ([`Baseline::earlier`]), against the baseline. `chances` is how many numbers in the whole run chance has a part in
/// ([`Baseline::chances`] of everything found, summed over suites).
pub fn compare(baseline: &Baseline, survey: &SurveyResult<'_>, rules: &Rules, chances: usize) -> Comparison {
    let today = Baseline::of(survey);
    let replicates = baseline.made.replicates.min(today.made.replicates);
    let quantile = rules.quantile(chances, replicates);
    let mut gate = Gate {
        rules,
        quantile,
        same_sampling: same_sampling(baseline, &today),
        same_limits: baseline.made.limits == today.made.limits,
        vanished: absent(baseline, &today),
        appeared: absent(&today, baseline),
        changes: Vec::new(),
        compared: Vec::new(),
    };
    gate.methods();
    gate.cases(baseline, &today, survey);
    gate.times(baseline, &today);
    let Gate { mut changes, compared, .. } = gate;
    changes.sort_by(|a, b| {
        let rank = |c: &Change| (c.effect, c.topic);
        rank(a).cmp(&rank(b)).then(b.size.total_cmp(&a.size)).then(a.subject.cmp(&b.subject))
    });
    Comparison { suite: today.made.suite.clone(), notes: notes(baseline, &today), changes, compared, quantile }
}

/// Whether references of the same question are the same to the bit unless the program has changed.
fn same_sampling(a: &Baseline, b: &Baseline) -> bool {
    let key = |made: &super::Made| (made.seed, made.precision.to_bits(), made.cap, made.replicates);
    key(&a.made) == key(&b.made)
}

/// Labels that `all` has somewhere and `of` nowhere.
fn absent(all: &Baseline, of: &Baseline) -> Vec<String> {
    let labels = |b: &Baseline| -> std::collections::BTreeSet<String> {
        b.cases.values().flat_map(|case| case.answers.keys().cloned()).collect()
    };
    labels(all).difference(&labels(of)).cloned().collect()
}

fn notes(baseline: &Baseline, today: &Baseline) -> Vec<String> {
    let (before, now) = (&baseline.made, &today.made);
    let mut notes = Vec::new();
    let mut other = |what: &str, before: String, now: String| {
        if before != now {
            notes.push(format!("The baseline was made with another {what}: {before}; now {now}."));
        }
    };
    other("version", before.version.clone(), now.version.clone());
    other("text of the suite (SHA-256)", before.hash.clone(), now.hash.clone());
    other("seed", before.seed.to_string(), now.seed.to_string());
    other("precision", format!("{:e}", before.precision), format!("{:e}", now.precision));
    other("cap", before.cap.to_string(), now.cap.to_string());
    other("number of replicates", before.replicates.to_string(), now.replicates.to_string());
    let limits = |made: &super::Made| serde_json::to_value(made.limits).unwrap_or_default();
    if let (Some(before), Some(now)) = (limits(before).as_object(), limits(now).as_object()) {
        for (name, limit) in now {
            let kept = before.get(name).unwrap_or(limit);
            other(&format!("limit {name}"), kept.to_string(), limit.to_string());
        }
    }
    notes
}

struct Gate<'a> {
    rules: &'a Rules,
    quantile: f64,
    same_sampling: bool,
    same_limits: bool,
    vanished: Vec<String>,
    appeared: Vec<String>,
    changes: Vec<Change>,
    compared: Vec<Subject>,
}

impl Gate<'_> {
    fn methods(&mut self) {
        let of = |method: &String| Subject { case: None, method: Some(method.clone()) };
        for method in &self.vanished {
            self.changes.push(presence(of(method), Effect::Worse, "method", "there", "gone"));
        }
        for method in &self.appeared {
            self.changes.push(presence(of(method), Effect::Noted, "method", "not there", "new"));
        }
    }

    fn cases(&mut self, baseline: &Baseline, today: &Baseline, survey: &SurveyResult<'_>) {
        let found: BTreeMap<&str, &CaseResult> =
            survey.cases.iter().map(|result| (survey.suite.cases[result.index].id(), result)).collect();
        for name in baseline.cases.keys().filter(|name| !today.cases.contains_key(*name)) {
            self.changes.push(presence(whole(name), Effect::Worse, "case", "there", "gone"));
        }
        for (name, now) in &today.cases {
            let Some(before) = baseline.cases.get(name) else {
                self.changes.push(presence(whole(name), Effect::Noted, "case", "not there", "new"));
                continue;
            };
            self.compared.push(whole(name));
            let Some(result) = found.get(name.as_str()) else { continue };
            let case = &survey.suite.cases[result.index];
            if before.question != question(case) {
                let redrawn = if self.same_sampling { "another question" } else { "another (seed?)" };
                self.changes.push(presence(whole(name), Effect::Moved, "case", "one question", redrawn));
                continue;
            }
            let differences: BTreeMap<&str, Option<&Scores>> = survey
                .plan
                .entrants()
                .zip(&result.answers)
                .map(|(entrant, answer)| (entrant.label(), answer.as_ref().ok().and_then(|a| a.change.as_ref())))
                .collect();
            self.case(case, before, now, &differences);
        }
    }

    fn case(
        &mut self,
        case: &Case,
        before: &KeptCase,
        now: &KeptCase,
        differences: &BTreeMap<&str, Option<&Scores>>,
    ) {
        let units = Units::of(case, &before.reference.moments);
        self.reference(case, &units, &before.reference, &now.reference);
        let sampled_alike = before.reference.moments == now.reference.moments;
        let both_sound = before.reference.soundness.bears_verdicts() && now.reference.soundness.bears_verdicts();
        for (label, old) in before.answers.iter().filter(|(label, _)| !self.vanished.contains(label)) {
            let subject = Subject { case: Some(case.id().into()), method: Some(label.clone()) };
            let Some(new) = now.answers.get(label) else {
                self.changes.push(presence(subject, Effect::Worse, "answer", "there", "gone"));
                continue;
            };
            self.compared.push(subject.clone());
            let difference = differences.get(label.as_str()).copied().flatten();
            let mut answer = AnswerGate {
                rules: self.rules,
                quantile: self.quantile,
                // Nothing but the program can have changed a verdict.
                no_chance: sampled_alike || !self.same_limits,
                sampled_alike,
                both_sound,
                label,
                changes: Vec::new(),
            };
            answer.compare(&units, old, new, difference);
            self.changes.extend(answer.changes.into_iter().map(|found| found.of(subject.clone())));
        }
    }

    fn reference(&mut self, case: &Case, units: &Units<'_>, before: &KeptReference, now: &KeptReference) {
        let mut push = |topic: Topic, effect: Effect, what: &str, sides: (String, String), size: f64| {
            let subject = whole(case.id());
            let what = what.to_string();
            self.changes.push(Change { subject, topic, effect, what, before: sides.0, now: sides.1, size });
        };
        if before.soundness != now.soundness {
            let effect = match rank(now.soundness).cmp(&rank(before.soundness)) {
                std::cmp::Ordering::Less => Effect::Better,
                // Two independent estimates that disagree at odds of a million are no chance of a seed.
                _ if self.same_sampling || now.soundness == Soundness::Disputed => Effect::Worse,
                _ => Effect::Noted,
            };
            let sides = (soundness(before.soundness), soundness(now.soundness));
            push(Topic::Reference, effect, "soundness of the reference", sides, f64::INFINITY);
        }
        if !(before.soundness.bears_verdicts() && now.soundness.bears_verdicts()) {
            return;
        }
        let (old_errors, new_errors) = (in_order(&before.standard_error), in_order(&now.standard_error));
        let pairs = units.pairs(&before.moments, &now.moments);
        // The one that is furthest off stands for the case; they move together.
        let furthest =
            pairs
                .iter()
                .zip(old_errors.iter().zip(&new_errors))
                .filter_map(|(pair, (old, new))| {
                    let error = old.hypot(*new);
                    let allowed = REFERENCE_ROUNDING * pair.coarseness + self.quantile * error / pair.unit;
                    (pair.apart > allowed || (pair.apart > 0.0 && !allowed.is_finite() && error == 0.0))
                        .then_some((pair, old, new, pair.apart / allowed))
                })
                .max_by(|a, b| a.3.total_cmp(&b.3));
        if let Some((pair, &old, &new, size)) = furthest {
            let side = |value, standard_error| with_error(Estimate { value, standard_error });
            let sides = (side(pair.before, old), side(pair.now, new));
            push(Topic::Reference, Effect::Moved, &format!("reference: {}", pair.name), sides, size);
        }
        if let (Some(old), Some(new)) = (before.floor, now.floor) {
            let allowed = score_rounding(old.value) + self.quantile * joint_error(old, new);
            let apart = (new.value - old.value).abs();
            if apart > allowed {
                let sides = (with_error(old), with_error(new));
                push(Topic::Reference, Effect::Moved, "floor", sides, apart / allowed);
            }
        }
        if before.floor.is_some() != now.floor.is_some() {
            let word = |floor: Option<Estimate>| floor.map_or("undefined".into(), with_error);
            push(Topic::Reference, Effect::Moved, "floor", (word(before.floor), word(now.floor)), 1.0);
        }
        if before.floor_standing != now.floor_standing {
            let worse = standing(now.floor_standing) > standing(before.floor_standing);
            let chance = before.moments != now.moments && self.same_limits;
            let effect = match (worse, chance) {
                (true, false) => Effect::Worse,
                (true, true) => Effect::Noted,
                (false, _) => Effect::Better,
            };
            let word = |s: Standing| format!("limit {}", s.name());
            let sides = (word(before.floor_standing), word(now.floor_standing));
            push(Topic::Verdict, effect, "floor", sides, 0.0);
        }
    }

    fn times(&mut self, baseline: &Baseline, today: &Baseline) {
        let Some(margin) = self.rules.time_margin else { return };
        for (method, &now) in &today.time_ratios {
            let Some(&before) = baseline.time_ratios.get(method) else { continue };
            let effect = if now > before * margin {
                Effect::Worse
            } else if now < before / margin {
                Effect::Better
            } else {
                continue;
            };
            self.changes.push(Change {
                subject: Subject { case: None, method: Some(method.clone()) },
                topic: Topic::Time,
                effect,
                what: "time, as a ratio to taylor-1".into(),
                before: format!("{before:.2}"),
                now: format!("{now:.2}"),
                size: (now / before).ln().abs(),
            });
        }
    }
}

/// A change of an answer, yet to be laid to its subject.
struct Found {
    topic: Topic,
    effect: Effect,
    what: String,
    before: String,
    now: String,
    size: f64,
}

impl Found {
    fn of(self, subject: Subject) -> Change {
        let Self { topic, effect, what, before, now, size } = self;
        Change { subject, topic, effect, what, before, now, size }
    }
}

/// One answer against another.
struct AnswerGate<'a> {
    rules: &'a Rules,
    quantile: f64,
    no_chance: bool,
    sampled_alike: bool,
    both_sound: bool,
    label: &'a str,
    changes: Vec<Found>,
}

impl AnswerGate<'_> {
    fn push(&mut self, topic: Topic, effect: Effect, what: &str, sides: (String, String), size: f64) {
        self.changes.push(Found { topic, effect, what: what.into(), before: sides.0, now: sides.1, size });
    }

    fn compare(&mut self, units: &Units<'_>, old: &KeptAnswer, new: &KeptAnswer, difference: Option<&Scores>) {
        use KeptAnswer::Given;
        let (
            Given { moments: before, evaluations: old_work, trust: old_trust, scores: old_scores },
            Given { moments: now, evaluations: work, trust, scores },
        ) = (old, new)
        else {
            self.standing_of_answers(old, new);
            return;
        };
        let moved = self.moved(units, before, now);
        let (n, p) = now.cross_covariance.shape();
        let entries = (p + p * (p + 1) / 2 + n * p) as f64;
        match (old_scores, scores) {
            (Ok(old), Ok(new)) => match &moved {
                Some(moved) => self.scores_of_moved(old, new, difference, moved),
                None => self.scores_of_unmoved(old, new, entries),
            },
            (old, new) => {
                let word = |s: &Result<_, String>| s.as_ref().err().map_or("a Gaussian".into(), Clone::clone);
                if old.is_ok() != new.is_ok() {
                    let effect = match new.is_ok() {
                        true => Effect::Better,
                        false if moved.is_some() || self.no_chance => Effect::Worse,
                        false => Effect::Noted,
                    };
                    self.push(Topic::Validity, effect, "validity", (word(old), word(new)), 0.0);
                }
                if let Some(moved) = moved.as_ref().filter(|_| old.is_err()) {
                    let effect = if new.is_ok() { Effect::Better } else { Effect::Moved };
                    self.push_moved(effect, moved);
                }
            }
        }
        if old_trust != trust {
            let effect = match (level(*trust) > level(*old_trust), moved.is_some() || self.no_chance) {
                (true, true) => Effect::Worse,
                (true, false) => Effect::Noted,
                (false, _) => Effect::Better,
            };
            self.push(Topic::Verdict, effect, "verdict", (old_trust.name().into(), trust.name().into()), 0.0);
        }
        self.evaluations(*old_work, *work);
    }

    /// At least one side has no answer.
    fn standing_of_answers(&mut self, old: &KeptAnswer, new: &KeptAnswer) {
        use KeptAnswer::{Given, Missing, Skipped};
        let word = |answer: &KeptAnswer| match answer {
            Given { .. } => "an answer".to_string(),
            Missing(why) => why.clone(),
            Skipped(why) => format!("skipped: {why}"),
        };
        let effect = match (old, new) {
            (Given { .. }, _) => Effect::Worse,
            (_, Given { .. }) => Effect::Better,
            (Skipped(_), Missing(_)) => Effect::Worse,
            _ => return,
        };
        self.push(Topic::Presence, effect, "answer", (word(old), word(new)), 0.0);
    }

    /// The moment that has moved furthest beyond rounding, if one has.
    fn moved(&self, units: &Units<'_>, before: &Moments, now: &Moments) -> Option<super::moments::Pair> {
        if before == now {
            return None;
        }
        let rounding = self.rules.rounding_of(self.label);
        let pairs = units.pairs(before, now).into_iter();
        pairs
            .filter(|pair| pair.apart > rounding * pair.coarseness)
            .max_by(|a, b| (a.apart / a.coarseness).total_cmp(&(b.apart / b.coarseness)))
    }

    fn push_moved(&mut self, effect: Effect, moved: &super::moments::Pair) {
        let sides = (figure(moved.before), format!("{} ({:+.1e})", figure(moved.now), moved.now - moved.before));
        self.push(Topic::Moments, effect, &moved.name, sides, moved.apart);
    }

    /// Today's scores and those of the accepted moments, both on today's reference.
    fn scores_of_moved(
        &mut self,
        old: &BTreeMap<ScoreKind, Estimate>,
        new: &BTreeMap<ScoreKind, Estimate>,
        difference: Option<&Scores>,
        moved: &super::moments::Pair,
    ) {
        let (mut worse, mut better) = (false, false);
        let both_sound = self.both_sound;
        for (kind, now) in new.iter().filter(|_| both_sound) {
            let Some(change) = difference.and_then(|d| d.get(*kind)) else { continue };
            let allowed = score_rounding(now.value) + self.quantile * change.standard_error;
            if change.value.abs() <= allowed {
                continue;
            }
            let before = now.value - change.value;
            let step = badness(*kind, now.value) - badness(*kind, before);
            let effect = if step > 0.0 { Effect::Worse } else { Effect::Better };
            // Gains count when the errors of both sides do not explain them, losses as soon as they are resolved.
            let joint = old.get(kind).map_or(f64::INFINITY, |old| joint_error(*old, *now));
            match effect {
                Effect::Worse => worse = true,
                _ if change.value.abs() > self.quantile * joint => better = true,
                _ => continue,
            }
            let now = format!("{} ({:+.1e})", figure(now.value), change.value);
            self.push(Topic::Score, effect, kind.name(), (figure(before), now), step.abs());
        }
        self.definedness(old, new);
        let effect = match (worse, better) {
            (true, _) => Effect::Worse,
            (false, true) => Effect::Better,
            (false, false) => Effect::Moved,
        };
        self.push_moved(effect, moved);
    }

    /// The method stands still: only the reference, or what is made of it, can have changed a score.
    ///
    /// A norm of errors that are all chance has a mean of up to the root of their number times its standard error, and two references
    /// may have standard errors of different size: that bias is allowed on top of q.
    fn scores_of_unmoved(
        &mut self,
        old: &BTreeMap<ScoreKind, Estimate>,
        new: &BTreeMap<ScoreKind, Estimate>,
        entries: f64,
    ) {
        let both_sound = self.both_sound;
        for (kind, now) in new.iter().filter(|_| both_sound) {
            let Some(before) = old.get(kind) else { continue };
            let error = if self.sampled_alike { 0.0 } else { joint_error(*before, *now) };
            let allowed = score_rounding(now.value) + (self.quantile + entries.sqrt()) * error;
            if (now.value - before.value).abs() <= allowed {
                continue;
            }
            let step = badness(*kind, now.value) - badness(*kind, before.value);
            // A score that gains while its method stands still is nobody's merit.
            let effect = if step > 0.0 { Effect::Worse } else { Effect::Moved };
            self.push(Topic::Score, effect, kind.name(), (with_error(*before), with_error(*now)), step.abs());
        }
        self.definedness(old, new);
    }

    fn definedness(&mut self, old: &BTreeMap<ScoreKind, Estimate>, new: &BTreeMap<ScoreKind, Estimate>) {
        for kind in ScoreKind::ALL {
            let (before, now) = (old.get(&kind), new.get(&kind));
            if before.is_some() != now.is_some() {
                let word = |e: Option<&Estimate>| e.map_or("undefined".into(), |e| with_error(*e));
                let effect = if now.is_some() { Effect::Noted } else { Effect::Worse };
                self.push(Topic::Score, effect, kind.name(), (word(before), word(now)), f64::MAX);
            }
        }
    }

    fn evaluations(&mut self, old: Option<Evaluations>, new: Option<Evaluations>) {
        let (Some(old), Some(new)) = (old, new) else { return };
        let counts = |e: Evaluations| {
            [
                (e.values, "values"),
                (e.jacobians, "Jacobians"),
                (e.hessians, "Hessians"),
                (e.exact_moments, "moments"),
            ]
        };
        let pairs = counts(old).into_iter().zip(counts(new)).filter(|(before, now)| before.0 != now.0);
        let pairs: Vec<_> = pairs.collect();
        let rose = pairs.iter().any(|(before, now)| now.0 > before.0);
        for ((before, what), (now, _)) in pairs {
            let effect = if rose { Effect::Worse } else { Effect::Better };
            let sides = (before.to_string(), now.to_string());
            self.push(
                Topic::Evaluations,
                effect,
                &format!("evaluations: {what}"),
                sides,
                now.abs_diff(before) as f64,
            );
        }
    }
}

fn presence(subject: Subject, effect: Effect, what: &str, before: &str, now: &str) -> Change {
    let (what, before, now) = (what.into(), before.into(), now.into());
    Change { subject, topic: Topic::Presence, effect, what, before, now, size: 0.0 }
}

fn whole(case: &str) -> Subject {
    Subject { case: Some(case.into()), method: None }
}

fn level(trust: Trust) -> u8 {
    match trust {
        Trust::Trusted => 0,
        Trust::Undecided => 1,
        Trust::Rejected => 2,
    }
}

fn standing(standing: Standing) -> u8 {
    match standing {
        Standing::Kept => 0,
        Standing::Open => 1,
        Standing::Broken => 2,
    }
}

fn rank(soundness: Soundness) -> u8 {
    match soundness {
        Soundness::Sound => 0,
        Soundness::Wide => 1,
        Soundness::HeavyTailed => 2,
        Soundness::Disputed => 3,
        Soundness::Refused => 4,
    }
}

fn soundness(soundness: Soundness) -> String {
    match soundness {
        Soundness::Sound => "sound",
        Soundness::Wide => "wide",
        Soundness::HeavyTailed => "heavy-tailed",
        Soundness::Disputed => "disputed",
        Soundness::Refused => "refused",
    }
    .into()
}
