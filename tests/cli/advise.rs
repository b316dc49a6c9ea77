//! `advise`: a case, a budget, and an answer.

use serde_json::Value;

use crate::desk::{CAUTION, Desk, assert_narrow};

/// A buoy that hears a ship 200 m off with a spread of 60 m across: no line any more.
const CLOSE: &str = r#"{"case":"close","sensor":{"kind":"bearing-only","station":[0,0]},"prior":{"mean":[100,173],"covariance":[[6000,2500],[2500,8000]]},"noise":{"covariance":3e-4}}"#;
/// The same buoy, a ship 8 km off.
const FAR: &str = r#"{"case":"far","sensor":{"kind":"bearing-only","station":[0,0]},"prior":{"mean":[4000,6900],"covariance":[[6000,2500],[2500,8000]]},"noise":{"covariance":3e-4}}"#;

fn advice(desk: &Desk, extra: &[&str]) -> Value {
    let out = desk.succeed(&[&["advise", "--no-timing", "--format", "json"], extra].concat());
    assert_eq!(out.lines().count(), 1);
    serde_json::from_str(&out).unwrap()
}

#[test]
fn where_a_line_will_do_the_cheapest_is_taken() {
    let desk = Desk::new();
    let found = advice(&desk, &["--record", FAR]);
    // Three numbers, a value and two slopes, are less than any point set takes; simplex has three points and is as cheap, but
    // for a name that comes later.
    let first = &found["methods"][0];
    assert_eq!((&found["recommendation"], &first["verdict"]), (&first["method"], &Value::from("trusted")));
    assert_eq!(first["work"], 3);
    let text = desk.succeed(&["advise", "--no-timing", "--record", FAR]);
    assert!(text.starts_with("far\n  Take "), "{text}");
    assert!(text.contains(CAUTION));
    assert_narrow(&text);
}

#[test]
fn a_budget_binds() {
    let desk = Desk::new();
    let without =
        advice(&desk, &["--record", FAR, "--no-derivatives", "--no-negative-weights", "--most-evaluations", "8"]);
    let methods = without["methods"].as_array().unwrap();
    let chosen = methods.iter().find(|m| m["method"] == without["recommendation"]).unwrap();
    assert!(chosen["evaluations"].as_u64().unwrap() <= 8);
    let objections: Vec<&str> = methods.iter().filter_map(|m| m["beyond_budget"].as_str()).collect();
    for word in ["needs derivatives", "has negative weights", "8 are allowed"] {
        assert!(objections.iter().any(|o| o.contains(word)), "{word}: {objections:?}");
    }
    let single = advice(&desk, &["--record", FAR, "--single-precision"]);
    let served = single["methods"].as_array().unwrap().iter().filter(|m| m["verdict"] != "skipped");
    assert!(served.clone().count() > 10);
    assert!(served.into_iter().all(|m| m["method"].as_str().unwrap().ends_with(":arithmetic=f32")));
}

#[test]
fn where_nothing_will_do_it_says_how_far_the_prior_must_shrink() {
    let desk = Desk::new();
    let found = advice(&desk, &["--record", CLOSE, "--methods", "taylor-1,unscented"]);
    assert_eq!(found["recommendation"], Value::Null);
    let reasons: Vec<&str> = found["reasons"].as_array().unwrap().iter().map(|r| r.as_str().unwrap()).collect();
    assert!(reasons[0].contains("No method within the budget keeps every limit"), "{reasons:?}");
    let shrink = reasons.last().unwrap();
    let scale: f64 = shrink
        .split_once("at ")
        .and_then(|(_, rest)| rest.split_once(" of what"))
        .and_then(|(scale, _)| scale.parse().ok())
        .unwrap_or_else(|| panic!("{shrink}"));
    // As it says: trusted there, and not at a tenth more.
    for (factor, trusted) in [(scale, true), (1.1 * scale, false)] {
        let s = factor * factor;
        let record = CLOSE.replace(
            "[6000,2500],[2500,8000]",
            &format!("[{},{}],[{},{}]", 6000.0 * s, 2500.0 * s, 2500.0 * s, 8000.0 * s),
        );
        let again = advice(&desk, &["--record", &record, "--methods", "taylor-1"]);
        assert_eq!(again["methods"][0]["verdict"] == "trusted", trusted, "{factor}: {again}");
    }
    assert!(found["methods"].as_array().unwrap().iter().all(|m| m["cause"].is_string()), "{found}");
}

#[test]
fn envelopes_of_an_earlier_survey_are_held_against_the_case() {
    let desk = Desk::new();
    let suite = "draws = 600\nseed = 5\nprecision = 1e-2\n[envelope]\n[[method]]\nid = \"taylor-1\"\n[sensor]\n\
        kind = \"bearing-only\"\nstation = [0, 0]\n[prior]\n\
        range = { draw = \"log-uniform\", from = \"1 km\", to = \"20 km\" }\nbearing = \"50 deg\"\n\
        along_sd = \"5 %\"\nacross_sd = { draw = \"log-uniform\", from = \"0.1 deg\", to = \"10 deg\" }\n[noise]\nsd = \"1 deg\"\n";
    desk.write("buoys.toml", suite);
    let printed = desk.succeed(&["survey", "buoys.toml", "--no-timing"]);
    assert!(printed.contains("Envelopes: where each method is trusted"), "{printed}");
    assert_narrow(&printed);
    let found = advice(&desk, &["buoys.toml", "--case", "buoys-003"]);
    let envelopes = found["methods"][0]["envelopes"].as_array().unwrap();
    assert!(!envelopes.is_empty(), "{found}");
    for envelope in envelopes {
        let kept = |t: &Value| t["value"].as_f64().unwrap() <= t["limit"].as_f64().unwrap();
        let inside = envelope["terms"].as_array().unwrap().iter().all(kept);
        assert_eq!(envelope["inside"], inside);
    }
    // Of another suite, by its folder.
    let close = advice(&desk, &["--record", CLOSE, "--methods", "taylor-1", "--envelopes", "results/buoys"]);
    assert_eq!(close["methods"][0]["envelopes"][0]["inside"], false);
}

#[test]
fn what_cannot_be_meant_is_refused() {
    let desk = Desk::new();
    for (arguments, word) in [
        (vec!["advise", "smoke", "--case", "gauge-01"], "smoke: has no case `gauge-01`; did you mean"),
        (vec!["advise", "smoke", "--case", "none"], "hand-out"),
        (vec!["advise", "--record", "{"], "--record: is not JSON"),
        (vec!["advise", "--record", r#"{"case":"x"}"#], "--record: "),
        (vec!["advise"], "name one"),
        (vec!["advise", "--record", FAR, "--most-time", "0"], "--most-time: give a ratio above 0"),
        (vec!["advise", "--record", FAR, "--most-time", "2", "--no-timing"], "--most-time: nothing is timed"),
        (vec!["advise", "--record", FAR, "--envelopes", "nowhere"], "envelopes.json: cannot be read"),
    ] {
        let outcome = desk.run(&arguments);
        assert_eq!(outcome.code, Some(2), "{arguments:?}: {outcome:?}");
        assert!(outcome.err.contains(word), "{arguments:?}: {}", outcome.err);
    }
}
