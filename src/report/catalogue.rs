use super::table::{lines, plain_table};
use crate::score::ScoreKind;
use crate::{method, sensor};

/// The built-in sensors: name, measurement function, parameters, source.
pub fn sensor_table() -> String {
    let mut table = plain_table(&["sensor", "measures", "formula", "parameters", "source"], 0..0);
    for kind in sensor::KINDS {
        table.add_row([kind.name, kind.summary, kind.formula, kind.parameters, kind.source]);
    }
    lines(&table)
}

/// The methods: id, published name, parameters, evaluations in the number a of read components, source.
pub fn method_table() -> String {
    let mut table = plain_table(&["method", "published as", "parameters", "evaluations", "source"], 0..0);
    for kind in method::KINDS {
        table.add_row([kind.id, kind.name, kind.parameters, kind.evaluations, kind.source]);
    }
    lines(&table)
}

/// The scores: name, formula, unit, how it reads.
pub fn score_table() -> String {
    let mut table = plain_table(&["score", "formula", "unit", "reads as"], 0..0);
    for kind in ScoreKind::ALL {
        table.add_row([kind.id(), kind.formula(), kind.unit(), kind.reads_as()]);
    }
    table.add_row([
        "floor",
        "1/2 (ln det O - ln det R), O = S - C' P^-1 C",
        "nats",
        "how far the true law is from any Gaussian: what no method can mend",
    ]);
    lines(&table)
}
