use comfy_table::Table;

use super::table::{keep_whole, lines, plain_table, wrapped};
use crate::score::ScoreKind;
use crate::{method, sensor};

/// The built-in sensors: name, measurement function, parameters, source.
pub fn sensor_table() -> String {
    let mut table = plain_table(&["sensor", "measures", "formula", "parameters", "source"], 0..0);
    for kind in sensor::KINDS {
        table.add_row([kind.name, kind.summary, kind.formula, kind.parameters, kind.source]);
    }
    // A name is there to be copied.
    keep_whole(&mut table, 0..1);
    with_legend(
        &table,
        &[
            "x: the state, n components, counted from 0; (x, y), (x, y, z) its position; (sx, sy), (sx, sy, sz) a \
             station; p: number of outputs; y_j, theta_j: output j; ': transposed.",
            "|p - s_j|: distance of the position p, in the plane or in space, from station j; v: its velocity; [x, y(, z)]: two \
             or three coordinates.",
            "n x n and the like: rows x columns, a list of rows. A value after = is the default.",
            "[rad, angular]: counter-clockwise from the x axis, on the circle, so that -pi and +pi are the same.",
        ],
    )
}

/// The methods: id, published name, parameters, evaluations in the number a of read components, source.
pub fn method_table() -> String {
    let mut table = plain_table(&["method", "published as", "parameters", "evaluations", "source"], 0..0);
    for kind in method::KINDS {
        table.add_row([kind.id, kind.name, kind.parameters, kind.evaluations, kind.source]);
    }
    with_legend(
        &table,
        &[
            "a: number of state components that the sensor reads, for points are laid in these alone.",
            "evaluations: of the sensor in one transform. A value after = is the default; another is given as in \
             gauss-hermite:order=5.",
        ],
    )
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
    with_legend(
        &table,
        &[
            "n: number of state components; p: number of outputs; P: prior covariance (n x n); R: noise covariance \
             (p x p); mu, S, C: the reference's mean, covariance (p x p, noise included) and cross-covariance \
             (n x p) of the measurement.",
            "A hat (mu^, S^, C^, and O^, B^, K^, P+^ made of them) marks the method's own; b = mu - mu^, wrapped where \
             an output is angular.",
            "B: regression of measurement on state; O: what of the measurement it leaves unexplained; K: gain; P+: \
             covariance that the update claims; M: covariance that it truly has; M*: that of the best linear update.",
            "': transposed; ^-1, ^-1/2: inverse and its square root; tr: trace; ||.||_F: Frobenius norm; KL: \
             Kullback-Leibler divergence; nats: its unit, with natural logarithms; NEES: normalised estimation \
             error squared.",
        ],
    )
}

/// The table, and below it what its symbols mean.
fn with_legend(table: &Table, legend: &[&str]) -> String {
    let mut text = lines(table);
    text.push('\n');
    for paragraph in legend {
        text.push('\n');
        text.push_str(&wrapped(paragraph, 2));
    }
    text
}
