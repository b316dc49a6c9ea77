//! Published guidance: what the page says by its script is what the library computes; foreign text stays text.

use std::path::{Path, PathBuf};
use std::process::Command;

use gaussworthy::guidance::{Budget, Outcome, Study, View};
use gaussworthy::publish::Publication;
use gaussworthy::trust::{Limits, Trust};
use serde_json::{Value, json};

/// A title that would be a script, an element and a cell of a table, if anybody let it.
const FOREIGN: &str = "</script><b data-foreign>bold</b> | `code` [link](x) {{ braces }}";

/// Grids of one and of two sweeps, draws, a method that is refused by the budget, a case without noise and one whose reference
/// is refused.
fn suite() -> String {
    format!(
        r#"
title = {FOREIGN:?}
note = "Invented numbers: a radar of Brackmoor Sound."
draws = 2
precision = 3e-3
cap = 131072
method = "every"
[sensor]
kind = "range-bearing"
station = [0, 0]
[prior]
range = {{ from = "300 m", to = "6 km", steps = 3, scale = "log" }}
bearing = "35 deg"
along_sd = "30 m"
across_sd = {{ list = ["1 deg", "6 deg", "18 deg"] }}
[noise]
sd = ["10 m", "0.3 deg"]
[[family]]
name = "grid"
[[family]]
name = "line <i>"
[family.prior]
range = {{ from = "300 m", to = "6 km", steps = 5, scale = "log" }}
bearing = {{ draw = "uniform", from = "0 deg", to = "360 deg" }}
along_sd = "20 m"
across_sd = "4 deg"
[[family]]
name = "noiseless"
[family.prior]
mean = [500, 300]
sd = [20, 20]
[family.noise]
covariance = 0
[[family]]
name = "around"
[family.sensor]
kind = "bearing-only"
station = [0, 0]
[family.prior]
mean = [0, 0]
sd = [1, 1]
[family.noise]
sd = "0.5 deg"
"#
    )
}

fn gaussworthy(arguments: &[&str]) -> std::process::Output {
    Command::new(env!("CARGO_BIN_EXE_gaussworthy")).args(arguments).output().unwrap()
}

/// The results folder of the suite above.
fn results(folder: &Path) -> PathBuf {
    let toml = folder.join("foreign.toml");
    std::fs::write(&toml, suite()).unwrap();
    let out = folder.join("results");
    let done = gaussworthy(&["survey", toml.to_str().unwrap(), "--out", out.to_str().unwrap()]);
    assert!(done.status.success(), "{}", String::from_utf8_lossy(&done.stderr));
    out.join("foreign")
}

/// Limits and budgets that move verdicts either way.
fn trials(own: Limits) -> Vec<(&'static str, Limits, Budget)> {
    let any = Budget::default();
    let mut strict = own;
    (strict.mean_error, strict.nees_ratio_high, strict.excess) = (0.01, 1.01, 1e-3);
    let mut lax = own;
    (lax.mean_error, lax.variance_ratio_low, lax.variance_ratio_high) = (2.0, 0.1, 10.0);
    (lax.cross_covariance_error, lax.nees_ratio_low, lax.nees_ratio_high, lax.excess) = (2.0, 0.1, 30.0, 10.0);
    (lax.floor) = 0.4;
    vec![
        ("the suite's own", own, any),
        ("strict", strict, any),
        ("lax", lax, any),
        ("few evaluations", own, Budget { evaluations: Some(5), ..any }),
        ("no derivatives", lax, Budget { no_derivatives: true, ..any }),
        ("nothing affordable", own, Budget { evaluations: Some(0), ..any }),
    ]
}

