//! What a study says, in sentences.

use super::axes::{parted, quantity};
use crate::guidance::{Ranked, SHARE_CONFIDENCE, Study, View};
use crate::method::Evaluations;
use crate::report::evaluations_text;
use crate::suite::{Setting, Suite};

/// A sentence in which names stand between backticks.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) struct Rich(String);

/// A part of a sentence.
pub(super) struct Piece<'a> {
    pub text: &'a str,
    /// Whether it is a name as it is typed.
    pub code: bool,
}

impl Rich {
    pub fn pieces(&self) -> impl Iterator<Item = Piece<'_>> {
        self.0.split('`').enumerate().map(|(k, text)| Piece { text, code: k % 2 == 1 })
    }
}

/// A name between backticks; one that it holds itself would end it.
fn name(text: &str) -> String {
    format!("`{}`", text.replace('`', "'"))
}

/// Everything that is foreign to the sentence and no name.
fn plain(text: &str) -> String {
    text.replace('`', "'")
}

pub(super) fn percent(count: usize, of: usize) -> String {
    match of {
        0 => "–".into(),
        // Halves go up, as in a browser.
        _ => format!("{} %", (100.0 * count as f64 / of as f64 + 0.5).floor()),
    }
}

pub(super) fn evaluations(of: Option<(Evaluations, Evaluations)>) -> String {
    of.map_or("–".into(), evaluations_text)
}

/// What one transform costs, in words.
fn price(of: Option<(Evaluations, Evaluations)>) -> String {
    match of.map(evaluations_text).as_deref() {
        None => "evaluations that are not known".into(),
        Some("1 J") => "one Jacobian".into(),
        Some("1 H") => "one set of Hessians".into(),
        Some("1 M") => "one set of exact moments".into(),
        Some(counts) => format!("{counts} evaluations"),
    }
}

/// The answer: which method where, with its evidence.
pub(super) fn answer(study: &Study, view: &View<'_>) -> Vec<Rich> {
    let ranking = view.ranking();
    let total = study.cases.len();
    let mut said = Vec::new();
    match ranking.first().filter(|best| best.trusted > 0) {
        Some(best) => {
            said.push(one_for_all(study, best));
            said.extend(cheaper(study, &ranking, best));
        }
        None => said.push(format!("None of the {} methods is trusted in any of the {total} cases.", ranking.len())),
    }
    let families = study.families();
    if families.len() > 1 || study.sweeps(families.first().unwrap_or(&"")).len() == 1 {
        said.extend(families.iter().map(|family| in_family(study, view, family)));
    }
    match view.nobody() {
        0 => {}
        1 => said.push(format!("In 1 of {total} cases no method of these is trusted.")),
        nobody => said.push(format!("In {nobody} of {total} cases no method of these is trusted.")),
    }
    let beyond = view.beyond_gaussian();
    let limit = study.provenance.settings.limits.floor;
    if beyond > 0 {
        said.push(format!(
            "Trusted is not yet useful: in {beyond} of {total} cases the true law is more than {limit} nats from any Gaussian, \
             so that none should be trusted there, whichever method makes it."
        ));
    } else if study.cases.iter().all(|case| case.floor.is_some()) {
        said.push(format!("In no case is the true law surely more than {limit} nats from its best Gaussian."));
    }
    let doubtful = study.cases.iter().filter(|case| !case.reference.bears_verdicts()).count();
    if doubtful > 0 {
        said.push(format!(
            "In {doubtful} of {total} cases the reference cannot be believed; no verdict rests on it."
        ));
    }
    said.into_iter().map(Rich).collect()
}

/// What to take where one method is to serve the whole suite.
fn one_for_all(study: &Study, best: &Ranked) -> String {
    let price = price(best.evaluations);
    let drawn = study.cases.iter().all(|case| {
        case.settings.iter().zip(&study.headings).any(|(s, h)| s.is_some() && h.ends_with(Setting::DRAWN))
    });
    let bound = if drawn {
        format!(
            "; of all cases that the suite might draw in at least {:.0} %, at {:.0} % confidence",
            (100.0 * best.lower_bound()).floor(),
            100.0 * SHARE_CONFIDENCE
        )
    } else {
        String::new()
    };
    let which = if best.trusted == best.served() { "all".into() } else { format!("{} of", best.trusted) };
    format!(
        "Where one method is to serve everywhere, take {}: trusted in {which} {} cases ({}{bound}), for {price} a transform.",
        name(&study.labels[best.entrant]),
        best.served(),
        percent(best.trusted, best.served()),
    )
}

