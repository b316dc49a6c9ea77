use std::io::{self, Write};

use super::table::{CAUTION, keep_whole, lines, plain_table, wrapped};
use crate::guidance::{Advice, MethodAdvice};

/// Writes advice for people.
///
/// # Errors
/// What the writer says.
pub fn write_advice(advice: &Advice, to: &mut dyn Write) -> io::Result<()> {
    writeln!(to, "{}", advice.case)?;
    for reason in &advice.reasons {
        writeln!(to, "{}", wrapped(reason, 2))?;
    }
    writeln!(to)?;
    for fact in facts(advice) {
        writeln!(to, "{}", wrapped(&fact, 2))?;
    }
    writeln!(to)?;
    let header = ["method", "verdict", "evals", "work", "time", "excess [nats]", "envelope"];
    let mut table = plain_table(&header, 2..6);
    for method in &advice.methods {
        table.add_row(row(method));
    }
    keep_whole(&mut table, 0..7);
    writeln!(to, "{}", lines(&table))?;
    writeln!(to)?;
    for method in &advice.methods {
        for note in notes(method) {
            writeln!(to, "{}", wrapped(&note, 2))?;
        }
    }
    for (cost, front) in [("work", &advice.pareto_work), ("time", &advice.pareto_time)] {
        if !front.is_empty() {
            let text = format!("No other method has less excess for less {cost}: {}.", front.join(", "));
            writeln!(to, "{}", wrapped(&text, 2))?;
        }
    }
    let legend = "work: numbers that the sensor computes in one transform, 1 a value, 1 + a a Jacobian, 1 + a + a (a + 1) / 2 a \
                  set of Hessians or of exact moments; time: as a ratio to first-order Taylor; excess: what the method adds \
                  to what any Gaussian loses.";
    writeln!(to, "{}\n\n{CAUTION}", wrapped(legend, 2))
}

fn facts(advice: &Advice) -> Vec<String> {
    let mut facts = Vec::new();
    if let Some(doubt) = &advice.doubt {
        facts.push(format!("Reference: {doubt}."));
    }
    let floor = match advice.floor {
        Some(floor) => {
            format!("{:.4} +- {:.1e} nats, {}", floor.value, floor.standard_error, advice.floor_standing)
        }
        None => "not defined".into(),
    };
    facts.push(format!("Floor, what any Gaussian loses: {floor}."));
    let indices: Vec<String> = advice.indices.iter().map(|i| format!("{} {:.4}", i.index, i.value)).collect();
    if !indices.is_empty() {
        facts.push(format!("Regime: {}.", indices.join(", ")));
    }
    facts
}

fn row(method: &MethodAdvice) -> Vec<String> {
    let whole = |value: Option<u64>| value.map_or("-".into(), |v| v.to_string());
    let inside = match method.envelopes.as_slice() {
        [] => "-".to_string(),
        all => format!("inside {} of {}", all.iter().filter(|e| e.inside).count(), all.len()),
    };
    vec![
        method.method.clone(),
        method.verdict.into(),
        whole(method.evaluations),
        whole(method.work),
        method.time.map_or("-".into(), |t| format!("{t:.1}")),
        method.excess.map_or("-".into(), |e| format!("{:.2e} +- {:.0e}", e.value, e.standard_error)),
        inside,
    ]
}

/// What the table has no room for.
fn notes(method: &MethodAdvice) -> Vec<String> {
    let mut notes = Vec::new();
    if let Some(objection) = &method.beyond_budget {
        notes.push(format!("{} is beyond the budget: {objection}.", method.method));
    }
    match (method.verdict, &method.cause) {
        ("rejected", Some(cause)) => notes.push(format!("{}: {}; {cause}.", method.method, method.reason)),
        ("trusted", _) => {}
        _ => notes.push(format!("{}: {}.", method.method, method.reason)),
    }
    for envelope in &method.envelopes {
        let terms: Vec<String> = envelope.terms.iter().map(|term| term.against()).collect();
        let place = if envelope.inside { "inside" } else { "outside" };
        notes.push(format!("{} is {place} its envelope: {}.", method.method, terms.join(", ")));
    }
    notes
}