/// What the page carries for its script.
fn carried(page: &str) -> Value {
    let data = page.split_once(r#"<script type="application/json" id="data">"#).unwrap().1;
    serde_json::from_str(data.split_once("</script>").unwrap().0).unwrap()
}

/// What the library finds, as the page is to show it: counts in the order of rows, and what stands in every cell of every map.
fn found(study: &Study, data: &Value, limits: Limits, budget: Budget) -> (Value, Value, Vec<String>) {
    let view = View::new(study, limits, budget);
    let ranking = view.ranking();
    let counts = ranking.iter().map(|r| json!([r.entrant, r.trusted, r.rejected, r.undecided])).collect();
    let cell = |cell: &gaussworthy::guidance::Cell| {
        let mut words = vec![match cell.choice {
            Some(entrant) => data["methods"][entrant]["code"].as_str().unwrap(),
            None => "none",
        }];
        words.extend((cell.beyond_gaussian > 0).then_some("!"));
        json!(words)
    };
    let choices = view.maps().iter().map(|map| map.cells.iter().map(cell).collect::<Value>()).collect();
    let verdicts = (0..study.cases.len())
        .flat_map(|case| (0..study.labels.len()).map(move |entrant| (case, entrant)))
        .map(|(case, entrant)| view.outcome(case, entrant).name().to_string());
    (counts, choices, verdicts.collect())
}

/// Runs the page's own script in Node, without a page, on the data that the page carries.
const IN_NODE: &str = r#"
const fs = require("fs");
const [page, trials] = process.argv.slice(2).map((file) => fs.readFileSync(file, "utf8"));
const script = page.split('<script id="judge">')[1].split("</script>")[0];
const Judge = new Function(script + "; return Judge;")();
const data = JSON.parse(page.split('<script type="application/json" id="data">')[1].split("</script>")[0]);
const suite = Judge.decoded(data.suites[0]);
const out = JSON.parse(trials).map(({ limits, budget }) => {
  const found = Judge.view(suite, limits, { evaluations: budget.evaluations, time: budget.time, derivatives: !budget.no_derivatives });
  return {
    counts: found.ranking.map((r) => [r.entrant, r.trusted, r.rejected, r.undecided]),
    breaks: found.ranking.map((r) => r.breaks),
    verdicts: found.verdicts.map((v) => v.name),
    choices: suite.maps.map((map) => map.cells.map((cell) => {
      const best = Judge.choice(suite, found, cell.cases);
      const beyond = cell.cases.some((item) => found.floors[item] === "broken");
      return [best ? suite.methods[best.entrant].code : "none", ...(beyond ? ["!"] : [])];
    })),
  };
});
console.log(JSON.stringify(out));
"#;

#[test]
fn the_page_judges_as_the_library_does() {
    let folder = tempfile::tempdir().unwrap();
    let results = results(folder.path());
    let to = folder.path().join("guidance");
    let done = gaussworthy(&["publish", results.to_str().unwrap(), "--to", to.to_str().unwrap()]);
    assert!(done.status.success(), "{}", String::from_utf8_lossy(&done.stderr));
    let page_file = to.join("index.html");
    let page = std::fs::read_to_string(&page_file).unwrap();
    let data = &carried(&page)["suites"][0];
    let study = Study::read(&results).unwrap();

    // Every verdict of the survey is found again from its scores, but where it rests on something else.
    let own = View::own(&study);
    for (c, case) in study.cases.iter().enumerate() {
        for (entrant, entry) in case.entries.iter().enumerate() {
            assert_eq!(own.outcome(c, entrant), entry.outcome, "{} {}", case.id, study.labels[entrant]);
            let doubtful = !case.reference.bears_verdicts();
            let odd = entry.outcome == Outcome::Skipped || entry.reason.starts_with("no Gaussian");
            let singular = case.family == "noiseless";
            assert!(entry.by_scores || doubtful || odd || singular, "{}: {}", case.id, entry.reason);
        }
    }
    let outcomes = |wanted: Trust| {
        own.ranking()
            .iter()
            .map(|r| match wanted {
                Trust::Trusted => r.trusted,
                Trust::Rejected => r.rejected,
                Trust::Undecided => r.undecided,
            })
            .sum::<usize>()
    };
    assert!([Trust::Trusted, Trust::Rejected, Trust::Undecided].map(outcomes).iter().all(|&count| count > 0));

    let trials = trials(study.provenance.settings.limits);
    let asked: Vec<Value> =
        trials.iter().map(|(_, limits, budget)| json!({ "limits": limits, "budget": budget })).collect();
    let expected: Vec<_> =
        trials.iter().map(|&(name, limits, budget)| (name, found(&study, data, limits, budget))).collect();
    for pair in expected.windows(2) {
        assert_ne!(pair[0].1.0, pair[1].1.0, "{} changes nothing", pair[1].0);
    }

    let (script, trials_file) = (folder.path().join("judge.js"), folder.path().join("trials.json"));
    std::fs::write(&script, IN_NODE).unwrap();
    std::fs::write(&trials_file, serde_json::to_string(&asked).unwrap()).unwrap();
    match Command::new("node").args([&script, &page_file, &trials_file]).output() {
        Err(_) => eprintln!("SKIPPED: there is no node; the page's script was not held against the library by it"),
        Ok(done) => {
            assert!(done.status.success(), "{}", String::from_utf8_lossy(&done.stderr));
            let by_page: Vec<Value> = serde_json::from_slice(&done.stdout).unwrap();
            for ((name, (counts, choices, verdicts)), by_page) in expected.iter().zip(&by_page) {
                assert_eq!(by_page["verdicts"], json!(verdicts), "{name}");
                assert_eq!(by_page["counts"], *counts, "{name}");
                assert_eq!(by_page["choices"], *choices, "{name}");
            }
            let breaks: Vec<Value> = own.ranking().iter().map(|r| json!(r.breaks_first)).collect();
            assert_eq!(by_page[0]["breaks"], json!(breaks));
        }
    }

    // The gate gives a Python that can drive a browser.
    let Ok(python) = std::env::var("GAUSSWORTHY_BROWSER_PYTHON") else {
        eprintln!("SKIPPED: GAUSSWORTHY_BROWSER_PYTHON is not set; the page was not opened in a browser");
        return;
    };
    let trials: Vec<Value> = trials
        .iter()
        .zip(&expected)
        .map(|((name, limits, budget), (_, (counts, choices, _)))| {
            let mut limits = json!(limits);
            limits.as_object_mut().unwrap().remove("confidence");
            json!({ "name": name, "limits": limits, "budget": budget, "counts": counts, "choices": choices })
        })
        .collect();
    let expected = json!({ "suites": [{ "trials": trials }], "foreign": FOREIGN });
    let expected_file = folder.path().join("expected.json");
    std::fs::write(&expected_file, expected.to_string()).unwrap();
    let mut command = Command::new(python);
    command
        .arg(Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/browser/page.py"))
        .args([&page_file, &expected_file]);
    command.args(std::env::var_os("GAUSSWORTHY_SCREENSHOTS"));
    let done = command.output().unwrap();
    let said = String::from_utf8_lossy(&done.stdout);
    assert!(done.status.success(), "{said}{}", String::from_utf8_lossy(&done.stderr));
}

#[test]
fn foreign_text_stays_text() {
    let folder = tempfile::tempdir().unwrap();
    let results = results(folder.path());
    let to = folder.path().join("guidance");
    Publication::read(None, &[results]).unwrap().write(&to).unwrap();
    let page = std::fs::read_to_string(to.join("index.html")).unwrap();
    assert!(!page.contains("<b data-foreign") && !page.contains("<i>\""), "markup came through");
    assert!(page.contains("&#60;/script&#62;&#60;b data-foreign&#62;"));
    // Two scripts and the data, as the template has them.
    assert_eq!(page.matches("</script>").count(), 3);
    let text = std::fs::read_to_string(to.join("guidance.md")).unwrap();
    assert!(text.contains(r"\</script\>\<b data-foreign\>bold\</b\> \| \`code\` \[link\](x)"), "{text}");
    // Nothing is fetched.
    for outward in ["src=\"http", "href=\"http", "url(http", "@import"] {
        assert!(!page.contains(outward), "{outward}");
    }
    for section in
        ["answer", "caution", "explore", "envelopes", "methods", "definitions", "references", "reproduce"]
    {
        let at =
            |name: &str| page.find(&format!("id=\"{name}\"")).or_else(|| page.find(&format!("class=\"{name}\"")));
        assert!(at(section).is_some(), "{section}");
    }
}

#[test]
fn what_cannot_be_published_is_said() {
    let folder = tempfile::tempdir().unwrap();
    let to = folder.path().join("to");
    let to = to.to_str().unwrap();
    let nowhere = gaussworthy(&["publish", "no/such/folder", "--to", to]);
    assert_eq!(nowhere.status.code(), Some(2));
    let said = String::from_utf8(nowhere.stderr).unwrap();
    assert!(said.contains("no/such/folder/manifest.json") && said.contains("a survey has written"), "{said}");

    let results = results(folder.path());
    let twice = gaussworthy(&["publish", results.to_str().unwrap(), results.to_str().unwrap(), "--to", to]);
    assert_eq!(twice.status.code(), Some(2));
    assert!(String::from_utf8(twice.stderr).unwrap().contains("name each suite once"));

    let scores = results.join("scores.csv");
    let table = std::fs::read_to_string(&scores).unwrap();
    for (spoilt, word) in [
        (table.replacen("verdict", "judgement", 1), "no column `verdict`"),
        (table.replacen("trusted", "hallowed", 1), "`hallowed` cannot stand in column `verdict`"),
        (table.lines().take(2).collect::<Vec<_>>().join("\n"), "they are not of one survey"),
    ] {
        std::fs::write(&scores, spoilt).unwrap();
        let done = gaussworthy(&["publish", results.to_str().unwrap(), "--to", to]);
        let said = String::from_utf8(done.stderr).unwrap();
        assert_eq!(done.status.code(), Some(2), "{said}");
        assert!(said.contains("scores.csv") && said.contains(word), "{said}");
        assert!(!Path::new(to).exists(), "something was published all the same");
    }
}