/// Methods that cost less, each trusted more often than any that costs no more.
fn cheaper(study: &Study, ranking: &[Ranked], best: &Ranked) -> Option<String> {
    let most = |r: &Ranked| r.work.map_or(u64::MAX, |(_, most)| most);
    let mut rising: Vec<&Ranked> = ranking.iter().filter(|r| most(r) < most(best) && r.trusted > 0).collect();
    rising.sort_by_key(|r| (most(r), std::cmp::Reverse(r.trusted)));
    let mut ladder: Vec<&Ranked> = Vec::new();
    for r in rising {
        if ladder.last().is_none_or(|last| r.trusted > last.trusted) {
            ladder.push(r);
        }
    }
    let steps: Vec<String> = ladder
        .iter()
        .map(|r| {
            format!(
                "{} ({}) in {}",
                name(&study.labels[r.entrant]),
                price(r.evaluations),
                percent(r.trusted, r.served())
            )
        })
        .collect();
    (!steps.is_empty()).then(|| format!("For less work, trusted less often: {}.", steps.join(", ")))
}

fn in_family(study: &Study, view: &View<'_>, family: &str) -> String {
    let cases: Vec<usize> = (0..study.cases.len()).filter(|&k| study.cases[k].family == family).collect();
    let among = format!("In the family {} ({} cases{})", name(family), cases.len(), over(study, family, &cases));
    if let Some(entrant) = view.choice(&cases) {
        return format!(
            "{among}: {} is the cheapest that is trusted in all of them.",
            name(&study.labels[entrant])
        );
    }
    let ranking = view.ranking_in(family);
    match ranking.first().filter(|best| best.trusted > 0) {
        Some(best) => format!(
            "{among}: none is trusted in all; {} comes furthest, with {} ({}).",
            name(&study.labels[best.entrant]),
            best.trusted,
            percent(best.trusted, best.served())
        ),
        None => format!("{among}: no method is trusted in any."),
    }
}

/// `, prior.range 300 m to 20 km`.
fn over(study: &Study, family: &str, cases: &[usize]) -> String {
    let ranges = study.sweeps(family).into_iter().map(|axis| {
        let values = || cases.iter().filter_map(|&case| study.cases[case].settings[axis]);
        let heading = &study.headings[axis];
        let (least, most) = (values().fold(f64::INFINITY, f64::min), values().fold(f64::NEG_INFINITY, f64::max));
        plain(&format!("; {} {} to {}", parted(heading).0, quantity(least, heading), quantity(most, heading)))
    });
    ranges.collect()
}

/// How references of a study stand.
pub(super) fn references(study: &Study) -> Rich {
    let total = study.cases.len();
    let mut counts: Vec<(&str, usize)> = Vec::new();
    for case in &study.cases {
        match counts.iter_mut().find(|(word, _)| *word == case.reference.soundness) {
            Some((_, count)) => *count += 1,
            None => counts.push((&case.reference.soundness, 1)),
        }
    }
    let counts: Vec<String> = counts.iter().map(|(word, count)| format!("{count} {}", plain(word))).collect();
    let settings = &study.provenance.settings;
    let (least, most) = study
        .cases
        .iter()
        .map(|case| case.reference.points)
        .fold((u64::MAX, 0), |(least, most), points| (least.min(points), most.max(points)));
    Rich(format!(
        "{}: {} references, {}; {:.2e} samples in all, {least} to {most} a case, in {} replicates; standardised standard error asked \
         {:e}, cap {} samples a case.",
        name(&study.provenance.suite.name),
        total,
        counts.join(", "),
        study.provenance.samples as f64,
        settings.replicates,
        settings.precision,
        settings.cap
    ))
}

