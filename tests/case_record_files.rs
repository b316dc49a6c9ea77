//! Files of case records as their users meet them: read back to the bit, refused with line and key.

use std::io::Write;
use std::path::Path;

use gaussworthy::sensor::KINDS;
use gaussworthy::suite::{Case, Suite};

fn same_bits(a: &Case, b: &Case) -> bool {
    let bits = |case: &Case| {
        let numbers = case.prior().mean().iter().chain(case.prior().covariance().iter());
        numbers.chain(case.noise_or_zero().iter()).map(|v| v.to_bits()).collect::<Vec<_>>()
    };
    a.id() == b.id() && bits(a) == bits(b) && a.to_json() == b.to_json()
}

fn file(folder: &Path, name: &str, bytes: &[u8]) -> std::path::PathBuf {
    let path = folder.join(name);
    std::fs::File::create(&path).unwrap().write_all(bytes).unwrap();
    path
}

#[test]
fn case_records_are_read_line_by_line() {
    let folder = tempfile::tempdir().unwrap();
    let suite = Suite::load("smoke", None).unwrap();
    let lines: Vec<_> = suite.cases.iter().map(|case| format!("{}\n\n", case.to_json())).collect();
    let path = file(folder.path(), "mine.jsonl", lines.concat().as_bytes());
    let back = Suite::from_case_records(&path).unwrap();
    assert_eq!((&*back.name, back.cases.len()), ("mine", suite.cases.len()));
    assert!(back.cases.iter().zip(&suite.cases).all(|(a, b)| same_bits(a, b)));
}

#[test]
fn case_records_that_cannot_be_meant_are_refused() {
    const GOOD: &str = r#"{"case":"k-1","sensor":{"kind":"range-bearing","station":[0,0]},"prior":{"mean":[30,10],"covariance":[[9,2],[2,4]]},"noise":{"covariance":0.01}}"#;
    let folder = tempfile::tempdir().unwrap();
    let kinds = KINDS.iter().map(|k| k.name).collect::<Vec<_>>().join(", ");
    let said = |text: &str| {
        let path = file(folder.path(), "r.jsonl", text.as_bytes());
        let error = Suite::from_case_records(&path).unwrap_err().to_string();
        error.replace(&format!("{}/", folder.path().display()), "").replace(&kinds, "KINDS")
    };
    let second = |from: &str, to: &str| {
        let line = GOOD.replace("k-1", "k-2");
        assert!(line.contains(from), "{from}");
        format!("{GOOD}\n\n{}\n", line.replacen(from, to, 1))
    };
    const EMPTY: &str = "r.jsonl:1: holds no case; give one case record a line, as {\"case\":\"k-001\",\"sensor\":{..},\"prior\":{..}}";
    let table = [
        (String::new(), EMPTY),
        ("\n  \n".into(), EMPTY),
        (format!("{GOOD}\n\n{GOOD}\n"), "r.jsonl:3: case: the name \"k-1\" stands on line 1 already; rename one"),
        (format!("{GOOD}\n{{\"case\":"), "r.jsonl:2: is not JSON: EOF while parsing a value (column 8)"),
        (
            format!("{GOOD}\n[1]"),
            "r.jsonl:2: is no case record; give an object {\"case\":..,\"sensor\":..,\"prior\":..}",
        ),
        (
            second("\"prior\"", "\"piror\""),
            "r.jsonl:3: piror: unknown key `piror`; did you mean `prior`? allowed: case, sensor, prior, noise",
        ),
        (
            second("\"mean\":", "\"mean\":[1,2],\"mean\":"),
            "r.jsonl:3: prior.mean: the key stands twice; delete one",
        ),
        (second("\"prior\":", "\"case\":\"k-3\",\"prior\":"), "r.jsonl:3: case: the key stands twice; delete one"),
        (second("\"mean\":[30,10],", ""), "r.jsonl:3: prior: `mean` is missing"),
        (second("[30,10]", "[30,\"x\"]"), "r.jsonl:3: prior.mean[1]: is the text \"x\"; give a number"),
        (second("[30,10]", "[30,NaN]"), "r.jsonl:3: is not JSON: expected value (column 85)"),
        (
            second("[[9,2],[2,4]]", "[[9,2],[1,4]]"),
            "r.jsonl:3: prior.covariance: covariance[0][1] is 2, but covariance[1][0] is 1; a covariance is symmetric",
        ),
        (
            second("[[9,2],[2,4]]", "[[9,2],[2]]"),
            "r.jsonl:3: prior.covariance[1]: has 1 numbers, but the first row has 2",
        ),
        (second("[0,0]", "[0,0,0]"), "r.jsonl:3: sensor.station: has length 3; give a list of length 2"),
        (second("range-bearing", "sonar"), "r.jsonl:3: sensor.kind: there is no sensor `sonar`; give one of KINDS"),
        (
            second("0.01", "-0.01"),
            "r.jsonl:3: noise.covariance: covariance[0][0] is -0.01; a variance cannot be negative",
        ),
        (second("0.01", "\"x\""), "r.jsonl:3: noise.covariance: is \"x\"; give a 2 x 2 matrix or one number"),
        (
            second("k-2", "k,2"),
            "r.jsonl:3: case: the name holds `,`; use printable characters, no comma and no quotes",
        ),
    ];
    let wrong: Vec<_> = table
        .into_iter()
        .filter(|(text, expected)| said(text) != *expected)
        .map(|(text, expected)| format!("expected {expected}\n    said {}\n", said(&text)))
        .collect();
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
    // A line that never ends is not read to its end.
    let endless = format!("{GOOD}\n{}", "x".repeat((8 << 20) + 2));
    assert_eq!(said(&endless), "r.jsonl:2: the line is longer than 8 MiB, the most for a case");
}
