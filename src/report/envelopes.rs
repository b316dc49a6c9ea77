//! Envelopes as a file for machines and sentences for people.

use std::io::{self, Write};

use super::table::wrapped;
use crate::guidance::{Conclusions, MethodEnvelopes};
use crate::trust::{Counts, Envelope};

/// `envelopes.json`: one object a method, in the order of rows.
pub(super) fn write(envelopes: &[MethodEnvelopes], to: &mut dyn Write) -> io::Result<()> {
    serde_json::to_writer_pretty(&mut *to, envelopes)?;
    writeln!(to)
}

/// Writes where each method is trusted, if envelopes were asked for.
///
/// # Errors
/// What the writer says.
pub fn write_envelopes(conclusions: &Conclusions, to: &mut dyn Write) -> io::Result<()> {
    let Some(envelopes) = &conclusions.envelopes else { return Ok(()) };
    writeln!(to, "Envelopes: where each method is trusted")?;
    for sentence in envelopes.iter().flat_map(envelope_sentences) {
        writeln!(to, "{}", wrapped(&sentence, 2))?;
    }
    writeln!(to)
}

/// What an envelope says, with its evidence, in a sentence or two.
pub fn envelope_sentence(method: &str, envelope: &Envelope) -> String {
    let terms: Vec<String> = envelope.terms.iter().map(|t| format!("{} <= {}", t.index, short(t.limit))).collect();
    let of = |counts: &Counts| format!("{} of {}", counts.breached, counts.inside);
    let claim = &envelope.claim;
    let caught = match envelope.caught {
        Some(share) => format!("catches {} of the trusted cases", percent(share)),
        None => "no case held out is trusted".into(),
    };
    let contradiction =
        if envelope.contradicted { " CONTRADICTED by the cases held out: do not use it." } else { "" };
    format!(
        "{method} where {}: at most {} of cases not trusted, at {} confidence (calibration {}, held out {}: at most {}); \
         {caught}.{contradiction}",
        terms.join(" and "),
        percent(claim.risk),
        percent(claim.confidence),
        of(&envelope.calibration),
        of(&envelope.held_out),
        percent(envelope.held_out.upper_bound),
    )
}

/// Everything that is said of one method.
pub fn envelope_sentences(found: &MethodEnvelopes) -> Vec<String> {
    let all = [&found.index, &found.pair, &found.second_opinion];
    let mut said: Vec<String> =
        all.into_iter().flatten().map(|envelope| envelope_sentence(&found.method, envelope)).collect();
    if said.is_empty() {
        said.push(format!(
            "{}: no envelope; trusted in {} of {} cases, no limit on an index bears the claim.",
            found.method, found.trusted, found.cases
        ));
    }
    said
}

fn percent(share: f64) -> String {
    let text = format!("{:.1}", 100.0 * share);
    format!("{} %", text.strip_suffix(".0").unwrap_or(&text))
}

/// Three digits.
fn short(value: f64) -> String {
    if value == 0.0 || (1e-3..1e4).contains(&value.abs()) {
        let decimals = (2 - value.abs().max(1e-3).log10().floor() as i32).max(0) as usize;
        format!("{value:.decimals$}")
    } else {
        format!("{value:.2e}")
    }
}
