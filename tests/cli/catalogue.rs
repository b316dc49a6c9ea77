//! The catalogue lists everything that can be named.

use gaussworthy::score::ScoreKind;
use gaussworthy::suite::{Case, Suite};
use gaussworthy::{method, sensor};

use crate::contract::{CaseRecord, MomentsRecord};
use crate::desk::{Desk, assert_narrow};

#[test]
fn everything_that_can_be_named_is_listed() {
    let desk = Desk::new();
    let shelves: [(&str, Vec<&str>); 3] = [
        ("sensors", sensor::KINDS.iter().map(|k| k.name).collect()),
        ("methods", method::KINDS.iter().map(|k| k.id).collect()),
        ("scores", ScoreKind::ALL.iter().map(|k| k.id()).chain(["floor"]).collect()),
    ];
    let all = desk.succeed(&["catalogue"]);
    assert_narrow(&all);
    for (shelf, ids) in &shelves {
        let page = desk.succeed(&["catalogue", shelf]);
        assert_narrow(&page);
        assert!(all.contains(page.trim_end()), "{shelf} alone is what it is among the others");
        // An entry begins at the left edge; what goes on from it, and the legend, is indented.
        let entries = page.lines().filter(|line| !line.starts_with(' '));
        let listed: Vec<&str> = entries.filter_map(|line| line.split_whitespace().next()).collect();
        for id in ids {
            assert!(listed.contains(id), "{id} is missing in {page}");
        }
        for (other, ids) in &shelves {
            assert!(other == shelf || !ids.iter().any(|id| listed.contains(id)), "{shelf} lists {other}");
        }
    }
}

#[test]
fn symbols_are_explained_below_the_tables() {
    let desk = Desk::new();
    for (shelf, symbols) in [
        ("sensors", &["outputs:", "[rad, angular]:", "`catalogue sensors NAME` shows all"][..]),
        ("methods", &["a:", "evaluations:", "J:", "H:", "M:", "exact:", "negative:", "default"]),
        ("scores", &["n:", "p:", "mu, S, C:", "P:", "R:", "A hat", "b =", "O:", "B:", "K:", "M:", "nats:", "tr:"]),
    ] {
        let page = desk.succeed(&["catalogue", shelf]);
        let legend = page.split("\n\n").last().unwrap().split_whitespace().collect::<Vec<_>>().join(" ");
        for symbol in symbols {
            assert!(legend.contains(symbol), "{shelf} does not say what {symbol} is: {legend}");
        }
    }
}

/// One sensor whole: everything that its entry in the list holds, its symbols, and a line that is its example.
#[test]
fn a_sensor_is_shown_whole() {
    let desk = Desk::new();
    for kind in sensor::KINDS {
        let page = desk.succeed(&["catalogue", "sensors", kind.name]);
        let (text, example) = page.trim_end().rsplit_once('\n').unwrap();
        assert_eq!(example, kind.example);
        assert_narrow(text);
        assert_eq!(text.lines().next(), Some(kind.name));
        let flat = text.split_whitespace().collect::<Vec<_>>().join(" ");
        for fact in [kind.summary, kind.formula, kind.parameters, kind.source] {
            assert!(flat.contains(fact), "{fact} is missing in {page}");
        }
        for (key, unit) in kind.quantities {
            assert!(flat.contains(&format!("{key} in {unit}")), "{key} is missing in {page}");
        }
        for symbol in ["x:", "q:", "p:", "':", "rows x columns", "[rad, angular]:"] {
            assert!(flat.contains(symbol), "{} does not say what {symbol} is: {page}", kind.name);
        }
    }
    for (name, outputs, reads) in [
        ("range-bearing", "outputs range [m], bearing [rad, angular] reads", "reads components 0, 1 of 2"),
        (
            "stereo-disparity",
            "outputs u [pixel], v [pixel], disparity [pixel] reads",
            "reads components 0, 1, 2 of 3",
        ),
        ("attitude-vector", "outputs direction x, direction y, direction z reads", "reads components 0, 1, 2 of 3"),
        ("line-feature", "outputs offset [m] reads", "reads components 0, 1, 2, 3 of 4"),
    ] {
        let page = desk.succeed(&["catalogue", "sensors", name]);
        let flat = page.split_whitespace().collect::<Vec<_>>().join(" ");
        assert!(flat.contains(outputs) && flat.contains(reads), "{page}");
    }
}