/// The limits of a suite in a sentence.
pub(super) fn limits(study: &Study) -> String {
    let l = &study.provenance.settings.limits;
    format!(
        "mean error at most {} reference standard deviations; variance ratio {} to {}; cross-covariance error at most {} in \
         correlation units; expected NEES ratio {} to {}; excess at most {} nats; floor at most {} nats; confidence {} %, t \
         quantile {:.4}.",
        l.mean_error,
        l.variance_ratio_low,
        l.variance_ratio_high,
        l.cross_covariance_error,
        l.nees_ratio_low,
        l.nees_ratio_high,
        l.excess,
        l.floor,
        100.0 * l.confidence,
        study.judge.quantile()
    )
}

/// How a method fared in a suite, in a sentence or two.
pub(super) fn fared(study: &Study, view: &View<'_>, ranked: &Ranked) -> Rich {
    let mut text = format!(
        "{} a transform; trusted in {} of {} cases ({}), rejected in {}, undecided in {}",
        price(ranked.evaluations),
        ranked.trusted,
        ranked.served(),
        percent(ranked.trusted, ranked.served()),
        ranked.rejected,
        ranked.undecided
    );
    if let Some(time) = ranked.time {
        text.push_str(&format!("; {time:.1} times the time of first-order Taylor"));
    }
    if ranked.skipped > 0 {
        let reason = (0..study.cases.len())
            .find(|&case| view.outcome(case, ranked.entrant) == crate::guidance::Outcome::Skipped)
            .map(|case| study.cases[case].entries[ranked.entrant].reason.as_str());
        text.push_str(&format!("; skipped in {}: {}", ranked.skipped, reason.unwrap_or_default()));
    }
    text.push('.');
    if let Some((fault, count)) = ranked.breaks_first {
        text.push_str(&format!(" What breaks first: {fault} ({}).", percent(count, ranked.rejected)));
    }
    let worst = worst_case(study, ranked.entrant);
    if let Some((id, cause)) = worst {
        text.push_str(&format!(" For example {id}: {cause}."));
    }
    Rich(text)
}

/// The case of greatest excess whose cause is known.
fn worst_case(study: &Study, entrant: usize) -> Option<(&str, &str)> {
    let excess = |case: &crate::guidance::StudyCase| {
        case.entries[entrant].scores.get(crate::score::ScoreKind::Excess).map_or(f64::NEG_INFINITY, |e| e.value)
    };
    let with_cause = study.cases.iter().filter(|case| !case.entries[entrant].cause.is_empty());
    let worst = with_cause.max_by(|a, b| excess(a).total_cmp(&excess(b)))?;
    Some((&worst.id, &worst.entries[entrant].cause))
}

/// The command that makes the results again.
pub(super) fn command(study: &Study) -> String {
    let from = &study.provenance;
    let settings = &from.settings;
    let bundled = Suite::load(&from.suite.name, None).is_ok_and(|suite| suite.hash == from.suite.hash);
    let suite = if bundled { from.suite.name.clone() } else { format!("{}.toml", from.suite.name) };
    format!(
        "gaussworthy survey {} --seed {} --precision {:e} --cap {} --methods {}",
        shell(&suite),
        from.seed,
        settings.precision,
        settings.cap,
        shell(&settings.methods.join(","))
    )
}

/// One word of a shell.
fn shell(word: &str) -> String {
    shlex::try_quote(word).map_or_else(|_| "..".into(), Into::into)
}

/// What it takes to make the results again.
pub(super) fn facts(study: &Study) -> Vec<(&'static str, String)> {
    let from = &study.provenance;
    let mut facts = vec![
        ("program", format!("gaussworthy {} ({}, {})", from.version, from.build.profile, from.build.target)),
        ("seed", from.seed.to_string()),
        ("suite, SHA-256", from.suite.hash.clone()),
        ("cases", from.cases.finished.to_string()),
        ("measured", from.times.started.clone()),
    ];
    if !from.settings.outside.is_empty() {
        let names: Vec<&str> = from.settings.outside.iter().map(|outside| outside.name.as_str()).collect();
        facts.push(("outside", format!("{}; their answers are not made again by this command", names.join(", "))));
    }
    facts
}
