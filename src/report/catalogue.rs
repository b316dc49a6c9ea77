use comfy_table::Table;
use serde_json::{Map, Value};

use super::table::{WIDTH, keep_whole, labelled, lines, plain_table, wrapped};
use crate::method::{Degree, Evaluations, MethodSpec};
use crate::score::ScoreKind;
use crate::sensor::Output;
use crate::suite::Case;
use crate::wording::unknown_name;
use crate::{method, sensor};

/// The built-in sensors: name, what each measures, the outputs of its example.
pub fn sensor_table() -> String {
    let mut table = plain_table(&["sensor", "measures", "outputs"], 0..0);
    for kind in sensor::KINDS {
        table.add_row([kind.name, kind.summary, &outputs(&example(kind))]);
    }
    // A name is there to be copied.
    keep_whole(&mut table, 0..1);
    with_legend(
        &table,
        &[
            "outputs: of the example. [rad, angular]: counter-clockwise from the x axis, on the circle, so that -pi and \
             +pi are the same. No brackets: no unit of its own.",
            "`catalogue sensors NAME` shows all of one: formula, parameters, source, and a case to start from.",
        ],
    )
}

/// All about one sensor: formula, parameters, outputs, components read, source, and an example as a suite and as a case
/// record alone on its line.
///
/// # Errors
/// What to say where no sensor has this name.
pub fn sensor_page(name: &str) -> Result<String, String> {
    let Some(kind) = sensor::KINDS.iter().find(|kind| kind.name == name) else {
        let names: Vec<_> = sensor::KINDS.iter().map(|kind| kind.name).collect();
        return Err(unknown_name("sensor", name, &names));
    };
    let case = example(kind);
    let n = case.prior().dimension();
    let of_state = case.sensor().reads().iter().filter(|&&i| i < n);
    let components: Vec<_> = of_state.map(usize::to_string).collect();
    let mut facts = vec![
        ("measures", kind.summary.into()),
        ("formula", kind.formula.into()),
        ("parameters", kind.parameters.into()),
    ];
    if !kind.quantities.is_empty() {
        let quantities: Vec<_> = kind.quantities.iter().map(|(key, unit)| format!("{key} in {unit}")).collect();
        facts.push(("units", format!("{}; in a suite also as text with another unit", quantities.join(", "))));
    }
    facts.extend([
        ("outputs", outputs(&case)),
        ("reads", format!("components {} of {n} in the example", components.join(", "))),
        ("source", kind.source.into()),
    ]);
    if let names @ [_, ..] = case.sensor().noise() {
        facts.push(("noise", format!("inside, in the example: {}", names.join(", "))));
    }
    let mut page = format!("{}\n{}", kind.name, labelled(&facts));
    for paragraph in SENSOR_LEGEND {
        page.push_str(&format!("\n\n{}", wrapped(paragraph, 2)));
    }
    let how = "A suite to start from, a file that ends in .toml:";
    page.push_str(&format!("\n\n{}\n{}", wrapped(how, 2), as_suite(kind).trim_end()));
    let how = "The same as a case record, one line of a file for `survey --cases FILE`:";
    page.push_str(&format!("\n\n{}\n{}", wrapped(how, 2), kind.example));
    Ok(page)
}

/// What the symbols of the sensors' formulas mean.
const SENSOR_LEGEND: [&str; 1] = [
    "x: the state, n components, counted from 0; q: its position, (x, y) or (x, y, z); v: its velocity; s_j: station j, \
     (sx, sy) in the plane; p: number of outputs; y_j, theta_j: output j; ': transposed. n x n and the like: rows x columns, a list of rows. A value after = is the \
     default. [rad, angular]: counter-clockwise from the x axis, on the circle.",
];

/// The case that a sensor offers to start from.
fn example(kind: &sensor::Kind) -> Case {
    let record = serde_json::from_str(kind.example).map_err(|e| e.to_string());
    let case = record.and_then(|record| Case::from_json(record).map_err(|e| e.to_string()));
    case.unwrap_or_else(|e| unreachable!("a test holds that every example is a case: {}: {e}", kind.name))
}

/// The example as the sections of a suite; parameters that a suite wants with their unit have it.
fn as_suite(kind: &sensor::Kind) -> String {
    let written = serde_json::from_str::<Map<String, Value>>(kind.example).map_err(|e| e.to_string());
    let written = written.and_then(|mut example| {
        example.shift_remove("case");
        for (key, unit) in kind.quantities.iter().filter(|(_, unit)| unit.starts_with("rad")) {
            if let Some(value) = example.get_mut("sensor").and_then(|sensor| sensor.get_mut(*key)) {
                give_unit(value, unit);
            }
        }
        toml::to_string(&example).map_err(|e| e.to_string())
    });
    let text =
        written.unwrap_or_else(|e| unreachable!("a test holds that every example is a suite: {}: {e}", kind.name));
    // Rows of wide matrices, each on a line of its own.
    let fold =
        |line: &str| if line.len() > usize::from(WIDTH) { line.replace("], [", "],\n    [") } else { line.into() };
    text.lines().map(fold).collect::<Vec<_>>().join("\n")
}

/// Numbers, alone or in lists, as texts with their unit.
fn give_unit(value: &mut Value, unit: &str) {
    match value {
        Value::Array(list) => list.iter_mut().for_each(|entry| give_unit(entry, unit)),
        Value::Number(number) => *value = format!("{number} {unit}").into(),
        _ => {}
    }
}