#[test]
fn a_method_is_shown_whole() {
    let desk = Desk::new();
    for kind in method::KINDS {
        let page = desk.succeed(&["catalogue", "methods", kind.id]);
        assert_narrow(&page);
        assert_eq!(page.lines().next(), Some(kind.id));
        let flat = page.split_whitespace().collect::<Vec<_>>().join(" ");
        for fact in [kind.name, kind.parameters, kind.evaluations, kind.source].iter().chain(kind.examples) {
            assert!(flat.contains(fact), "{fact} is missing in {page}");
        }
    }
    // Counts by hand from the formulas; 0 of the weights of cubature-5 at a = 2 and 4 is below zero, (4 - a) is from 5 on.
    for (id, facts) in [
        (
            "cubature-5",
            "exact mean up to degree 5, cross-covariance up to degree 4, covariance up to degree 2",
            "9 at a = 2; 33 at a = 4; 73 at a = 6, some weights negative; 201 at a = 10, some weights negative source",
        ),
        (
            "statistical-linearisation",
            "exact mean for every sensor that it serves, cross-covariance for every sensor that it serves, covariance up to \
             degree 1",
            "1 M at a = 2; 1 M at a = 4; 1 M at a = 6; 1 M at a = 10 source",
        ),
        (
            "conjugate-4",
            "cross-covariance up to degree 4",
            "have to lie infinitely far away; give w0 above 0 and up to 0.5; 24 at a = 4; 76 at a = 6; 1044 at a = 10 source",
        ),
    ]
    .map(|(id, one, two)| (id, [one, two]))
    {
        let page = desk.succeed(&["catalogue", "methods", id]);
        let flat = page.split_whitespace().collect::<Vec<_>>().join(" ");
        for fact in facts {
            assert!(flat.contains(fact), "{fact} is missing in {flat}");
        }
    }
    let table = desk.succeed(&["catalogue", "methods"]);
    let flat = table.split_whitespace().collect::<Vec<_>>().join(" ");
    for row in ["5, 9, 13, 21 3, 2, 1 4, 6, 10", "9, 33, 73, 201 5, 4, 2 6, 10", "4, 8, 12, 20 3, 2, 1 none"] {
        assert!(flat.contains(row), "{row} is missing in {table}");
    }
}

#[test]
fn a_name_that_is_not_there_is_answered_with_the_nearest() {
    let desk = Desk::new();
    for (shelf, name, start, end) in [
        (
            "sensors",
            "pinhoel",
            "there is no sensor `pinhoel`; did you mean `pinhole`? give one of range-bearing, ",
            "formula",
        ),
        ("sensors", "", "there is no sensor ``; give one of range-bearing, ", "formula"),
        ("sensors", "taylor-1", "there is no sensor `taylor-1`; give one of range-bearing, ", "formula"),
        (
            "methods",
            "tailor-1",
            "there is no method `tailor-1`; did you mean `taylor-1`? give one of taylor-1, ",
            "quasi-monte-carlo",
        ),
        ("scores", "floor", "`catalogue scores` shows every score whole; ", "leave out `floor`"),
    ] {
        let said = desk.refuse(&["catalogue", shelf, name]);
        assert!(said.starts_with(start) && said.ends_with(end), "{said}");
    }
}

/// The suite to start from is the case to start from.
#[test]
fn every_example_is_a_suite_too() {
    let desk = Desk::new();
    for kind in sensor::KINDS {
        let page = desk.succeed(&["catalogue", "sensors", kind.name]);
        let start = page.find("\n[sensor]\n").unwrap_or_else(|| panic!("{page}"));
        let end = page[start..].find("\n\n  The same as a case record").unwrap_or_else(|| panic!("{page}"));
        let suite = Suite::from_text("pasted", "pasted.toml", &page[start..start + end], None);
        let suite = suite.unwrap_or_else(|e| panic!("{}: {e}\n{page}", kind.name));
        let example = Case::from_json(serde_json::from_str(kind.example).unwrap()).unwrap();
        assert_eq!(suite.cases.len(), 1);
        assert_eq!(suite.cases[0].question(), example.question(), "{}", kind.name);
    }
}

/// What is printed to start from does start: every example, pasted into one file, is surveyed.
#[test]
fn every_example_can_be_pasted_and_surveyed() {
    let desk = Desk::new();
    let examples: Vec<String> = sensor::KINDS
        .iter()
        .map(|kind| {
            let page = desk.succeed(&["catalogue", "sensors", kind.name]);
            page.lines().find(|line| line.starts_with('{')).unwrap().to_string()
        })
        .collect();
    desk.write("pasted.jsonl", &(examples.join("\n") + "\n"));
    let survey = ["survey", "--cases", "pasted.jsonl", "--cap", "8192", "--no-timing", "--out", "found"];
    desk.succeed(&survey);
    let cases: Vec<CaseRecord> = desk.lines("found/pasted/cases.jsonl");
    let references: Vec<MomentsRecord> = desk.lines("found/pasted/references.jsonl");
    assert_eq!((cases.len(), references.len()), (sensor::KINDS.len(), sensor::KINDS.len()));
    for reference in &references {
        assert!(reference.mean.iter().all(Option::is_some), "{reference:?}");
    }
}
