//! The catalogue lists everything that can be named.

use gaussworthy::score::ScoreKind;
use gaussworthy::{method, sensor};

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
        ("sensors", &["x:", "p:", "':", "rows x columns"][..]),
        ("methods", &["a:", "evaluations:", "default"]),
        ("scores", &["n:", "p:", "mu, S, C:", "P:", "R:", "A hat", "b =", "O:", "B:", "K:", "M:", "nats:", "tr:"]),
    ] {
        let page = desk.succeed(&["catalogue", shelf]);
        let legend = page.split("\n\n").last().unwrap().split_whitespace().collect::<Vec<_>>().join(" ");
        for symbol in symbols {
            assert!(legend.contains(symbol), "{shelf} does not say what {symbol} is: {legend}");
        }
    }
}