/// `range [m], bearing [rad, angular]`.
fn outputs(case: &Case) -> String {
    let one = |output: &Output| match (output.unit.as_ref(), output.angular) {
        ("", _) => output.name.clone(),
        (unit, false) => format!("{} [{unit}]", output.name),
        (unit, true) => format!("{} [{unit}, angular]", output.name),
    };
    case.sensor().outputs().iter().map(one).collect::<Vec<_>>().join(", ")
}

/// Read components at which the catalogue says what a method costs.
const SHOWN: [usize; 4] = [2, 4, 6, 10];

/// The methods: id, published name, evaluations and negative weights by the number a of read components, exactness.
pub fn method_table() -> String {
    let header = ["method", "published as", "evaluations", "exact", "negative"];
    let mut table = plain_table(&header, 0..0);
    for kind in method::KINDS {
        let method = default_of(kind);
        let mut evaluations =
            SHOWN.map(|a| Evaluations::of(method.method(), a).map_or_else(|_| "-".into(), short)).to_vec();
        if evaluations.iter().all(|e| *e == evaluations[0]) {
            evaluations.truncate(1);
        }
        let exact = method.method().exactness().map_or_else(String::new, |e| {
            [e.mean, e.cross_covariance, e.covariance].map(|degree| degree.to_string()).join(", ")
        });
        table.add_row([kind.id, kind.name, &evaluations.join(", "), &exact, &negative(&method)]);
    }
    keep_whole(&mut table, 0..1);
    keep_whole(&mut table, 2..5);
    with_legend(
        &table,
        &[
            "a: number of state components that the sensor reads, for points are laid in these alone.",
            "evaluations: of the sensor in one transform with the default parameters, at a = 2, 4, 6 and 10 (once where all are \
             equal), where no output is angular. J: a Jacobian; H: a set of Hessians; M: a set of exact moments, which only some sensors know; -: not served.",
            "exact: up to which degree of a polynomial sensor, in the mean, the cross-covariance and the covariance; all: for \
             every sensor that is served.",
            "negative: at which of these a a weight is below zero, so that a covariance can come out indefinite; \
             nothing: no weighted point set.",
            "`catalogue methods NAME` shows all of one: parameters with their defaults, other parameters to try, source.",
        ],
    )
}

/// All about one method, by its id without parameters.
///
/// # Errors
/// What to say where no method has this id.
pub fn method_page(id: &str) -> Result<String, String> {
    let Some(kind) = method::KINDS.iter().find(|kind| kind.id == id) else {
        let ids: Vec<_> = method::KINDS.iter().map(|kind| kind.id).collect();
        return Err(unknown_name("method", id, &ids));
    };
    let method = default_of(kind);
    let mut facts = vec![("published as", kind.name.to_string()), ("parameters", kind.parameters.into())];
    if !kind.examples.is_empty() {
        facts.push(("others to try", kind.examples.join(", ")));
    }
    if let Some(exact) = method.method().exactness() {
        let words = |degree| match degree {
            Degree::UpTo(degree) => format!("up to degree {degree}"),
            Degree::Every => "for every sensor that it serves".into(),
        };
        let [mean, cross, covariance] = [exact.mean, exact.cross_covariance, exact.covariance].map(words);
        facts.push(("exact", format!("mean {mean}, cross-covariance {cross}, covariance {covariance}")));
    }
    facts.extend([
        ("evaluations", format!("{}, a the number of state components that the sensor reads", kind.evaluations)),
        ("", SHOWN.map(|a| at(&method, a)).join("; ")),
        ("source", kind.source.into()),
    ]);
    Ok(format!("{}\n{}", kind.id, labelled(&facts)))
}

fn default_of(kind: &method::Kind) -> MethodSpec {
    MethodSpec::parse(kind.id).unwrap_or_else(|e| unreachable!("a test holds that every kind has defaults: {e}"))
}

/// `4 at a = 2, some weights negative`.
fn at(method: &MethodSpec, a: usize) -> String {
    match Evaluations::of(method.method(), a) {
        Ok(evaluations) if has_negative_weights(method, a) => {
            format!("{} at a = {a}, some weights negative", short(evaluations))
        }
        Ok(evaluations) => format!("{} at a = {a}", short(evaluations)),
        Err(refusal) => format!("none at a = {a}: {refusal}"),
    }
}

/// At which of the shown numbers of components weights are negative; nothing where there are no weights.
fn negative(method: &MethodSpec) -> String {
    if !matches!(method.method().point_set(SHOWN[1]), Ok(Some(_))) {
        return String::new();
    }
    let at: Vec<_> =
        SHOWN.into_iter().filter(|&a| has_negative_weights(method, a)).map(|a| a.to_string()).collect();
    if at.is_empty() { "none".into() } else { at.join(", ") }
}

fn has_negative_weights(method: &MethodSpec, a: usize) -> bool {
    let Ok(Some(set)) = method.method().point_set(a) else { return false };
    set.mean_weights().iter().chain(set.covariance_weights().iter()).any(|&w| w < 0.0)
}

/// `9`, `1 J`, `1 H` or `1 M`.
fn short(evaluations: Evaluations) -> String {
    let Evaluations { values, jacobians, hessians, exact_moments } = evaluations;
    let counts = [(values, ""), (jacobians, " J"), (hessians, " H"), (exact_moments, " M")];
    let parts = counts.iter().filter(|(count, _)| *count > 0).map(|(count, mark)| format!("{count}{mark}"));
    parts.collect::<Vec<_>>().join(" + ")
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
    with_legend(&table, &SCORE_LEGEND)
}

/// What the symbols of the scores' formulas mean.
pub(crate) const SCORE_LEGEND: [&str; 4] = [
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
];

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
